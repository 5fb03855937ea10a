//! Thickness of a milled chip: a cut narrower than half of the cutter makes a chip thinner than the feed per tooth.
//!
//! Geometry of the peripheral cut, in every book on milling: the thickest place is h = 2 f_z sqrt(a_e / d (1 - a_e / d)).

/// Thickest place of the chip over the feed per tooth; 1 from half of the diameter on.
pub fn thinning(a_e: f32, d: f32) -> f32 {
    let share = a_e / d;
    if share >= 0.5 {
        1.0
    } else {
        2.0 * libm::sqrtf(share * (1.0 - share))
    }
}

/// Mean thickness of the chip, mm, with the work's width `a_e` on one side of the cutter's middle:
/// h = f_z sqrt(a_e / d), at most f_z.
pub fn mean_thickness(f_z: f32, a_e: f32, d: f32) -> f32 {
    f_z * libm::sqrtf((a_e / d).min(1.0))
}
