//! Edge life from cutting speed: Taylor, v T^n = C (test standard: ISO 3685).
//!
//! The exponent n is a property of tool and work that shops do not know; books publish ranges. So every use here takes the
//! end of the range that promises less: the largest exponent when slowing down buys life (it asks for the slowest speed),
//! the smallest when speeding up costs life (it takes the most of it).

/// The wanted lives, min, for which the law is used: published fits do not reach further.
pub const LIFE_RANGE_MIN: (f32, f32) = (15.0, 240.0);

/// The life, min, that catalogue speeds and insert boxes are often stated for (common practice, no source).
pub const BOX_LIFE_MIN: f32 = 15.0;

/// The cutting speed for life `t2` where `v1` gives life `t1`: v2 = v1 (t1 / t2)^n.
pub fn speed_for_life(v1: f32, t1: f32, t2: f32, n: f32) -> f32 {
    v1 * libm::powf(t1 / t2, n)
}

/// The life at cutting speed `v2` where `v1` gives life `t1`: T2 = t1 (v1 / v2)^(1/n).
pub fn life_at_speed(v1: f32, t1: f32, v2: f32, n: f32) -> f32 {
    t1 * libm::powf(v1 / v2, 1.0 / n)
}

/// As [`life_at_speed`], with the exponent of `range` that promises the shorter life: above `v1` the smallest, below it the
/// largest.
pub fn cautious_life_at_speed(v1: f32, t1: f32, v2: f32, range: (f32, f32)) -> f32 {
    life_at_speed(v1, t1, v2, if v2 > v1 { range.0 } else { range.1 })
}

/// The exponent through two tests: n = ln(v2 / v1) / ln(t1 / t2).
pub fn exponent(v1: f32, t1: f32, v2: f32, t2: f32) -> f32 {
    libm::logf(v2 / v1) / libm::logf(t1 / t2)
}

/// Taylor's constant, the speed that lasts one minute: C = v T^n.
pub fn constant(v: f32, t: f32, n: f32) -> f32 {
    v * libm::powf(t, n)
}

/// The life, min, at which the cost of a piece is least: T = (1/n - 1) (t_c + C_t / C_m), with `change` the time of a tool
/// change, min, and `edge_cost` what an edge costs in minutes of machine and operator. With no cost of the edge it is
/// the life for the most pieces (Ghosh & Mallik, Manufacturing Science, ch. 4).
pub fn economic_life(n: f32, change: f32, edge_cost: f32) -> f32 {
    (1.0 / n - 1.0) * (change + edge_cost)
}
