//! Power and torque of a cut, and what speed a motor can pull it at.

use core::f32::consts::PI;

/// Torque, N m, of the cutting force `f_c`, N, at diameter `d`, mm: M = F_c d / 2000.
pub fn torque(f_c: f32, d: f32) -> f32 {
    f_c * d / 2000.0
}

/// Power, kW, of the cutting force `f_c`, N, at cutting speed `v`, m/min: P = F_c v / 60 000.
pub fn of_force(f_c: f32, v: f32) -> f32 {
    f_c * v / 60_000.0
}

/// Power, kW, to remove `q` cm3/min at a specific energy of `u` W s/mm3 (the same number as kW per cm3/s, and as 1000 N/mm2).
pub fn of_removal(u: f32, q: f32) -> f32 {
    u * q / 60.0
}

/// Power, kW, of torque `m`, N m, at `n` rev/min: P = 2 pi n M / 60 000.
pub fn of_torque(m: f32, n: f32) -> f32 {
    2.0 * PI * n * m / 60_000.0
}

/// The speed, rev/min, at which `kw` give torque `m`, N m: n = 60 000 P / (2 pi M), 9549 P / M.
pub fn speed_of(kw: f32, m: f32) -> f32 {
    60_000.0 * kw / (2.0 * PI * m)
}

/// The torque, N m, that `kw` give at `n` rev/min.
pub fn torque_of(kw: f32, n: f32) -> f32 {
    60_000.0 * kw / (2.0 * PI * n)
}
