//! The mains frequency, which is never quite its nominal value.

use crate::random::Random;

/// A slow random walk around 1, band-limited and bounded.
///
/// Between random values evenly spaced in time it moves along a cubic without corners, so there is nothing faster in it
/// than about half a cycle per spacing, and it never leaves the stated band. That mains frequency wanders by a few tenths
/// of a percent is common practice, no source.
#[derive(Clone, Debug)]
pub(super) struct Wander {
    share: f64,
    spacing_ns: u64,
    random: Random,
    /// When the stretch between the two values began, ns.
    began: u64,
    from: f64,
    to: f64,
}

impl Wander {
    pub(super) fn new(share: f64, spacing_s: f64, mut random: Random) -> Self {
        let from = random.between(-1.0, 1.0);
        let to = random.between(-1.0, 1.0);
        Wander {
            share,
            spacing_ns: ((spacing_s * 1e9) as u64).max(1),
            random,
            began: 0,
            from,
            to,
        }
    }

    /// Actual over nominal frequency; times come in order.
    pub(super) fn factor(&mut self, now_ns: u64) -> f64 {
        while now_ns.saturating_sub(self.began) >= self.spacing_ns {
            self.began += self.spacing_ns;
            self.from = self.to;
            self.to = self.random.between(-1.0, 1.0);
        }
        let x = now_ns.saturating_sub(self.began) as f64 / self.spacing_ns as f64;
        let blend = x * x * (3.0 - 2.0 * x);
        1.0 + self.share * (self.from + (self.to - self.from) * blend)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn it_wanders_slowly_inside_its_band() {
        let mut wander = Wander::new(0.002, 5.0, Random::new(3, 0));
        let (mut low, mut high, mut last) = (f64::MAX, f64::MIN, None);
        for ms in (0..600_000).step_by(10) {
            let f = wander.factor(ms * 1_000_000);
            assert!((f - 1.0).abs() <= 0.002);
            if let Some(last) = last {
                // The cubic's steepest slope is 1.5 times the whole band in one spacing.
                let step: f64 = f - last;
                assert!(step.abs() <= 1.5 * 0.004 / 5.0 * 0.0101);
            }
            last = Some(f);
            low = low.min(f);
            high = high.max(f);
        }
        assert!(low < 0.9985 && high > 1.0015, "{low} {high}");
    }
}
