//! What turning does to the hold on the work. None of this replaces a rating: it says what a speed costs, never that one is
//! safe.

use core::f32::consts::PI;

/// Grip, N, that `jaws` jaws of `mass` kg each lose at `n` rev/min, their mass centres at `radius` mm: m r w^2 a jaw.
pub fn grip_loss(jaws: f32, mass: f32, radius: f32, n: f32) -> f32 {
    let omega = 2.0 * PI * n / 60.0;
    jaws * mass * radius / 1000.0 * omega * omega
}

/// The speed, rev/min, at which the jaws have lost `loss` N.
pub fn speed_at_loss(jaws: f32, mass: f32, radius: f32, loss: f32) -> f32 {
    libm::sqrtf(loss * 1000.0 / (jaws * mass * radius)) * 60.0 / (2.0 * PI)
}

/// The share of the static grip that must be left (assumed, no source: a third lost is what chuck makers often allow).
pub const GRIP_LEFT: f32 = 2.0 / 3.0;

/// Rim speed, m/s, behind the cap that may be offered (assumed, no source). It is about half of what old rules allowed
/// cast-iron flywheels.
pub const RIM_SPEED: f32 = 15.0;

/// The speed, rev/min, at which a rim of `d` mm moves at `v` m/s: n = 60 000 v / (pi d).
pub fn rim_speed_cap(d: f32, v: f32) -> f32 {
    60_000.0 * v / (PI * d)
}
