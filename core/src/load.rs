//! The load from the spindle's speed alone, for induction motors on the mains: how much slower it turns than it does free.
//!
//! The law is [`slip::load`]. What it needs is the free speed, which is learned for each step: the highest sustained speed of
//! the step, taken when the spindle has run up and turns steadily, for nobody starts a lathe with the tool in the metal. It
//! follows slow drift (warmth, belt creep, the mains), and a cut cannot draw it down by more than that.
//!
//! The mains frequency wanders by as much as a light cut slows the spindle, but it does so over seconds: a cut, and its end,
//! is told by a step of the speed between two steady stretches, not by the speed itself. The same wander is why the load comes
//! in four coarse marks and never in watts.
//!
//! What it cannot tell:
//! - from turning free, a cut of less than 0.15 of the rated torque (a tenth is seen nine times in ten; of a motor with a rated
//!   slip of 1.3 % it takes 0.2), or one that comes in over many seconds;
//! - a cut that gets lighter, down to what the mains may have wandered meanwhile, from its end; until the next start or cut;
//! - anything while the speed changes: it follows by about a second, at slow steps by some turns;
//! - the load in a step in which the spindle was not seen to run up since the box was switched on;
//! - neighbouring steps nearer than about 1.15 : 1 from each other: no load in either; nearer than 1.25 : 1, an overload of
//!   twice the rated torque from the slower step;
//! - a warm motor, which slips more, or a slack belt from more load: by up to a third, one mark.

use crate::machine::{
    ABOVE_PLATE, BELOW_PLATE, BELOW_PLATE_LOADED, Drive, MAX_STEPS, Machine, Step,
};
use crate::physics::slip;
use crate::tacho::{Reading, Signal};
use crate::time::{Duration, Instant};

/// The reading is looked at at most this often.
const LOOK: Duration = Duration::from_millis(20);

/// What an idling headstock takes of the motor's slip: its free slip as a share of the rated one (common practice, no source;
/// bearings, belts and gears take a twentieth of the rated torque in slow steps, a third in the fastest).
const FREE_SHARE: f32 = 0.1;
/// What belts give way between free running and rated load (common practice, no source: V-belts 0.5 to 1 %).
const BELT: f32 = 0.005;

/// The mains move the free speed by at most this much, from one end of their wander to the other (common practice, no source:
/// the frequency strays by 0.3 % each way).
const WANDER: f32 = 0.006;
/// The free speed is followed at this rate while free, a share in a second: faster than the mains wander, slower than a cut.
const FOLLOW: f32 = 0.002;
/// The highest free speed of a step is forgotten at this rate, a share in a second: warming takes minutes.
const FORGET: f32 = 0.000_05;
/// A step of the speed of this share of the rated load, or this share of the speed, is a cut that begins, ends or changes.
const STEP_OF_LOAD: f32 = 0.1;
const STEP_OF_SPEED: f32 = 0.0025;
/// Nearer to the free speed than this, as a load, the cut has ended.
const ENDED: f32 = 0.03;

/// The speed is steady when it has stayed within this share of a reference, which follows it as slowly as the mains wander,
/// for this long, s, or for so many turns. Whoever looks a little earlier or later finds the same.
const STEADY: f32 = 0.0015;
const STEADY_FOR: f32 = 0.3;
const STEADY_TURNS: f32 = 1.0;
/// The calm speed moves for this long after a change, s, or for so many turns, and swings a little beyond: what was known
/// stays known, and what was found may still settle.
const HOLD: f32 = 1.5;
const HOLD_TURNS: f32 = 6.0;
/// Who is unsteady in one step for so many times as long does not pass through it: a coasting spindle leaves the fifth of its
/// speed that a step takes sooner, unless it takes a quarter of a minute to stop (common practice, no source).
const STAYS: f32 = 2.0;

/// A first free speed is believed from here on, as a share of the plate's: ISO 229 allows 2 % below (from memory), and the
/// mains and the rounding of plates as much again.
const LEAST_OF_PLATE: f32 = 0.94;

/// Where the marks begin, and how far beyond, as loads, the last one holds.
const HEAVY: f32 = 0.6;
const STALLING: f32 = 1.3;
const HYSTERESIS: f32 = 0.06;

/// How hard the motor works: coarse, for the mains wander.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Mark {
    /// It turns free.
    Free,
    /// Up to 0.6 of what the rated torque leaves.
    Working,
    /// Up to the rated torque and somewhat above.
    Heavy,
    /// From 1.3 on: a motor pulls that for a short time.
    Stalling,
}

impl Mark {
    /// Every mark, lightest first.
    pub const ALL: [Mark; 4] = [Mark::Free, Mark::Working, Mark::Heavy, Mark::Stalling];

