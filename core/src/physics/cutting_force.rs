//! Cutting force from the section of the chip: Kienzle, F_c = k_c1.1 b h^(1 - m_c), with b = a_p / sin kappa and
//! h = f sin kappa (O. Kienzle 1952; the law is in every book on metal cutting).
//!
//! k_c1.1 is the force, N, on a chip 1 mm wide and 1 mm thick; m_c says how much harder, for its section, a thin chip cuts.

/// The chip thicknesses, mm, over which published constants are fitted (Kienzle's tests; from memory). Outside of it the
/// law is carried on, and whoever asks is told.
pub const H_RANGE_MM: (f32, f32) = (0.05, 2.5);

/// Force of an edge worn to the end of its life against a sharp one: 1.3 to 1.5 in German textbooks (Tschaetsch, Praxis der
/// Zerspantechnik; from memory), 1.2 to 1.3 for normal turning in Machinery's Handbook's wear factors (from memory).
pub const WORN_EDGE: f32 = 1.3;

/// Force of high-speed steel at its low speeds against carbide, for which the constants are fitted: 1.2 (Tschaetsch, Praxis
/// der Zerspantechnik; from memory).
pub const HIGH_SPEED_STEEL: f32 = 1.2;

/// The setting angle kappa assumed where nobody enters one, as its sine: 75 degrees, a roughing tool (common practice, no
/// source). 90 degrees would ask 1 % less force.
pub const SIN_KAPPA: f32 = 0.965_925_8;

/// The constants of a material.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Kienzle {
    /// k_c1.1, N/mm2.
    pub kc11: f32,
    /// m_c.
    pub mc: f32,
}

impl Kienzle {
    /// The specific cutting force, N/mm2, at chip thickness `h`, mm: k_c = k_c1.1 h^-m_c.
    pub fn specific(self, h: f32) -> f32 {
        self.kc11 * libm::powf(h, -self.mc)
    }

    /// The cutting force, N, with depth `a_p` and feed `f`, mm.
    pub fn force(self, a_p: f32, f: f32, sin_kappa: f32) -> f32 {
        let (b, h) = (a_p / sin_kappa, f * sin_kappa);
        self.kc11 * b * libm::powf(h, 1.0 - self.mc)
    }

    /// The cutting torque, N m, of a twist drill of diameter `d` with two edges, feed `f`, mm: each edge takes half of the
    /// feed, and its force acts at a quarter of the diameter, so M = k_c f d^2 / 8000, at h = f / 2 sin 59 degrees.
    pub fn drill_torque(self, d: f32, f: f32) -> f32 {
        const SIN_HALF_POINT: f32 = 0.857_167_3;
        self.specific(f / 2.0 * SIN_HALF_POINT) * f * d * d / 8000.0
    }
}

/// Whether a chip this thick, mm, lies where the constants are fitted.
pub fn in_range(h: f32) -> bool {
    (H_RANGE_MM.0..=H_RANGE_MM.1).contains(&h)
}
