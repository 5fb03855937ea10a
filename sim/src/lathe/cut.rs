//! The load of a cut on the spindle.

/// A cut in progress.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Cut {
    /// Specific cutting force k_c of the work at this chip thickness, N/mm2.
    pub specific_force: f64,
    /// Depth of cut a_p, mm.
    pub depth: f64,
    /// Feed per revolution f, mm.
    pub feed: f64,
    /// Diameter that the edge meets, mm.
    pub diameter: f64,
    /// Where round the work there is metal to cut.
    pub engagement: Engagement,
}

/// How much of a turn the edge is in the metal.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Engagement {
    /// All of it.
    Continuous,
    /// `times` in a turn (6 for a hexagon bar), each for `share` (0 to 1) of its part of the turn.
    Interrupted {
        /// Engagements per turn; at least 1.
        times: u32,
        /// Share of the turn that the edge cuts.
        share: f64,
    },
}

impl Cut {
    /// Cutting force F_c = k_c a_p f, N (the definition of the specific cutting force).
    pub fn force(&self) -> f64 {
        self.specific_force * self.depth * self.feed
    }

    /// Torque on the spindle while the edge is in the metal, N m: M = F_c D / 2000 with D in mm.
    pub fn torque(&self) -> f64 {
        self.force() * self.diameter / 2000.0
    }

    /// Mean torque between two angles, rev; at one angle where both are the same.
    ///
    /// The mean over the stretch, not a sample of it, so that an interrupted cut takes exactly its share of the energy,
    /// whatever the length of the steps.
    pub fn torque_between(&self, from: f64, to: f64) -> f64 {
        let share = match self.engagement {
            Engagement::Continuous => 1.0,
            Engagement::Interrupted { times, share } => {
                let (from, to) = (from * f64::from(times), to * f64::from(times));
                if (to - from).abs() < 1e-9 {
                    let here = from - libm::floor(from);
                    f64::from(u8::from(here < share))
                } else {
                    (engaged(to, share) - engaged(from, share)) / (to - from)
                }
            }
        };
        self.torque() * share
    }
}

/// How much of the way from 0 to `x` is in the metal, when the first `share` of every whole unit is.
fn engaged(x: f64, share: f64) -> f64 {
    let whole = libm::floor(x);
    whole * share + (x - whole).min(share)
}

#[cfg(test)]
mod tests {
    use super::*;
    use core::f64::consts::TAU;

    #[test]
    fn published_worked_examples() {
        // P. C. Sharma, "A Textbook of Production Engineering", example 14.17 (book p. 575): turning 300 mm at 45 rpm,
        // 2 mm deep, 0.3 mm/rev, F_c = 1850 N: 1.31 kW.
        let cut = Cut {
            specific_force: 1850.0 / (2.0 * 0.3),
            depth: 2.0,
            feed: 0.3,
            diameter: 300.0,
            engagement: Engagement::Continuous,
        };
        let kw = cut.torque() * TAU * 45.0 / 60.0 / 1000.0;
        assert!((kw - 1.31).abs() < 0.005, "{kw}");

        // Kalpakjian and Schmid, "Manufacturing Engineering and Technology", example 22.1 (book p. 600): stainless steel,
        // 0.500 to 0.480 in, 400 rpm, 8 in/min, 4 W s/mm3 (that is 4000 N/mm2): 0.1803 hp at the mean diameter.
        let inch = 25.4;
        let cut = Cut {
            specific_force: 4000.0,
            depth: 0.010 * inch,
            feed: 8.0 / 400.0 * inch,
            diameter: 0.490 * inch,
            engagement: Engagement::Continuous,
        };
        let hp = cut.torque() * TAU * 400.0 / 60.0 / 745.7;
        assert!((hp - 0.1803).abs() < 0.0003, "{hp}");
    }

    #[test]
    fn an_interrupted_cut_takes_its_share() {
        let cut = Cut {
            specific_force: 2000.0,
            depth: 1.0,
            feed: 0.1,
            diameter: 20.0,
            engagement: Engagement::Interrupted {
                times: 6,
                share: 0.7,
            },
        };
        // Any chopping of a turn gives the same mean, forwards and backwards, also at negative angles.
        for steps in [1, 7, 60, 1000] {
            for (from, to) in [(0.0, 1.0), (3.3, 2.3), (-5.2, -4.2)] {
                let at = |i: i32| from + (to - from) * f64::from(i) / f64::from(steps);
                let sum: f64 = (0..steps)
                    .map(|i| cut.torque_between(at(i), at(i + 1)))
                    .sum();
                let mean = sum / f64::from(steps);
                assert!((mean - 0.7 * cut.torque()).abs() < 1e-9, "{steps} {mean}");
            }
        }
        assert_eq!(cut.torque_between(0.01, 0.01), cut.torque());
        assert_eq!(cut.torque_between(0.16, 0.16), 0.0);
    }
}
