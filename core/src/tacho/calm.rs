//! The calm speed: least squares over the mean times of whole turns.
//!
//! The mean time of the pulses of one whole turn does not depend on where the magnets sit. A line through the means of R turns
//! with N pulses each has, for white timestamp noise sigma and a turn's time T, the relative error
//! sqrt(12 / (N R (R^2 - 1))) sigma / T: the bound with placement unknown. Against all edges of the same window with placement
//! known (Kay's line fit) that is worse by R / sqrt(R^2 - 1) for many pulses: 6 % with three turns, less with more.
//!
//! An edge costs one addition. Turns are gathered in blocks, so that any speed fits a fixed memory; a block of k turns among B
//! loses a factor 1 / sqrt(1 - 1 / B^2) at most. The window grows to [`LONG`] or [`TURNS`] turns while one line explains the
//! turns, and drops its past when a line no longer does: see [`RIPPLE`].

use heapless::Deque;

use crate::time::{Duration, Instant};

/// The window grows to this, or to this many turns, whichever is longer: more than half a second and three turns, so that
/// what is still in the open block is made up for; no more, for a reading is half a window old.
const LONG: Duration = Duration::from_millis(700);
const TURNS: u32 = 4;
/// A line needs this many turns; before, whole turns from end to end are as good.
const LINE: u32 = 3;
/// Blocks aimed at, and the most.
const AIM: u32 = 12;
const BLOCKS: usize = 24;
/// A turn that differs from the window by more than 1/64 begins a new window: the speed is changing.
const CHANGE_SHIFT: u32 = 6;
/// The ripple floor: belts and gears change a spindle's speed by 0.1 to 0.5 %, coming and going (common practice, no source).
/// Two halves of a window that differ by more than 0.3 % each way are two speeds.
const RIPPLE: f32 = 0.006;
/// Deviations are cut here, ns: more than any window that holds together has.
const LATEST: i64 = 1 << 32;
/// Fractional bits of a period.
const FRACTION: u32 = 16;

/// Some whole turns.
#[derive(Clone, Copy, Debug)]
struct Block {
    turns: u32,
    /// Twice the place of its middle in the count of turns; it wraps.
    middle: u32,
    /// Mean time of its pulses, ns.
    mean: u64,
}

/// The line through the blocks, as far as it has been worked out.
#[derive(Clone, Copy, Debug, Default)]
struct Line {
    /// Time of a turn, ns, with [`FRACTION`] bits.
    period: u64,
    /// Standard error of the period from the scatter about the line, as a share of it.
    error: f32,
}

/// The window of the calm view.
#[derive(Clone, Debug)]
pub(super) struct Calm {
    pulses: u32,
    blocks: Deque<Block, BLOCKS>,
    /// Turns in all blocks.
    turns: u32,
    /// Twice the count of turns up to the open block.
    place: u32,
    /// The open block: its first pulse, sum of the times since, pulses still to come, and its turns.
    base: u64,
    sum: u64,
    left: u32,
    size: u32,
    /// Time of a turn for all checks, ns; 0 until there is one.
    period: u64,
    line: Option<Line>,
    /// Since when one speed explains the pulses, and how many that were.
    since: Instant,
    steady: u32,
}

impl Calm {
    pub(super) fn new(pulses: u32) -> Self {
        Calm {
            pulses,
            blocks: Deque::new(),
            turns: 0,
            place: 0,
            base: 0,
            sum: 0,
            left: pulses,
            size: 1,
            period: 0,
            line: None,
            since: Instant::ZERO,
            steady: 0,
        }
    }

    /// Nothing is known any more.
    pub(super) fn clear(&mut self) {
        self.restart(0, Instant::ZERO);
        self.steady = 0;
    }

    /// Begins a new window with the turn that began at `since` and lasted `turn` ns.
    pub(super) fn restart(&mut self, turn: u64, since: Instant) {
        self.blocks.clear();
        self.turns = 0;
        self.open(1);
        self.period = turn;
        self.line = None;
        self.since = since;
        // With the pulse that ends it.
        self.steady = self.pulses - 1;
    }

    fn open(&mut self, size: u32) {
        self.sum = 0;
        self.size = size;
        self.left = size * self.pulses;
    }

    /// Time of a turn for checks, ns, if one is known.
    pub(super) fn period(&self) -> Option<u64> {
        (self.period > 0).then_some(self.period)
    }

    /// Since when one speed explains the pulses.
    pub(super) fn since(&self) -> Instant {
        self.since
    }

    /// Whole turns that one speed explains.
    pub(super) fn steady_turns(&self) -> u32 {
        self.steady / self.pulses
    }

    /// Whether that is long enough for a line.
    pub(super) fn is_steady(&self) -> bool {
        self.steady >= LINE * self.pulses
    }

    /// The turn that ends now lasted `turn` ns and began at `since`. By how much it differs from the others, ns; nothing where
    /// it begins a new window. O(1).
    pub(super) fn check(&mut self, turn: u64, since: Instant) -> u64 {
        if self.period == 0 {
            // The first turn: what came with it stays.
            self.period = turn;
            self.since = since;
        }
        let off = turn.abs_diff(self.period);
        if off > self.period >> CHANGE_SHIFT {
            self.restart(turn, since);
            return 0;
        }
        off
    }

    /// Takes the next pulse, come or filled in. O(1), but for the one that closes a block.
    pub(super) fn pulse(&mut self, at: Instant) {
        let at = at.nanos();
        if self.left == self.size * self.pulses {
            self.base = at;
        }
        self.sum = self.sum.wrapping_add(at.wrapping_sub(self.base));
        self.steady = self.steady.saturating_add(1);
        self.left -= 1;
        if self.left == 0 {
            self.close();
        }
    }

