//! What is a pulse: pieces of one passage joined, slivers dropped.
//!
//! While a magnet passes, the line is low. At the switching point it may chatter, so one passage can arrive in pieces:
//! pieces whose gap is short against the passage are one pulse, its first fall is its time. A low that is far narrower
//! than the passages seen lately, and stands alone, is a sliver (drive noise) and dropped.
//!
//! A pulse is reported at the rise that proves it wide enough; later pieces of the same passage only widen it.

use heapless::Vec;

use crate::time::{Edge, EdgeKind, Instant};

/// A gap below this joins: a tenth of the passage. A toothed wheel may be low for up to nine tenths of its pitch.
fn joining(passage: u32) -> u32 {
    // 3/32, which needs no division.
    (passage >> 4) + (passage >> 5)
}
/// Where passages and gaps are known, a gap below this share of the shorter one joins.
const KNOWN_JOIN_SHARE: u32 = 4;
/// All gaps before a passage is proven are together below this share of what passages have been.
const GAPS_SHARE: u32 = 4;
/// A low narrower than this share of the recent passages is a sliver. Magnets of one collar differ less than that,
/// and so do two passages that follow one another in a run-up.
const SLIVER_SHARE: u32 = 4;
/// Slivers may be the passages of a spindle that has become much faster: not if they are thinner than this part of their
/// spacing (4.5 degrees for one magnet),
const THINNEST: u32 = 80;
/// and only after this many in a row.
const NARROW_IS_USUAL: u8 = 6;
/// A longer low, ns, is no passage but a magnet that was parked at the sensor: it says nothing about the next one.
const PARKED: u32 = 1_000_000_000;
/// The input's electrical limit, pulses a second,
pub(super) const HIGHEST_RATE: f32 = 20_000.0;
/// as a period, ns, with a tenth for jitter. Never derived from the machine's top speed: a runaway must be seen.
const SHORTEST_PERIOD: u32 = 45_000;

/// One passage of a magnet.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Pulse {
    /// Its first fall.
    pub(super) at: Instant,
    /// From its first fall to its last rise as known when it was reported, ns.
    pub(super) width: u32,
}

/// What was not counted as a pulse, by kind.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Rejected {
    /// Pieces of a passage that were joined to it.
    pub joined: u32,
    /// Isolated lows too narrow for a passage.
    pub slivers: u32,
    /// Pulses closer to the one before than the input's electrical limit.
    pub too_close: u32,
    /// Edges that repeat the line's state or go back in time.
    pub disordered: u32,
    /// Pieces of noise that ran into a passage and were told from it by their time.
    pub noise: u32,
    /// Pulses close behind a passage, which were that passage again.
    pub doubled: u32,
    /// Other pulses between two expected ones.
    pub extra: u32,
    /// Passages that ran into the next one.
    pub merged: u32,
    /// Passages of a magnet that stands at the sensor and shakes.
    pub shaken: u32,
    /// Expected pulses that did not come.
    pub missing: u32,
}

/// A passage that may still grow.
#[derive(Clone, Copy, Debug)]
struct Passage {
    first: Instant,
    last_rise: Instant,
    /// From the one to the other, ns.
    width: u32,
    /// How long the line was low in it, ns: what noise adds to that is little.
    low: u32,
    reported: bool,
}

/// Pieces of a passage whose falls are remembered.
const BEGINS: usize = 6;
/// Time from `earlier` to `later`, ns; whatever is longer than four seconds is only that: 32 bits are what the chip works in.
pub(super) fn short(later: Instant, earlier: Instant) -> u32 {
    u32::try_from(later.nanos().wrapping_sub(earlier.nanos())).unwrap_or(u32::MAX)
}

/// Stands for what has never been: far before the clock's start, for [`short`] wraps.
const LONG_AGO: Instant = Instant::from_nanos(1 << 63);

#[derive(Clone, Debug)]
pub(super) struct Gate {
    last_edge: Instant,
    /// When the line fell, while it is low.
    low_since: Option<Instant>,
    passage: Option<Passage>,
    /// Where there are several: falls of its pieces until it was reported, the first and the last ones. Any of them may be its
    /// beginning, and what came before noise.
    begins: Vec<Instant, BEGINS>,
    /// First fall of the last reported pulse.
    reported_at: Instant,
    /// Fall of the piece that proved it wide enough: what came before may have been noise.
    proven_at: Instant,
    /// Width of the last passage and the gap behind it, ns; zero where nothing is known.
    usual: u32,
    usual_gap: u32,
    /// First fall of the last passage or sliver that is over.
    closed_at: Instant,
    /// Slivers in a row that a faster spindle could have made.
    narrow: u8,
    pub(super) rejected: Rejected,
}

impl Gate {
    pub(super) fn new() -> Self {
        Gate {
            last_edge: Instant::ZERO,
            low_since: None,
            passage: None,
            begins: Vec::new(),
            reported_at: LONG_AGO,
            proven_at: LONG_AGO,
            usual: 0,
            usual_gap: 0,
            closed_at: LONG_AGO,
            narrow: 0,
            rejected: Rejected::default(),
        }
    }

    /// Forgets the usual width: after a standstill the next passages may have any.
    pub(super) fn forget_width(&mut self) {
        self.usual = 0;
        self.usual_gap = 0;
    }

    /// Forgets all but what was counted: edges were lost.
    pub(super) fn forget(&mut self) {
        *self = Gate {
            rejected: self.rejected,
            ..Gate::new()
        };
    }

    /// When the pulse that began at `at` certainly had begun.
    pub(super) fn proven(&self, at: Instant) -> Instant {
        if self.reported_at == at {
            self.proven_at
        } else {
            at
        }
    }

