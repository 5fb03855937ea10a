//! Which magnet each pulse belongs to: an index for every pulse, with missing and extra pulses accounted for.
//!
//! Speed is then the angle between two pulses over the time between them. Over whole revolutions the angle is exact, for a
//! span starts and ends at the same magnet; over parts of one it is as exact as the placement learned so far.

use heapless::Deque;

use super::gate::{Pulse, Rejected};
use super::placement::Placement;
use crate::time::{Duration, Instant};

/// Pulses remembered: more than the most pulses in a revolution, so that a whole turn always fits. Placement is learned
/// from two turns; wheels of more than 127 teeth are taken as evenly cut.
const MARKS: usize = 256;
/// The calm view looks back over this long, or over this many revolutions, whichever is longer.
const CALM: Duration = Duration::from_millis(500);
const CALM_TURNS: u32 = 3;
/// A turn that differs from the window by more begins a new window: the speed is changing.
const STEADY_SHARE: f32 = 0.015;
/// Placement is learned only while turns agree this closely.
const LEARN_SHARE: f32 = 0.004;
/// A pulse earlier than this share of the expected spacing is suspected to be an extra one.
const EARLY: f32 = 0.75;
/// A pulse later than this share may mean that pulses are missing.
const LATE: f32 = 1.5;
/// A whole number of spacings must be met this closely, in spacings, to say that pulses are missing.
const MISSING_WITHIN: f32 = 0.25;
/// Indices are counted anew from here, long before they overflow.
const RENUMBER: u32 = 1 << 31;

/// A pulse and its place in the count of magnets.
#[derive(Clone, Copy, Debug)]
struct Mark {
    at: Instant,
    index: u32,
}

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
    marks: Deque<Mark, MARKS>,
    /// Index at which the present window begins.
    window: u32,
    /// A pulse that came too early to be believed yet.
    suspect: Option<Instant>,
    /// So many pulses are taken as missing before the newest one, though braking might explain the gap.
    late: Option<u32>,
    /// So many had been taken as missing before a pulse that was late again: the rhythm may yet return.
    retreated: Option<u32>,
    /// The last pulses that were dropped as extra stood in the middle.
    extra_in_a_row: u8,
    /// One bit a magnet, newest lowest, set where its pulse was missing.
    missed: u32,
    pub(super) placement: Placement,
}

impl Track {
    pub(super) fn new(pulses: u16, brake_rpm_per_s: f32) -> Self {
        Track {
            pulses: u32::from(pulses.max(1)),
            brake: brake_rpm_per_s / 60.0,
            marks: Deque::new(),
            window: 0,
            suspect: None,
            late: None,
            retreated: None,
            extra_in_a_row: 0,
            missed: 0,
            placement: Placement::new(pulses),
        }
    }

