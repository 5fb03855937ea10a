//! `Reading x Advice -> Verdict`: whether the spindle runs right.
//!
//! - danger: above a hard bound;
//! - fast: above 1.05 of the soft upper bound, left again at 1.00;
//! - slow: below the greater of the lower bound and 0.90 of the advised step;
//! - right: the rest.
//!
//! Run-up grace suppresses slow only. An unconfirmed cut suppresses everything but danger. In doubt never right.

use crate::advice::{Advice, FAST_ABOVE, Pick};
use crate::tacho::{Reading, Signal};
use crate::time::{Duration, Instant};

/// After a start the spindle may take this long to come up to speed before it counts as slow
/// (common practice, no source).
pub const RUN_UP_GRACE: Duration = Duration::from_secs(4);

/// What the box says about the spindle's speed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Verdict {
    /// Above a hard bound: something may break loose.
    Danger,
    /// The remembered setup waits for a knob to be pressed.
    Unconfirmed,
    /// The signal is gone though the spindle cannot have stopped.
    Lost,
    /// There is a reading that cannot be believed.
    Doubtful,
    /// There are no pulses. That is never to say that the spindle is stopped or safe.
    NoPulses,
    /// Too fast for edge, finish or motor.
    Fast,
    /// There is no basis for advice on this combination.
    NoAdvice,
    /// The holder is unrated and no cap was typed.
    NeedsCap,
    /// Coming up to speed.
    RunUp,
    /// Too slow.
    Slow,
    /// Inside the window.
    Right,
}

impl Verdict {
    /// A stable word.
    pub const fn id(self) -> &'static str {
        match self {
            Verdict::Danger => "danger",
            Verdict::Unconfirmed => "unconfirmed",
            Verdict::Lost => "lost",
            Verdict::Doubtful => "doubtful",
            Verdict::NoPulses => "no-pulses",
            Verdict::Fast => "fast",
            Verdict::NoAdvice => "no-advice",
            Verdict::NeedsCap => "needs-cap",
            Verdict::RunUp => "run-up",
            Verdict::Slow => "slow",
            Verdict::Right => "right",
        }
    }

    /// Every verdict.
    pub const ALL: [Verdict; 11] = [
        Verdict::Danger,
        Verdict::Unconfirmed,
        Verdict::Lost,
        Verdict::Doubtful,
        Verdict::NoPulses,
        Verdict::Fast,
        Verdict::NoAdvice,
        Verdict::NeedsCap,
        Verdict::RunUp,
        Verdict::Slow,
        Verdict::Right,
    ];
}

/// Remembers what the hysteresis and the grace need.
#[derive(Clone, Copy, Debug, Default)]
pub struct Judge {
    /// The last verdict was fast: it is left at 1.00, not at 1.05.
    fast: bool,
    /// Since when the spindle has been coming up, until it first was up.
    run_up: Option<Instant>,
    turning: bool,
}

impl Judge {
    /// Judges one reading. Bounded work.
    pub fn verdict(
        &mut self,
        now: Instant,
        reading: &Reading,
        advice: &Advice,
        confirmed: bool,
    ) -> Verdict {
        let turning = reading.signal != Signal::Still;
        if turning && !self.turning {
            self.run_up = Some(now);
        }
        self.turning = turning;

        let speed = reading.quick;
        let over = |bound: crate::units::Rpm| speed.is_some_and(|n| n > bound);
        let under = |bound: crate::units::Rpm| speed.is_some_and(|n| n < bound);

        let was_fast = core::mem::take(&mut self.fast);
        let fast = advice.window.soft.is_some_and(|soft| {
            over(if was_fast {
                soft.at
            } else {
                soft.at.scaled(FAST_ABOVE)
            })
        });

        if advice.window.hard.is_some_and(|hard| over(hard.at)) {
            self.fast = fast;
            return Verdict::Danger;
        }
        if !confirmed {
            return Verdict::Unconfirmed;
        }
        match reading.signal {
            Signal::Lost => return Verdict::Lost,
            Signal::Doubtful => return Verdict::Doubtful,
            Signal::Still => return Verdict::NoPulses,
            // The speed is an upper bound only: nothing may be said of it but that it is not above.
            Signal::Turning if reading.overdue => return Verdict::NoPulses,
            Signal::Turning => {}
        }
        if fast {
            self.fast = true;
            self.run_up = None;
            return Verdict::Fast;
        }
        match advice.pick {
            Pick::NoBasis(_) => return Verdict::NoAdvice,
            Pick::NeedsCap => return Verdict::NeedsCap,
            Pick::Set(_) | Pick::TooFast { .. } => {}
        }
        if under(advice.slow_below()) {
            return match self.run_up {
                Some(start) if now.since(start) < RUN_UP_GRACE => Verdict::RunUp,
                _ => Verdict::Slow,
            };
        }
        self.run_up = None;
        Verdict::Right
    }
}
