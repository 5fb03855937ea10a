//! Edges to a [`Reading`].
//!
//! [`gate`](self) decides what a pulse is, `track` which magnet it belongs to, `calm` and `placement` fit a line and the
//! magnets' places, `signal` says what may be said. Time comes in with the edges and with [`Tacho::reading`]; a reading uses
//! no later edge.

mod calm;
mod gate;
mod hold;
mod marks;
mod placement;
mod signal;
mod start;
mod track;

use core::num::NonZeroU16;

use heapless::HistoryBuf;

use crate::time::{Duration, Edge, Instant};
use crate::units::Rpm;

pub use gate::Rejected;
pub use signal::Signal;

use gate::{Gate, HIGHEST_RATE, Pulse, short};
use hold::Hold;
use start::START_PULSES;
use track::{Span, Track};

/// The ripple floor: belts and gears change a spindle's speed by 0.1 to 0.5 % each, coming and going (common practice, no
/// source). Turns, or halves of a window, that differ by more are two speeds.
const RIPPLE: f32 = 0.006;
/// A view is carried on to its newest pulse by at most this share: where an acceleration ends, it is then still no more than
/// 0.8 % beyond the truth.
const CARRY: f32 = 0.008;
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
    /// The calm speed, for digits: zero when still, `None` when lost, not to be shown when doubtful.
    pub speed: Option<Rpm>,
    /// The fast speed, for verdict and beacon: the higher one where pulses may be missing.
    pub quick: Option<Rpm>,
    /// Pulses are overdue by more than a missing one explains: the speeds are upper bounds and nothing more.
    pub overdue: bool,
    /// Standard uncertainty of the calm speed, as a share of it: scatter about the line, and the [`CLOCK`].
    pub uncertainty: f32,
    /// Silence alone lowers the calm speed: the next pulse, or one that is missing, decides.
    pub bounded: bool,
    /// The calm speed as digits show it, a whole number of rev/min: ripple moves it twice a second at most and by one, a
    /// missing pulse not at all.
    pub held: Option<Rpm>,
}

/// Tolerance of the clock that stamps the edges: a common crystal's 50 parts in a million (catalogue tolerances are 20, 50 and
/// 100). Nothing measured against it is more exact, however many edges there are.
pub const CLOCK: f32 = 50e-6;

impl Reading {
    /// No pulses yet.
    pub const NOTHING: Reading = Reading {
        signal: Signal::Still,
        speed: Some(Rpm::ZERO),
        quick: Some(Rpm::ZERO),
        overdue: false,
        uncertainty: 0.0,
        bounded: false,
        held: None,
    };

    /// Whether the spindle may be turning.
    pub fn is_running(&self) -> bool {
        self.signal != Signal::Still
    }
}

/// How well the sensor works: for whoever sets it up.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Health {
    /// Pulses in one revolution, as set.
    pub pulses: NonZeroU16,
    /// Pulses counted since the start.
    pub counted: u32,
    /// What was not counted, by kind.
    pub rejected: Rejected,
    /// How far the worst magnet sits from its even place, degrees of the spindle; `None` until learned.
    pub placement: Option<f32>,
    /// Standard deviation of a pulse's time, s, ripple included; `None` until known.
    pub jitter: Option<f32>,
    /// The highest speed that can be measured with so many pulses: 20,000 of them in a second.
    pub highest: Rpm,
}

