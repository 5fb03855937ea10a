//! Time as a value: it is handed in, never read.

use core::ops::{Add, AddAssign, Sub};

/// A point in time: nanoseconds of the capture clock since it started.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Instant(u64);

/// A length of time in nanoseconds; it cannot be negative.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Duration(u64);

impl Instant {
    /// The start of the capture clock.
    pub const ZERO: Instant = Instant(0);

    /// From nanoseconds of the capture clock.
    pub const fn from_nanos(ns: u64) -> Self {
        Instant(ns)
    }

    /// Nanoseconds of the capture clock; 2^64 of them are 584 years.
    pub const fn nanos(self) -> u64 {
        self.0
    }

    /// Time since `earlier`, or zero where `earlier` is in fact later.
    pub const fn since(self, earlier: Instant) -> Duration {
        Duration(self.0.saturating_sub(earlier.0))
    }
}

impl Duration {
    /// No time at all.
    pub const ZERO: Duration = Duration(0);
    /// The longest time that can be written.
    pub const MAX: Duration = Duration(u64::MAX);

    /// From nanoseconds.
    pub const fn from_nanos(ns: u64) -> Self {
        Duration(ns)
    }
    /// From microseconds.
    pub const fn from_micros(us: u64) -> Self {
        Duration(us.saturating_mul(1_000))
    }
    /// From milliseconds.
    pub const fn from_millis(ms: u64) -> Self {
        Duration(ms.saturating_mul(1_000_000))
    }
    /// From whole seconds.
    pub const fn from_secs(s: u64) -> Self {
        Duration(s.saturating_mul(1_000_000_000))
    }
    /// From seconds with a fraction; negative or not a number gives zero, too long gives [`Duration::MAX`].
    pub fn from_secs_f32(s: f32) -> Self {
        // A float-to-integer cast saturates and turns NaN to 0: no special cases are left.
        Duration((s * 1e9) as u64)
    }
    /// Nanoseconds.
    pub const fn nanos(self) -> u64 {
        self.0
    }
    /// Whole milliseconds, rounded down.
    pub const fn millis(self) -> u64 {
        self.0 / 1_000_000
    }
    /// Seconds; exact to seven digits.
    pub fn secs_f32(self) -> f32 {
        self.0 as f32 * 1e-9
    }
}

impl Add<Duration> for Instant {
    type Output = Instant;
    fn add(self, d: Duration) -> Instant {
        Instant(self.0.saturating_add(d.0))
    }
}

impl AddAssign<Duration> for Instant {
    fn add_assign(&mut self, d: Duration) {
        *self = *self + d;
    }
}

impl Sub<Duration> for Instant {
    type Output = Instant;
    fn sub(self, d: Duration) -> Instant {
        Instant(self.0.saturating_sub(d.0))
    }
}

impl Add for Duration {
    type Output = Duration;
    fn add(self, d: Duration) -> Duration {
        Duration(self.0.saturating_add(d.0))
    }
}

/// What the sensor's line did.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum EdgeKind {
    /// The line went low: a magnet arrives at the sensor.
    Fall,
    /// The line went high: the magnet leaves.
    Rise,
}

/// One change of the sensor's line, with its time.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Edge {
    /// When.
    pub at: Instant,
    /// Which way.
    pub kind: EdgeKind,
}

impl Edge {
    /// A magnet arrives.
    pub const fn fall(at: Instant) -> Self {
        Edge {
            at,
            kind: EdgeKind::Fall,
        }
    }
    /// A magnet leaves.
    pub const fn rise(at: Instant) -> Self {
        Edge {
            at,
            kind: EdgeKind::Rise,
        }
    }
}
