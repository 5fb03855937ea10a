//! Finding out how many pulses the sensor gives in a revolution. A state machine; nothing is drawn here.
//!
//! ```text
//! ten turns by hand:  Waiting -- press --> Counting -- press --> Counted -- press --> taken over, or counted again
//!                                              +--- edges lost --> Lost ---- press --> counted again
//!                                              +--- motor runs --> Driven -- press --> counted again
//! plate's speed:      runs steadily, plate chosen --> fit --> One -- counted too, or no doubt --> press --> taken over
//! ```
//!
//! Ten turns count, timing only confirms: where both were done and differ, nothing is taken over. Whoever chooses the plate may be
//! mistaken, so timing alone is believed only where no other step explains the rate ([`Doubt`]). Nothing changes by itself.

mod pace;
mod passages;
mod timing;

use crate::machine::{Drive, MAX_PULSES, Machine};
use crate::setup::Pulses;
use crate::time::{Edge, Instant};
use crate::units::Rpm;

pub use passages::Passages;
pub use timing::{CLEAR, Fit, PULSES_SEEN, fit};

use pace::Pace;
use timing::Rate;

/// Whole turns that are made by hand: so many that a pulse more or less at the mark does not matter.
pub const TURNS: u32 = 10;
/// How far a count may be from ten times a whole number: a magnet that stands near the sensor at the mark is counted once
/// more or once less. The same for fine wheels, where a hand has to meet the mark within a tooth: of a count that is further
/// off nobody knows what else was missed (common practice, no source).
pub const ALLOWED: u32 = 1;
/// From more pulses than this on, teeth that start and stop with a hand are as quick as chatter: a count with a piece of it
/// for every other passage proves nothing (measured in the tests: up to nine off with 240 teeth).
const FINE: u16 = 24;

/// Why ten turns gave no number.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Miscount {
    /// No magnet passed at all.
    Nothing,
    /// Not within [`ALLOWED`] of ten times a whole number; the two nearest ones.
    Between(u32, u32),
    /// More than ten times [`MAX_PULSES`].
    TooMany,
    /// The line chatters, and the teeth are too fine for that.
    Chatter,
}

/// How many pulses in a revolution the passages of ten turns are.
///
/// # Errors
/// Says what is wrong with a count that is not near ten times 1 to [`MAX_PULSES`].
pub fn of_ten_turns(passages: u32) -> Result<Pulses, Miscount> {
    if passages == 0 {
        return Err(Miscount::Nothing);
    }
    if passages > u32::from(MAX_PULSES) * TURNS + ALLOWED {
        return Err(Miscount::TooMany);
    }
    let (below, nearest) = (passages / TURNS, (passages + TURNS / 2) / TURNS);
    if passages.abs_diff(nearest * TURNS) > ALLOWED {
        return Err(Miscount::Between(below * TURNS, (below + 1) * TURNS));
    }
    // It fits, and where it is 0 the count was, or is far from ten.
    let found = u16::try_from(nearest).map(Pulses::new);
    found
        .ok()
        .and_then(Result::ok)
        .ok_or(Miscount::Between(0, TURNS))
}

/// The same for passages that were counted up to `now`; the line must not have chattered where that hides teeth.
///
/// # Errors
/// As [`of_ten_turns`].
pub fn counted(passages: &Passages, now: Instant) -> (u32, Result<Pulses, Miscount>) {
    let count = passages.count(now);
    let found = of_ten_turns(count).and_then(|found| {
        if found.get().get() > FINE && passages.joined() > count / 2 {
            Err(Miscount::Chatter)
        } else {
            Ok(found)
        }
    });
    (count, found)
}

/// How far the ten turns by hand have come.
#[derive(Clone, Debug, Default, PartialEq)]
pub enum Hand {
    /// Nobody has counted yet.
    #[default]
    Waiting,
    /// Somebody turns the spindle.
    Counting(Passages),
    /// So many passages were counted, and that is what they mean.
    Counted(u32, Result<Pulses, Miscount>),
    /// Edges were lost meanwhile.
    Lost,
    /// The passages were too even or too fast for a hand: the motor runs.
    Driven,
}

