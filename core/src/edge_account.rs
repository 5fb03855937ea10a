//! How much of an edge's life is used: dt / T(v) summed over the measured speed.
//!
//! T is Taylor's life at the speed measured, by the exponent that promises less. Time counts while cutting where somebody can
//! tell cutting from turning free, else while turning, which uses an edge up sooner than it wears; the account says which.

use crate::advice::EdgeLife;
use crate::time::Duration;

/// A longer silence between two looks is not counted: nobody looked.
const LONGEST_LOOK: Duration = Duration::from_secs(1);

/// What the time was counted by.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Counted {
    /// Nothing has been counted.
    #[default]
    Nothing,
    /// Only while cutting.
    Cutting,
    /// All the time while the spindle turned, at least for a part of it.
    Turning,
}

impl Counted {
    /// In words for the screen.
    pub const fn words(self) -> &'static str {
        match self {
            Counted::Nothing => "new",
            Counted::Cutting => "used, cutting",
            Counted::Turning => "used, turning",
        }
    }
}

/// The account of the present edge.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct EdgeAccount {
    /// In double precision: a look adds a millionth, which single precision would lose in time.
    used: f64,
    counted: Counted,
}

impl EdgeAccount {
    /// Takes `dt` at cutting speed `v`, m/min. `cutting` says whether the tool is in the metal, where that is known.
    pub fn add(&mut self, dt: Duration, v: f32, edge: &EdgeLife, cutting: Option<bool>) {
        if cutting == Some(false) || !v.is_finite() || v <= 0.0 {
            return;
        }
        let dt = if dt < LONGEST_LOOK { dt } else { LONGEST_LOOK };
        let life_s = 60.0 * edge.expected_min(v).max(1e-3);
        // More than a thousand edges is no account any more, and the sum stays finite.
        self.used = (self.used + f64::from(dt.secs_f32() / life_s)).min(1000.0);
        self.counted = match (cutting, self.counted) {
            (Some(true), Counted::Nothing | Counted::Cutting) => Counted::Cutting,
            _ => Counted::Turning,
        };
    }

    /// The used share of the edge's life; 1 at its end.
    pub fn used(&self) -> f32 {
        self.used as f32
    }
    /// The used share in whole percent.
    pub fn percent(&self) -> u32 {
        // A float-to-integer cast saturates.
        libm::floor(self.used * 100.0) as u32
    }
    /// What the time was counted by.
    pub fn counted(&self) -> Counted {
        self.counted
    }
    /// A new edge.
    pub fn renew(&mut self) {
        *self = EdgeAccount::default();
    }
}
