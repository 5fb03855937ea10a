//! The roughness that feed and nose radius leave at best: the tool's shape repeated once a turn. Built-up edge, chatter and
//! worn noses come on top; a real surface is never finer (common practice, no source).
//!
//! All lengths in mm; so are Rt and Ra, which people read in micrometres.

/// Ra of a parabola over its peak-to-valley height times 8: Ra = f^2 / (18 sqrt(3) r) = 0.0321 f^2 / r
/// (Stephenson & Agapiou, Metal Cutting Theory and Practice, eq. 10.9-10.10). The shop's 1/32 is 2.6 % lower.
const RA: f32 = 0.032_075;

/// Peak to valley, rounded nose `r`, feed `f`: Rt = f^2 / (8 r).
pub fn rt(f: f32, r: f32) -> f32 {
    f * f / (8.0 * r)
}

/// Arithmetic mean, rounded nose: Ra = f^2 / (18 sqrt(3) r).
pub fn ra(f: f32, r: f32) -> f32 {
    RA * f * f / r
}

/// The feed for a wanted Ra.
pub fn feed_for_ra(ra: f32, r: f32) -> f32 {
    libm::sqrtf(ra * r / RA)
}

/// Peak to valley of a tool without a nose radius, with the tangent of its side cutting edge angle and the cotangent of its
/// end cutting edge angle: Rt = f / (tan psi + cot kappa').
pub fn rt_sharp(f: f32, tan_side: f32, cot_end: f32) -> f32 {
    f / (tan_side + cot_end)
}

/// Peak to valley of the teeth marks of a slab mill of diameter `d`, feed per tooth `f_z`: Rt = f_z^2 / (4 d).
pub fn rt_slab(f_z: f32, d: f32) -> f32 {
    f_z * f_z / (4.0 * d)
}

/// Peak to valley that an Ra goes with under a rounded nose, times: 18 sqrt(3) / 8.
pub const RT_PER_RA: f32 = 3.897;
