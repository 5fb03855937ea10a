//! Time of a pass, and the travel beyond the length asked for.

/// Time, min, of a travel of `length` mm at `f` mm per revolution and `n` rev/min: t = L / (f n).
pub fn of_pass(length: f32, f: f32, n: f32) -> f32 {
    length / (f * n)
}

/// Height of a twist drill's point, mm, which must come through as well: 0.29 of the diameter (P. C. Sharma, A Textbook of
/// Production Engineering, ch. 4; a point of 118 degrees gives 0.30).
pub fn drill_point(d: f32) -> f32 {
    0.29 * d
}

/// Way of a slab or side-milling cutter of diameter `d` from first touch to full depth `depth`, mm: sqrt(a (d - a)). A cut
/// deeper than the radius counts as one to the radius.
pub fn slab_approach(d: f32, depth: f32) -> f32 {
    let a = depth.min(d / 2.0);
    libm::sqrtf(a * (d - a))
}

/// Way of a face mill of diameter `d`, mm, onto the work, and the same off it: half of the diameter.
pub fn face_approach(d: f32) -> f32 {
    d / 2.0
}
