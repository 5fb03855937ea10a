//! Edges to a [`Reading`].
//!
//! [`gate`](self) decides what a pulse is, `track` which magnet it belongs to and how fast they pass, `signal` what may be
//! said. Time comes in with the edges and with [`Tacho::reading`]; a reading uses no later edge.

mod gate;
mod signal;
mod track;

use core::num::NonZeroU16;

use heapless::Deque;

use crate::time::{Duration, Edge, Instant};
use crate::units::Rpm;

pub use gate::Rejected;
pub use signal::Signal;

use gate::{Gate, Pulse};
use track::Track;

/// A speed is doubted only after it has been steady for this long.
const DOUBT_AFTER: Duration = Duration::from_secs(1);

/// What the tacho has to know about the spindle and its sensor.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Config {
    /// Pulses in one revolution.
    pub pulses: NonZeroU16,
    /// The hardest stop that the machine can make, rev/min in a second.
    pub brake_rpm_per_s: f32,
    /// The slowest speed worth reading.
    pub slowest: Rpm,
}

/// What is known about the spindle's speed.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Reading {
    /// What may be said.
    pub signal: Signal,
    /// The calm speed, for digits: zero when still, `None` when lost or doubtful.
    pub speed: Option<Rpm>,
    /// The fast speed, for verdict and beacon: as `speed`, but when doubtful the highest speed that the pulses allow.
    pub quick: Option<Rpm>,
}

impl Reading {
    /// No pulses yet.
    pub const NOTHING: Reading = Reading {
        signal: Signal::Still,
        speed: Some(Rpm::ZERO),
        quick: Some(Rpm::ZERO),
    };

    /// Whether the spindle may be turning.
    pub fn is_running(&self) -> bool {
        self.signal != Signal::Still
    }
}

/// From the sensor's edges to the spindle's speed.
#[derive(Clone, Debug)]
pub struct Tacho {
    config: Config,
    gate: Gate,
    track: Track,
    state: State,
    /// The last pulses, oldest first: a start must agree with itself.
    latest: Deque<Pulse, 4>,
    /// How many pulses in a row were too wide for a spindle that turns.
    too_wide: u8,
    /// Low share of the pulse spacing as seen while turning; it tells turning from a parked magnet that shakes.
    low_share: Option<f32>,
}

#[derive(Clone, Copy, Debug, PartialEq)]
enum State {
    Still,
    Turning,
    /// With the last speed, rev/s.
    Lost(f32),
}

/// Without experience: the largest low share of the spacing at which a spindle with few magnets may turn. Magnets of a
/// collar are far smaller than their spacing; a magnet parked at its switching point shakes low for about half the time.
const LOW_SHARE_FEW: f32 = 0.35;
/// The same for toothed wheels, where tooth and gap are alike.
const LOW_SHARE_MANY: f32 = 0.85;
/// From here on it is a toothed wheel.
const MANY_PULSES: u16 = 8;
/// With experience: how far, as a factor, the low share may be above what was seen while turning.
const LOW_SHARE_AGREES: f32 = 2.5;
/// Range of the ratio of neighbouring low shares in a start; magnets of one collar differ somewhat.
const LOW_SHARES_ALIKE: core::ops::Range<f32> = 0.6..1.6;
/// A spindle that stops may end with two wide passages; after this many in a row it is a parked magnet that shakes.
const TOO_WIDE_IS_STILL: u8 = 3;
/// Until the placement is known, the largest gap may be this much wider than an even one: six magnets, each 3 degrees off.
const UNKNOWN_GAP: f32 = 1.1;
/// Range of the ratio of neighbouring intervals that agree. A run-up from rest at constant torque shortens its third
/// interval to 0.77 of its second; a coast lengthens it the other way; six magnets each 3 degrees off give 0.82 to 1.22.
const INTERVALS_AGREE: core::ops::Range<f32> = 0.7..1.4;
/// How far the speed may be from the last one to end a loss after two intervals.
const SPEEDS_AGREE: f32 = 0.10;

