//! Which magnet each pulse belongs to: an index for every pulse, with missing and extra pulses accounted for.
//!
//! Speed is then the slope of the index against time. Spans over whole revolutions start and end at the same magnet, so
//! the magnets' placement errors cancel in them exactly.

use heapless::Deque;

use super::gate::{Pulse, Rejected};
use crate::time::{Duration, Instant};

/// Pulses remembered. One more than the most pulses in a revolution, so that a whole turn always fits.
const MARKS: usize = 256;
/// The calm view looks back over this long, or over this many revolutions, whichever is longer.
const CALM: Duration = Duration::from_millis(500);
const CALM_TURNS: u32 = 3;
/// A turn that differs from the window by more begins a new window: the speed is changing.
const STEADY_SHARE: f32 = 0.015;
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

/// A pulse that came whole spacings late.
#[derive(Clone, Copy, Debug)]
struct Late {
    /// The spacing before it, s.
    spacing: f32,
    /// How many pulses would be missing.
    missing: u32,
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
    /// The newest pulse was late by whole spacings: the next one tells whether some were missing.
    late: Option<Late>,
    /// The last pulses that were dropped as extra stood in the middle.
    extra_in_a_row: u8,
    /// Largest gap between neighbouring magnets as seen over a steady turn, revolutions; zero until one was seen.
    gap: f32,
    /// The same for the turn under way, and how many magnets of it have passed.
    gap_so_far: (f32, u32),
    /// One bit a magnet, newest lowest, set where its pulse was missing.
    missed: u32,
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
            extra_in_a_row: 0,
            gap: 0.0,
            gap_so_far: (0.0, 0),
            missed: 0,
        }
    }

    /// Starts anew from pulses that agree, oldest first.
    pub(super) fn start<'a>(&mut self, pulses: impl Iterator<Item = &'a Pulse>) {
        self.marks.clear();
        self.window = 0;
        self.suspect = None;
        self.late = None;
        self.extra_in_a_row = 0;
        self.missed = 0;
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
        let newest = self.marks.back()?;
        let wanted = newest.index.checked_sub(back)?;
        // Without a missing pulse the place is exact; each missing one moves it towards the newest.
        let mut place = (self.marks.len() - 1).saturating_sub(back as usize);
        loop {
            let mark = self.marks.get(place)?;
            if mark.index == wanted {
                return Some(*mark);
            }
            if mark.index > wanted && place == 0
                || mark.index < wanted && self.marks.get(place + 1)?.index > wanted
            {
                return None;
            }
            place = if mark.index > wanted {
                place - 1
            } else {
                place + 1
            };
        }
    }

    /// Mean speed between two marks, rev/s.
    fn slope(&self, from: Mark, to: Mark) -> Option<f32> {
        let span = to.at.since(from.at).secs_f32();
        let turns = to.index.checked_sub(from.index)? as f32 / self.pulses as f32;
        (span > 0.0 && turns > 0.0).then(|| turns / span)
    }

    /// The largest gap between neighbouring magnets, in revolutions: as seen over a steady turn, before that an even
    /// spacing times `unknown`.
    pub(super) fn largest_gap(&self, unknown: f32) -> f32 {
        if self.gap > 0.0 {
            self.gap
        } else {
            unknown / self.pulses as f32
        }
    }

    /// Learns the largest gap from turn after steady turn.
    fn learn_gap(&mut self, interval: f32) {
        let Some(turn) = self
            .back(self.pulses)
            .zip(self.marks.back())
            .map(|(a, b)| b.at.since(a.at).secs_f32())
        else {
            return;
        };
        let (largest, magnets) = self.gap_so_far;
        let largest = largest.max(interval / turn);
        if magnets + 1 < self.pulses {
            self.gap_so_far = (largest, magnets + 1);
        } else {
            self.gap = largest.max(1.0 / self.pulses as f32);
            self.gap_so_far = (0.0, 0);
        }
    }

    /// Times of the last revolution and of the one before it, s. Where less than one turn is known, the last interval
    /// stands for it.
    pub(super) fn last_turns(&self) -> Option<(f32, Option<f32>)> {
        let newest = *self.marks.back()?;
        let last = self
            .back(self.pulses)
            .and_then(|from| self.slope(from, newest))
            .or_else(|| self.quick())?;
        let before = self
            .back(2 * self.pulses)
            .zip(self.back(self.pulses))
            .and_then(|(a, b)| self.slope(a, b));
        Some((1.0 / last, before.map(|n| 1.0 / n)))
    }

    /// Mean speed of the last whole turn, or of all that is known where that is less; rev/s.
    pub(super) fn quick(&self) -> Option<f32> {
        let newest = *self.marks.back()?;
        let from = self
            .back(self.pulses)
            .or_else(|| self.oldest_within(newest, self.pulses))?;
        self.slope(from, newest)
    }

    /// Mean speed over whole turns of the present window; rev/s. At most [`CALM_TURNS`] turns or [`CALM`], whichever is longer.
    pub(super) fn calm(&self) -> Option<f32> {
        let newest = *self.marks.back()?;
        let known = newest.index.saturating_sub(self.window) / self.pulses;
        let one_turn = 1.0 / self.quick()?;
        let wanted = CALM_TURNS.max((CALM.secs_f32() / one_turn) as u32);
        let mut turns = known.min(wanted).min((MARKS as u32 - 1) / self.pulses);
        while turns > 0 {
            if let Some(from) = self.back(turns * self.pulses) {
                return self.slope(from, newest);
            }
            turns -= 1;
        }
        self.quick()
    }

    /// Whether one speed has explained the pulses for this long and for [`CALM_TURNS`] turns.
    pub(super) fn steady_for(&self, time: Duration) -> bool {
        let Some(newest) = self.marks.back() else {
            return false;
        };
        let Some(turn) = self.quick().map(|n| 1.0 / n) else {
            return false;
        };
        let turns = newest.index.saturating_sub(self.window) / self.pulses;
        turns >= CALM_TURNS && turns as f32 * turn >= time.secs_f32()
    }

    /// More than a quarter of the last 32 magnets gave no pulse.
    pub(super) fn often_missing(&self) -> bool {
        self.missed.count_ones() > 8
    }

    fn oldest_within(&self, newest: Mark, span: u32) -> Option<Mark> {
        self.marks
            .iter()
            .find(|m| m.index + span >= newest.index && m.index < newest.index)
            .copied()
    }

    /// Spacing of the last two marks in seconds, a single magnet's worth.
    fn spacing(&self) -> Option<f32> {
        let newest = *self.marks.back()?;
        let before = *self.marks.get(self.marks.len().checked_sub(2)?)?;
        let steps = newest.index.checked_sub(before.index)?.max(1);
        Some(newest.at.since(before.at).secs_f32() / steps as f32)
    }

    /// Takes the next pulse; O(1).
    ///
    /// An early pulse with an implausible width never makes the spindle faster: a magnet parked at its switching point
    /// shakes.
    pub(super) fn push(&mut self, at: Instant, plausible: bool, rejected: &mut Rejected) {
        let (Some(newest), Some(spacing)) = (self.marks.back().copied(), self.spacing()) else {
            return self.accept(at, 1, rejected);
        };
        let interval = at.since(newest.at).secs_f32();
        let steps = interval / spacing;
        let late = core::mem::take(&mut self.late);
        match self.suspect.take() {
            None if steps < EARLY && !plausible => rejected.extra += 1,
            None if steps < EARLY => match late {
                // The rhythm from before the long gap goes on: the gap was missing pulses, not a slower spindle.
                Some(late) if alike(interval, late.spacing) => {
                    self.advance_newest(late.missing, rejected);
                    self.accept(at, 1, rejected);
                }
                _ => self.suspect = Some(at),
            },
            None => self.accept_late(at, steps, interval, rejected),
            Some(suspect) => {
                let halves_alike = alike(
                    suspect.since(newest.at).secs_f32(),
                    at.since(suspect).secs_f32(),
                );
                if halves_alike && (steps < EARLY || self.extra_in_a_row > 0) {
                    // Two early intervals that agree, within one spacing or time and again: the spindle is faster.
                    self.extra_in_a_row = 0;
                    self.accept(suspect, 1, rejected);
                    self.accept(at, 1, rejected);
                } else {
                    rejected.extra += 1;
                    if steps < EARLY {
                        self.suspect = Some(at);
                    } else {
                        self.extra_in_a_row = u8::from(halves_alike);
                        self.accept_late(at, steps, interval, rejected);
                    }
                }
            }
        }
    }

    /// Takes a pulse that is not early. Where not even the hardest braking explains the gap, pulses are missing;
    /// where braking might, the next pulse tells.
    fn accept_late(&mut self, at: Instant, steps: f32, interval: f32, rejected: &mut Rejected) {
        let whole = libm::roundf(steps);
        let missing = if steps > LATE && (steps - whole).abs() < MISSING_WITHIN {
            whole as u32 - 1
        } else {
            0
        };
        if missing == 0 {
            return self.accept(at, 1, rejected);
        }
        let speed = 1.0 / (interval / steps * self.pulses as f32);
        let braked = (self.brake * interval).min(speed);
        let turned = interval * (speed - braked / 2.0);
        if turned * self.pulses as f32 > 1.0 + MISSING_WITHIN {
            self.accept(at, 1 + missing, rejected);
        } else {
            self.late = Some(Late {
                spacing: interval / steps,
                missing,
            });
            self.accept(at, 1, rejected);
        }
    }

    /// The newest mark turns out to be `missing` magnets further on.
    fn advance_newest(&mut self, missing: u32, rejected: &mut Rejected) {
        if let Some(newest) = self.marks.back_mut() {
            newest.index += missing;
        }
        self.miss(missing, rejected);
    }

    fn miss(&mut self, missing: u32, rejected: &mut Rejected) {
        rejected.missing = rejected.missing.saturating_add(missing);
        self.missed = self.missed.checked_shl(missing).unwrap_or(0)
            | 1_u32.checked_shl(missing).map_or(u32::MAX, |b| b - 1);
    }

    /// Takes a pulse as the `steps`-th magnet after the newest one.
    fn accept(&mut self, at: Instant, steps: u32, rejected: &mut Rejected) {
        let before = self.calm();
        let newest = self.marks.back().map(|m| m.at);
        self.miss(steps - 1, rejected);
        self.missed <<= 1;
        let index = self.marks.back().map_or(0, |m| m.index + steps);
        self.remember(Mark { at, index });
        if index >= RENUMBER {
            self.renumber();
        }
        // A turn that the window's speed does not explain begins a new window.
        if let (Some(before), Some(turn)) = (before, self.quick())
            && (turn / before - 1.0).abs() > STEADY_SHARE
        {
            self.window = self
                .marks
                .back()
                .map_or(0, |m| m.index.saturating_sub(self.pulses));
            self.gap_so_far = (0.0, 0);
        } else if let (1, Some(newest)) = (steps, newest) {
            self.learn_gap(at.since(newest).secs_f32());
        } else {
            self.gap_so_far = (0.0, 0);
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
