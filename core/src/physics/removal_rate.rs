//! Metal removed in a minute, cm3.

use core::f32::consts::PI;

/// Turning: Q = v a_p f, with v in m/min at the diameter `d` before the cut, a_p and f in mm. The mean diameter of the pass
/// would give d - a_p instead; books use either, and this is the larger.
pub fn turning(v: f32, a_p: f32, f: f32) -> f32 {
    v * a_p * f
}

/// Drilling from the solid: Q = pi d^2 f n / 4000, d and f in mm, n in rev/min.
pub fn drilling(d: f32, f: f32, n: f32) -> f32 {
    PI * d * d * f * n / 4000.0
}

/// Milling: Q = a_e a_p v_f / 1000, width, depth in mm, table feed in mm/min.
pub fn milling(a_e: f32, a_p: f32, v_f: f32) -> f32 {
    a_e * a_p * v_f / 1000.0
}