impl Tacho {
    /// Starts without knowing anything of the spindle.
    pub fn new(config: Config) -> Self {
        Tacho {
            gate: Gate::default(),
            track: Track::new(config.pulses.get(), config.brake_rpm_per_s),
            state: State::Still,
            latest: Deque::new(),
            too_wide: 0,
            low_share: None,
            config,
        }
    }

    /// What was not counted as a pulse, by kind.
    pub fn rejected(&self) -> Rejected {
        self.gate.rejected
    }

    /// Takes one edge of the sensor's line. O(1).
    pub fn push(&mut self, edge: Edge) {
        self.settle(edge.at);
        let Some(pulse) = self.gate.push(edge) else {
            return;
        };
        let interval = self
            .latest
            .back()
            .map(|before| pulse.at.since(before.at).secs_f32());
        let plausible = interval.is_none_or(|i| pulse.width.secs_f32() / i <= self.widest_share());
        self.too_wide = if plausible {
            0
        } else {
            self.too_wide.saturating_add(1)
        };
        if self.latest.is_full() {
            self.latest.pop_front();
        }
        // Room was just made.
        let _ = self.latest.push_back(pulse);
        match self.state {
            State::Turning if self.too_wide < TOO_WIDE_IS_STILL => {
                self.learn(pulse);
                self.track
                    .push(pulse.at, plausible, &mut self.gate.rejected);
            }
            State::Turning => self.stand_still(),
            State::Still | State::Lost(_) => {
                if let Some(count) = self.starts() {
                    let skip = self.latest.len().saturating_sub(count);
                    self.track.start(self.latest.iter().skip(skip));
                    self.state = State::Turning;
                }
            }
        }
    }

    /// What is known at `now`; `explains` says whether the machine can turn at a speed at all.
    pub fn reading(&mut self, now: Instant, explains: impl Fn(Rpm) -> bool) -> Reading {
        self.settle(now);
        match self.state {
            State::Still => Reading::NOTHING,
            State::Lost(_) => Reading {
                signal: Signal::Lost,
                speed: None,
                quick: None,
            },
            State::Turning => {
                let bound = self.silence_bound(now);
                let believe = |n: Option<f32>| n.map(|n| Rpm::saturating(60.0 * n.min(bound)));
                let (calm, quick) = (believe(self.track.calm()), believe(self.track.quick()));
                let unexplained = self.track.steady_for(DOUBT_AFTER)
                    && calm.is_some_and(|n| n > self.config.slowest && !explains(n));
                if unexplained || self.track.often_missing() {
                    let quick = quick.map(|n| {
                        if unexplained {
                            self.with_a_magnet_gone(n, &explains)
                        } else {
                            n
                        }
                    });
                    Reading {
                        signal: Signal::Doubtful,
                        speed: None,
                        quick,
                    }
                } else {
                    Reading {
                        signal: Signal::Turning,
                        speed: calm,
                        quick,
                    }
                }
            }
        }
    }

    /// When the signal changes next if no edge comes.
    pub fn next_change(&self) -> Option<Instant> {
        if self.state != State::Turning {
            return None;
        }
        self.lost_at().or_else(|| self.still_at())
    }

    /// If one of several magnets is gone the spindle turns faster than the pulses say: assume so where that is explained.
    fn with_a_magnet_gone(&self, speed: Rpm, explains: impl Fn(Rpm) -> bool) -> Rpm {
        let n = f32::from(self.config.pulses.get());
        let faster = speed.scaled(n / (n - 1.0).max(1.0));
        if explains(faster) { faster } else { speed }
    }

    /// Lets silence up to `now` change the state.
    fn settle(&mut self, now: Instant) {
        if self.state != State::Turning {
            return;
        }
        if let Some(at) = self.lost_at() {
            if now >= at {
                self.state = State::Lost(self.track.quick().unwrap_or(0.0));
                self.latest.clear();
            }
        } else if self.still_at().is_some_and(|at| now >= at) {
            self.stand_still();
        }
    }

