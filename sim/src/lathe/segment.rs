//! The spindle's motion over one short step, exactly: what a sensor solves for its edges.

use core::f64::consts::TAU;
use rimrate_core::time::Instant;

/// One component of the unevenness of a turning spindle.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Wave {
    /// Largest deviation of the speed, as a share of it (0.003 is 0.3 %).
    pub share: f64,
    /// How often it comes round in one turn of the spindle; above 0.
    pub per_turn: f64,
    /// Where it is when the smooth angle is 0, rad.
    pub phase: f64,
}

impl Wave {
    /// The angle that it adds at a smooth angle, rev.
    fn angle(&self, smooth: f64) -> f64 {
        if self.share == 0.0 {
            return 0.0;
        }
        self.share / (TAU * self.per_turn) * libm::sin(TAU * self.per_turn * smooth + self.phase)
    }

    /// The speed that it adds at a smooth angle, as a share.
    fn speed(&self, smooth: f64) -> f64 {
        if self.share == 0.0 {
            return 0.0;
        }
        self.share * libm::cos(TAU * self.per_turn * smooth + self.phase)
    }
}

/// The unevenness that drive and spindle add to the smooth motion: angle = smooth + turn(smooth) + belt(smooth).
///
/// Both waves are tied to the angle, as eccentric pulleys, belt joints and unbalanced work are: they vanish with the
/// motion, in whichever direction the spindle turns.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Ripple {
    /// Once per turn of the spindle.
    pub turn: Wave,
    /// Once per round of the belt.
    pub belt: Wave,
}

impl Ripple {
    /// The true angle at a smooth angle, rev.
    pub fn angle(&self, smooth: f64) -> f64 {
        smooth + self.turn.angle(smooth) + self.belt.angle(smooth)
    }

    /// True speed over smooth speed at a smooth angle.
    pub fn speed(&self, smooth: f64) -> f64 {
        1.0 + self.turn.speed(smooth) + self.belt.speed(smooth)
    }

    /// The largest difference between true and smooth angle, rev.
    fn reach(&self) -> f64 {
        [self.turn, self.belt]
            .iter()
            .filter(|wave| wave.share != 0.0)
            .map(|wave| (wave.share / (TAU * wave.per_turn)).abs())
            .sum()
    }

    /// The smooth angle at which the true angle is `angle`, rev. It exists and is unique while the shares add up to
    /// less than 1.
    pub fn smooth(&self, angle: f64) -> f64 {
        let reach = self.reach();
        if reach == 0.0 {
            return angle;
        }
        // Newton's method, held inside a bracket that every step narrows; a step out of it halves the bracket instead.
        let (mut low, mut high) = (angle - reach, angle + reach);
        let mut smooth = angle;
        for _ in 0..60 {
            let excess = self.angle(smooth) - angle;
            if excess > 0.0 {
                high = smooth;
            } else {
                low = smooth;
            }
            let mut next = smooth - excess / self.speed(smooth);
            if !(next >= low && next <= high) {
                next = 0.5 * (low + high);
            }
            // 1e-14 of a turn is far under a nanosecond at any speed, and above what a double resolves near angle 0.
            let done = (next - smooth).abs() <= 1e-14 * (1.0 + smooth.abs());
            smooth = next;
            if done {
                break;
            }
        }
        smooth
    }
}

/// A stretch of motion with a constant smooth acceleration: smooth(t) = angle + speed t + accel t^2 / 2 for
/// 0 <= t <= len, and the ripple on top of it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Segment {
    /// When it starts.
    pub start: Instant,
    /// How long it is, ns.
    pub len_ns: u64,
    /// Smooth angle at its start, rev; it grows forwards and never wraps.
    pub angle: f64,
    /// Smooth speed at its start, rev/s; negative backwards.
    pub speed: f64,
    /// Smooth acceleration throughout, rev/s2.
    pub accel: f64,
    /// What comes on top of the smooth motion.
    pub ripple: Ripple,
}

impl Segment {
    /// How long it is, s.
    pub fn secs(&self) -> f64 {
        self.len_ns as f64 * 1e-9
    }

    /// True where the spindle stands still throughout.
    pub fn is_still(&self) -> bool {
        self.speed == 0.0 && self.accel == 0.0
    }

    /// Smooth angle `t` seconds after the start, rev.
    pub fn angle_at(&self, t: f64) -> f64 {
        self.angle + (self.speed + 0.5 * self.accel * t) * t
    }

    /// Smooth speed `t` seconds after the start, rev/s.
    pub fn speed_at(&self, t: f64) -> f64 {
        self.speed + self.accel * t
    }
}
