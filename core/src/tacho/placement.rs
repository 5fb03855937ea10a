//! Where the magnets sit: the gaps between them, learned while the spindle turns steadily.
//!
//! The time from one magnet to the next, summed over whole turns, is to the time of those turns as the gap is to a revolution:
//! sums in whole nanoseconds, one division in many turns. What the spindle does once a turn, turn after turn, is learned
//! with it, and is no error of a speed either.

use super::marks::Marks;
use crate::machine::MAX_PULSES;

/// Gaps are kept in this part of a revolution: 0.00002 degrees.
pub(super) const REV: u32 = 1 << 24;
/// Sums are scaled so that a turn is below this: 32 such turns fit 32 bits.
const TURN_BITS: u32 = 26;
/// With this many turns the sums are halved: what is learned follows what changes.
const TURNS: u32 = 16;
/// A gap that differs from what was learned by more than a degree, in two turns one after the other, fits no more.
const FITS: u32 = REV / 360;

/// The gaps between neighbouring magnets.
#[derive(Clone, Debug)]
pub(super) struct Placement {
    pulses: u32,
    /// From the magnet before to this one, in 1/[`REV`]; even until learned.
    gaps: [u32; MAX_PULSES as usize],
    /// Time from the magnet before to this one, summed over the turns, in units of 2^shift ns.
    sums: [u32; MAX_PULSES as usize],
    shift: u32,
    turns: u32,
    known: bool,
    /// How far the worst magnet is off, degrees.
    error: f32,
    /// The last turn did not fit.
    misfit: bool,
    /// Largest gap ever learned: it stays, though after a standstill nobody knows which magnet it precedes.
    largest: u32,
}

impl Placement {
    pub(super) fn new(pulses: u32) -> Self {
        let mut placement = Placement {
            pulses: pulses.clamp(1, u32::from(MAX_PULSES)),
            gaps: [0; MAX_PULSES as usize],
            sums: [0; MAX_PULSES as usize],
            shift: 0,
            turns: 0,
            known: false,
            error: 0.0,
            misfit: false,
            largest: 0,
        };
        placement.forget();
        placement
    }

    /// Forgets which magnet is which.
    pub(super) fn forget(&mut self) {
        self.gaps.fill(REV / self.pulses);
        self.sums.fill(0);
        self.turns = 0;
        self.misfit = false;
        // A single magnet's gap is a revolution.
        self.known = self.pulses == 1;
    }

    /// Whether every gap has been learned, from two turns at least.
    pub(super) fn known(&self) -> bool {
        self.known
    }

    /// The gap that ends at a magnet, in 1/[`REV`].
    pub(super) fn gap(&self, magnet: u32) -> u32 {
        // There is one for every magnet.
        self.gaps.get(magnet as usize).copied().unwrap_or(REV)
    }

    /// The largest gap in revolutions, or an even one times `unknown` until one was learned.
    pub(super) fn largest(&self, unknown: f32) -> f32 {
        if self.largest > 0 {
            rev(self.largest)
        } else {
            unknown / self.pulses as f32
        }
    }

    /// How far the worst magnet sits from its even place, degrees; `None` until learned.
    pub(super) fn error(&self) -> Option<f32> {
        self.known.then_some(self.error)
    }

    /// The same from the gaps. Places are measured from their own mean, so that no magnet has to be the right one.
    fn worst(&self) -> f32 {
        let even = i64::from(REV);
        let (mut off, mut sum, mut low, mut high) = (0_i64, 0_i64, i64::MAX, i64::MIN);
        for magnet in 0..self.pulses {
            // In 1/(REV pulses), so that an even gap is a whole number.
            off += i64::from(self.gap(magnet)) * i64::from(self.pulses) - even;
            sum += off;
            low = low.min(off);
            high = high.max(off);
        }
        let mean = sum / i64::from(self.pulses);
        let worst = (high - mean).max(mean - low) as f32;
        360.0 * worst / (REV as f32 * self.pulses as f32)
    }

