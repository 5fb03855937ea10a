//! Telling a motor from a hand while ten turns are counted.
//!
//! How many magnets there are nobody knows yet, so a speed cannot be told from passages alone. Evenness can: a motor brings the
//! same magnet round in the same time turn after turn, a hand that pulls and rests never does. Where passages are quick the
//! steady rate tells ([`Rate`](super::timing)); this is for few magnets and slow steps, of which ten turns are few passages.

use crate::time::{Duration, Edge, EdgeKind, Instant};

/// Ten turns in less than this are no hand's: 120 rev/min; the tests' hands pull at up to 70 (common practice, no source).
pub(super) const FASTEST: Duration = Duration::from_secs(5);
/// A passage is compared with the ones up to so many before it: one of them was the same magnet's, where there are so few.
const LAGS: usize = 4;
/// Alike is within this of each other: mains and belts change less from turn to turn, hands ten times as much (common
/// practice, no source),
const ALIKE: u32 = 64;
/// for so many passages in a row.
const IN_A_ROW: u8 = 8;
/// Only where passages are further apart than this, in 1024 ns: the teeth of a fine wheel are alike within one pull.
const SLOW: u32 = 100_000;

/// How even the passages are.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(super) struct Pace {
    fell: Option<Instant>,
    /// The last intervals, in 1024 ns, the newest first, and how many in a row were like those so far before them.
    recent: [u32; LAGS],
    alike: [u8; LAGS],
}

impl Pace {
    pub(super) fn push(&mut self, edge: Edge) {
        if edge.kind == EdgeKind::Rise {
            return;
        }
        let Some(fell) = self.fell.replace(edge.at) else {
            return;
        };
        let interval = (edge.at.since(fell).nanos() >> 10).min(u64::from(u32::MAX)) as u32;
        for (alike, &before) in self.alike.iter_mut().zip(&self.recent) {
            let even = interval >= SLOW && interval.abs_diff(before) < interval / ALIKE;
            *alike = if even { alike.saturating_add(1) } else { 0 };
        }
        self.recent.rotate_right(1);
        if let Some(newest) = self.recent.first_mut() {
            *newest = interval;
        }
    }

    /// Whether no hand turns so evenly.
    pub(super) fn is_a_motors(&self) -> bool {
        self.alike.iter().any(|&alike| alike >= IN_A_ROW)
    }
}