    /// In a word for the screen, at most 8 letters.
    pub const fn word(self) -> &'static str {
        match self {
            Mark::Free => "free",
            Mark::Working => "working",
            Mark::Heavy => "heavy",
            Mark::Stalling => "stalling",
        }
    }

    /// The mark of a load while cutting, see [`slip::load`].
    pub fn of(load: f32) -> Mark {
        match load {
            l if l >= STALLING => Mark::Stalling,
            l if l >= HEAVY => Mark::Heavy,
            _ => Mark::Working,
        }
    }
}

/// What the spindle does.
#[derive(Clone, Copy, Debug, PartialEq)]
enum State {
    /// Nobody can say.
    Unknown,
    /// It speeds up, slows down, or has not been steady since.
    Between,
    /// It turns free. Until `settled` the calm speed may swing back from the change that it came with, down to `lowest`.
    Free { settled: Instant, lowest: f32 },
    /// It cuts. `free_at`: when it was last seen free; `None` where it has cut since it came up, as far as one can tell.
    Cutting {
        free_at: Option<Instant>,
        mark: Mark,
    },
}

/// The step that the spindle turns in.
#[derive(Clone, Copy, Debug)]
struct InStep {
    index: usize,
    plate: f32,
    rated_slip: f32,
    /// The free speed, rev/min, and the speed of the present steady stretch; both 0 before the first.
    free: f32,
    level: f32,
}

impl InStep {
    // Floats are calls on a core without them: inlining these would cost a kilobyte of flash and save no time.
    #[inline(never)]
    fn load(&self, n: f32) -> f32 {
        let rated = self.rated_slip + BELT;
        slip::load(self.free, n, rated, FREE_SHARE * self.rated_slip).unwrap_or(0.0)
    }

    /// It turns free at this speed.
    #[inline(never)]
    fn is_free(&mut self, now: Instant, n: f32, lowest: f32) -> State {
        self.level = n;
        self.free = n;
        let settled = now + Duration::from_secs_f32(change_lasts(n));
        State::Free { settled, lowest }
    }

    /// How far apart, as a share of the speed, loads of 0 and 1 are.
    fn span(&self) -> f32 {
        self.rated_slip * (1.0 - FREE_SHARE) + BELT
    }
}

/// Learns the free speeds and tells the load.
#[derive(Clone, Debug)]
pub struct Load {
    /// The highest sustained speed of each step as a share of its plate's; 0 where it has not been learned.
    learned: [f32; MAX_STEPS],
    state: State,
    step: Option<InStep>,
    /// The spindle was seen at rest, or at speeds out of the step's, since it was last steady.
    run_up: bool,
    looked: Instant,
    /// What the speed stays near to, rev/min, and since when.
    reference: f32,
    near_since: Instant,
    /// Since when the speed has not been steady.
    unsteady: Option<Instant>,
    /// It has been so for long.
    lapsed: bool,
    /// So long that the spindle does not pass through the step on its way up or down.
    stays: bool,
}

impl Default for Load {
    fn default() -> Self {
        Load {
            learned: [0.0; MAX_STEPS],
            state: State::Unknown,
            step: None,
            run_up: false,
            looked: Instant::ZERO,
            reference: 0.0,
            near_since: Instant::ZERO,
            unsteady: None,
            lapsed: false,
            stays: false,
        }
    }
}

impl Load {
    /// Looks at a reading; no more often than every 20 ms, whoever asks more often. Bounded work: the machine's steps once
    /// when the step changes, else a few comparisons. Says nothing on a machine that does not tell its load
    /// ([`Machine::tells_load`]).
    pub fn look(&mut self, now: Instant, reading: &Reading, machine: &Machine) {
        let since = now.since(self.looked);
        if since < LOOK {
            return;
        }
        self.looked = now;
        match (reading.signal, reading.speed) {
            (Signal::Turning, _) if reading.overdue => self.lapsed = true,
            // What silence allows is no measured speed: a missing pulse, or a spindle that slows down.
            (Signal::Turning, _) if reading.bounded => {}
            (Signal::Turning, Some(speed)) => {
                // After a pause it is as steady as it was before.
                let seconds = since.secs_f32().min(1.0);
                self.turning(now, seconds, speed.get(), machine);
            }
            (Signal::Still, _) => {
                // What comes next is a run-up.
                self.leave(State::Between);
                self.run_up = true;
            }
            (Signal::Lost | Signal::Doubtful | Signal::Turning, _) => self.forget_run(),
        }
    }

    /// Nobody has looked: what is learned stays, what the spindle does is unknown.
    pub fn forget_run(&mut self) {
        self.leave(State::Unknown);
        self.run_up = false;
    }

