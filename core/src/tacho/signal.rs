//! Still, turning, lost, doubtful: what silence and rhythm allow one to say.
//!
//! Silence of t bounds the speed from above by g / t, with g the largest gap between magnets in revolutions. With the
//! spindle's speed w at its last pulse (rev/s) and its hardest braking a (rev/s in a second): while w^2 > 2 a g, silence
//! longer than (w - sqrt(w^2 - 2 a g)) / a cannot be a stop, so the signal is lost. Below that speed a dead sensor and a
//! stop look the same, and nobody can know.

use super::RIPPLE;
use super::track::Span;
use crate::time::{Duration, Instant};

/// A lost signal is said after this long at the earliest,
pub(super) const LOST_AFTER: Duration = Duration::from_millis(500);
/// and after this many expected pulses.
const LOST_AFTER_PULSES: f32 = 4.0;
/// A spindle whose last turn is faster than expected by more is still speeding up.
const SPEEDING_UP: f32 = 0.01;
/// Ripple comes on top of the hardest braking.
const HARDER: f32 = 1.05;
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

/// The slowest that the spindle can have turned at the end of a stretch, rev/s, with at most `brake` of deceleration.
///
/// Of all ways to make the stretch in its time, the one that ends slowest keeps the speed at its start for as long as it can
/// and then brakes at the limit; without knowledge of that speed it brakes all along. `before` is the revolution before the
/// stretch and `third` the one before that.
pub(super) fn slowest_end(
    stretch: Span,
    before: Option<Span>,
    third: Option<Span>,
    brake: f32,
) -> f32 {
    let brake = brake * HARDER;
    let braked_all_along = stretch.speed() - brake * stretch.time / 2.0;
    let (Some(before), Some(third)) = (before, third) else {
        return braked_all_along;
    };
    let (before, third) = (before.speed(), third.speed());
    // While it speeds up, the end of a revolution is faster than its mean by half of the gain.
    let gain = (before - third).max(0.0);
    let start = (before + gain / 2.0) * (1.0 + RIPPLE);
    if stretch.speed() > start * (1.0 + SPEEDING_UP) || gain > SPEEDING_UP * before {
        return braked_all_along;
    }
    let short = (start * stretch.time - stretch.angle).max(0.0);
    let braking = libm::sqrtf(2.0 * short / brake);
    if braking > stretch.time {
        braked_all_along
    } else {
        (start - brake * braking).max(braked_all_along)
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
    let brake = brake * HARDER;
    let left = end * end - 2.0 * brake * gap;
    if end <= 0.0 || left <= 0.0 {
        return None;
    }
    let stop = (end - libm::sqrtf(left)) / brake;
    let wait = stop.max(LOST_AFTER_PULSES * spacing);
    Some(last + Duration::from_secs_f32(wait).max(LOST_AFTER))
}
