//! Edges of an analytic speed profile, without a lathe: for captures whose true speed is known at every instant.
//!
//! ```
//! use rimrate_sim::sensor::{Sensor, SensorSpec, profile::{self, Piece}};
//!
//! // Two seconds at 800 rpm, then braked to a stop at 3000 rpm/s, then a second at rest.
//! let pieces = [Piece::steady(800.0, 2.0), Piece::ramp(800.0, 0.0, 3000.0), Piece::steady(0.0, 1.0)];
//! let mut sensor = Sensor::new(SensorSpec::ideal(2), 1);
//! let edges = profile::edges(&pieces, &mut sensor);
//! // 26.67 turns steady and 1.78 braking, two magnets: 57 pulses.
//! assert_eq!(edges.len(), 2 * 57);
//! ```

use super::hall::Sensor;
use crate::lathe::{Ripple, Segment};
use rimrate_core::time::Edge;
use rimrate_core::time::{Duration, Instant};

/// A stretch in which the speed changes evenly.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Piece {
    /// How long it lasts, s; rounded to whole nanoseconds.
    pub secs: f64,
    /// Speed at its start, rpm; negative in reverse.
    pub from_rpm: f64,
    /// Speed at its end, rpm. The next piece may start at another one: a jump.
    pub to_rpm: f64,
}

impl Piece {
    /// A constant speed in rpm for a time in seconds.
    pub fn steady(rpm: f64, secs: f64) -> Self {
        Piece {
            secs,
            from_rpm: rpm,
            to_rpm: rpm,
        }
    }

    /// From one speed to another at a rate in rpm per second; the rate's sign does not matter.
    pub fn ramp(from_rpm: f64, to_rpm: f64, rpm_per_s: f64) -> Self {
        Piece {
            secs: ((to_rpm - from_rpm) / rpm_per_s).abs(),
            from_rpm,
            to_rpm,
        }
    }
}

/// A spindle that follows the pieces it is given.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Profile {
    /// The time reached.
    pub now: Instant,
    /// The smooth angle reached, rev; magnets are counted from angle 0.
    pub angle: f64,
    /// What comes on top of the smooth motion.
    pub ripple: Ripple,
}

impl Profile {
    /// At time 0 and an angle in rev, without ripple.
    pub fn new(angle: f64) -> Self {
        Profile {
            now: Instant::ZERO,
            angle,
            ripple: Ripple::default(),
        }
    }

    /// Turns through one piece, past a sensor; between two pieces its faults may be switched.
    pub fn run(&mut self, piece: &Piece, sensor: &mut Sensor, on_edge: &mut impl FnMut(Edge)) {
        let len_ns = libm::round(piece.secs * 1e9) as u64;
        if len_ns == 0 {
            return;
        }
        let speed = piece.from_rpm / 60.0;
        let mut segment = Segment {
            start: self.now,
            len_ns,
            angle: self.angle,
            speed,
            accel: 0.0,
            ripple: self.ripple,
        };
        segment.accel = (piece.to_rpm / 60.0 - speed) / segment.secs();
        sensor.sense(&segment, on_edge);
        self.angle = segment.angle_at(segment.secs());
        self.now += Duration::from_nanos(len_ns);
    }
}

/// All edges of a sensor along the pieces. The spindle starts at time 0, with the first magnet half an even gap ahead of
/// the sensor, so that the line is high.
pub fn edges(pieces: &[Piece], sensor: &mut Sensor) -> Vec<Edge> {
    let mut profile = Profile::new(-0.5 / f64::from(sensor.magnets().max(1)));
    let mut edges = Vec::new();
    for piece in pieces {
        profile.run(piece, sensor, &mut |edge| edges.push(edge));
    }
    edges
}
