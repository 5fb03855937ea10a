//! Pulses in a revolution from the plate's speed: what timing can confirm.
//!
//! A spindle in a step turns at the plate's speed but for a few percent, so N pulses in a revolution come 60 f / n = N times as
//! often as turns, and n is only known within those percents. From ten pulses on several whole numbers fit, and no number is
//! said; evenly spaced magnets cannot be counted from timing alone.

use crate::machine::{ABOVE_PLATE, BELOW_PLATE_LOADED, MAX_PULSES};
use crate::setup::Pulses;
use crate::time::{Duration, Instant};
use crate::units::Rpm;

/// Up to this number of pulses the band of 8 % leaves a gap to the next number that a spindle which is not quite steady yet, or
/// pulled down by a cut, does not cross: 1.3 % at least, where the rate is known within 1 to 1.5 %, as after [`PULSES_SEEN`].
pub const CLEAR: u32 = 9;

/// A rate counts as steady from so many pulses on,
pub const PULSES_SEEN: u32 = 40;
/// and after so long.
const SEEN_FOR: Duration = Duration::from_secs(5);
/// It is compared in pieces of so many pulses,
const PIECE_PULSES: u32 = PULSES_SEEN / 2;
/// and of this length.
const PIECE: Duration = Duration::from_millis(1000);
/// Steady is where every piece is within this of the first: mains frequency and a belt that warms up do less (common practice, no
/// source).
const STEADY: f32 = 0.01;
/// How far both ends of a count are off together, in spacings: each magnet a tenth of a spacing from its place, as six of them
/// are that each sit 3 degrees off.
const ENDS: f32 = 0.2;
/// A silence of so many spacings is a stop.
const STOPPED: f32 = 4.0;

/// Which whole numbers of pulses a rate can mean.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Fit {
    /// This one alone.
    One(Pulses),
    /// Any from the first to the second, which may be the same where it is above [`CLEAR`].
    Several(u32, u32),
    /// None; this many pulses a turn at the plate's speed.
    Nothing(f32),
}

impl Fit {
    /// Whether this number is among them.
    pub fn allows(self, pulses: Pulses) -> bool {
        let n = u32::from(pulses.get().get());
        match self {
            Fit::One(one) => one == pulses,
            Fit::Several(from, to) => (from..=to).contains(&n),
            Fit::Nothing(_) => false,
        }
    }

    /// How many of the numbers are up to [`CLEAR`].
    pub(super) fn clear(self) -> u32 {
        match self {
            Fit::One(_) => 1,
            Fit::Several(from, to) => (to.min(CLEAR) + 1).saturating_sub(from),
            Fit::Nothing(_) => 0,
        }
    }
}

/// Which numbers of pulses in a revolution `rate` pulses a second can mean, known within a `share` of it, where the plate says
/// `plate`.
pub fn fit(rate: f32, share: f32, plate: Rpm) -> Fit {
    let at_plate = 60.0 * rate / plate.get().max(f32::MIN_POSITIVE);
    let fewest = libm::ceilf(at_plate / (ABOVE_PLATE * (1.0 + share)));
    let most = libm::floorf(at_plate / BELOW_PLATE_LOADED * (1.0 + share));
    // Casts saturate, and what is not a number becomes 0.
    let (fewest, most) = (fewest.max(1.0) as u32, most as u32);
    if most < fewest || fewest > u32::from(MAX_PULSES) {
        return Fit::Nothing(at_plate);
    }
    match u16::try_from(fewest).map(Pulses::new) {
        Ok(Ok(pulses)) if fewest == most && most <= CLEAR => Fit::One(pulses),
        _ => Fit::Several(fewest, most.min(u32::from(MAX_PULSES))),
    }
}

/// A pulse: how many there were up to it, and when it came.
type Mark = (u32, Instant);

/// The rate of pulses of a spindle that runs steadily.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(super) struct Rate {
    from: Option<Mark>,
    /// The rate in the first piece since then, to which all that follow are compared: a slow run-up is not steady.
    first: Option<(f32, f32)>,
    /// Pieces that agree with the first one, which is among them.
    agree: u8,
    piece: Option<Mark>,
    last: Option<Mark>,
}

impl Rate {
    /// Sees the last pulse so far; what was not steady is forgotten.
    pub(super) fn see(&mut self, now: Instant, pulse: Option<Mark>) {
        let (Some(pulse), Some(from), Some(piece)) = (pulse, self.from, self.piece) else {
            *self = Rate {
                from: pulse,
                first: None,
                agree: 0,
                piece: pulse,
                last: pulse,
            };
            return;
        };
        self.last = Some(pulse);
        if let Some((rate, _)) = rate(from, pulse)
            && now.since(pulse.1).secs_f32() * rate > STOPPED
        {
            *self = Rate::default();
            return;
        }
        let over = pulse.0.wrapping_sub(piece.0) >= PIECE_PULSES && pulse.1.since(piece.1) >= PIECE;
        let Some((now, share)) = rate(piece, pulse).filter(|_| over) else {
            return;
        };
        let as_first = self
            .first
            .is_some_and(|(rate, known)| (now / rate - 1.0).abs() <= STEADY + known + share);
        if !as_first {
            self.from = Some(piece);
            self.first = Some((now, share));
            self.agree = 0;
        }
        self.agree = self.agree.saturating_add(1);
        self.piece = Some(pulse);
    }

    /// Pulses a second and within which share of it that is known, once steady.
    pub(super) fn steady(&self) -> Option<(f32, f32)> {
        let (from, last) = (self.from?, self.last?);
        let enough = self.seen() >= PULSES_SEEN && last.1.since(from.1) >= SEEN_FOR;
        let enough = enough && self.agree >= 2;
        let (rate, share) = enough.then(|| rate(from, last)).flatten()?;
        Some((rate, share + STEADY))
    }

    /// Whether a motor turns the spindle: no hand keeps to one rate for so long.
    pub(super) fn is_a_motors(&self) -> bool {
        self.agree >= 3 && self.steady().is_some()
    }

    /// Pulses in a steady row.
    pub(super) fn seen(&self) -> u32 {
        match (self.from, self.last) {
            (Some(from), Some(last)) => last.0.wrapping_sub(from.0),
            _ => 0,
        }
    }
}

/// Pulses a second between two of them, and within which share of it that is known.
fn rate(from: Mark, to: Mark) -> Option<(f32, f32)> {
    let count = to.0.wrapping_sub(from.0);
    let secs = to.1.since(from.1).secs_f32();
    (count > 0 && secs > 0.0).then(|| (count as f32 / secs, ENDS / count as f32))
}
