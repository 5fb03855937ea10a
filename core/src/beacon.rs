//! Lamps, buzzer and relay: the verdict at a glance, readable without colour.
//!
//! Three lamps stand one above the other: over, right, under. Place and rhythm carry the meaning, colour only repeats it.
//!
//! | verdict | lamps | buzzer | relay |
//! |---|---|---|---|
//! | danger | over, four flashes a second | long high tone, with the flashes | closed |
//! | fast | over, one long flash a second | one short tone a second | open |
//! | right | right, steady | silent | open |
//! | slow | under, one long flash a second | silent | open |
//! | lost, doubtful | over and under in turn, once a second | one low tone every two seconds | open |
//! | unconfirmed, needs cap, no advice | over and under together, a short flash every two seconds | silent | open |
//! | no pulses, run-up | dark | silent | open |
//!
//! The middle lamp, the green one, is lit by `right` alone.

use crate::time::{Duration, Instant};
use crate::verdict::Verdict;

/// What the outputs do at one moment.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Outputs {
    /// The upper lamp.
    pub over: bool,
    /// The middle lamp.
    pub right: bool,
    /// The lower lamp.
    pub under: bool,
    /// The buzzer's pitch in Hz, if it sounds.
    pub buzzer_hz: Option<u16>,
    /// Closed on danger, for an extra-low-voltage lamp or siren; never a start, stop or interlock circuit.
    pub relay: bool,
}

const HIGH_HZ: u16 = 2700;
const MIDDLE_HZ: u16 = 1800;
const LOW_HZ: u16 = 900;

/// The shortest piece of any pattern; outputs change only at whole multiples of it.
pub const TICK: Duration = Duration::from_millis(125);

/// The outputs for a verdict that began at `since`, and when they change next (`None`: not by themselves).
pub fn outputs(verdict: Verdict, since: Instant, now: Instant) -> (Outputs, Option<Instant>) {
    let dark = Outputs::default();
    let tick = now.since(since).nanos() / TICK.nanos();
    let next = since + Duration::from_nanos((tick + 1).saturating_mul(TICK.nanos()));
    // Place within one second and within two, in eighths of a second.
    let (second, two) = (tick % 8, tick % 16);
    match verdict {
        Verdict::Danger => {
            let on = tick.is_multiple_of(2);
            (
                Outputs {
                    over: on,
                    buzzer_hz: on.then_some(HIGH_HZ),
                    relay: true,
                    ..dark
                },
                Some(next),
            )
        }
        Verdict::Fast => (
            Outputs {
                over: second < 5,
                buzzer_hz: (second == 0).then_some(MIDDLE_HZ),
                ..dark
            },
            Some(next),
        ),
        Verdict::Right => (
            Outputs {
                right: true,
                ..dark
            },
            None,
        ),
        Verdict::Slow => (
            Outputs {
                under: second < 5,
                ..dark
            },
            Some(next),
        ),
        Verdict::Lost | Verdict::Doubtful => (
            Outputs {
                over: second < 4,
                under: second >= 4,
                buzzer_hz: (two == 0).then_some(LOW_HZ),
                ..dark
            },
            Some(next),
        ),
        Verdict::Unconfirmed | Verdict::NeedsCap | Verdict::NoAdvice => {
            let on = two == 0;
            (
                Outputs {
                    over: on,
                    under: on,
                    ..dark
                },
                Some(next),
            )
        }
        Verdict::NoPulses | Verdict::RunUp => (dark, None),
    }
}
