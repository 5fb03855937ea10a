//! Quantities with their units; inch and metric enter and leave only here.
//!
//! Every quantity is finite and greater than zero ([`Rpm`] may be zero), so arithmetic on them needs no checks.
//! Exact factors: 1 in = 25.4 mm and 1 ft = 0.3048 m (international yard and pound agreement, 1959).

use core::fmt;
use core::str::FromStr;

/// Millimetres in an inch, exact.
pub const MM_PER_INCH: f32 = 25.4;
/// Metres in a foot, exact.
pub const M_PER_FOOT: f32 = 0.3048;

/// Which units a person reads.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[cfg_attr(
    feature = "serde",
    derive(serde::Serialize, serde::Deserialize),
    serde(rename_all = "kebab-case")
)]
pub enum UnitSystem {
    /// mm and m/min.
    #[default]
    Metric,
    /// in and ft/min.
    Inch,
}

/// A length, 0.001 mm to 100 m.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Length(f32);

/// A cutting speed, 0.01 to 10 000 m/min.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct SurfaceSpeed(f32);

/// A spindle speed, 0 to 10 000 000 rev/min.
#[derive(Clone, Copy, Debug, Default, PartialEq, PartialOrd)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Rpm(f32);

/// Why a text is no quantity.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum UnitError {
    /// Nothing was given.
    Empty,
    /// The text before the unit is no number.
    NotANumber,
    /// A fraction with zero below the line.
    ZeroDenominator,
    /// A number without a unit.
    NoUnit,
    /// A unit that this quantity does not have.
    UnknownUnit,
    /// Zero or below.
    NotPositive,
    /// Too small, too large, or not finite.
    OutOfRange,
}

impl UnitError {
    /// What is wrong, in a few words.
    pub const fn problem(self) -> &'static str {
        match self {
            UnitError::Empty => "is empty",
            UnitError::NotANumber => "does not start with a number",
            UnitError::ZeroDenominator => "divides by zero",
            UnitError::NoUnit => "has no unit",
            UnitError::UnknownUnit => "has a unit that does not belong here",
            UnitError::NotPositive => "is not above zero",
            UnitError::OutOfRange => "is out of range",
        }
    }
}

impl fmt::Display for UnitError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.problem())
    }
}

impl core::error::Error for UnitError {}

impl Length {
    const RANGE: (f32, f32) = (0.001, 100_000.0);
    /// One millimetre.
    pub const MILLIMETRE: Length = Length(1.0);
    /// One inch.
    pub const INCH: Length = Length(MM_PER_INCH);

    /// From millimetres.
    pub fn from_mm(mm: f32) -> Result<Self, UnitError> {
        checked(mm, Self::RANGE).map(Length)
    }
    /// From inches.
    pub fn from_inch(inch: f32) -> Result<Self, UnitError> {
        Self::from_mm(inch * MM_PER_INCH)
    }
    /// Millimetres.
    pub const fn mm(self) -> f32 {
        self.0
    }
    /// Inches.
    pub fn inch(self) -> f32 {
        self.0 / MM_PER_INCH
    }
    /// Prints in the units that a person reads: `25 mm`, `0.375 in`.
    pub fn display(self, system: UnitSystem) -> impl fmt::Display {
        match system {
            UnitSystem::Metric => Quantity {
                value: self.0,
                decimals: 3,
                unit: "mm",
            },
            UnitSystem::Inch => Quantity {
                value: self.inch(),
                decimals: 4,
                unit: "in",
            },
        }
    }
}

impl SurfaceSpeed {
    const RANGE: (f32, f32) = (0.01, 10_000.0);