    /// When a pulse began that may be under way at `now` but is not proven yet.
    pub(super) fn under_way(&self, now: Instant) -> Option<Instant> {
        let begun = self.passage.filter(|p| {
            // A rise may be later than the time asked about.
            let pause = self.low_since.unwrap_or(now).since(p.last_rise).nanos();
            !p.reported && pause < u64::from(joining(self.usual))
        });
        begun.map(|p| p.first).or(self.low_since)
    }

    /// Takes one edge; O(1).
    pub(super) fn push(&mut self, edge: Edge) -> Option<Pulse> {
        if edge.at < self.last_edge {
            self.rejected.disordered = self.rejected.disordered.saturating_add(1);
            return None;
        }
        self.last_edge = edge.at;
        match (edge.kind, self.low_since) {
            (EdgeKind::Fall, None) => {
                self.low_since = Some(edge.at);
                None
            }
            (EdgeKind::Rise, Some(fell)) => {
                self.low_since = None;
                self.low(fell, edge.at)
            }
            // The edge between these two was lost: the longer low, or the longer high, is the safer guess.
            (EdgeKind::Fall, Some(_)) | (EdgeKind::Rise, None) => {
                self.rejected.disordered = self.rejected.disordered.saturating_add(1);
                None
            }
        }
    }

    /// One stretch of low, from `fell` to `rose`.
    fn low(&mut self, fell: Instant, rose: Instant) -> Option<Pulse> {
        let piece = short(rose, fell);
        let mut passage = Passage {
            first: fell,
            last_rise: rose,
            width: piece,
            low: piece,
            reported: false,
        };
        let before = self.passage.as_ref();
        // Nothing is before the first one, and that is long ago.
        let gap = before.map_or(u32::MAX, |p| short(fell, p.last_rise));
        let widest = before.map_or(0, |p| p.width).max(piece).max(self.usual);
        // What nearly every gap is: neither share in `joins` is more than a quarter.
        let apart = gap >= widest / KNOWN_JOIN_SHARE;
        if apart || !self.joins(&mut passage) {
            self.close(gap);
            self.begins.clear();
        }
        let is_new = !passage.reported && passage.low >= self.usual / SLIVER_SHARE;
        passage.reported |= is_new;
        let (first, width) = (passage.first, passage.width);
        self.passage = Some(passage);
        if !is_new {
            return None;
        }
        if short(first, self.reported_at) < SHORTEST_PERIOD {
            self.rejected.too_close = self.rejected.too_close.saturating_add(1);
            return None;
        }
        self.reported_at = first;
        self.proven_at = fell;
        Some(Pulse { at: first, width })
    }

    /// Where the pulse that was just reported may have begun, earliest first, where it came in pieces.
    pub(super) fn begins(&self) -> &[Instant] {
        &self.begins
    }

    /// Makes a piece a part of the passage before it, if it belongs there: by a gap that is short against the passage, or
    /// short against both a passage and a gap as they have been.
    #[cold]
    fn joins(&mut self, piece: &mut Passage) -> bool {
        let Some(p) = &self.passage else {
            return false;
        };
        let gap = short(piece.first, p.last_rise);
        let begun = if p.reported { 0 } else { self.usual };
        // A magnet that was parked at the sensor, or a short circuit, is no passage: against it every gap is short.
        let passing = |width: u32| if width > PARKED { 0 } else { width };
        // All gaps together are shorter than what is low, or far shorter than a passage as they have been: else the passages
        // of a spindle that has become much faster would be one.
        let low = passing(piece.low).max(passing(p.low));
        let gaps = short(piece.first, p.first).saturating_sub(p.low);
        let passage = passing(piece.width).max(passing(p.width)).max(begun);
        let joins = (gaps < low || gaps < begun / GAPS_SHARE)
            && (gap < joining(passage) || gap < self.usual.min(self.usual_gap) / KNOWN_JOIN_SHARE);
        if !joins {
            return false;
        }
        self.rejected.joined = self.rejected.joined.saturating_add(1);
        if !p.reported {
            if self.begins.is_full() {
                self.begins.remove(1);
            }
            // There is room for both.
            if self.begins.is_empty() {
                let _ = self.begins.push(p.first);
            }
            let _ = self.begins.push(piece.first);
        }
        piece.first = p.first;
        piece.width = short(piece.last_rise, p.first);
        piece.low = piece.low.saturating_add(p.low);
        piece.reported = p.reported;
        true
    }

    /// The passage or sliver, if there is one, is over, and has a gap of so many ns behind it.
    fn close(&mut self, gap: u32) {
        let Some(passage) = &self.passage else {
            return;
        };
        let (before, width) = (self.closed_at, passage.width);
        self.closed_at = passage.first;
        if !passage.reported {
            return self.sliver(before);
        }
        self.narrow = 0;
        self.usual = if width > PARKED { 0 } else { width };
        // Where pulses are missing, or the spindle slows down, the gap is longer than it will be: it follows slowly.
        self.usual_gap = match self.usual_gap {
            0 => gap,
            known => gap.min(known.saturating_add(known / 8)),
        };
    }

    /// The passage was a sliver; `before` is when the one before it began.
    #[cold]
    fn sliver(&mut self, before: Instant) {
        self.rejected.slivers = self.rejected.slivers.saturating_add(1);
        let Some(passage) = &self.passage else {
            return;
        };
        // Its lows: pieces of noise that were joined are as wide as they lie apart.
        let could_turn = passage.low >= short(passage.first, before) / THINNEST;
        self.narrow = if could_turn { self.narrow + 1 } else { 0 };
        if self.narrow >= NARROW_IS_USUAL {
            self.forget_width();
            self.narrow = 0;
        }
    }
}
