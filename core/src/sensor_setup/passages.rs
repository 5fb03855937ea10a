//! Counting the passages of magnets while a hand turns the spindle.
//!
//! A hand pulls, lets go and pulls again: one passage takes a fortieth of a second, the next a whole one, and a third never
//! ends because the magnet stands at the sensor. The tacho's gate goes by how long passages have been, which holds while a
//! motor turns the spindle; here it drops quick passages after slow ones. So nothing is judged by what came before, but by what
//! stands around it: chatter is a run of stretches of the line, each of them short against the stretch on either side of the
//! run. What follows is waited for, so a count may step back by one or two.
//!
//! It costs something on each edge, but only while somebody counts.

use heapless::Vec;

use crate::time::{Edge, EdgeKind, Instant};

/// A gap between two lows of one passage is below this share of either, as in the tacho's gate: the gaps of a toothed wheel
/// are at least a tenth of its pitch.
const SAME_PASSAGE: (u32, u32) = (3, 32);
/// Where the line goes over from high to low or back, a piece of chatter is below this share of what stands on either side.
/// Of a spindle that starts or stops evenly, a low and the gap behind it are together never so short (see the tests).
const CHANGE: (u32, u32) = (5, 32);
/// A stretch in which the spindle rested says nothing about how fast it moved: longer ones count as this long. A tooth that a
/// hand moves from rest takes more than the share of it (estimate: pulls of 10 rad/s2, which is brisk for a chuck).
const RESTED_NS: u32 = 200_000_000;
/// A lone low below this is no passage but noise: a tooth of 240, turned by hand at two turns a second, takes 0.7 ms.
const NOISE_NS: u32 = 200_000;
/// A change of the line has this many short stretches at the most; more in a row are teeth.
const LONGEST_RUN: usize = 6;
/// Stretches that are waited for: two runs and what stands around them.
const RECENT: usize = 16;

/// How long the line kept its level.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Stretch {
    low: bool,
    ns: u32,
}

impl Stretch {
    /// What stands beside it and is below this is short.
    fn limit(self, share: (u32, u32)) -> u32 {
        self.ns.min(RESTED_NS) / share.1 * share.0
    }
}

/// Passages counted since a moment, from the edges of the sensor's line.
#[derive(Clone, Debug, PartialEq)]
pub struct Passages {
    begun: Instant,
    /// Passages that are over for good.
    over: u32,
    /// Pieces of chatter so far.
    joined: u32,
    /// The last stretches, oldest first, low and high in turn.
    recent: Vec<Stretch, RECENT>,
    /// When the stretch under way began, and whether the line is low in it; before the first edge nobody knows.
    since: Instant,
    low: Option<bool>,
}

impl Passages {
    /// Counts from `now` on.
    pub fn new(now: Instant) -> Self {
        Passages {
            begun: now,
            over: 0,
            joined: 0,
            recent: Vec::new(),
            since: now,
            low: None,
        }
    }

    /// Takes an edge. O(1): at most `RECENT` stretches are looked at.
    pub fn push(&mut self, edge: Edge) {
        let falls = edge.kind == EdgeKind::Fall;
        // The edge between two of a kind was lost: the line goes on.
        if self.low == Some(falls) || edge.at < self.since {
            return;
        }
        let ns = nanos(self.since, edge.at);
        self.take(Stretch { low: !falls, ns });
        self.since = edge.at;
        self.low = Some(falls);
    }

    /// How many passages there have been up to `now`. The one under way is not among them: it ends in the turns to come, as
    /// one that was under way at the start was counted at its end.
    #[inline(never)]
    pub fn count(&self, now: Instant) -> u32 {
        let Some(low) = self.low else {
            return 0;
        };
        // The stretch under way stands behind what may be chatter.
        let mut known = self.clone();
        let ns = nanos(self.since, now);
        known.take(Stretch { low, ns });
        known
            .over
            .saturating_add(known.lows())
            .saturating_sub(u32::from(low))
    }

    /// When the count began.
    pub fn begun(&self) -> Instant {
        self.begun
    }

    /// Pieces of chatter that were told from passages so far.
    pub fn joined(&self) -> u32 {
        self.joined
    }

    fn lows(&self) -> u32 {
        self.recent.iter().filter(|s| s.low).count() as u32
    }

    /// Not inlined, like [`Passages::count`]: both are large and used twice.
    #[inline(never)]
    fn take(&mut self, stretch: Stretch) {
        if self.recent.is_full() {
            self.over = self
                .over
                .saturating_add(u32::from(self.recent.remove(0).low));
        }
        // Room was just made.
        let _ = self.recent.push(stretch);
        while self.join() {}
    }

    /// Joins the run of short stretches before the last one to what stands around it, where there is such a run.
    fn join(&mut self) -> bool {
        let Some((last, before)) = self.recent.split_last() else {
            return false;
        };
        let (mut longest, mut sum) = (0, 0_u32);
        for (run, pair) in before.windows(2).rev().take(LONGEST_RUN).enumerate() {
            let &[first, short] = pair else {
                return false;
            };
            longest = short.ns.max(longest);
            sum = sum.saturating_add(short.ns);
            // The larger of the shares: no run that goes on from here is short enough.
            if longest >= last.limit(CHANGE) {
                return false;
            }
            let same = first.low == last.low;
            let share = if same { SAME_PASSAGE } else { CHANGE };
            if longest >= first.limit(share) || longest >= last.limit(share) {
                continue;
            }
            // What stands between two highs is a passage, unless it is noise.
            if same && !last.low && (run > 0 || short.ns > NOISE_NS) {
                continue;
            }
            let mut joined = Stretch {
                ns: sum.saturating_add(last.ns),
                ..*last
            };
            let mut keep = self.recent.len() - 2 - run;
            if same {
                joined.ns = joined.ns.saturating_add(first.ns);
                keep -= 1;
            }
            self.recent.truncate(keep);
            self.joined = self.joined.saturating_add(run as u32 / 2 + 1);
            // There is room: two stretches or more were taken away.
            let _ = self.recent.push(joined);
            return true;
        }
        false
    }
}

fn nanos(from: Instant, to: Instant) -> u32 {
    u32::try_from(to.since(from).nanos()).unwrap_or(u32::MAX)
}
