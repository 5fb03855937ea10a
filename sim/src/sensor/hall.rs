//! The sensor at work.

use super::line::Line;
use super::noise::{Shake, Shaking, Spikes, nanos};
use super::spec::{Fault, SensorSpec};
use super::track::{Place, Track};
use crate::lathe::{Ripple, Segment};
use crate::random::Random;
use rimrate_core::time::Edge;

/// Streams of the run's seed.
const STREAM_EDGES: u64 = 0x6564_6765;
const STREAM_SPIKES: u64 = 0x7370_696b;
const STREAM_SHAKE: u64 = 0x7368_616b;
/// Normal numbers are cut at this many standard deviations, so that a delay of as many on average is never negative.
const CUT: f64 = 4.0;
/// The longest that a delay given as an angle may last, ns: near standstill it would be endless.
const LONGEST_DELAY: f64 = 20e6;

/// Which faults are on.
#[derive(Clone, Debug, Default)]
struct Faults {
    chatter: bool,
    spikes: bool,
    dropouts: bool,
    lost: Vec<u32>,
    stuck_high: bool,
    stuck_low: bool,
    shake_regular: bool,
    shake_random: bool,
}

/// A hall sensor and its magnets: the line is low while a magnet faces it.
#[derive(Clone, Debug)]
pub struct Sensor {
    spec: SensorSpec,
    track: Track,
    faults: Faults,
    line: Line,
    spikes: Spikes,
    shaking: Shaking,
    edges: Random,
    spike_chance: Random,
    shake_chance: Random,
    /// The time up to which the motion is known, ns.
    now: u64,
    /// Where the sensor is in the ring; not known before the first segment.
    place: Option<Place>,
    /// The magnet that it faces makes no pulse.
    silent: bool,
    /// The smooth angles at which the place changes, backwards and forwards, under this ripple.
    limits: (f64, f64),
    ripple: Ripple,
}

impl Sensor {
    /// A sensor at time 0; the same seed and the same motion give the same edges.
    pub fn new(spec: SensorSpec, seed: u64) -> Self {
        Sensor {
            track: Track::new(&spec),
            spec,
            faults: Faults::default(),
            line: Line::default(),
            spikes: Spikes::default(),
            shaking: Shaking::default(),
            edges: Random::new(seed, STREAM_EDGES),
            spike_chance: Random::new(seed, STREAM_SPIKES),
            shake_chance: Random::new(seed, STREAM_SHAKE),
            now: 0,
            place: None,
            silent: false,
            limits: (f64::NEG_INFINITY, f64::INFINITY),
            ripple: Ripple::default(),
        }
    }

    /// Switches a fault on or off, from the end of the last segment on. A passage that is under way is not undone.
    pub fn set(&mut self, fault: Fault, on: bool) {
        let faults = &mut self.faults;
        match fault {
            Fault::Chatter => faults.chatter = on,
            Fault::Spikes => faults.spikes = on,
            Fault::Dropouts => faults.dropouts = on,
            Fault::MagnetLost(number) => {
                faults.lost.retain(|lost| *lost != number);
                if on {
                    faults.lost.push(number);
                }
            }
            Fault::StuckHigh => faults.stuck_high = on,
            Fault::StuckLow => faults.stuck_low = on,
            Fault::ShakeRegular => faults.shake_regular = on,
            Fault::ShakeRandom => faults.shake_random = on,
        }
        let stuck = if self.faults.stuck_low {
            Some(true)
        } else if self.faults.stuck_high {
            Some(false)
        } else {
            None
        };
        self.line.hold(stuck, self.now);
    }

    /// How many magnets there are, lost ones included.
    pub fn magnets(&self) -> u32 {
        self.spec.magnets
    }

    /// True where the line is low after the edges handed out so far. Before the first segment it is not known and false.
    pub fn is_low(&self) -> bool {
        self.line.is_low()
    }

    /// Takes in the next piece of motion, which starts where the last one ended, and hands out the edges before its end:
    /// in order of time, no two at the same, falls and rises in turn.
    pub fn sense(&mut self, segment: &Segment, on_edge: &mut impl FnMut(Edge)) {
        let start = segment.start.nanos();
        let end = start.saturating_add(segment.len_ns);
        if self.place.is_none() || self.ripple != segment.ripple {
            self.begin(segment);
        }
        let shake = match segment.is_still() {
            true if self.faults.shake_random => Some(Shake::Random),
            true if self.faults.shake_regular => Some(Shake::Regular),
            _ => None,
        };
        let span = (start, end);
        self.spikes.play(
            self.faults.spikes,
            span,
            &self.spec,
            &mut self.spike_chance,
            &mut self.line,
        );
        self.shaking.play(
            shake,
            matches!(self.place, Some(Place::Facing(_))) && !self.silent,
            span,
            &self.spec,
            &mut self.shake_chance,
            &mut self.line,
        );

        // Within a piece the speed changes its sign at most once; each part is solved on its own.
        let secs = segment.secs();
        let turning = -segment.speed / segment.accel;
        let bounds = if turning > 0.0 && turning < secs {
            [0.0, turning, secs]
        } else {
            [0.0, secs, secs]
        };
        for part in bounds.windows(2) {
            self.pass(segment, part[0], part[1], on_edge);
        }
        self.line.play(end, on_edge);
        self.now = end;
    }