/// What the next press of the right knob does.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Offer {
    /// Begins to count.
    Start,
    /// Ends the count.
    End,
    /// Counts once more.
    Again,
    /// Takes this number over.
    Use(Pulses),
    /// Nothing.
    Nothing,
}

/// What stands against a number that the plate's speed gives and nobody has counted.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Doubt {
    /// The number in use is the right one if the spindle runs in this other step.
    Step(Rpm),
    /// The number in use is the right one if a cut slows the spindle, or anywhere in the range of a variable drive.
    InUse,
    /// More than one step fits, each with a number of its own.
    Several,
}

/// What is known about the pulses in a revolution.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct SensorSetup {
    hand: Hand,
    pace: Pace,
    /// Passages so far, as of the last look.
    passages: u32,
    plate: Option<Rpm>,
    rate: Rate,
    /// What the rate meant when the spindle last ran steadily with this plate.
    fit: Option<Fit>,
}

impl SensorSetup {
    /// Takes edges; they are counted while somebody turns the spindle by hand.
    pub fn edges(&mut self, edges: &[Edge]) {
        if let Hand::Counting(passages) = &mut self.hand {
            for &edge in edges {
                passages.push(edge);
                self.pace.push(edge);
            }
        }
    }

    /// Edges were lost, or held back.
    pub fn edges_lost(&mut self) {
        if matches!(self.hand, Hand::Counting(_)) {
            self.hand = Hand::Lost;
        }
        self.rate = Rate::default();
    }

    /// Looks at the time, and at the tacho's last pulse: how many there were up to it and when it came.
    #[inline(never)]
    pub fn look(&mut self, now: Instant, pulse: Option<(u32, Instant)>) {
        if let Hand::Counting(passages) = &self.hand {
            self.passages = passages.count(now);
        }
        self.rate.see(now, pulse);
        if matches!(self.hand, Hand::Counting(_)) && self.is_driven() {
            self.hand = Hand::Driven;
        }
        if let (Some(plate), Some((rate, share))) = (self.plate, self.rate.steady()) {
            self.fit = Some(fit(rate, share, plate));
        }
    }

    /// How far the ten turns have come.
    pub fn hand(&self) -> &Hand {
        &self.hand
    }
    /// Passages counted by hand, as of the last look.
    pub fn passages(&self) -> u32 {
        self.passages
    }
    /// The plate's speed as chosen.
    pub fn plate(&self) -> Option<Rpm> {
        self.plate
    }
    /// Pulses a second while the spindle runs steadily.
    pub fn rate(&self) -> Option<f32> {
        self.rate.steady().map(|(rate, _)| rate)
    }
    /// Pulses that came steadily so far, of [`PULSES_SEEN`].
    pub fn seen(&self) -> u32 {
        self.rate.seen()
    }
    /// What the rate means with the chosen plate, as of the last steady run.
    pub fn fit(&self) -> Option<Fit> {
        self.fit
    }
    fn by_hand(&self) -> Option<Pulses> {
        match self.hand {
            Hand::Counted(_, found) => found.ok(),
            _ => None,
        }
    }
    fn is_driven(&self) -> bool {
        self.pace.is_a_motors() || self.rate.is_a_motors()
    }
    /// What hand and plate say where they contradict each other: then neither is taken over.
    pub fn contradiction(&self) -> Option<(Pulses, Fit)> {
        let both = self.by_hand().zip(self.fit);
        both.filter(|(hand, fit)| !fit.allows(*hand))
    }

    /// What a press does on the page of the ten turns, while `used` is the number in use.
    pub fn hand_offer(&self, used: Pulses) -> Offer {
        match &self.hand {
            Hand::Waiting => Offer::Start,
            Hand::Counting(_) => Offer::End,
            Hand::Counted(_, Ok(found)) if *found != used && self.contradiction().is_none() => {
                Offer::Use(*found)
            }
            Hand::Counted(..) | Hand::Lost | Hand::Driven => Offer::Again,
        }
    }

    /// The number that the spindle, as it runs now, gives with the chosen plate, and that is neither in use nor contradicted;
    /// with the rate and the share within which that is known.
    fn timed(&self, used: Pulses) -> Option<(Pulses, f32, f32)> {
        let (rate, share) = self.rate.steady()?;
        match self.fit {
            Some(Fit::One(found)) if found != used && self.contradiction().is_none() => {
                Some((found, rate, share))
            }
            _ => None,
        }
    }

