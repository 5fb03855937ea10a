//! The number that the digits show: ripple and a missing pulse leave it alone.

use crate::time::{Duration, Instant};
use crate::units::Rpm;

/// A whole number stays while the speed is within this of it, rev/min: rounding alone would flicker at every half.
const STAYS: f32 = 0.56;
/// From here on it is another speed and not the next number, rev/min, or as a share of the speed where that is more.
const ANOTHER: f32 = 1.56;
const ANOTHER_SHARE: f32 = 0.002;
/// The next number waits for this long after a change: twice a second can be read.
const WAITS: Duration = Duration::from_millis(500);

/// What is shown, and since when.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Hold {
    shown: Option<(Rpm, Instant)>,
}

impl Hold {
    /// The number for a calm speed. `bounded`: silence alone lowers it, by no more than a missing pulse would.
    pub(super) fn show(&mut self, now: Instant, speed: Option<Rpm>, bounded: bool) -> Option<Rpm> {
        let Some(speed) = speed else {
            self.shown = None;
            return None;
        };
        let (n, another) = (speed.get(), ANOTHER.max(ANOTHER_SHARE * speed.get()));
        let stays = self.shown.is_some_and(|(shown, since)| {
            let off = (n - shown.get()).abs();
            bounded || off <= STAYS || off < another && now.since(since) < WAITS
        });
        if !stays {
            // One step where it is the next speed, all of them where it is another.
            let whole = match self.shown {
                Some((shown, _)) if (n - shown.get()).abs() < another => {
                    shown.get() + if n > shown.get() { 1.0 } else { -1.0 }
                }
                _ => libm::roundf(n),
            };
            self.shown = Some((Rpm::saturating(whole), now));
        }
        self.shown.map(|(shown, _)| shown)
    }
}
