//! How fast a single-point thread may run up to a shoulder, rev/min. Elementary kinematics.

/// The reaction time, s, of a hand on the half-nut lever (common practice, no source).
pub const REACTION_S: f32 = 1.0;

/// Opening the half-nut by hand: in the reaction time `t` the tool travels n `lead` t / 60, which must fit the runout:
/// n = 60 l_r / (P_h t). Runout and lead in mm.
pub fn half_nut_opened(runout: f32, lead: f32, t: f32) -> f32 {
    60.0 * runout / (lead * t)
}

/// Half-nut kept closed, the spindle is stopped: running down evenly it makes n `t_stop` / 120 more turns, and each moves the
/// tool by the lead: n = 120 l_r / (P_h t_stop).
pub fn half_nut_closed(runout: f32, lead: f32, t_stop: f32) -> f32 {
    120.0 * runout / (lead * t_stop)
}

/// The pitch, mm, of so many threads per inch.
pub fn pitch_of(threads_per_inch: f32) -> f32 {
    crate::units::MM_PER_INCH / threads_per_inch
}
