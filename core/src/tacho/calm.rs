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
//!
//! A line is read at its middle, and so lags behind a speed that changes. Under steady acceleration, of up to about a hundredth
//! a turn, a parabola explains the turns (see [`BENT`]) and is read at its end. Its relative error there is
//! sqrt(192 / (N R^3)) sigma / T for many turns, four times that of a line: it is worth that only where the speed changes.

mod fit;

use heapless::{Deque, Vec};

use super::{CARRY, RIPPLE};
use crate::time::{Duration, Instant};
use fit::Point;
use libm::{fabsf, sqrtf};

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
/// A parabola is looked for where the halves differ by more than this: ripple of 0.3 % that comes and goes in three turns bends
/// a window of seven turns by 0.12 %.
const BENT: f32 = 0.0015;
/// It takes so many blocks, over up to so many times the turns of a line: its end is less exact.
const MANY: usize = 5;
const HISTORY: u32 = 2;
/// Its bend is this many standard errors or it is chance,
const SURE: f32 = 6.0;
/// and it explains nothing where turns scatter about it by more than this, in turns: ripple as above does by 0.0007.
const EXPLAINS: f32 = 0.001;
/// Turns scatter by this at the least, in turns, for all that is known from so few: about a parabola, and about a line.
const SCATTER: f32 = 0.000_1;
const SCATTER_OF_LINE: f32 = 0.000_4;
/// A newest block that is further than this from where the ones before put it, in standard deviations, is another motion's.
const MISFIT: f32 = 4.0;
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
    /// The newest block is another motion's, or moved by noise: the next one tells.
    misfit: bool,
    /// Since when one speed explains the pulses, within the ripple floor.
    since: Instant,
    /// How many a line explains.
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
            misfit: false,
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
        self.misfit = false;
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

    /// For how long one speed, within the ripple floor, has explained the pulses up to `last`; not at all before three turns.
    pub(super) fn one_speed_for(&self, last: Instant) -> Duration {
        let past = last.since(self.since);
        if self.period > 0 && past.nanos() >= u64::from(LINE) * self.period {
            past
        } else {
            Duration::ZERO
        }
    }

    /// Whole turns that a line explains.
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

    #[inline(never)]
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
            && self.turns - oldest.turns >= HISTORY * wanted
        {
            self.turns -= oldest.turns;
            self.blocks.pop_front();
        }
        self.fit(wanted);
        self.open(wanted.div_ceil(AIM).min(self.turns / 4).max(1));
    }

    /// How many turns the window should have.
    fn wanted(&self) -> u32 {
        // Less than 2^32: a turn lasts at least 45 us.
        let turns = LONG.nanos() / self.period.max(45_000);
        TURNS.max(turns as u32)
    }

    /// The oldest blocks are the smallest ones: they come from when the window was short.
    #[inline(never)]
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

    /// The blocks as points: half-turns, and nanoseconds beyond a steady turn's worth, since the oldest one.
    #[inline(never)]
    fn points(&self) -> Vec<Point, BLOCKS> {
        let mut points = Vec::new();
        let Some(&oldest) = self.blocks.front() else {
            return points;
        };
        for block in &self.blocks {
            let half_turns = block.middle.wrapping_sub(oldest.middle);
            let expected = u64::from(half_turns) * self.period / 2;
            let late = block.mean.wrapping_sub(oldest.mean).wrapping_sub(expected) as i64;
            // There are as many places.
            let _ = points.push(Point {
                turns: block.turns as i32,
                at: half_turns as i32,
                late: late.clamp(-LATEST, LATEST),
            });
        }
        points
    }

    /// Drops so many of the oldest blocks: they had another speed.
    #[inline(never)]
    fn forget(&mut self, count: usize) {
        for _ in 0..count {
            self.turns -= self.blocks.pop_front().map_or(0, |b| b.turns);
        }
        self.since = self
            .blocks
            .front()
            .map_or(self.since, |b| Instant::from_nanos(b.mean));
        self.steady = self.turns * self.pulses;
    }

    /// Where the window of a line begins: the newest blocks that have the turns wanted.
    fn begin(&self, wanted: u32) -> usize {
        let mut turns = self.turns;
        self.blocks
            .iter()
            .take_while(|block| {
                turns -= block.turns;
                turns >= wanted
            })
            .count()
    }

    /// Finds what explains the newest blocks, and drops those before. Each round but the last drops some.
    fn fit(&mut self, wanted: u32) {
        self.line = None;
        while self.turns >= LINE && self.blocks.len() >= LINE as usize {
            let points = self.points();
            let (bend, half) = fit::bend(&points, self.period as f32);
            if fabsf(bend) > BENT && points.len() >= MANY && self.parabola(&points) {
                self.steady = 0;
                // A wobble within the ripple floor is a speed that a step must explain: it puts off no doubt.
                if fabsf(bend) > RIPPLE {
                    self.since = Instant::from_nanos(self.blocks.back().map_or(0, |b| b.mean));
                }
                return;
            }
            if fabsf(bend) > RIPPLE && self.turns > LINE {
                self.forget(half);
                continue;
            }
            let first = self.begin(wanted);
            let points = points.get(first..).unwrap_or_default();
            let (bend, half) = fit::bend(points, self.period as f32);
            if fabsf(bend) > RIPPLE && self.turns > LINE {
                self.forget(first + half);
                continue;
            }
            if self.straight(points) {
                return;
            }
        }
    }

    /// The line through these points; none where the two newest ones do not fit the others, which are dropped.
    fn straight(&mut self, points: &[Point]) -> bool {
        let line = fit::Line::through(points);
        let (scatter, error) = line.scatter(points);
        let misfit = scatter.misfit(MISFIT, SCATTER_OF_LINE * self.period as f32);
        let again = core::mem::replace(&mut self.misfit, misfit) && misfit;
        if again && self.blocks.len() > LINE as usize {
            self.misfit = false;
            self.forget(self.blocks.len() - LINE as usize);
            return false;
        }
        self.read(line.slope, error);
        true
    }

    /// The parabola through all blocks, read at the newest pulse, if it explains them.
    fn parabola(&mut self, points: &[Point]) -> bool {
        let [.., before, newest] = points else {
            return false;
        };
        let parabola = fit::Parabola::through(points);
        let turn = self.period as f32;
        let scatter = sqrtf(parabola.scatter.variance());
        if scatter > EXPLAINS * turn || parabola.bend() < SURE * scatter.max(SCATTER * turn) {
            return false;
        }
        let last = (newest.late - before.late) as f32 / (newest.at - before.at) as f32;
        // A block's last pulse is half of its turns after its middle, less half of a spacing.
        let beyond = newest.turns as f32 - 1.0 / self.pulses as f32;
        let (slope, error) = parabola.slope(newest.at, beyond);
        let misfit = parabola.scatter.misfit(MISFIT, SCATTER * turn);
        // In doubt no further than the mean speed of the last two blocks, which no spindle's extremes can be within.
        let most = if misfit { 0.0 } else { CARRY * turn / 2.0 };
        let read = last + (slope - last).clamp(-most, most);
        self.read(read, error + fabsf(slope - read));
        if core::mem::replace(&mut self.misfit, misfit) && misfit {
            self.forget(self.blocks.len() - LINE as usize);
        }
        true
    }

    /// The period is longer by so much a half-turn than that of all checks, with a standard error.
    #[inline(never)]
    fn read(&mut self, slope: f32, error: f32) {
        // Two half-turns are a turn.
        let more = 2.0 * slope;
        let fixed = (self.period << FRACTION) as i64 + (more * (1 << FRACTION) as f32) as i64;
        let period = fixed.max(1) as u64;
        let turn = (period >> FRACTION).max(1);
        self.line = Some(Line {
            period,
            error: 2.0 * error / turn as f32,
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
