//! Drilling by hand and by power: thrust, pecks, and the feed that a hand may give.

/// Thrust, N, of a twist drill: 1.16 K d (100 f)^0.85 kgf, d and f in mm (P. C. Sharma, A Textbook of Production Engineering,
/// ch. 15, with K = 1.1 for steel of 200 HB).
pub fn thrust(k: f32, d: f32, f: f32) -> f32 {
    const N_PER_KGF: f32 = 9.806_65;
    1.16 * k * d * libm::powf(100.0 * f, 0.85) * N_PER_KGF
}

/// Torque, N m, of a twist drill in a material of `hb` Brinell: M = HB d^2 f / 8 kgf mm (P. C. Sharma, ch. 15). It is the
/// law of [`super::cutting_force::Kienzle::drill_torque`] with the hardness for the specific force, without regard to the
/// chip's thickness: sharp edges and thick chips only.
pub fn torque_by_hardness(hb: f32, d: f32, f: f32) -> f32 {
    const N_M_PER_KGF_MM: f32 = 9.806_65e-3;
    hb * d * d * f / 8.0 * N_M_PER_KGF_MM
}

/// Holes deeper than this many diameters are pecked (common practice, no source).
pub const PECK_BEYOND: f32 = 3.0;

/// Depth of the next peck, mm, after the first three diameters: one diameter (common practice, no source).
pub fn peck(d: f32) -> f32 {
    d
}
