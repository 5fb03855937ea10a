//! Which magnet each pulse belongs to: a place for every pulse, with missing and extra pulses accounted for.
//!
//! Speed is then the angle between two pulses over the time between them. Over whole revolutions the angle is exact, for a
//! span starts and ends at the same magnet; over parts of one it is as exact as the placement learned so far.
//!
//! A pulse costs whole numbers only. Single precision comes in where a pulse is early or late, and where something is read.

use heapless::Vec;

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
/// A pulse earlier than this share of the expected spacing is suspected to be an extra one.
const EARLY: f32 = 0.75;
/// A pulse after a suspected one that keeps the rhythm so closely, in spacings, makes that one an extra one.
const IN_TIME: f32 = 0.08;
/// The second of two early intervals may be shorter than the first by so much: a spindle that is clutched in.
const FASTER: f32 = 0.55;
const ALIKE: f32 = 1.3;
/// Noise is shorter than this, ns (common practice, no source); with few magnets passages are longer.
const NOISE: u32 = 200_000;
const MANY: u32 = 8;
/// A pulse later than this share may mean that pulses are missing.
const LATE: f32 = 1.5;
/// A whole number of spacings must be met this closely, in spacings, to say that pulses are missing.
const MISSING_WITHIN: f32 = 0.25;
/// A spindle that slows down is not late by whole spacings time and again: so closely,
const EXACT: f32 = 0.1;
/// nor for longer than this, s, or this often in a row where that is longer.
const LATE_FOR: f32 = 0.3;
const LATE_OF_TWO: usize = 2;
const LATE_OF_OTHERS: usize = 4;
const LATE_IN_A_ROW: usize = 8;
/// A sensor that missed a pulse among so many misses pulses now and then.
const RESTLESS: u32 = 200;
/// Fewer missing pulses in a row than this, or than a turn, are filled in for the calm view.
const FILLED: u32 = 4;
/// Intervals are cut here, ns (a minute): what is slower is no speed.
const LONGEST: u64 = 1 << 36;
/// New turns weigh 2^-4 in the mean scatter when there are so many.
const SCATTER_SHIFT: u32 = 4;
const SCATTERS: u32 = 1 + (1 << SCATTER_SHIFT);
/// Mean size of the third difference of four times with white noise, over the noise's standard deviation:
/// sqrt(20) sqrt(2 / pi). A steady acceleration is not in it.
const SCATTER: f32 = 3.568_2;
/// The fast view is carried on to its newest pulse by at most this share: where an acceleration ends, it is then still
/// no more than 0.8 % beyond the truth.
const CARRY: f32 = 0.008;
/// Only a change by more is an acceleration and no ripple.
const RIPPLE: f32 = 0.006;

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

    /// The stretch between the pulses `from` and `to` magnets before the newest one.
    pub(super) fn span(&self, from: u32, to: u32) -> Option<Span> {
        let time = self
            .marks
            .back(to)?
            .since(self.marks.back(from)?)
            .secs_f32();
        let angle = self.placement.angle(self.magnet, from, to);
        (time > 0.0 && angle > 0.0).then_some(Span { angle, time })
    }

    /// The stretch from the newest pulse to one that may be coming at `at`; where placement is unknown it may be shorter than
    /// an even one by the factor `unknown`.
    pub(super) fn next_span(&self, at: Instant, unknown: f32) -> Span {
        let even = rev(self.placement.gap(self.next_magnet()));
        let angle = if self.placement.known() {
            even
        } else {
            even / unknown
        };
        let time = self
            .last()
            .map_or(Duration::ZERO, |last| at.since(last))
            .secs_f32();
        Span {
            angle,
            time: time.max(f32::MIN_POSITIVE),
        }
    }

    /// The last whole turn, or all that is known where that is less.
    pub(super) fn turn(&self) -> Option<Span> {
        (1..=self.pulses)
            .rev()
            .find_map(|back| self.span(back, 0))
            .or_else(|| (self.pulses..self.marks.held()).find_map(|back| self.span(back, 0)))
    }

    /// The fast view, rev/s: a quarter of a turn where placement is known, a whole one before. While the speed changes it
    /// is carried on from the middle of that stretch to its end, as far as it is safe.
    pub(super) fn quick(&self) -> Option<f32> {
        let part = self.pulses.div_ceil(4);
        let (speed, back) = match self.span(part, 0).filter(|_| self.placement.known()) {
            Some(span) => (span.speed(), part),
            None => (self.turn()?.speed(), self.pulses),
        };
        let Some(before) = self.span(2 * back, back).map(Span::speed) else {
            return Some(speed);
        };
        let gain = (speed - before) / 2.0;
        if gain.abs() < RIPPLE * speed || self.calm.is_steady() {
            return Some(speed);
        }
        Some(speed + gain.clamp(-CARRY * speed, CARRY * speed))
    }

    /// The calm view, rev/s, and its standard error as a share of it: the line through the window, or whole turns from
    /// end to end where there is none yet.
    pub(super) fn calm(&self) -> Option<(f64, f32)> {
        if let Some(speed) = self.calm.speed() {
            return Some(speed);
        }
        let turns = self
            .calm
            .steady_turns()
            .min(self.marks.held() / self.pulses);
        let span = (1..=turns)
            .rev()
            .find_map(|turns| self.span(turns * self.pulses, 0))
            .or_else(|| self.turn())?;
        let speed = span.speed();
        // Nothing is known of the scatter about a line yet: what the last two turns differ by stands for it.
        let before = self.span(2 * self.pulses, self.pulses).map(Span::speed);
        let last = self.span(self.pulses, 0).map_or(speed, Span::speed);
        let error = before.map_or(UNKNOWN, |before| (before / last - 1.0).abs());
        Some((
            f64::from(speed),
            error.max(self.jitter().unwrap_or(0.0) / span.time),
        ))
    }

    /// Whether one speed has explained the pulses for this long and for three turns.
    pub(super) fn steady_for(&self, time: Duration) -> bool {
        let last = self.last().unwrap_or(Instant::ZERO);
        self.calm.is_steady() && last.since(self.calm.since()) >= time
    }

    /// Standard deviation of a pulse's time, s, from how much turns differ; ripple is in it. `None` before it is known.
    pub(super) fn jitter(&self) -> Option<f32> {
        (self.scatter > 0).then(|| Duration::from_nanos(self.scatter).secs_f32() / SCATTER)
    }

    /// Low share of the spacing over the last steady turn, once.
    pub(super) fn take_low_share(&mut self) -> Option<f32> {
        self.low_share.take()
    }

    /// More than a quarter of the last 32 magnets gave no pulse.
    pub(super) fn often_missing(&self) -> bool {
        self.missed.count_ones() > 8
    }

    /// The longest row of magnets without a pulse among the last 32.
    pub(super) fn longest_missing(&self) -> u32 {
        let mut rest = self.missed;
        let mut longest = 0;
        while rest != 0 {
            rest &= rest << 1;
            longest += 1;
        }
        longest
    }

    /// When the next pulse is expected after the newest one, s.
    pub(super) fn expected(&self) -> Option<f32> {
        let next = self.placement.gap(self.next_magnet()) as f32;
        (self.interval > 0)
            .then(|| Duration::from_nanos(self.interval).secs_f32() * next / self.gap as f32)
    }

    /// Whether a pulse at this time keeps the rhythm of those before.
    pub(super) fn goes_on(&self, at: Instant) -> bool {
        let steps = self
            .last()
            .zip(self.expected())
            .map(|(last, expected)| at.since(last).secs_f32() / expected);
        self.marks.held() > 2 && steps.is_some_and(|steps| (EARLY..1.0 / EARLY).contains(&steps))
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

    /// Takes a pulse that takes a closer look.
    #[cold]
    fn irregular(&mut self, pulse: Pulse, plausible: bool, rejected: &mut Rejected) {
        self.irregular = true;
        let Some(newest) = self.last().filter(|_| self.interval > 0) else {
            return self.accept(pulse, 1, rejected);
        };
        if self.is_due(pulse.at, newest) && self.suspect.is_none() {
            self.late = 0;
            self.before = None;
            self.accept(pulse, 1, rejected);
        } else {
            self.out_of_time(pulse, newest, plausible, rejected);
        }
    }

    /// Whether a pulse comes at 3/4 to 3/2 of what is expected, without a division.
    fn is_due(&self, at: Instant, newest: Instant) -> bool {
        let interval = at.since(newest).nanos().min(LONGEST);
        let come = interval * u64::from(self.gap);
        let due = self.interval * u64::from(self.placement.gap(self.next_magnet()));
        let thrice = due + (due << 1);
        come << 2 >= thrice && come << 1 < thrice
    }

    /// A piece of noise just before a passage looks like its beginning: of all the pieces' falls the one that a steady spindle
    /// makes one expect, and else the first.
    #[cold]
    pub(super) fn likeliest(&self, begins: &[Instant]) -> Instant {
        let first = begins.first().copied().unwrap_or(Instant::ZERO);
        let turn_ago = self.marks.back(self.pulses - 1);
        match turn_ago.zip(self.calm.period()) {
            Some((turn_ago, period)) if self.calm.is_steady() => {
                let expected = turn_ago + Duration::from_nanos(period);
                let off = |at: &Instant| at.since(expected).max(expected.since(*at));
                begins.iter().copied().min_by_key(off).unwrap_or(first)
            }
            _ => first,
        }
    }

    /// Takes a pulse that is early or late, or one that decides about those before it.
    fn out_of_time(
        &mut self,
        pulse: Pulse,
        newest: Instant,
        plausible: bool,
        rejected: &mut Rejected,
    ) {
        let at = pulse.at;
        let Some(expected) = self.expected() else {
            return self.accept(pulse, 1, rejected);
        };
        let steps = at.since(newest).secs_f32() / expected;
        if self.late > 0 && steps >= LATE {
            let odd = (steps - libm::roundf(steps)).abs();
            // Of two magnets one may be gone: then every other pulse is missing for good, where none was before.
            let least = match self.pulses == 2 && !self.restless {
                true => LATE_OF_TWO,
                false => LATE_OF_OTHERS,
            };
            let enough = ((LATE_FOR / (steps * expected)) as usize).clamp(least, LATE_IN_A_ROW);
            if odd > EXACT || self.late >= enough {
                // Late again: the spindle has become slower, and none was missing.
                self.before = Some((self.interval, self.gap));
                self.retreat(rejected);
                return self.accept(pulse, 1, rejected);
            }
        } else {
            self.late = 0;
        }
        if let Some((interval, gap)) = self.before.take() {
            let come = at.since(newest).nanos().min(LONGEST) * u64::from(gap);
            let due = interval * u64::from(self.placement.gap(self.next_magnet()));
            if come.abs_diff(due) < due / 16 {
                // The rhythm from before the late ones returns: they were missing pulses.
                self.accept(pulse, 1, rejected);
                return self.begin_anew();
            }
        }
        let Some(suspect) = self.suspect.take() else {
            return match steps < EARLY {
                true if plausible => self.suspect(pulse),
                true => self.extra(pulse, newest, rejected),
                false => self.accept_late(pulse, steps, expected, rejected),
            };
        };
        let (first, second) = (
            suspect.at.since(newest).secs_f32(),
            at.since(suspect.at).secs_f32(),
        );
        let halves_alike = alike(first, second);
        // A pulse of noise does not move the one after it.
        let out_of_time = (steps - libm::roundf(steps)).abs() > IN_TIME;
        let no_noise = suspect.width >= NOISE && self.pulses < MANY;
        let faster = (FASTER * first..ALIKE * first).contains(&second) && (out_of_time || no_noise);
        if plausible && (faster || halves_alike && self.extra_in_a_row > 0) {
            // Early twice, out of the rhythm or time and again: the spindle is faster.
            self.extra_in_a_row = 0;
            self.accept(suspect, 1, rejected);
            self.accept(pulse, 1, rejected);
            return;
        }
        self.extra(suspect, newest, rejected);
        if steps < EARLY {
            self.suspect(pulse);
        } else {
            self.extra_in_a_row = u8::from(halves_alike);
            self.accept_late(pulse, steps, expected, rejected);
        }
    }

    fn suspect(&mut self, pulse: Pulse) {
        self.suspect = Some(pulse);
        self.pace = 0;
    }

    /// Drops a pulse between two expected ones; close behind a passage it is that passage, doubled.
    fn extra(&self, pulse: Pulse, newest: Instant, rejected: &mut Rejected) {
        let behind = pulse
            .at
            .since(newest)
            .nanos()
            .saturating_sub(u64::from(self.width));
        if behind < u64::from(self.width / 2) {
            rejected.doubled += 1;
        } else {
            rejected.extra += 1;
        }
    }

    /// Takes a pulse that is not early. Whole spacings late, it is taken as a sign of missing pulses, which is the higher
    /// speed; where braking might explain the gap as well, the next pulse tells.
    fn accept_late(&mut self, pulse: Pulse, steps: f32, expected: f32, rejected: &mut Rejected) {
        let whole = libm::roundf(steps);
        if steps < LATE || (steps - whole).abs() > MISSING_WITHIN {
            return self.accept(pulse, 1, rejected);
        }
        let interval = expected * steps;
        // Braking may have begun with the interval before.
        let speed = 1.0 / (expected * self.pulses as f32) - self.brake * expected / 2.0;
        let braked = (self.brake * interval).min(speed);
        let least = interval * (speed - braked / 2.0) * self.pulses as f32;
        let spacing = Duration::from_secs_f32(expected).nanos();
        if u64::from(self.width) > spacing - spacing / 4 {
            rejected.merged = rejected.merged.saturating_add(1);
        }
        if self.late == 0 {
            self.restless = self.since_missing < RESTLESS;
        }
        self.accept(pulse, whole as u32, rejected);
        self.late = if least < 1.0 + MISSING_WITHIN {
            self.late + 1
        } else {
            0
        };
    }

    /// No pulses were missing before the newest marks after all.
    fn retreat(&mut self, rejected: &mut Rejected) {
        let mut late: Vec<Instant, LATE_IN_A_ROW> = Vec::new();
        let mut missing = 0;
        for _ in 0..core::mem::take(&mut self.late) {
            if let Some((at, before)) = self.marks.pop() {
                missing += before;
                // There are never more of them.
                let _ = late.push(at);
            }
        }
        let count = late.len() as u32;
        while let Some(at) = late.pop() {
            self.marks.push(at);
        }
        self.turn_back(missing);
        rejected.missing = rejected.missing.saturating_sub(missing);
        self.missed = self.missed.checked_shr(missing + count).unwrap_or(0) << count;
        if let Some((newest, before)) = self.last().zip(self.marks.back(1)) {
            self.newest = before;
            self.paced(newest);
        }
        self.begin_anew();
    }

    /// The count of magnets was too high by so many.
    fn turn_back(&mut self, magnets: u32) {
        self.magnet = (self.magnet + self.pulses - magnets % self.pulses) % self.pulses;
    }

    /// The count of magnets has been corrected: no window goes through that.
    fn begin_anew(&mut self) {
        self.unbroken = 0;
        let turn = self.span(self.pulses, 0).map(|turn| turn.time);
        let turn = turn.map_or(0, |time| Duration::from_secs_f32(time).nanos());
        let since = self.marks.back(self.pulses).unwrap_or(Instant::ZERO);
        self.calm.restart(turn, since);
    }

    /// The last interval, if it may have been one slow spacing as well as several with pulses missing.
    pub(super) fn doubtful_interval(&self, unknown: f32) -> Option<Span> {
        if self.late == 0 {
            return None;
        }
        let missing = (1..self.marks.held()).find(|&back| self.marks.back(back).is_some())? - 1;
        let time = self
            .marks
            .last()?
            .since(self.marks.back(missing + 1)?)
            .secs_f32();
        // The first of those magnets.
        let first = (self.magnet + self.pulses - missing % self.pulses) % self.pulses;
        let angle = rev(self.placement.gap(first)) / unknown;
        (time > 0.0).then_some(Span { angle, time })
    }

    fn miss(&mut self, missing: u32, rejected: &mut Rejected) {
        rejected.missing = rejected.missing.saturating_add(missing);
        let ones = 1_u32.checked_shl(missing).map_or(u32::MAX, |bit| bit - 1);
        self.missed = self.missed.checked_shl(missing).unwrap_or(0) | ones;
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

    /// The pace of the newest pulse where it came `steps` magnets after the one before.
    fn paced_over(&mut self, interval: u64, steps: u32) {
        self.pace = 0;
        self.interval = (interval.clamp(1, LONGEST) / u64::from(steps)).max(1);
        let angle = self.placement.angle(self.magnet, steps, 0);
        self.gap = ((angle * REV as f32 / steps as f32) as u32).max(1);
    }

    /// Takes a pulse as the `steps`-th magnet after the newest one.
    #[cold]
    fn accept(&mut self, pulse: Pulse, steps: u32, rejected: &mut Rejected) {
        let before = self.last();
        if steps > 1 {
            self.skip(pulse.at, steps - 1, rejected);
        }
        self.next(pulse, rejected);
        match before {
            Some(before) if steps > 1 => self.paced_over(pulse.at.since(before).nanos(), steps),
            Some(_) => {}
            // There is no interval before the first pulse.
            None => {
                self.interval = 0;
                self.pace = 0;
            }
        }
        if self.suspect.is_some() {
            self.pace = 0;
        }
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

    /// Passes magnets whose pulses are missing before the one at `at`; their times are filled in evenly by angle.
    fn skip(&mut self, at: Instant, missing: u32, rejected: &mut Rejected) {
        self.miss(missing, rejected);
        let before = self.last().unwrap_or(at);
        let interval = at.since(before).secs_f32();
        self.unbroken = 0;
        self.since_missing = 0;
        let fill = missing < self.pulses.max(FILLED);
        let next = (self.magnet + missing + 1) % self.pulses;
        let whole = self.placement.angle(next, missing + 1, 0);
        for skipped in 1..=missing.min(u32::from(u8::MAX)) {
            self.marks.push_missing();
            if fill {
                self.magnet = self.next_magnet();
                let part = self.placement.angle(self.magnet, skipped, 0) / whole;
                self.calm
                    .pulse(before + Duration::from_secs_f32(interval * part));
            }
        }
        if !fill {
            self.magnet = (self.magnet + missing) % self.pulses;
            self.calm.clear();
        }
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

/// The error of a speed of which nothing but one turn is known: the largest error that placement makes (see the start).
const UNKNOWN: f32 = 0.1;

/// Within 30 % of each other.
fn alike(a: f32, b: f32) -> bool {
    a < ALIKE * b && b < ALIKE * a
}