/// From the sensor's edges to the spindle's speed.
#[derive(Clone, Debug)]
pub struct Tacho {
    config: Config,
    gate: Gate,
    track: Track,
    state: State,
    /// The last pulses, oldest first: a start must agree with itself.
    latest: HistoryBuf<Pulse, START_PULSES>,
    counted: u32,
    /// How many pulses in a row were too wide for a spindle that turns.
    too_wide: u8,
    /// Low share of the pulse spacing as seen while turning; it tells turning from a parked magnet that shakes.
    low_share: Option<f32>,
    /// The widest low share at which a spindle may turn, in 1/[`SHARE`], less than all of them.
    widest: u32,
    /// A silence shorter than this, ns, never means anything;
    patience: u32,
    /// it lasts since then.
    quiet_from: Instant,
    hold: Hold,
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
/// With experience: how far, as a factor, the low share may be from what was seen while turning.
const LOW_SHARE_AGREES: f32 = 1.8;
/// A spindle that stops may end with two wide passages; after this many in a row it is a parked magnet that shakes.
const TOO_WIDE_IS_STILL: u8 = 3;
/// Until the placement is known, the largest gap may be this much wider than an even one: six magnets, each 3 degrees off.
const UNKNOWN_GAP: f32 = 1.1;
/// A pulse this much later than expected, and the jitter of a cheap switch on top, is only just overdue.
const OVERDUE: f32 = 1.005;
/// Later than this factor on its time, not even a missing pulse explains a silence.
const LATE: f32 = 1.25;
/// So many pulses may be missing in a row where that takes no longer than a moment in which nobody could act.
const MISSING_IN_A_MOMENT: f32 = 5.0;
const MOMENT: Duration = Duration::from_millis(150);
const JITTER: Duration = Duration::from_micros(5);
/// So many standard deviations of the jitter as measured may stand between two pulses.
const JITTERS: f32 = 8.0;
/// What shares are counted in: fine enough for a magnet that passes in a thousandth of a turn.
const SHARE: u32 = 1 << 16;

impl Tacho {
    /// Starts without knowing anything of the spindle.
    ///
    /// A function of its own, like its parts': so the stack holds the kilobytes of one of them at a time.
    #[inline(never)]
    pub fn new(config: Config) -> Self {
        let mut tacho = Tacho {
            gate: Gate::new(),
            track: Track::new(config.pulses.get(), config.brake_rpm_per_s),
            state: State::Still,
            latest: HistoryBuf::new(),
            counted: 0,
            too_wide: 0,
            low_share: None,
            widest: 0,
            patience: 0,
            quiet_from: Instant::ZERO,
            hold: Hold::default(),
            config,
        };
        tacho.widest = tacho.widest();
        tacho.patience = tacho.patience();
        tacho
    }

    /// Starts anew with another sensor: everything learned is forgotten. A spindle that turned still does, so its signal is
    /// lost until its pulses agree with themselves.
    ///
    /// Its frame is as large as a tacho: nobody else's holds it.
    #[inline(never)]
    pub fn configure(&mut self, config: Config) {
        let turned = self.state == State::Turning;
        let speed = self.track.quick().unwrap_or(0.0) * f32::from(self.config.pulses.get())
            / f32::from(config.pulses.get());
        *self = Tacho::new(config);
        if turned {
            self.state = State::Lost(speed);
        }
    }

    /// Pulses counted up to the last one, and when that came.
    pub fn last_pulse(&self) -> Option<(u32, Instant)> {
        self.latest.recent().map(|pulse| (self.counted, pulse.at))
    }

    /// What was not counted as a pulse, by kind.
    pub fn rejected(&self) -> Rejected {
        self.gate.rejected
    }

    /// How well the sensor works.
    pub fn health(&self) -> Health {
        let pulses = self.config.pulses;
        Health {
            pulses,
            counted: self.counted,
            rejected: self.gate.rejected,
            placement: self.track.placement.error(),
            jitter: self.track.jitter(),
            highest: Rpm::saturating(60.0 * HIGHEST_RATE / f32::from(pulses.get())),
        }
    }

    /// Takes one edge of the sensor's line. O(1), but for the end of a turn, which is O(pulses).
    ///
    /// What nearly every edge takes stands in the way of nothing else: the rest is in functions of its own.
    #[inline(never)]
    pub fn push(&mut self, edge: Edge) {
        self.settle(edge.at);
        if let Some(pulse) = self.gate.push(edge) {
            self.pulse(pulse);
        }
    }

