//! Spindle speed from cutting speed and diameter: n = 1000 v / (pi D), with v in m/min and D in mm.
//!
//! It is the definition of cutting speed, in every handbook; the inch form is n = 12 v / (pi D) with v in ft/min
//! and D in inches (Machining 1, Open Washington Pressbooks, ch. 8 part 5: 12/pi = 3.8197).

use core::f32::consts::PI;

use crate::setup::Diameter;
use crate::units::{Rpm, SurfaceSpeed};

/// The spindle speed at which the edge meets `diameter` with cutting speed `v`.
pub fn spindle_speed(v: SurfaceSpeed, diameter: Diameter) -> Rpm {
    spindle_speed_of(v.m_min(), diameter)
}

/// As [`spindle_speed`], from a computed `v` in m/min.
pub fn spindle_speed_of(v: f32, diameter: Diameter) -> Rpm {
    Rpm::saturating(1000.0 * v / (PI * diameter.mm()))
}

/// The cutting speed in m/min at `diameter` when the spindle turns at `n`; 0 at rest.
pub fn surface_speed_m_min(n: Rpm, diameter: Diameter) -> f32 {
    n.get() * PI * diameter.mm() / 1000.0
}
