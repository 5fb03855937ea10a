//! Which magnet each pulse belongs to: a place for every pulse, with missing and extra pulses accounted for.
//!
//! Speed is then the angle between two pulses over the time between them. Over whole revolutions the angle is exact, for a
//! span starts and ends at the same magnet; over parts of one it is as exact as the placement learned so far.
//!
//! Here is what nearly every pulse takes, and what a turn teaches: whole numbers only. `rhythm` is for the pulses that come early
//! or late, `views` for what is read; there single precision comes in.

mod rhythm;
mod views;

use super::UNKNOWN_GAP;
use super::calm::Calm;
use super::gate::{Pulse, Rejected, short};
use super::marks::Marks;
use super::placement::{Placement, REV, rev};
use crate::time::{Duration, Instant};

/// Placement is learned only while two turns agree to 1/256.
const LEARN_SHIFT: u32 = 8;
/// And not more often than this, once it is known.
const LEARN_EVERY: Duration = Duration::from_millis(100);
/// An interval that differs from the last one by less than 2^-3 is in time where the gaps differ by less than 2^-4:
/// between 0.82 and 1.2 of what is expected.
const PACE_SHIFT: u32 = 3;
const GAP_SHIFT: u32 = 4;
/// A sensor that missed a pulse among so many misses pulses now and then.
const RESTLESS: u32 = 200;
/// Intervals are cut here, ns (a minute): what is slower is no speed.
const LONGEST: u64 = 1 << 36;
/// New turns weigh 2^-4 in the mean scatter when there are so many.
const SCATTER_SHIFT: u32 = 4;
const SCATTERS: u32 = 1 + (1 << SCATTER_SHIFT);

/// A stretch of motion: an angle in revolutions and the time that it took in seconds.
#[derive(Clone, Copy, Debug)]
pub(super) struct Span {
    pub(super) angle: f32,
    pub(super) time: f32,
}

impl Span {
    /// Mean speed, rev/s.
    pub(super) fn speed(self) -> f32 {
        self.angle / self.time
    }
}

/// The count of magnets since the spindle was last seen to start.
#[derive(Clone, Debug)]
pub(super) struct Track {
    pulses: u32,
    /// Braking limit, rev/s in a second.
    brake: f32,
    marks: Marks,
    /// Magnet of the newest mark, counted within the turn.
    magnet: u32,
    /// Time between the two newest pulses, ns, and their angle, 1/[`REV`]; per magnet where some were missing between.
    interval: u64,
    gap: u32,
    /// The newest pulse and the interval again, for what nearly every pulse is: one that keeps the rhythm. The interval is
    /// zero where that takes a closer look: while a pulse is suspected, too.
    newest: Instant,
    pace: u32,
    /// A pulse since the last reading took that closer look.
    pub(super) irregular: bool,
    /// When the last two turns began, that is ended at magnet 0, and how many pulses have come since without one missing.
    turns_began: [Instant; 2],
    unbroken: u32,
    /// Pulses since one was missing.
    since_missing: u32,
    /// Time for which the line was low in the turn under way, ns.
    low: u64,
    /// Low share of the last steady turn, until it is taken.
    low_share: Option<f32>,
    /// By how much the last turn was longer than the one before, ns, and the mean size of how much that changes.
    longer: i64,
    scatter: u64,
    scatters: u32,
    /// A pulse of a steady spindle is not further from its time than this, ns.
    usually: u64,
    /// When placement was learned from a turn.
    learned_at: Instant,
    /// Pulses since one that was.
    since_odd: u32,
    /// A pulse that came too early to be believed yet.
    suspect: Option<Pulse>,
    /// The last pulse came too soon for what crawled or stood: it must start anew.
    pub(super) leapt: bool,
    /// Before each of so many newest pulses others are taken as missing, though braking might explain the gap.
    late: usize,
    /// Others had been missing not long before those.
    restless: bool,
    /// The pace, interval and gap, before the last ones were taken as a slower spindle's.
    before: Option<(u64, u32)>,
    /// The last pulses that were dropped as extra stood in the middle.
    extra_in_a_row: u8,
    /// One bit a magnet, newest lowest, set where its pulse was missing.
    missed: u32,
    /// Width of the newest pulse, ns.
    width: u32,
    pub(super) calm: Calm,
    pub(super) placement: Placement,
}