    /// Starts anew from pulses that agree, oldest first. Which magnet is which is not known any more.
    pub(super) fn start<'a>(&mut self, pulses: impl Iterator<Item = &'a Pulse>) {
        self.marks.clear();
        self.window = 0;
        self.suspect = None;
        self.late = None;
        self.retreated = None;
        self.extra_in_a_row = 0;
        self.missed = 0;
        self.placement.forget();
        for (index, pulse) in (0..).zip(pulses) {
            self.remember(Mark {
                at: pulse.at,
                index,
            });
        }
    }

    /// When the last believed pulse came.
    pub(super) fn last(&self) -> Option<Instant> {
        self.marks.back().map(|m| m.at)
    }

    fn remember(&mut self, mark: Mark) {
        if self.marks.is_full() {
            self.marks.pop_front();
        }
        // Room was just made.
        let _ = self.marks.push_back(mark);
    }

    /// The mark `back` magnets before the newest one, if that magnet's pulse is remembered. O(missing pulses).
    fn back(&self, back: u32) -> Option<Mark> {
        let wanted = self.marks.back()?.index.checked_sub(back)?;
        // Without a missing pulse the place is exact; each missing one moves it towards the newest.
        let mut place = (self.marks.len() - 1).saturating_sub(back as usize);
        loop {
            let mark = *self.marks.get(place)?;
            if mark.index >= wanted {
                // Places before this one hold older magnets only.
                return (mark.index == wanted).then_some(mark).or_else(|| {
                    let before = *self.marks.get(place.checked_sub(1)?)?;
                    (before.index == wanted).then_some(before)
                });
            }
            place += 1;
        }
    }

    fn between(&self, from: Mark, to: Mark) -> Option<Span> {
        let time = to.at.since(from.at).secs_f32();
        let angle = self.placement.angle(from.index, to.index);
        (time > 0.0 && angle > 0.0).then_some(Span { angle, time })
    }

    /// The stretch between the pulses `from` and `to` magnets before the newest one.
    pub(super) fn span(&self, from: u32, to: u32) -> Option<Span> {
        self.between(self.back(from)?, self.back(to)?)
    }

    /// The stretch from the newest pulse to one that may be coming at `at`; where placement is unknown it may be shorter than
    /// an even one by the factor `unknown`.
    pub(super) fn next_span(&self, at: Instant, unknown: f32) -> Span {
        let index = self.marks.back().map_or(0, |m| m.index);
        let even = self.placement.angle(index, index + 1);
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

    /// The last interval between two pulses, however many magnets it spans.
    pub(super) fn last_interval(&self) -> Option<Span> {
        let newest = *self.marks.back()?;
        let before = *self.marks.get(self.marks.len().checked_sub(2)?)?;
        self.between(before, newest)
    }

    /// The last whole turn, or all that is known where that is less.
    pub(super) fn turn(&self) -> Option<Span> {
        let newest = *self.marks.back()?;
        let reach = newest.index.saturating_sub(self.pulses);
        let from = self
            .back(self.pulses)
            .or_else(|| self.marks.iter().find(|m| m.index >= reach).copied())?;
        self.between(from, newest)
    }

    /// The fast view, rev/s: a quarter of a turn where placement is known, a whole one before.
    pub(super) fn quick(&self) -> Option<f32> {
        let part = if self.placement.known() {
            self.span(self.pulses.div_ceil(4), 0)
        } else {
            None
        };
        part.or_else(|| self.turn()).map(Span::speed)
    }

    /// The calm view, rev/s: whole turns of the present window, at most [`CALM_TURNS`] or [`CALM`], whichever is longer.
    pub(super) fn calm(&self) -> Option<f32> {
        let newest = *self.marks.back()?;
        let turn = self.turn()?.speed();
        let known = newest.index.saturating_sub(self.window) / self.pulses;
        // A float-to-integer cast saturates.
        let wanted = CALM_TURNS.max((CALM.secs_f32() * turn) as u32);
        let most = known.min(wanted).min((MARKS as u32 - 1) / self.pulses);
        (1..=most)
            .rev()
            .find_map(|turns| self.span(turns * self.pulses, 0))
            .map_or(Some(turn), |span| Some(span.speed()))
    }

    /// Whether one speed has explained the pulses for this long and for [`CALM_TURNS`] turns.
    pub(super) fn steady_for(&self, time: Duration) -> bool {
        let Some((newest, turn)) = self.marks.back().zip(self.turn()) else {
            return false;
        };
        let turns = newest.index.saturating_sub(self.window) / self.pulses;
        turns >= CALM_TURNS && turns as f32 / turn.speed() >= time.secs_f32()
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
        let newest = self.marks.back()?;
        Some(self.placement.angle(newest.index, newest.index + 1) / self.last_interval()?.speed())
    }

    /// Whether a pulse at this time keeps the rhythm of those before.
    pub(super) fn goes_on(&self, at: Instant) -> bool {
        let steps = self
            .last()
            .zip(self.expected())
            .map(|(last, expected)| at.since(last).secs_f32() / expected);
        self.marks.len() > 2 && steps.is_some_and(|steps| (EARLY..1.0 / EARLY).contains(&steps))
    }

    /// Takes the next pulse; O(1).
    ///
    /// An early pulse with an implausible width never makes the spindle faster: a magnet parked at its switching point
    /// shakes.
    pub(super) fn push(&mut self, at: Instant, plausible: bool, rejected: &mut Rejected) {
        let late = self.late.take();
        let overdue =
            |track: &Track| Some(at.since(track.last()?).secs_f32() >= LATE * track.expected()?);
        if let Some(missing) = late
            && overdue(self) == Some(true)
        {
            // Late again: the spindle has become slower, and none was missing.
            self.retreat(missing, rejected);
            self.accept(at, 1, rejected);
            self.retreated = Some(missing);
            return;
        }
        let retreated = self.retreated.take();
        let (Some(newest), Some(expected)) = (self.last(), self.expected()) else {
            return self.accept(at, 1, rejected);
        };
        let steps = at.since(newest).secs_f32() / expected;
        if let Some(missing) = retreated
            && alike(steps * (missing + 1) as f32, 1.0)
        {
            // The rhythm returns: both gaps were missing pulses.
            self.advance_two(missing, rejected);
            return self.accept(at, 1, rejected);
        }
        let Some(suspect) = self.suspect.take() else {
            return match steps < EARLY {
                true if plausible => self.suspect = Some(at),
                true => rejected.extra += 1,
                false => self.accept_late(at, steps, expected, rejected),
            };
        };
        let halves_alike = alike(
            suspect.since(newest).secs_f32(),
            at.since(suspect).secs_f32(),
        );
        if halves_alike && plausible && (steps < EARLY || self.extra_in_a_row > 0) {
            // Two early intervals that agree, within one spacing or time and again: the spindle is faster.
            self.extra_in_a_row = 0;
            self.accept(suspect, 1, rejected);
            self.accept(at, 1, rejected);
            return;
        }
        rejected.extra += 1;
        if steps < EARLY {
            self.suspect = Some(at);
        } else {
            self.extra_in_a_row = u8::from(halves_alike);
            self.accept_late(at, steps, expected, rejected);
        }
    }

    /// Takes a pulse that is not early. Whole spacings late, it is taken as a sign of missing pulses, which is the higher
    /// speed; where braking might explain the gap as well, the next pulse tells.
    fn accept_late(&mut self, at: Instant, steps: f32, expected: f32, rejected: &mut Rejected) {
        let whole = libm::roundf(steps);
        if steps < LATE || (steps - whole).abs() > MISSING_WITHIN {
            return self.accept(at, 1, rejected);
        }
        let missing = whole as u32 - 1;
        let interval = expected * steps;
        // Braking may have begun with the interval before.
        let speed = 1.0 / (expected * self.pulses as f32) - self.brake * expected / 2.0;
        let braked = (self.brake * interval).min(speed);
        let least = interval * (speed - braked / 2.0) * self.pulses as f32;
        self.accept(at, 1 + missing, rejected);
        if least < 1.0 + MISSING_WITHIN {
            self.late = Some(missing);
        }
    }

    /// No pulses were missing before the newest mark after all.
    fn retreat(&mut self, missing: u32, rejected: &mut Rejected) {
        if let Some(newest) = self.marks.back_mut() {
            newest.index -= missing;
            self.window = self.window.min(newest.index);
        }
        rejected.missing = rejected.missing.saturating_sub(missing);
        self.missed = (self.missed >> 1).checked_shr(missing).unwrap_or(0) << 1;
    }

    /// Pulses were missing before each of the two newest marks.
    fn advance_two(&mut self, missing: u32, rejected: &mut Rejected) {
        for mark in self.marks.iter_mut().rev().take(2).zip([2, 1]) {
            mark.0.index += mark.1 * missing;
        }
        self.miss(missing, rejected);
        self.missed <<= 1;
        self.miss(missing, rejected);
        self.missed <<= 1;
    }

    /// The last interval, if it may have been one slow spacing as well as several with pulses missing.
    pub(super) fn doubtful_interval(&self, unknown: f32) -> Option<Span> {
        self.late?;
        let newest = self.marks.back()?;
        let before = self.marks.get(self.marks.len().checked_sub(2)?)?;
        let time = newest.at.since(before.at).secs_f32();
        let angle = self.placement.angle(before.index, before.index + 1) / unknown;
        (time > 0.0).then_some(Span { angle, time })
    }

    fn miss(&mut self, missing: u32, rejected: &mut Rejected) {
        rejected.missing = rejected.missing.saturating_add(missing);
        let ones = 1_u32.checked_shl(missing).map_or(u32::MAX, |bit| bit - 1);
        self.missed = self.missed.checked_shl(missing).unwrap_or(0) | ones;
    }

    /// Takes a pulse as the `steps`-th magnet after the newest one.
    fn accept(&mut self, at: Instant, steps: u32, rejected: &mut Rejected) {
        let before = self.calm();
        self.miss(steps - 1, rejected);
        self.missed <<= 1;
        let index = self.marks.back().map_or(0, |m| m.index + steps);
        self.remember(Mark { at, index });
        let turn = self.span(self.pulses, 0);
        let change = before
            .zip(turn)
            .map_or(0.0, |(before, turn)| (turn.speed() / before - 1.0).abs());
        if change > STEADY_SHARE {
            // A turn that the window's speed does not explain begins a new window.
            self.window = index.saturating_sub(self.pulses);
        }
        let turns = turn.zip(self.span(2 * self.pulses, self.pulses));
        match (turns, self.last_interval()) {
            (Some((turn, before)), Some(interval))
                if (turn.time / before.time - 1.0).abs() < LEARN_SHARE && steps == 1 =>
            {
                self.placement.learn(index, interval.time / turn.time);
            }
            _ => self.placement.interrupt(),
        }
        if index >= RENUMBER {
            self.renumber();
        }
    }

    /// Keeps indices small: 2^31 pulses come in a month at full rate.
    fn renumber(&mut self) {
        let oldest = self.marks.front().map_or(0, |m| m.index);
        let shift = oldest - oldest % self.pulses;
        self.window = self.window.saturating_sub(shift);
        for mark in self.marks.iter_mut() {
            mark.index -= shift;
        }
    }
}

/// Within 30 % of each other.
fn alike(a: f32, b: f32) -> bool {
    a < 1.3 * b && b < 1.3 * a
}
