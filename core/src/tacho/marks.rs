//! The times of the last pulses, by the magnet's place in the count.

use crate::time::Instant;

/// Pulses remembered: a whole turn with the most pulses that a revolution may have.
const MARKS: usize = 256;
/// Stands for a magnet whose pulse is missing. The capture clock reaches it after 584 years.
const MISSING: u64 = u64::MAX;

/// A ring of pulse times; the newest one is a pulse that came, the ones before it may be missing.
#[derive(Clone, Debug)]
pub(super) struct Marks {
    at: [u64; MARKS],
    /// Place of the newest; it wraps, which a ring of a power of two does not mind.
    newest: u32,
    held: u32,
}

impl Marks {
    pub(super) fn new() -> Self {
        Marks {
            at: [MISSING; MARKS],
            newest: 0,
            held: 0,
        }
    }

    pub(super) fn clear(&mut self) {
        self.held = 0;
    }

    /// Magnets remembered, missing pulses included.
    pub(super) fn held(&self) -> u32 {
        self.held
    }

    pub(super) fn push(&mut self, at: Instant) {
        self.put(at.nanos());
    }

    /// Takes a magnet whose pulse is missing; a pulse that came must follow.
    pub(super) fn push_missing(&mut self) {
        self.put(MISSING);
    }

    fn put(&mut self, at: u64) {
        self.newest = self.newest.wrapping_add(1);
        self.held = (self.held + 1).min(MARKS as u32);
        if let Some(place) = self.at.get_mut(self.newest as usize % MARKS) {
            *place = at;
        }
    }

    /// Takes away the newest pulse and the missing ones before it; gives its time and their number.
    pub(super) fn pop(&mut self) -> Option<(Instant, u32)> {
        let last = self.last()?;
        let mut missing = 0;
        self.drop_newest();
        while self.held > 0 && self.last().is_none() {
            self.drop_newest();
            missing += 1;
        }
        Some((last, missing))
    }

    fn drop_newest(&mut self) {
        self.newest = self.newest.wrapping_sub(1);
        self.held -= 1;
    }

    /// The newest pulse.
    pub(super) fn last(&self) -> Option<Instant> {
        self.back(0)
    }

    /// The pulse `back` magnets before the newest one, if it is remembered and came.
    pub(super) fn back(&self, back: u32) -> Option<Instant> {
        if back >= self.held {
            return None;
        }
        let place = self.newest.wrapping_sub(back) as usize % MARKS;
        self.at
            .get(place)
            .filter(|&&at| at != MISSING)
            .map(|&at| Instant::from_nanos(at))
    }
}