impl Track {
    #[inline(never)]
    pub(super) fn new(pulses: u16, brake_rpm_per_s: f32) -> Self {
        let pulses = u32::from(pulses.max(1));
        Track {
            pulses,
            brake: brake_rpm_per_s / 60.0,
            marks: Marks::new(),
            magnet: 0,
            interval: 0,
            gap: REV / pulses,
            newest: Instant::ZERO,
            pace: 0,
            irregular: false,
            turns_began: [Instant::ZERO; 2],
            unbroken: 0,
            since_missing: RESTLESS,
            low: 0,
            low_share: None,
            longer: 0,
            scatter: 0,
            scatters: 0,
            usually: 0,
            learned_at: Instant::ZERO,
            since_odd: 0,
            suspect: None,
            leapt: false,
            late: 0,
            restless: false,
            before: None,
            extra_in_a_row: 0,
            missed: 0,
            width: 0,
            calm: Calm::new(pulses),
            placement: Placement::new(pulses),
        }
    }

    /// Starts anew from pulses that agree, oldest first. Which magnet is which is not known any more.
    pub(super) fn start<'a>(
        &mut self,
        pulses: impl Iterator<Item = &'a Pulse>,
        rejected: &mut Rejected,
    ) {
        self.marks.clear();
        self.magnet = 0;
        self.interval = 0;
        self.pace = 0;
        self.unbroken = 0;
        self.since_missing = RESTLESS;
        self.suspect = None;
        self.leapt = false;
        self.late = 0;
        self.before = None;
        self.extra_in_a_row = 0;
        self.missed = 0;
        self.scatter = 0;
        self.scatters = 0;
        self.placement.forget();
        self.calm.clear();
        for &pulse in pulses {
            self.accept(pulse, 1, rejected);
        }
    }

    /// When the last believed pulse came.
    pub(super) fn last(&self) -> Option<Instant> {
        self.marks.last()
    }

    fn next_magnet(&self) -> u32 {
        if self.magnet + 1 >= self.pulses {
            0
        } else {
            self.magnet + 1
        }
    }

    /// Takes the next pulse; O(1), but for the end of a turn.
    ///
    /// An early pulse with an implausible width never makes the spindle faster: a magnet parked at its switching point
    /// shakes.
    ///
    /// True at the end of a turn that there is something to learn from.
    #[inline(never)]
    pub(super) fn push(&mut self, pulse: Pulse, plausible: bool, rejected: &mut Rejected) -> bool {
        // The rhythm kept, as nearly every pulse keeps it.
        let interval = short(pulse.at, self.newest);
        let in_time = interval.abs_diff(self.pace) <= self.pace >> PACE_SHIFT;
        if in_time && self.pace > 0 {
            self.late = 0;
            self.before = None;
            self.next(pulse, rejected);
        } else {
            self.irregular(pulse, plausible, rejected);
        }
        self.low_share.is_some()
    }

    /// The pace of a pulse as the next magnet's.
    fn paced(&mut self, at: Instant) {
        let interval = at.nanos().wrapping_sub(self.newest.nanos());
        self.newest = at;
        self.interval = interval.clamp(1, LONGEST);
        self.gap = self.placement.gap(self.magnet);
        let next = self.placement.gap(self.next_magnet());
        let alike = next.abs_diff(self.gap) <= self.gap >> GAP_SHIFT;
        self.pace = u32::try_from(interval).ok().filter(|_| alike).unwrap_or(0);
    }

    /// Takes a pulse as the next magnet's.
    fn next(&mut self, pulse: Pulse, rejected: &mut Rejected) {
        self.missed <<= 1;
        self.magnet = self.next_magnet();
        self.paced(pulse.at);
        self.marks.push(pulse.at);
        self.width = pulse.width;
        self.low = self.low.wrapping_add(u64::from(pulse.width));
        self.unbroken = self.unbroken.saturating_add(1);
        self.since_missing = self.since_missing.saturating_add(1);
        let mut at = pulse.at;
        if let Some(turn_ago) = self.marks.back(self.pulses) {
            let turn = at.nanos().wrapping_sub(turn_ago.nanos());
            let off = self.calm.check(turn, turn_ago);
            if self.is_noise(off) {
                rejected.noise = rejected.noise.saturating_add(1);
                at = turn_ago + Duration::from_nanos(self.calm.period().unwrap_or(0));
            }
        }
        self.calm.pulse(at);
        if self.magnet == 0 {
            self.turned(pulse.at);
        }
    }

    /// Whether a steady spindle's newest pulse, so far off its time, was moved by noise: it alone is. A spindle that changes
    /// its speed moves the next pulse as well.
    fn is_noise(&mut self, off: u64) -> bool {
        let since_odd = self.since_odd;
        self.since_odd = since_odd.saturating_add(1);
        if off <= self.usually || self.scatter == 0 {
            return false;
        }
        // Neither the next pulse is cut nor the one that is measured against this one.
        let after_one = since_odd == 0 || since_odd == self.pulses - 1;
        let noise = !after_one && self.calm.is_steady() && self.off_alone();
        if noise {
            self.since_odd = 0;
        }
        noise
    }

    /// Whether the newest pulse is off its time and the one before it was not, by the turns that end with them: while the
    /// speed changes, both are off.
    #[cold]
    #[inline(never)]
    fn off_alone(&self) -> bool {
        let turn = |back| {
            let end = self.marks.back(back)?;
            Some(end.since(self.marks.back(back + self.pulses)?).nanos())
        };
        let (Some(newest), Some(before), Some(period)) = (turn(0), turn(1), self.calm.period())
        else {
            return true;
        };
        newest.abs_diff(before) > self.usually && before.abs_diff(period) <= self.usually / 2
    }

    /// At the end of a turn that was steady like the one before it: learns from it. O(pulses).
    #[cold]
    fn turned(&mut self, at: Instant) {
        let low = core::mem::take(&mut self.low);
        let [first, second] = self.turns_began;
        self.turns_began = [second, at];
        let (before, turn) = (second.since(first).nanos(), at.since(second).nanos());
        if self.unbroken > self.pulses {
            self.placement.guess(&self.marks, turn, UNKNOWN_GAP);
        }
        if self.unbroken <= 2 * self.pulses {
            return;
        }
        let differ = turn.abs_diff(before);
        if differ > turn >> LEARN_SHIFT {
            return;
        }
        // Both are turns that agree: far less than 2^63 ns.
        let longer = turn.wrapping_sub(before) as i64;
        let change = longer.abs_diff(core::mem::replace(&mut self.longer, longer));
        // A plain mean at first.
        self.scatters = (self.scatters + 1).min(SCATTERS);
        self.scatter = match self.scatters {
            1 => 0,
            2 => change,
            SCATTERS => self.scatter - (self.scatter >> SCATTER_SHIFT) + (change >> SCATTER_SHIFT),
            n => (self.scatter * u64::from(n - 2) + change) / u64::from(n - 1),
        };
        // Mean sizes are 3.6 standard deviations of a pulse: eight of them, and a microsecond.
        self.usually = 9 * self.scatter / 4 + 1000;
        // Known, it changes slowly if at all, and a turn takes a while to learn from.
        if !self.placement.known() || at.since(self.learned_at) >= LEARN_EVERY {
            self.learned_at = at;
            self.placement.learn(&self.marks, turn);
        }
        self.low_share = Some(low as f32 / turn as f32);
    }
}
