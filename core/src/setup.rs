//! What the operator has chosen for the cut.

mod details;

use core::num::NonZeroU16;

use crate::error::Rejected;
use crate::machine::{self, Machine};
use crate::trade::{Coolant, Material, Operation, Tool};
use crate::units::{Length, Rpm, UnitError};

pub use details::{
    Bar, Details, HalfNut, InsertBox, Jaws, Life, Ra, Support, Thread, lead, length,
};

/// The largest diameter that the edge meets: 0.1 mm to 2000 mm.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Diameter(Length);

impl Diameter {
    /// Smallest and largest diameter, mm: below are wires, above no manual machine swings.
    pub const RANGE_MM: (f32, f32) = (0.1, 2000.0);

    /// Checks a length.
    pub fn new(length: Length) -> Result<Self, Rejected> {
        let (low, high) = Self::RANGE_MM;
        if (low..=high).contains(&length.mm()) {
            Ok(Diameter(length))
        } else {
            Err(Self::refused(length, UnitError::OutOfRange))
        }
    }

    /// Reads a text such as `25 mm` or `3/8 in`.
    pub fn parse(text: &str) -> Result<Self, Rejected> {
        text.parse::<Length>()
            .map_err(|e| Self::refused(text, e))
            .and_then(Self::new)
    }

    /// Moves this diameter into the allowed range.
    pub fn nearest(mm: f32) -> Self {
        let (low, high) = Self::RANGE_MM;
        let mm = if mm.is_nan() {
            low
        } else {
            mm.clamp(low, high)
        };
        Diameter(Length::from_mm(mm).unwrap_or(Length::MILLIMETRE))
    }

    /// The length.
    pub const fn length(self) -> Length {
        self.0
    }
    /// Millimetres.
    pub const fn mm(self) -> f32 {
        self.0.mm()
    }

    fn refused(value: impl core::fmt::Display, why: UnitError) -> Rejected {
        let (low, high) = Self::RANGE_MM;
        Rejected::new(
            "diameter",
            value,
            why.problem(),
            format_args!("a number with mm or in, {low} mm to {high} mm"),
        )
    }
}

/// Pulses of the sensor in one revolution of the spindle: 1 to [`machine::MAX_PULSES`].
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Pulses(NonZeroU16);

impl Pulses {
    /// Checks a number.
    ///
    /// # Errors
    /// Names `pulses`, the value and the range.
    pub fn new(n: u16) -> Result<Self, Rejected> {
        machine::pulses(n).map(Pulses)
    }
    /// The number.
    pub const fn get(self) -> NonZeroU16 {
        self.0
    }
}

impl core::fmt::Display for Pulses {
    fn fmt(&self, f: &mut core::fmt::Formatter<'_>) -> core::fmt::Result {
        u32::from(self.0.get()).fmt(f)
    }
}

/// Everything chosen for the cut; the machine's profile says the rest.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Setup {
    /// The work's material.
    pub material: Material,
    /// The tool's material.
    pub tool: Tool,
    /// What is done.
    pub operation: Operation,
    /// Whether cutting fluid reaches the edge.
    pub coolant: Coolant,
    /// The largest diameter that the edge meets.
    pub diameter: Diameter,
    /// Which of the machine's holders; an index into its list.
    pub holder: u8,
    /// The highest speed that the operator or instructor allows.
    pub cap: Option<Rpm>,
    /// The cap was typed for another holder: it still bounds the speed, but an unrated holder needs one of its own.
    pub cap_is_old: bool,
    /// Whether the load is shown, and told from turning free; see [`crate::load`].
    pub load: bool,
    /// What the operator has added: the cut, the finish, the life, the bar, the thread.
    pub details: Details,
    /// Pulses in a revolution as counted on the machine, where they are not those of its profile.
    pub pulses: Option<Pulses>,
}

impl Setup {
    /// What a box without a memory starts with: the slowest choice, which warns rather than lets pass.
    pub const CAUTIOUS: Setup = Setup {
        material: Material::UnknownSteel,
        tool: Tool::Hss,
        operation: Operation::RoughTurning,
        coolant: Coolant::Dry,
        diameter: Diameter(Length::INCH),
        holder: 0,
        cap: None,
        cap_is_old: false,
        load: false,
        details: Details::NONE,
        pulses: None,
    };

    /// Pulses in a revolution: those that were counted, or else the profile's.
    pub fn pulses_on(&self, machine: &Machine) -> Pulses {
        self.pulses.unwrap_or(Pulses(machine.pulses()))
    }
}

/// Checks a cap.
pub fn cap(rpm: Rpm) -> Result<Rpm, Rejected> {
    if (1.0..=100_000.0).contains(&rpm.get()) {
        Ok(rpm)
    } else {
        Err(Rejected::new(
            "cap",
            rpm,
            "is out of range",
            "1 rpm to 100000 rpm",
        ))
    }
}