    fn pulse(&mut self, mut pulse: Pulse) {
        let turning = matches!(self.state, State::Turning);
        if turning && !self.gate.begins().is_empty() {
            pulse.at = self.track.likeliest(self.gate.begins());
        }
        self.counted = self.counted.wrapping_add(1);
        let plausible = self.is_plausible(&pulse);
        self.too_wide = if plausible {
            0
        } else {
            self.too_wide.saturating_add(1)
        };
        self.latest.write(pulse);
        // It is looked at anew when an edge comes.
        self.quiet_from = pulse.at;
        if !turning || self.too_wide >= TOO_WIDE_IS_STILL {
            return self.at_rest(&pulse, plausible);
        }
        if self.track.push(pulse, plausible, &mut self.gate.rejected) {
            self.learn();
        }
        if self.track.leapt {
            self.track.leapt = false;
            return self.stand_still();
        }
        self.quiet_from = self.track.last().unwrap_or(pulse.at);
    }

    /// Takes a pulse of a spindle that stands, or of which nobody knows better.
    #[cold]
    fn at_rest(&mut self, pulse: &Pulse, plausible: bool) {
        match self.state {
            State::Turning => {
                self.gate.rejected.shaken += u32::from(TOO_WIDE_IS_STILL);
                self.stand_still();
            }
            State::Still if plausible && self.track.goes_on(pulse.at) => {
                self.state = State::Turning;
                if self.track.push(*pulse, plausible, &mut self.gate.rejected) {
                    self.learn();
                }
            }
            State::Still | State::Lost(_) => {
                if let Some(count) = self.starts() {
                    let skip = self.latest.len().saturating_sub(count);
                    let pulses = self.latest.oldest_ordered().skip(skip);
                    self.track.start(pulses, &mut self.gate.rejected);
                    self.state = State::Turning;
                } else if !plausible {
                    self.gate.rejected.shaken = self.gate.rejected.shaken.saturating_add(1);
                }
            }
        }
    }

    /// Whether a spindle that turns may pass so wide a magnet so long after the one before. Share by share, without a division.
    fn is_plausible(&self, pulse: &Pulse) -> bool {
        let Some(before) = self.latest.recent() else {
            return true;
        };
        // Cut off twice, for 32 bits: what is below that is below the product. Else the product decides.
        let interval = short(pulse.at, before.at);
        let surely = (interval >> 8) * (self.widest >> 8);
        pulse.width <= surely || {
            let interval = pulse.at.since(before.at).nanos();
            let widest = interval.saturating_mul(u64::from(self.widest));
            u64::from(pulse.width) <= widest / u64::from(SHARE)
        }
    }

    /// When the last pulse came; the clock's start where none has.
    pub fn silent_since(&self) -> Instant {
        self.quiet_from
    }

    /// Whether the speed may be another one than at the last reading: a pulse did not keep the rhythm since, or the last turns
    /// do not agree.
    pub fn is_changing(&self) -> bool {
        self.track.irregular || !self.track.steady_for(Duration::ZERO)
    }

    /// What is known at `now`; `explains` says whether the machine can turn at a speed at all.
    pub fn reading(&mut self, now: Instant, explains: impl Fn(Rpm) -> bool) -> Reading {
        self.settle(now);
        self.track.irregular = false;
        let mut reading = match self.state {
            State::Still => Reading::NOTHING,
            State::Lost(_) => Reading {
                signal: Signal::Lost,
                speed: None,
                quick: None,
                overdue: true,
                uncertainty: 0.0,
                bounded: false,
                held: None,
            },
            State::Turning => self.turning(now, explains),
        };
        let turning = reading.signal == Signal::Turning && !reading.overdue;
        let speed = reading.speed.filter(|_| turning);
        reading.held = self.hold.show(now, speed, reading.bounded);
        reading
    }