    /// Guesses the largest gap from the first turn, that is the newest one of `marks`; up to `most` of an even one.
    pub(super) fn guess(&mut self, marks: &Marks, turn_ns: u64, most: f32) {
        if self.largest > 0 {
            return;
        }
        let interval = |back| Some(marks.back(back)?.since(marks.back(back + 1)?).nanos());
        let widest = (0..self.pulses).filter_map(interval).max().unwrap_or(0);
        let even = 1.0 / self.pulses as f32;
        let share = widest as f32 / turn_ns.max(1) as f32;
        self.largest = (share.clamp(even, most * even) * REV as f32) as u32;
    }

    /// Learns from a steady turn, that is the newest one of `marks` and ends at magnet 0. O(pulses), once a turn.
    pub(super) fn learn(&mut self, marks: &Marks, turn_ns: u64) {
        if self.pulses == 1 {
            return;
        }
        if self.turns == 0 {
            self.shift = (64 - turn_ns.leading_zeros()).saturating_sub(TURN_BITS);
            self.sums.fill(0);
        }
        let turn = turn_ns >> self.shift;
        if turn >> (TURN_BITS + 1) != 0 {
            // Far slower than when the sums began.
            self.turns = 0;
            return;
        }
        let Some(mut end) = marks.last() else { return };
        let (mut fits, mut widest) = (true, 0);
        let margin = ((u64::from(FITS) * turn) >> 24) as u32;
        for back in 1..=self.pulses {
            let magnet = if back == 1 { 0 } else { self.pulses + 1 - back };
            let Some(begin) = marks.back(back) else {
                return;
            };
            let interval = (end.since(begin).nanos() >> self.shift) as u32;
            end = begin;
            widest = widest.max(interval);
            if self.known {
                let expected = ((u64::from(self.gap(magnet)) * turn) >> 24) as u32;
                fits &= interval.abs_diff(expected) <= margin;
            }
            if let Some(sum) = self.sums.get_mut(magnet as usize) {
                *sum = sum.saturating_add(interval);
            }
        }
        if !fits {
            if core::mem::replace(&mut self.misfit, true) {
                self.forget();
            }
            return;
        }
        self.misfit = false;
        self.turns += 1;
        if !self.known {
            let widest = widest as f32 / turn as f32 * REV as f32;
            self.largest = (widest as u32).max(REV / self.pulses);
        }
        if self.turns.is_power_of_two() && self.turns > 1 {
            self.publish();
        }
        if self.turns >= TURNS {
            self.sums.iter_mut().for_each(|sum| *sum /= 2);
            self.turns = TURNS / 2;
        }
    }

    /// Sums to gaps.
    fn publish(&mut self) {
        let used = self.pulses as usize;
        let total: u64 = self.sums.iter().take(used).map(|&s| u64::from(s)).sum();
        let scale = REV as f32 / total.max(1) as f32;
        for (gap, &sum) in self.gaps.iter_mut().zip(&self.sums).take(used) {
            // Rounded; a gap is at least the smallest part, so that nothing divides by zero.
            *gap = ((sum as f32 * scale + 0.5) as u32).max(1);
        }
        self.largest = self.gaps.iter().take(used).copied().max().unwrap_or(0);
        self.error = self.worst();
        self.known = true;
    }

    /// The angle, rev, from the magnet `from` magnets before `magnet` to the one `to` before it. Whole turns are exact.
    pub(super) fn angle(&self, magnet: u32, from: u32, to: u32) -> f32 {
        let magnets = from.saturating_sub(to);
        let (turns, rest) = (magnets / self.pulses, magnets % self.pulses);
        let mut end = (magnet + self.pulses - to % self.pulses) % self.pulses;
        let mut part = 0;
        for _ in 0..rest {
            part += self.gap(end);
            end = if end == 0 { self.pulses - 1 } else { end - 1 };
        }
        turns as f32 + rev(part)
    }
}

/// To revolutions.
pub(super) fn rev(parts: u32) -> f32 {
    parts as f32 / REV as f32
}
