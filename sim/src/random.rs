//! The one source of chance in the simulator: a named, seeded generator whose numbers are the same on every machine.
//!
//! PCG XSL 128/64 (MCG), known as `pcg64_fast` in O'Neill, "PCG: A Family of Simple Fast Space-Efficient Statistically
//! Good Algorithms for Random Number Generation", HMC-CS-2014-0905. The distributions are made here, with `libm`, so that
//! no other crate's change of method can move a recorded run.

use rand_core::{Rng, SeedableRng};
use rand_pcg::Pcg64Mcg;

/// A seeded stream of random numbers.
#[derive(Clone, Debug)]
pub struct Random {
    generator: Pcg64Mcg,
    /// The second of the two numbers that one turn of the polar method gives.
    spare: Option<f64>,
}

impl Random {
    /// A stream of its own for every pair of `seed` (the run's) and `stream` (which part of the simulator draws from it).
    pub fn new(seed: u64, stream: u64) -> Self {
        // Expanding the stream's number first keeps neighbours (seed 1, stream 2 and seed 2, stream 1) apart.
        let stream = Pcg64Mcg::seed_from_u64(stream).next_u64();
        Random {
            generator: Pcg64Mcg::seed_from_u64(seed ^ stream),
            spare: None,
        }
    }

    /// Even over `0.0 <= x < 1.0`, in steps of 2^-53.
    pub fn uniform(&mut self) -> f64 {
        const STEP: f64 = 1.0 / (1u64 << 53) as f64;
        (self.generator.next_u64() >> 11) as f64 * STEP
    }

    /// Even over `low <= x < high`.
    pub fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.uniform()
    }

    /// True with probability `p` (0 to 1).
    pub fn chance(&mut self, p: f64) -> bool {
        self.uniform() < p
    }

    /// Normal with mean 0 and standard deviation 1: the polar method (Marsaglia and Bray, "A convenient method for
    /// generating normal variables", SIAM Review 6, 1964; from memory).
    pub fn normal(&mut self) -> f64 {
        if let Some(spare) = self.spare.take() {
            return spare;
        }
        loop {
            let x = self.between(-1.0, 1.0);
            let y = self.between(-1.0, 1.0);
            let s = x * x + y * y;
            if s > 0.0 && s < 1.0 {
                let stretch = libm::sqrt(-2.0 * libm::log(s) / s);
                self.spare = Some(y * stretch);
                return x * stretch;
            }
        }
    }

    /// The wait for the next event of a Poisson process whose events come `mean` apart on average.
    pub fn wait(&mut self, mean: f64) -> f64 {
        // 1 - uniform() is never 0, so the logarithm is finite.
        -mean * libm::log(1.0 - self.uniform())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_generator_is_the_named_one() {
        // First outputs of pcg64_fast seeded with 42, from the reference implementation's test suite (C version).
        let mut generator = Pcg64Mcg::new(42);
        let first: [u64; 3] = core::array::from_fn(|_| generator.next_u64());
        assert_eq!(
            first,
            [0x63b4a3a813ce700a, 0x382954200617ab24, 0xa7fd85ae3fe950ce]
        );
    }

    #[test]
    fn recorded_runs_stay_what_they_were() {
        // Our own record, no outside source: if this moves, every recorded run moves with it.
        let mut random = Random::new(1, 2);
        let bits: [u64; 3] = [
            random.uniform().to_bits(),
            random.normal().to_bits(),
            random.wait(1.0).to_bits(),
        ];
        assert_eq!(bits, RECORDED, "{bits:#x?}");
    }
    const RECORDED: [u64; 3] = [
        0x3fe7_9421_f4c7_50ad,
        0x4002_210d_2a06_7f7c,
        0x3fa8_5f3d_3b4c_9872,
    ];

    #[test]
    fn the_distributions_have_their_moments() {
        let mut random = Random::new(7, 0);
        let n = 200_000;
        let (mut even, mut even2, mut normal, mut normal2, mut beyond, mut wait) =
            (0.0, 0.0, 0.0, 0.0, 0, 0.0);
        for _ in 0..n {
            let u = random.uniform();
            assert!((0.0..1.0).contains(&u));
            even += u;
            even2 += (u - 0.5) * (u - 0.5);
            let z = random.normal();
            normal += z;
            normal2 += z * z;
            beyond += usize::from(z.abs() > 1.959964);
            let w = random.wait(3.0);
            assert!(w >= 0.0 && w.is_finite());
            wait += w;
        }
        let n = f64::from(n);
        // Each tolerance is five standard errors.
        assert!((even / n - 0.5).abs() < 5.0 * 0.2887 / n.sqrt());
        assert!((even2 / n - 1.0 / 12.0).abs() < 5.0 * 0.0745 / n.sqrt());
        assert!((normal / n).abs() < 5.0 / n.sqrt());
        assert!((normal2 / n - 1.0).abs() < 5.0 * 2f64.sqrt() / n.sqrt());
        // 5 % of a normal distribution lie beyond 1.959964 standard deviations (any table of it).
        assert!((beyond as f64 / n - 0.05).abs() < 5.0 * 0.218 / n.sqrt());
        assert!((wait / n - 3.0).abs() < 5.0 * 3.0 / n.sqrt());
    }

    #[test]
    fn seeds_and_streams_are_apart() {
        let firsts: Vec<u64> = (0..4)
            .flat_map(|seed| {
                (0..4).map(move |stream| Random::new(seed, stream).uniform().to_bits())
            })
            .collect();
        let mut unique = firsts.clone();
        unique.sort_unstable();
        unique.dedup();
        assert_eq!(unique.len(), firsts.len());
    }
}