    /// Why the number that timing gives now is not offered. There is no doubt where ten turns gave the same, or where the
    /// number in use is surely wrong, as nothing explains it, and one step alone explains the rate.
    #[inline(never)]
    pub fn doubt(&self, used: Pulses, machine: &Machine) -> Option<Doubt> {
        let (found, rate, share) = self.timed(used)?;
        if self.by_hand() == Some(found) {
            return None;
        }
        let in_use = Rpm::saturating(60.0 * rate / f32::from(used.get().get()));
        if machine.explains(in_use) {
            let step = machine.step_at(in_use).map(|step| step.rpm);
            let other = step.filter(|&step| self.plate != Some(step));
            return Some(other.map_or(Doubt::InUse, Doubt::Step));
        }
        let fitting = match machine.drive() {
            Drive::Stepped(steps) => steps
                .iter()
                .map(|step| fit(rate, share, step.rpm).clear())
                .sum(),
            // Any number can be some speed's.
            Drive::Variable(_) => u32::MAX,
        };
        (fitting != 1).then_some(Doubt::Several)
    }

    /// What a press does on the page of the plate's speed.
    pub fn plate_offer(&self, used: Pulses, machine: &Machine) -> Offer {
        match self.timed(used) {
            Some((found, ..)) if self.doubt(used, machine).is_none() => Offer::Use(found),
            _ => Offer::Nothing,
        }
    }

    /// Begins or ends the count by hand.
    pub(crate) fn count(&mut self, now: Instant) {
        self.hand = match &self.hand {
            Hand::Counting(passages) => {
                let (count, found) = counted(passages, now);
                self.passages = count;
                let too_fast = found.is_ok() && now.since(passages.begun()) < pace::FASTEST;
                if too_fast || self.is_driven() {
                    Hand::Driven
                } else {
                    Hand::Counted(count, found)
                }
            }
            _ => {
                self.passages = 0;
                self.pace = Pace::default();
                self.time_anew();
                Hand::Counting(Passages::new(now))
            }
        };
    }

    /// The operator leaves: what was found and not taken over is no more.
    pub(crate) fn leave(&mut self) {
        self.hand = Hand::Waiting;
        self.fit = None;
        self.time_anew();
    }

    /// Times anew: what came before was another page, or another number of pulses.
    pub(crate) fn time_anew(&mut self) {
        self.rate = Rate::default();
    }

    /// The page of the plate's speed is entered: what was timed before is old. A contradiction stands until one of both is
    /// found anew.
    pub(crate) fn enter_plate(&mut self) {
        self.time_anew();
        if self.contradiction().is_none() {
            self.fit = None;
        }
    }

    /// Moves the plate's speed through the machine's steps, or by `turned` where it is set freely. Nobody guesses: the first
    /// detent begins at the slowest or the fastest one.
    pub(crate) fn turn_plate(
        &mut self,
        detents: i8,
        machine: &Machine,
        turned: impl Fn(Rpm, i8) -> Rpm,
    ) {
        if detents == 0 {
            return;
        }
        let drive = machine.drive();
        let (slowest, fastest) = (drive.slowest(), drive.fastest());
        let (from, detents) = match self.plate {
            Some(plate) => (plate, detents),
            None if detents > 0 => (slowest, detents - 1),
            None => (fastest, detents.saturating_add(1)),
        };
        let plate = match drive {
            Drive::Stepped(steps) => {
                let at = steps.iter().position(|s| s.rpm == from).unwrap_or(0) as i32;
                let last = steps.len().saturating_sub(1) as i32;
                let to = (at + i32::from(detents)).clamp(0, last);
                steps.get(to as usize).map_or(from, |s| s.rpm)
            }
            Drive::Variable(_) if detents == 0 => from,
            Drive::Variable(_) => {
                let to = turned(from, detents).get();
                Rpm::saturating(to.clamp(slowest.get(), fastest.get()))
            }
        };
        if self.plate != Some(plate) {
            self.plate = Some(plate);
            self.fit = None;
        }
    }
}
