//! A hand that turns the chuck: it pulls, lets go, and pulls again.

use std::collections::VecDeque;

use crate::random::Random;
use rimrate_core::time::{Duration, Instant};

/// What a hand does, of each the least and the most (estimates): turns in one pull,
const PULL: (f64, f64) = (0.15, 0.45);
/// the pull's fastest speed, rpm,
const FASTEST_RPM: (f64, f64) = (20.0, 60.0);
/// and the rest before the next one, s.
const REST_S: (f64, f64) = (0.1, 0.8);

/// Turns still to be made by hand.
#[derive(Clone, Debug)]
pub(super) struct Hand {
    left: f64,
    /// What comes next: until when, and the spindle's acceleration until then, rev/s2.
    phases: VecDeque<(Instant, f64)>,
}

impl Hand {
    pub(super) fn new(turns: f64) -> Self {
        Hand {
            left: turns,
            phases: VecDeque::new(),
        }
    }

    /// Until when the spindle goes on as at `now`, and its acceleration; `None` when all turns are made. A pull begins only
    /// where the spindle stands.
    pub(super) fn phase(
        &mut self,
        now: Instant,
        stands: bool,
        chance: &mut Random,
    ) -> Option<(Instant, f64)> {
        while self.phases.front().is_some_and(|(end, _)| *end <= now) {
            self.phases.pop_front();
        }
        if self.phases.is_empty() && stands {
            if self.left <= 0.0 {
                return None;
            }
            self.pull(now, chance);
        }
        self.phases.front().copied()
    }

    /// Plans one pull: faster evenly, slower evenly, a rest.
    fn pull(&mut self, now: Instant, chance: &mut Random) {
        let turn = chance.between(PULL.0, PULL.1).min(self.left);
        self.left -= turn;
        let fastest = chance.between(FASTEST_RPM.0, FASTEST_RPM.1) / 60.0;
        let half = Duration::from_nanos((turn / fastest * 1e9) as u64);
        let secs = half.nanos() as f64 * 1e-9;
        let accel = turn / (secs * secs);
        let rest = Duration::from_nanos((chance.between(REST_S.0, REST_S.1) * 1e9) as u64);
        let (top, end) = (now + half, now + half + half);
        self.phases
            .extend([(top, accel), (end, -accel), (end + rest, 0.0)]);
    }
}