    /// From metres a minute.
    pub fn from_m_min(v: f32) -> Result<Self, UnitError> {
        checked(v, Self::RANGE).map(SurfaceSpeed)
    }
    /// From feet a minute.
    pub fn from_ft_min(v: f32) -> Result<Self, UnitError> {
        Self::from_m_min(v * M_PER_FOOT)
    }
    /// A constant of a table: clamped to the allowed range, so that tables can be `const`.
    pub const fn of_table_m_min(v: f32) -> Self {
        SurfaceSpeed(v.clamp(Self::RANGE.0, Self::RANGE.1))
    }
    /// As [`SurfaceSpeed::of_table_m_min`], in feet a minute.
    pub const fn of_table_ft_min(v: f32) -> Self {
        Self::of_table_m_min(v * M_PER_FOOT)
    }
    /// Metres a minute.
    pub const fn m_min(self) -> f32 {
        self.0
    }
    /// Feet a minute.
    pub fn ft_min(self) -> f32 {
        self.0 / M_PER_FOOT
    }
    /// This speed times a positive factor; a factor that is none leaves the nearest allowed speed.
    #[must_use]
    pub fn scaled(self, factor: f32) -> Self {
        let v = self.0 * factor;
        SurfaceSpeed(if v.is_nan() {
            Self::RANGE.0
        } else {
            v.clamp(Self::RANGE.0, Self::RANGE.1)
        })
    }
    /// Prints in the units that a person reads: `30 m/min`, `98.43 ft/min`.
    pub fn display(self, system: UnitSystem) -> impl fmt::Display {
        match system {
            UnitSystem::Metric => Quantity {
                value: self.0,
                decimals: 2,
                unit: "m/min",
            },
            UnitSystem::Inch => Quantity {
                value: self.ft_min(),
                decimals: 2,
                unit: "ft/min",
            },
        }
    }
}

impl Rpm {
    /// At rest.
    pub const ZERO: Rpm = Rpm(0.0);
    /// The fastest that can be written.
    pub const MAX: Rpm = Rpm(10_000_000.0);

    /// From revolutions a minute.
    pub fn new(n: f32) -> Result<Self, UnitError> {
        if n == 0.0 {
            Ok(Rpm::ZERO)
        } else {
            checked(n, (1e-6, Rpm::MAX.0)).map(Rpm)
        }
    }
    /// From a computed value: brought into the allowed range, NaN to zero.
    pub fn saturating(n: f32) -> Self {
        if n.is_nan() {
            Rpm::ZERO
        } else {
            Rpm(n.clamp(0.0, Rpm::MAX.0))
        }
    }
    /// Revolutions a minute.
    pub const fn get(self) -> f32 {
        self.0
    }
    /// Revolutions a second.
    pub fn rev_per_s(self) -> f32 {
        self.0 / 60.0
    }
    /// This speed times a factor, brought into the allowed range.
    #[must_use]
    pub fn scaled(self, factor: f32) -> Self {
        Rpm::saturating(self.0 * factor)
    }
}

impl fmt::Display for Length {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        self.display(UnitSystem::Metric).fmt(f)
    }
}

impl fmt::Display for SurfaceSpeed {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        self.display(UnitSystem::Metric).fmt(f)
    }
}

impl fmt::Display for Rpm {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let decimals = if self.0 < 100.0 { 1 } else { 0 };
        Quantity {
            value: self.0,
            decimals,
            unit: "rpm",
        }
        .fmt(f)
    }
}

impl FromStr for Length {
    type Err = UnitError;
    fn from_str(s: &str) -> Result<Self, UnitError> {
        match split(s)? {
            (n, "mm") => Length::from_mm(n),
            (n, "in") => Length::from_inch(n),
            (_, "") => Err(UnitError::NoUnit),
            _ => Err(UnitError::UnknownUnit),
        }
    }
}

impl FromStr for SurfaceSpeed {
    type Err = UnitError;
    fn from_str(s: &str) -> Result<Self, UnitError> {
        match split(s)? {
            (n, "m/min") => SurfaceSpeed::from_m_min(n),
            (n, "ft/min") => SurfaceSpeed::from_ft_min(n),
            (_, "") => Err(UnitError::NoUnit),
            _ => Err(UnitError::UnknownUnit),
        }
    }
}