    fn turning(&self, now: Instant, explains: impl Fn(Rpm) -> bool) -> Reading {
        let rpm = |n: f32| Rpm::saturating(60.0 * n);
        let bound = self.silence_bound(now);
        let (calm, quick) = (self.track.calm(), self.track.quick());
        // Rounded once, at the very end.
        let speed = calm.map(|(n, _)| Rpm::saturating((60.0 * n) as f32));
        let scatter = calm.map_or(0.0, |(_, error)| error);
        // Judged by the pulses as they came: silence lowers what may be said, not what a step must explain.
        let unexplained = self.track.steady_for(DOUBT_AFTER)
            && speed.is_some_and(|n| n > self.config.slowest && !explains(n));
        // One missing pulse is no slower spindle, and where magnets are gone silence proves even less: the verdict assumes
        // the higher speed.
        let expected = self.track.expected().unwrap_or(f32::MAX);
        let missing = 1.0 + self.track.longest_missing().max(1) as f32;
        let missing = missing.max((MOMENT.secs_f32() / expected).min(MISSING_IN_A_MOMENT));
        let quick = quick.map(|n| rpm(n.min(bound * missing)));
        let due = expected * missing * LATE;
        let bounded = calm.is_some_and(|(n, _)| n as f32 > bound);
        Reading {
            overdue: self.silence(now).secs_f32() > due,
            signal: if unexplained || self.track.often_missing() {
                Signal::Doubtful
            } else {
                Signal::Turning
            },
            speed: if bounded { Some(rpm(bound)) } else { speed },
            quick: if unexplained {
                quick.map(|n| self.with_a_magnet_gone(n, explains))
            } else {
                quick
            },
            // A tolerance with all values alike likely has the standard uncertainty of its half width over sqrt(3)
            // (JCGM 100:2008, 4.3.7).
            uncertainty: libm::sqrtf(scatter * scatter + CLOCK * CLOCK / 3.0),
            bounded,
            held: None,
        }
    }

    /// Edges were lost: what came before them is dropped, and what follows must agree with itself again. A spindle that
    /// turned still does, so the signal is lost until then.
    pub fn capture_lost(&mut self) {
        if self.state == State::Turning {
            self.state = State::Lost(self.track.quick().unwrap_or(0.0));
        }
        self.latest.clear();
        self.gate.forget();
        self.track.start([].iter(), &mut self.gate.rejected);
    }

    /// If one of several magnets is gone the spindle turns faster than the pulses say: assume so where that is explained.
    fn with_a_magnet_gone(&self, speed: Rpm, explains: impl Fn(Rpm) -> bool) -> Rpm {
        let n = f32::from(self.config.pulses.get());
        let faster = speed.scaled(n / (n - 1.0).max(1.0));
        if explains(faster) { faster } else { speed }
    }

    /// Lets silence up to `now` change the state.
    fn settle(&mut self, now: Instant) {
        let turning = matches!(self.state, State::Turning);
        if turning && short(now, self.quiet_from) >= self.patience {
            self.look(now);
        }
    }

    /// Whether a silence up to `now`, which is long enough to mean something, is a loss or a stop.
    #[cold]
    fn look(&mut self, now: Instant) {
        if let Some(at) = self.lost_at(now) {
            if now >= at {
                self.state = State::Lost(self.track.quick().unwrap_or(0.0));
                self.latest.clear();
            }
        } else if self.still_at(now).is_some_and(|at| now >= at) {
            self.stand_still();
        }
    }

    /// The last pulses stay: where the slowest speed was only just missed, the next one goes on with them.
    fn stand_still(&mut self) {
        self.state = State::Still;
        self.gate.forget_width();
    }

    /// The widest low share of the spacing at which a spindle may turn.
    fn widest_share(&self) -> f32 {
        self.low_share
            .map_or(self.without_experience(), |s| s * LOW_SHARE_AGREES)
    }

    /// The same where nothing is known of the magnets yet.
    fn without_experience(&self) -> f32 {
        if self.config.pulses.get() < MANY_PULSES {
            LOW_SHARE_FEW
        } else {
            LOW_SHARE_MANY
        }
    }

    fn widest(&self) -> u32 {
        ((self.widest_share() * SHARE as f32) as u32).min(SHARE - 1)
    }

    /// The last pulse, or the fall of one that may be under way.
    fn last_sign(&self, now: Instant) -> Option<Instant> {
        self.track.last().max(self.gate.under_way(now))
    }

    fn still_at(&self, now: Instant) -> Option<Instant> {
        Some(self.last_sign(now)? + self.longest_gap())
    }

    /// The longest silence of a spindle at its slowest speed.
    fn longest_gap(&self) -> Duration {
        let slowest = self.config.slowest.rev_per_s();
        let longest = self.track.placement.largest(1.0) / slowest;
        Duration::from_secs_f32(longest * signal::STILL_MARGIN + self.jitter(longest))
    }

