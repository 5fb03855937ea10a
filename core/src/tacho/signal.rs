//! Still, turning, lost, doubtful: what silence and rhythm allow one to say.
//!
//! Silence of t bounds the speed from above by g / t, with g the largest gap between magnets in revolutions. With the
//! spindle's speed w at its last pulse (rev/s) and its hardest braking a (rev/s in a second): while w^2 > 2 a g, silence
//! longer than (w - sqrt(w^2 - 2 a g)) / a cannot be a stop, so the signal is lost. Below that speed a dead sensor and a
//! stop look the same, and nobody can know.

use crate::time::{Duration, Instant};

/// A lost signal is said after this long at the earliest,
const LOST_AFTER: Duration = Duration::from_millis(500);
/// and after this many expected pulses.
const LOST_AFTER_PULSES: f32 = 4.0;
/// How closely two turns at the same speed agree: ripple of belt and gears is 0.1 to 0.5 % (common practice, no source).
const RIPPLE: f32 = 0.003;
/// Turns that differ by more are not one speed.
const SPEEDING_UP: f32 = 0.01;
/// A rhythm slower than the slowest speed by this much is still: jitter must not make the slowest speed flicker.
pub(super) const STILL_MARGIN: f32 = 1.005;

/// What may be said about the spindle.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Signal {
    /// No pulses, or none that turning explains. The spindle may stand still or the sensor may be dead.
    Still,
    /// There is a speed.
    Turning,
    /// The pulses stopped though the spindle cannot have.
    Lost,
    /// There is a rhythm, but it cannot be the spindle's speed.
    Doubtful,
}

impl Signal {
    /// A stable word.
    pub const fn id(self) -> &'static str {
        match self {
            Signal::Still => "still",
            Signal::Turning => "turning",
            Signal::Lost => "lost",
            Signal::Doubtful => "doubtful",
        }
    }
}

/// The slowest that the spindle can have turned at its last pulse, rev/s.
///
/// `turn` is the time of the last revolution, `before` that of the revolution before it, where there was one.
/// Of all ways to make that revolution in that time with at most `brake` of deceleration, the one that ends slowest keeps
/// the old speed for as long as it can and then brakes at the limit; without knowledge of an old speed it brakes all along.
pub(super) fn slowest_end(turn: f32, before: Option<f32>, brake: f32) -> f32 {
    let mean = 1.0 / turn;
    let braked_all_along = mean - brake * turn / 2.0;
    let Some(before) = before else {
        return braked_all_along;
    };
    let old = (1.0 + RIPPLE) / before;
    if mean > old * (1.0 + SPEEDING_UP) {
        // It was still speeding up: the old speed says nothing about this revolution.
        return braked_all_along;
    }
    let braking = libm::sqrtf(2.0 * (old * turn - 1.0).max(0.0) / brake);
    if braking > turn {
        braked_all_along
    } else {
        (old - brake * braking).max(braked_all_along)
    }
}

/// When silence after the last pulse means that the signal is lost; `None` where it may as well be a stop.
///
/// `end` is the slowest speed at the last pulse and `spacing` the expected time to the next one, `gap` the largest gap
/// between magnets in revolutions.
pub(super) fn lost_at(
    last: Instant,
    end: f32,
    gap: f32,
    spacing: f32,
    brake: f32,
) -> Option<Instant> {
    let left = end * end - 2.0 * brake * gap;
    if end <= 0.0 || left <= 0.0 {
        return None;
    }
    let stop = (end - libm::sqrtf(left)) / brake;
    let wait = stop.max(LOST_AFTER_PULSES * spacing);
    Some(last + Duration::from_secs_f32(wait).max(LOST_AFTER))
}
