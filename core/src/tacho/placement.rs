//! Where the magnets sit: the gaps between them, learned while the spindle turns steadily.

use crate::machine::MAX_PULSES;

/// New turns weigh at least this much in what is learned.
const WEIGHT: f32 = 1.0 / 16.0;

/// The gaps between neighbouring magnets, in revolutions.
#[derive(Clone, Debug)]
pub(super) struct Placement {
    pulses: u32,
    /// From the magnet before to this one; even until learned.
    gaps: [f32; MAX_PULSES as usize],
    /// Intervals learned one after the other since the last start.
    learned: u32,
    /// Largest gap ever learned: it stays, though after a standstill nobody knows which magnet it precedes.
    largest: f32,
    /// Largest gap of the turn under way, and how many intervals of it have passed without an interruption.
    turn: (f32, u32),
}

impl Placement {
    pub(super) fn new(pulses: u16) -> Self {
        let pulses = u32::from(pulses.clamp(1, MAX_PULSES));
        Placement {
            pulses,
            gaps: [1.0 / pulses as f32; MAX_PULSES as usize],
            learned: 0,
            largest: 0.0,
            turn: (0.0, 0),
        }
    }

    /// Forgets which magnet is which.
    pub(super) fn forget(&mut self) {
        self.gaps.fill(1.0 / self.pulses as f32);
        self.learned = 0;
        self.interrupt();
    }

    /// The turn under way is not steady.
    pub(super) fn interrupt(&mut self) {
        self.turn = (0.0, 0);
    }

    /// Whether every gap has been learned from two turns at least.
    pub(super) fn known(&self) -> bool {
        self.learned >= 2 * self.pulses
    }

    /// Learns the gap that ends at the magnet of `index` from a steady turn.
    pub(super) fn learn(&mut self, index: u32, gap: f32) {
        let turns = self.learned / self.pulses;
        self.learned = self.learned.saturating_add(1);
        if let Some(place) = self.gaps.get_mut((index % self.pulses) as usize) {
            *place += (gap - *place) * (1.0 / (turns + 1) as f32).max(WEIGHT);
        }
        let (largest, passed) = self.turn;
        self.turn = (largest.max(gap), passed + 1);
        if passed + 1 >= self.pulses {
            self.largest = self.turn.0.max(1.0 / self.pulses as f32);
            self.interrupt();
        }
    }

    /// The largest gap, or an even one times `unknown` until one was learned.
    pub(super) fn largest(&self, unknown: f32) -> f32 {
        if self.largest > 0.0 {
            self.largest
        } else {
            unknown / self.pulses as f32
        }
    }

    /// The angle from one magnet to a later one, rev. Whole turns are exact.
    pub(super) fn angle(&self, from: u32, to: u32) -> f32 {
        let magnets = to.saturating_sub(from);
        let (turns, rest) = (magnets / self.pulses, magnets % self.pulses);
        if !self.known() {
            return turns as f32 + rest as f32 / self.pulses as f32;
        }
        let part: f32 = (to - rest + 1..=to)
            .filter_map(|index| self.gaps.get((index % self.pulses) as usize))
            .sum();
        turns as f32 + part
    }
}