    fn lost_at(&self, now: Instant) -> Option<Instant> {
        let n = u32::from(self.config.pulses.get());
        let brake = self.config.brake_rpm_per_s / 60.0;
        // Each stretch gives a lower bound on the speed at the last pulse: the best one counts.
        let end_after = |magnets: u32, stretch: Option<Span>| {
            let before = self.track.span(magnets + n, magnets);
            let third = self.track.span(magnets + 2 * n, magnets + n);
            stretch.map(|stretch| signal::slowest_end(stretch, before, third, brake))
        };
        let turn = self.track.turn()?;
        let of_turn = end_after(n, Some(turn));
        let of_interval = match self.track.placement.known() {
            true => end_after(1, self.track.span(1, 0)),
            false => None,
        };
        let last = self.track.last()?;
        let mut end = of_turn?.max(of_interval.unwrap_or(f32::MIN));
        if let Some(stretch) = self.track.doubtful_interval(UNKNOWN_GAP) {
            end = signal::slowest_end(stretch, None, None, brake);
        }
        let under_way = self.gate.under_way(now).filter(|&fell| fell > last);
        if let Some(fell) = under_way {
            // The spindle may have come to stand with a magnet at the sensor: that passage ends no more, but it counts.
            let stretch = self.track.next_span(fell, UNKNOWN_GAP);
            end = signal::slowest_end(stretch, Some(turn), self.track.span(2 * n, n), brake);
        }
        let gap = self.track.placement.largest(UNKNOWN_GAP);
        let spacing = 1.0 / (turn.speed() * n as f32);
        signal::lost_at(under_way.unwrap_or(last), end, gap, spacing, brake)
    }

    /// The silence since the last pulse. A pulse that may be under way ends one silence and begins another: the longer
    /// one counts.
    fn silence(&self, now: Instant) -> Duration {
        let Some(last) = self.track.last() else {
            return Duration::MAX;
        };
        let last = self.gate.proven(last);
        match self.gate.under_way(now).filter(|&fell| fell > last) {
            Some(fell) => fell.since(last).max(now.since(fell)),
            None => now.since(last),
        }
    }

    /// The fastest that the silence allows, rev/s. A pulse that is only just overdue proves little: see [`OVERDUE`].
    fn silence_bound(&self, now: Instant) -> f32 {
        let gap = self.track.placement.largest(1.0);
        let silence = self.silence(now).secs_f32();
        let proven = silence - self.jitter(silence).max(JITTER.secs_f32());
        if proven > 0.0 {
            gap * OVERDUE / proven
        } else {
            f32::INFINITY
        }
    }

    /// What jitter may add to a silence, s. It counts as far as a tenth of the silence: that is what placement may be off
    /// before it is known. A single magnet has none.
    fn jitter(&self, silence: f32) -> f32 {
        if self.config.pulses.get() == 1 {
            return 0.0;
        }
        let measured = JITTERS * self.track.jitter().unwrap_or(0.0);
        measured.min(silence * (UNKNOWN_GAP - 1.0))
    }

    /// Less than four seconds: the longest silence before `lost` is said.
    fn patience(&self) -> u32 {
        let least = self.longest_gap().min(signal::LOST_AFTER);
        u32::try_from(least.nanos()).unwrap_or(u32::MAX)
    }

    /// Learns the low share slowly, from turns of a steady spindle.
    #[cold]
    fn learn(&mut self) {
        let Some(share) = self.track.take_low_share() else {
            return;
        };
        // One odd pulse must not spoil what the next start will be judged by.
        self.low_share = Some(match self.low_share {
            Some(known) => {
                let believed = share.clamp(known / LOW_SHARE_AGREES, known * LOW_SHARE_AGREES);
                // A magnet that comes off makes the share smaller: when it is back, it must be known again.
                let turns = if believed < known { 1024.0 } else { 16.0 };
                known + (believed - known) / turns
            }
            None => share,
        });
        self.widest = self.widest();
        self.patience = self.patience();
    }
}