    /// The last pulses stay: a rhythm just below the slowest speed goes on with the next one.
    fn stand_still(&mut self) {
        self.state = State::Still;
        self.gate.forget_width();
    }

    /// The widest low share of the spacing at which a spindle may turn.
    fn widest_share(&self) -> f32 {
        let without_experience = if self.config.pulses.get() < MANY_PULSES {
            LOW_SHARE_FEW
        } else {
            LOW_SHARE_MANY
        };
        self.low_share
            .map_or(without_experience, |s| s * LOW_SHARE_AGREES)
    }

    fn still_at(&self) -> Option<Instant> {
        let longest =
            60.0 * self.track.largest_gap(1.0) / self.config.slowest.get() * signal::STILL_MARGIN;
        self.track
            .last()
            .map(|last| last + Duration::from_secs_f32(longest))
    }

    fn lost_at(&self) -> Option<Instant> {
        let (turn, before) = self.track.last_turns()?;
        let brake = self.config.brake_rpm_per_s / 60.0;
        let end = signal::slowest_end(turn, before, brake);
        let spacing = turn / f32::from(self.config.pulses.get());
        signal::lost_at(
            self.track.last()?,
            end,
            self.track.largest_gap(UNKNOWN_GAP),
            spacing,
            brake,
        )
    }

    /// The fastest that the silence since the last pulse allows, rev/s.
    fn silence_bound(&self, now: Instant) -> f32 {
        let silence = self
            .track
            .last()
            .map_or(Duration::ZERO, |last| now.since(last))
            .secs_f32();
        if silence > 0.0 {
            self.track.largest_gap(1.0) / silence
        } else {
            f32::INFINITY
        }
    }

    /// How many of the last pulses are a start: from still three agreeing intervals, from lost two that agree with the
    /// last speed.
    fn starts(&self) -> Option<usize> {
        if self.agree(4) {
            return Some(4);
        }
        let State::Lost(speed) = self.state else {
            return None;
        };
        let as_before = self
            .starting_speed(3)
            .is_some_and(|n| (n / speed - 1.0).abs() < SPEEDS_AGREE);
        (as_before && self.agree(3)).then_some(3)
    }

    /// Whether the last `count` pulses agree in interval and in low share.
    fn agree(&self, count: usize) -> bool {
        let Some(skip) = self.latest.len().checked_sub(count) else {
            return false;
        };
        let widest = self.widest_share();
        let mut pulses = self.latest.iter().skip(skip);
        let Some(mut before) = pulses.next() else {
            return false;
        };
        let mut last: Option<(f32, f32)> = None;
        for pulse in pulses {
            let interval = pulse.at.since(before.at).secs_f32();
            let share = before.width.secs_f32() / interval;
            let as_last = last.is_none_or(|(i, s)| {
                INTERVALS_AGREE.contains(&(interval / i)) && LOW_SHARES_ALIKE.contains(&(share / s))
            });
            if share > widest || !as_last {
                return false;
            }
            last = Some((interval, share));
            before = pulse;
        }
        true
    }

    fn starting_speed(&self, count: usize) -> Option<f32> {
        let from = self.latest.get(self.latest.len().checked_sub(count)?)?;
        let span = self.latest.back()?.at.since(from.at).secs_f32();
        (span > 0.0).then(|| (count - 1) as f32 / f32::from(self.config.pulses.get()) / span)
    }

    /// Learns the low share slowly, from pulses of a steady spindle.
    fn learn(&mut self, pulse: Pulse) {
        if !self.track.steady_for(Duration::ZERO) {
            return;
        }
        let Some(speed) = self.track.quick() else {
            return;
        };
        let share = pulse.width.secs_f32() * speed * f32::from(self.config.pulses.get());
        self.low_share = Some(self.low_share.map_or(share, |s| s + (share - s) / 16.0));
    }
}
