//! Bending of a turning bar: its first bending speed, and how slender it is.
//!
//! f1 = (beta L)^2 / (2 pi L^2) sqrt(E I / (rho A)), the uniform beam (Thomson, Theory of Vibration, App. D). A bar that turns
//! at f1 whirls: any bend grows until it strikes. I / A = (d^2 + bore^2) / 16 for a round bar or tube.

use core::f32::consts::PI;

/// (beta L) of the first mode, clamped at one end and free at the other (Thomson, App. D, p. 510).
pub const CLAMPED_FREE: f32 = 1.8751;
/// Clamped at one end, pinned at the other: chuck and tailstock (3.9266, from memory; Hicks, Civil Engineering Formulas,
/// fig. 2.26, agrees to 0.3 %).
pub const CLAMPED_PINNED: f32 = 3.9266;
/// Clamped at both ends (Thomson, App. D, p. 510).
pub const CLAMPED_CLAMPED: f32 = 4.73;

/// How much of its first bending speed a bar is let turn at (common practice, no source: real bars are bent).
pub const SHARE_ALLOWED: f32 = 0.5;

/// What bends.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Bar {
    /// Free length, mm.
    pub length: f32,
    /// Outside diameter, mm.
    pub diameter: f32,
    /// Inside diameter of a tube, mm; 0 for a solid bar.
    pub bore: f32,
    /// Young's modulus, GPa.
    pub e_gpa: f32,
    /// Density, kg/m3.
    pub rho: f32,
}

/// The first bending frequency, Hz, with `beta` = (beta L) of the support.
pub fn first_hz(bar: &Bar, beta: f32) -> f32 {
    let length = bar.length / 1000.0;
    // Radius of gyration, m.
    let gyration = libm::sqrtf(bar.diameter * bar.diameter + bar.bore * bar.bore) / 4000.0;
    let wave = libm::sqrtf(bar.e_gpa * 1e9 / bar.rho);
    beta * beta * gyration * wave / (2.0 * PI * length * length)
}

/// The fastest speed, rev/min, that the bar is let turn at.
pub fn fastest(bar: &Bar, beta: f32) -> f32 {
    SHARE_ALLOWED * 60.0 * first_hz(bar, beta)
}

/// Free length over diameter above which a bar bends under the cut, by its support (common practice, no source).
pub mod slender {
    /// In the chuck alone: above it no cut without support.
    pub const FREE: f32 = 4.0;
    /// With a tailstock: above it a steady.
    pub const TAILSTOCK: f32 = 10.0;
    /// Behind the headstock: above it a support, whatever the speed.
    pub const BEHIND: f32 = 10.0;
}