    fn close(&mut self) {
        let pulses = u64::from(self.size * self.pulses);
        let block = Block {
            turns: self.size,
            middle: self.place.wrapping_add(self.size),
            mean: self.base + (self.sum + pulses / 2) / pulses,
        };
        self.place = self.place.wrapping_add(2 * self.size);
        if self.blocks.is_full() {
            self.merge_oldest();
        }
        // Room was just made.
        let _ = self.blocks.push_back(block);
        self.turns += self.size;

        let wanted = self.wanted();
        while let Some(oldest) = self.blocks.front()
            && self.turns - oldest.turns >= wanted
        {
            self.turns -= oldest.turns;
            self.blocks.pop_front();
        }
        self.break_up();
        self.fit();
        self.open(wanted.div_ceil(AIM).min(self.turns / 4).max(1));
    }

    /// How many turns the window should have.
    fn wanted(&self) -> u32 {
        // Less than 2^32: a turn lasts at least 45 us.
        let turns = LONG.nanos() / self.period.max(45_000);
        TURNS.max(turns as u32)
    }

    /// The oldest blocks are the smallest ones: they come from when the window was short.
    fn merge_oldest(&mut self) {
        let (Some(a), Some(b)) = (self.blocks.pop_front(), self.blocks.pop_front()) else {
            return;
        };
        let turns = a.turns + b.turns;
        let merged = Block {
            turns,
            middle: a.middle.wrapping_add(b.turns),
            mean: a.mean + b.mean.wrapping_sub(a.mean) * u64::from(b.turns) / u64::from(turns),
        };
        // Two places were just freed.
        let _ = self.blocks.push_front(merged);
    }

    /// Half-turns and nanoseconds beyond a steady turn's worth since the oldest block.
    fn deviation(&self, block: &Block, oldest: &Block) -> (i64, i64) {
        let half_turns = u64::from(block.middle.wrapping_sub(oldest.middle));
        let expected = half_turns * self.period / 2;
        let time = block.mean.wrapping_sub(oldest.mean);
        let late = time.wrapping_sub(expected) as i64;
        (half_turns as i64, late.clamp(-LATEST, LATEST))
    }

    /// Drops the older half where it is another speed than the newer one.
    fn break_up(&mut self) {
        let (Some(oldest), Some(newest)) = (self.blocks.front(), self.blocks.back()) else {
            return;
        };
        let (whole, end) = self.deviation(newest, oldest);
        let middle = self
            .blocks
            .iter()
            .map(|b| self.deviation(b, oldest))
            .enumerate()
            .find(|(_, (x, _))| 2 * x >= whole);
        let Some((half, (x, y))) = middle.filter(|_| self.turns > LINE) else {
            return;
        };
        // The sagitta of the bend over its chord: a quarter of the window's time times the difference of the speeds.
        let sagitta = y as f32 - end as f32 * x as f32 / whole as f32;
        if sagitta.abs() > RIPPLE * whole as f32 * self.period as f32 / 8.0 {
            for _ in 0..half {
                self.turns -= self.blocks.pop_front().map_or(0, |b| b.turns);
            }
            self.since = self
                .blocks
                .front()
                .map_or(self.since, |b| Instant::from_nanos(b.mean));
            self.steady = self.turns * self.pulses;
        }
    }

    /// The line through the blocks, each with the weight of its turns. Exact in whole numbers but for the last division.
    fn fit(&mut self) {
        self.line = None;
        let Some(&oldest) = self.blocks.front() else {
            return;
        };
        if self.turns < LINE || self.blocks.len() < LINE as usize {
            return;
        }
        let (mut sum, mut sx) = (0_i64, 0_i64);
        for block in &self.blocks {
            let (x, _) = self.deviation(block, &oldest);
            sum += i64::from(block.turns);
            sx += i64::from(block.turns) * x;
        }
        // From about the middle, so that 64 bits hold every product.
        let centre = sx / sum;
        let (mut sx, mut sy, mut sxx, mut sxy) = (0_i64, 0_i64, 0_i64, 0_i64);
        for block in &self.blocks {
            let (x, y) = self.deviation(block, &oldest);
            let (w, x) = (i64::from(block.turns), x - centre);
            sx += w * x;
            sy += w * y;
            sxx += w * x * x;
            sxy += w * x * y;
        }
        // What the middle lacks to the mean is less than half a turn, and single precision enough for it.
        let (sum, sx, sy) = (sum as f32, sx as f32, sy as f32);
        let spread = sxx as f32 - sx * sx / sum;
        let slope = (sxy as f32 - sx * sy / sum) / spread;
        // Two half-turns are a turn.
        let more = 2.0 * slope;
        let fixed = (self.period << FRACTION) as i64 + (more * (1 << FRACTION) as f32) as i64;
        let period = fixed.max(1) as u64;

        let level = (sy - slope * sx) / sum;
        let scatter: f32 = self
            .blocks
            .iter()
            .map(|block| {
                let (x, y) = self.deviation(block, &oldest);
                let rest = y as f32 - level - slope * (x - centre) as f32;
                block.turns as f32 * rest * rest
            })
            .sum();
        let free = (self.blocks.len() - 2) as f32;
        let variance = scatter / free / spread;
        let turn = (period >> FRACTION).max(1);
        self.line = Some(Line {
            period,
            error: 2.0 * libm::sqrtf(variance) / turn as f32,
        });
        self.period = turn;
    }

    /// Speed in rev/s and its standard error as a share of it, if there is a line. Double precision for one division: single
    /// would be coarser than the bound.
    pub(super) fn speed(&self) -> Option<(f64, f32)> {
        let line = self.line?;
        let unit = 1e9 * (1_u32 << FRACTION) as f64;
        Some((unit / line.period as f64, line.error))
    }
}