    /// How hard the motor works, where that is known.
    pub fn mark(&self) -> Option<Mark> {
        match self.state {
            _ if self.lapsed => None,
            State::Free { .. } => Some(Mark::Free),
            State::Cutting { mark, .. } => Some(mark),
            State::Unknown | State::Between => None,
        }
    }

    /// Whether the tool is in the metal, where that is known. Speeding up and slowing down is not cutting; where the
    /// speed stays in a step and never settles nobody can say, for it may be an overload.
    pub fn cutting(&self) -> Option<bool> {
        match self.state {
            State::Between => (!self.stays).then_some(false),
            _ => self.mark().map(|mark| mark > Mark::Free),
        }
    }

    fn turning(&mut self, now: Instant, seconds: f32, n: f32, machine: &Machine) {
        let steady = self.is_steady(now, seconds, n);
        if !self.in_step(n, steady, machine) {
            return;
        }
        let Some(mut step) = self.step else {
            return;
        };
        let learned = self.learned.get(step.index).copied().unwrap_or(0.0) * step.plate;
        let state = match self.state {
            // A load is read off while the speed moves within the cut.
            State::Cutting { free_at, mark } if !steady => State::Cutting {
                free_at,
                mark: held(mark, step.load(n)),
            },
            _ if !steady => return,
            State::Unknown | State::Between => self.first(&mut step, now, n, learned),
            State::Free { settled, lowest } if now < settled && n >= lowest => {
                step.level = n;
                step.free = n;
                State::Free { settled, lowest }
            }
            State::Free { .. } => follow_free(&mut step, now, seconds, n, learned),
            State::Cutting { free_at, mark } => {
                follow_cut(&mut step, now, seconds, n, free_at, mark)
            }
        };
        // Forgotten only where the spindle is free, or was never seen so since it came up: a long cut must not become free.
        let forgets = match state {
            State::Free { settled, .. } => now >= settled,
            State::Cutting { free_at, .. } => free_at.is_none(),
            State::Unknown | State::Between => false,
        };
        if forgets && let Some(kept) = self.learned.get_mut(step.index) {
            let now_free = step.level / step.plate;
            *kept = now_free.max(*kept * (1.0 - FORGET * seconds));
            if matches!(state, State::Cutting { .. }) {
                step.free = *kept * step.plate;
            }
        }
        self.step = Some(step);
        self.state = state;
    }

    /// Whether the spindle turns in a step in which its load can be told.
    fn in_step(&mut self, n: f32, steady: bool, machine: &Machine) -> bool {
        if let Some(step) = &self.step {
            // Before the free speed is known the step explains what it does at all, an overload included.
            let low = if step.free > 0.0 {
                step.free * (1.0 - 2.5 * step.span())
            } else {
                step.plate * BELOW_PLATE
            };
            if n >= low && n <= step.plate * ABOVE_PLATE {
                return true;
            }
            // Pulled down further than any cut should, it still cuts, until it turns steadily in another step or slows down.
            let cuts = matches!(self.state, State::Cutting { .. }) && n < low && !self.lapsed;
            let elsewhere = || {
                let at = machine.step_at(crate::units::Rpm::saturating(n));
                at.is_some_and(|at| at.rpm.get() != step.plate)
            };
            if cuts && !(steady && elsewhere()) {
                return true;
            }
            // Nobody cuts while the speed goes from one step's to another's: it will have run up.
            self.leave(State::Between);
            self.run_up = true;
            return false;
        }
        let found = match machine.drive() {
            Drive::Stepped(steps) if machine.tells_load().is_ok() => found(steps, n, machine),
            _ => None,
        };
        match found {
            None => self.state = State::Unknown,
            Some(None) => self.state = State::Between,
            Some(Some(step)) => {
                self.step = Some(step);
                self.state = State::Between;
                self.decided();
            }
        }
        self.step.is_some()
    }

    /// The first steady speed in a step.
    fn first(&mut self, step: &mut InStep, now: Instant, n: f32, learned: f32) -> State {
        let is_new = learned == 0.0;
        if is_new && (!self.run_up || n < step.plate * LEAST_OF_PLATE) {
            return State::Unknown;
        }
        self.run_up = false;
        step.level = n;
        if is_new || n >= learned * (1.0 - WANDER - change(step)) {
            return step.is_free(now, n, n * (1.0 - WANDER));
        }
        step.free = learned;
        State::Cutting {
            free_at: None,
            mark: Mark::of(step.load(n)),
        }
    }