/// A spindle speed has one unit in the trade, so `rpm` may be left out.
impl FromStr for Rpm {
    type Err = UnitError;
    fn from_str(s: &str) -> Result<Self, UnitError> {
        match split(s)? {
            (n, "rpm" | "") => Rpm::new(n),
            _ => Err(UnitError::UnknownUnit),
        }
    }
}

fn checked(value: f32, (low, high): (f32, f32)) -> Result<f32, UnitError> {
    if value <= 0.0 {
        Err(UnitError::NotPositive)
    } else if (low..=high).contains(&value) {
        Ok(value)
    } else {
        Err(UnitError::OutOfRange)
    }
}

/// Splits `1 1/2 in` into its number and its unit.
pub(crate) fn split(s: &str) -> Result<(f32, &str), UnitError> {
    let s = s.trim();
    if s.is_empty() {
        return Err(UnitError::Empty);
    }
    let unit_at = s
        .find(|c: char| c.is_alphabetic() || c == '"' || c == '%')
        .unwrap_or(s.len());
    let (number, unit) = s.split_at_checked(unit_at).unwrap_or((s, ""));
    Ok((number_of(number.trim())?, unit.trim()))
}

/// A decimal (`12.5`), a fraction (`3/8`) or a whole with a fraction (`1 1/2`, `1-1/2`).
fn number_of(s: &str) -> Result<f32, UnitError> {
    let Some((left, below)) = s.split_once('/') else {
        return decimal(s);
    };
    let left = left.trim();
    // The hyphen of `1-1/2` joins; with a space before it, it would be a minus sign, which is no way to write a length.
    let (whole, above) = match left.rsplit_once([' ', '-']) {
        Some((whole, _)) if left.contains('-') && whole.ends_with(' ') => {
            return Err(UnitError::NotANumber);
        }
        Some((whole, above)) if !whole.trim().is_empty() => (decimal(whole.trim())?, above),
        _ => (0.0, left),
    };
    let (above, below) = (decimal(above)?, decimal(below.trim())?);
    if below == 0.0 {
        return Err(UnitError::ZeroDenominator);
    }
    if above < 0.0 || below < 0.0 || whole < 0.0 {
        return Err(UnitError::NotPositive);
    }
    Ok(whole + above / below)
}

fn decimal(s: &str) -> Result<f32, UnitError> {
    let value: f32 = s.parse().map_err(|_| UnitError::NotANumber)?;
    if value.is_finite() {
        Ok(value)
    } else {
        Err(UnitError::OutOfRange)
    }
}

/// Prints a number with at most `decimals` digits behind the point, without trailing zeros, then its unit.
struct Quantity {
    value: f32,
    decimals: u32,
    unit: &'static str,
}

impl fmt::Display for Quantity {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(
            f,
            "{} {}",
            Decimal {
                value: self.value,
                decimals: self.decimals
            },
            self.unit
        )
    }
}

/// Prints a number with at most `decimals` (up to 6) digits behind the point, without trailing zeros.
pub struct Decimal {
    /// The number; below zero it prints with a minus sign.
    pub value: f32,
    /// How many digits behind the point at the most.
    pub decimals: u32,
}

impl fmt::Display for Decimal {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let decimals = self.decimals.min(6);
        let scale = 10_u64.pow(decimals);
        // f64 keeps all digits of an f32 exact through this product.
        let scaled = libm::round(f64::from(self.value) * scale as f64);
        let (sign, scaled) = if scaled < 0.0 {
            ("-", -scaled)
        } else {
            ("", scaled)
        };
        let scaled = scaled as u64;
        let (whole, mut rest) = (scaled / scale, scaled % scale);
        let mut places = decimals as usize;
        while places > 0 && rest.is_multiple_of(10) {
            rest /= 10;
            places -= 1;
        }
        if places == 0 {
            write!(f, "{sign}{whole}")
        } else {
            write!(f, "{sign}{whole}.{rest:0places$}")
        }
    }
}