    /// Finds its place, or the limits of its place under another ripple.
    fn begin(&mut self, segment: &Segment) {
        self.ripple = segment.ripple;
        let place = match self.place {
            Some(place) => place,
            None => {
                let place = self.track.place(segment.ripple.angle(segment.angle));
                let low = self.arrive(place);
                self.line.begin(low);
                place
            }
        };
        self.settle(place);
    }

    /// Whether the line goes low on coming to a place.
    fn arrive(&mut self, place: Place) -> bool {
        let Place::Facing(number) = place else {
            return false;
        };
        let lost = self
            .track
            .number(number)
            .is_some_and(|number| self.faults.lost.contains(&number));
        self.silent = lost || self.faults.dropouts && self.edges.chance(self.spec.dropout);
        !self.silent
    }

    /// Takes a place and works out where it ends.
    fn settle(&mut self, place: Place) {
        let (back, ahead) = self.track.limits(place);
        let smooth = |angle: f64| {
            if angle.is_finite() {
                self.ripple.smooth(angle)
            } else {
                angle
            }
        };
        self.limits = (smooth(back), smooth(ahead));
        self.place = Some(place);
    }

    /// Passes everything on the way between two times, s into the segment, between which the speed keeps its sign.
    fn pass(&mut self, segment: &Segment, from: f64, until: f64, on_edge: &mut impl FnMut(Edge)) {
        let speed = segment.speed_at(0.5 * (from + until));
        if speed == 0.0 {
            return;
        }
        let forwards = speed > 0.0;
        let start = segment.start.nanos();
        let end = segment.angle_at(until);
        let mut t = from;
        while let Some(place) = self.place {
            let (back, ahead) = self.limits;
            let limit = if forwards { ahead } else { back };
            let reached = if forwards { limit <= end } else { limit >= end };
            if !reached {
                return;
            }
            // Never before the last one, whatever the rounding: the line counts on it.
            t = crossing(segment, limit, forwards).clamp(t, until);
            let next = Track::next(place, forwards);
            let leaves = matches!(place, Place::Facing(_)) && !self.silent;
            let arrives = self.arrive(next);
            if leaves || arrives {
                let at = start.saturating_add(nanos(t * 1e9));
                self.edge(at, segment.speed_at(t).abs() * 360e-9);
                // Whatever is still to come is not earlier than this; so that long pieces do not pile up.
                self.line.play(at, on_edge);
            }
            self.settle(next);
        }
    }

    /// Puts one edge on the line, with its delay and the pieces into which it falls.
    fn edge(&mut self, at: u64, degrees_per_ns: f64) {
        let delay = |degrees: f64| (degrees / degrees_per_ns).min(LONGEST_DELAY);
        let mut at = at;
        if self.spec.jitter_ns > 0.0 {
            let late = CUT + self.edges.normal().clamp(-CUT, CUT);
            at = at.saturating_add(nanos(late * self.spec.jitter_ns));
        }
        if self.spec.jitter_deg > 0.0 {
            let late = CUT + self.edges.normal().clamp(-CUT, CUT);
            at = at.saturating_add(nanos(delay(late * self.spec.jitter_deg)));
        }
        self.line.toggle(at);
        if self.faults.chatter {
            let pieces = 1 + (self.edges.uniform() * f64::from(self.spec.chatter_pieces)) as u32;
            // Two toggles a piece, so that the edge still ends where it led.
            for _ in 0..2 * pieces {
                let behind = self.edges.between(0.0, self.spec.chatter_zone);
                self.line.toggle(at.saturating_add(nanos(delay(behind))));
            }
        }
    }
}

/// When the smooth angle reaches `angle`, s after the start of the segment, on a way that leads only forwards or only
/// backwards until there. Written without the difference that would cancel for small accelerations.
fn crossing(segment: &Segment, angle: f64, forwards: bool) -> f64 {
    let way = if forwards { 1.0 } else { -1.0 };
    let (v, a) = (segment.speed, segment.accel);
    let d = angle - segment.angle;
    if d * way <= 0.0 && v * way >= 0.0 {
        return 0.0;
    }
    let root = libm::sqrt((v * v + 2.0 * a * d).max(0.0));
    if v * way >= 0.0 {
        2.0 * d / (v + way * root)
    } else {
        // First against the way, then along it: the later of the two solutions.
        (-v + way * root) / a
    }
}