    /// Whether the speed has been steady of late.
    fn is_steady(&mut self, now: Instant, seconds: f32, n: f32) -> bool {
        self.reference = followed(self.reference, n, seconds);
        if (n - self.reference).abs() > STEADY * n {
            self.reference = n;
            self.near_since = now;
        }
        let near = now.since(self.near_since).secs_f32();
        let steady = near >= STEADY_FOR.max(STEADY_TURNS * turn_s(n));
        if steady {
            self.decided();
        } else {
            let since = *self.unsteady.get_or_insert(now);
            let (lasted, change) = (now.since(since).secs_f32(), change_lasts(n));
            self.lapsed |= lasted > change;
            self.stays |= lasted > STAYS * change;
        }
        steady
    }

    fn leave(&mut self, state: State) {
        self.state = state;
        self.step = None;
        self.reference = 0.0;
        self.decided();
    }

    fn decided(&mut self) {
        self.unsteady = None;
        self.lapsed = false;
        self.stays = false;
    }
}

/// The step of this speed; `Some(None)` where no step turns so, `None` where its load cannot be told.
fn found(steps: &[Step], n: f32, machine: &Machine) -> Option<Option<InStep>> {
    let speed = crate::units::Rpm::saturating(n);
    let Some(at) = machine.step_at(speed) else {
        return Some(None);
    };
    let index = steps.iter().position(|s| core::ptr::eq(s, at))?;
    let step = InStep {
        index,
        plate: at.rpm.get(),
        rated_slip: at.rated_slip?,
        free: 0.0,
        level: 0.0,
    };
    // The slower of two neighbours, at its fastest, against the faster one, at its slowest and under load.
    let apart = |slower: &Step, faster: &Step| {
        let fall = STALLING * step.span();
        slower.rpm.get() * ABOVE_PLATE < faster.rpm.get() * BELOW_PLATE_LOADED * (1.0 - fall)
    };
    let below = index.checked_sub(1).and_then(|i| steps.get(i));
    let told = below.is_none_or(|slower| apart(slower, at))
        && steps.get(index + 1).is_none_or(|faster| apart(at, faster));
    told.then_some(Some(step))
}

/// Time of a turn, s.
fn turn_s(n: f32) -> f32 {
    60.0 / n.max(1.0)
}

/// For how long, s, the calm speed moves after a change.
#[inline(never)]
fn change_lasts(n: f32) -> f32 {
    HOLD.max(HOLD_TURNS * turn_s(n))
}

/// The least step of the speed, as a share of it, that is a cut.
#[inline(never)]
fn change(step: &InStep) -> f32 {
    STEP_OF_SPEED.max(STEP_OF_LOAD * step.span())
}

/// Moves `level` towards `n`, but no faster than the mains wander.
#[inline(never)]
fn followed(level: f32, n: f32, seconds: f32) -> f32 {
    let most = FOLLOW * seconds * level;
    level + (n - level).clamp(-most, most)
}

fn follow_free(step: &mut InStep, now: Instant, seconds: f32, n: f32, learned: f32) -> State {
    let change = change(step);
    if n < step.level * (1.0 - change) {
        step.level = n;
        return State::Cutting {
            free_at: Some(now),
            mark: Mark::of(step.load(n)),
        };
    }
    if n > step.level * (1.0 + change) {
        // What was taken for free was a cut that has ended.
        return step.is_free(now, n, (n + step.level) / 2.0);
    }
    let level = followed(step.level, n, seconds);
    step.level = level.max(learned * (1.0 - WANDER));
    step.free = step.level;
    State::Free {
        settled: now,
        lowest: 0.0,
    }
}

fn follow_cut(
    step: &mut InStep,
    now: Instant,
    seconds: f32,
    n: f32,
    free_at: Option<Instant>,
    mark: Mark,
) -> State {
    let change = change(step);
    let missing = 1.0 - n / step.free;
    // So far the free speed may have gone since it was seen.
    let wandered = free_at.map_or(WANDER, |at| (FOLLOW * now.since(at).secs_f32()).min(WANDER));
    let ended = ENDED * step.span();
    let rose = n > step.level * (1.0 + change) && missing < ended + wandered;
    if rose || missing < ended {
        // Beyond half of the way back it is another cut.
        return step.is_free(now, n, (n + step.level.min(n)) / 2.0);
    }
    let moved = (n / step.level - 1.0).abs() > change;
    step.level = if moved {
        n
    } else {
        followed(step.level, n, seconds)
    };
    State::Cutting {
        free_at,
        mark: held(mark, step.load(n)),
    }
}

/// The mark of a load; the last one holds a little beyond its ends.
fn held(mark: Mark, load: f32) -> Mark {
    let (lighter, heavier) = (Mark::of(load - HYSTERESIS), Mark::of(load + HYSTERESIS));
    mark.clamp(lighter, heavier)
}
