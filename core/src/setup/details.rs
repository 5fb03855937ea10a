//! What the operator may add to a setup: the cut, the finish, the life, the bar, the thread.
//!
//! Everything is optional: what is missing is not weighed.

use core::num::NonZeroU8;

use crate::error::Rejected;
use crate::physics::threading::pitch_of;
use crate::physics::tool_life::{BOX_LIFE_MIN, LIFE_RANGE_MIN};
use crate::physics::whirl;
use crate::units::{Length, SurfaceSpeed, UnitError, split};

/// What may be added to a setup.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Details {
    /// Depth of cut.
    pub depth: Option<Length>,
    /// Feed per revolution; per tooth when milling.
    pub feed: Option<Length>,
    /// Radius of the tool's nose.
    pub nose_radius: Option<Length>,
    /// Wanted arithmetic mean roughness.
    pub ra: Option<Ra>,
    /// Wanted edge life.
    pub life: Option<Life>,
    /// What is printed on the insert's box; it takes the place of the table's cutting speed.
    pub insert_box: Option<InsertBox>,
    /// The bar that sticks out.
    pub bar: Option<Bar>,
    /// The thread that is cut.
    pub thread: Option<Thread>,
    /// Length of the cut, or depth of the hole.
    pub length: Option<Length>,
    /// Teeth of the cutter.
    pub teeth: Option<NonZeroU8>,
    /// Width of cut when milling; width of the blade when parting.
    pub width: Option<Length>,
    /// The chuck's jaws and their grip.
    pub jaws: Option<Jaws>,
    /// The work's weight does not lie on the axis.
    pub off_balance: bool,
    /// The edge leaves the work and strikes it again in every turn.
    pub interrupted: bool,
}

impl Details {
    /// Nothing added.
    pub const NONE: Details = Details {
        depth: None,
        feed: None,
        nose_radius: None,
        ra: None,
        life: None,
        insert_box: None,
        bar: None,
        thread: None,
        length: None,
        teeth: None,
        width: None,
        jaws: None,
        off_balance: false,
        interrupted: false,
    };
}

/// An edge life, 15 to 240 min: Taylor's law is not used beyond.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Life(f32);

impl Life {
    /// The life that an insert's box is taken to speak of.
    pub const OF_BOX: Life = Life(BOX_LIFE_MIN);

    /// From minutes.
    ///
    /// # Errors
    /// Names `field`, the value and the range.
    pub fn new(field: &str, minutes: f32) -> Result<Self, Rejected> {
        in_range(field, minutes, LIFE_RANGE_MIN, "min").map(Life)
    }
    /// Reads `90 min` or `2 h`.
    pub fn parse(field: &str, text: &str) -> Result<Self, Rejected> {
        let factor = |unit: &str| match unit {
            "min" => Some(1.0),
            "h" => Some(60.0),
            _ => None,
        };
        let (low, high) = LIFE_RANGE_MIN;
        let allowed = format_args!("a number with min or h, {low} min to {high} min");
        number(field, text, factor, allowed, (low, high)).map(Life)
    }
    /// Minutes.
    pub const fn min(self) -> f32 {
        self.0
    }
}

/// An arithmetic mean roughness, 0.05 to 50 um.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Ra(f32);

impl Ra {
    /// Reads `1.6 um` or `63 uin`.
    pub fn parse(text: &str) -> Result<Self, Rejected> {
        let factor = |unit: &str| match unit {
            "um" | "\u{b5}m" | "\u{3bc}m" => Some(1.0),
            "uin" => Some(0.0254),
            _ => None,
        };
        let allowed = format_args!("a number with um or uin, 0.05 um to 50 um");
        number("ra", text, factor, allowed, (0.05, 50.0)).map(Ra)
    }
    /// Micrometres.
    pub const fn um(self) -> f32 {
        self.0
    }
}

/// What an insert's box says.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct InsertBox {
    /// Cutting speed.
    pub speed: SurfaceSpeed,
    /// The edge life for which it is stated.
    pub life: Life,
}

/// What holds the far end of a bar.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Support {
    /// Nothing.
    #[default]
    Free,
    /// The tailstock, or a steady.
    Tailstock,
    /// The bar sticks out of the back of the spindle, unsupported.
    Behind,
}

impl Support {
    /// All of them.
    pub const ALL: [Support; 3] = [Support::Free, Support::Tailstock, Support::Behind];

    /// The word that names it in files and commands.
    pub const fn id(self) -> &'static str {
        match self {
            Support::Free => "free",
            Support::Tailstock => "tailstock",
            Support::Behind => "behind",
        }
    }
    /// The support of that name.
    pub fn from_id(id: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|s| s.id() == id)
    }
    /// (beta L) of its first mode of bending.
    pub const fn beta(self) -> f32 {
        match self {
            Support::Free | Support::Behind => whirl::CLAMPED_FREE,
            Support::Tailstock => whirl::CLAMPED_PINNED,
        }
    }
    /// Free length over diameter from which on it needs another support.
    pub const fn slender_from(self) -> f32 {
        match self {
            Support::Free => whirl::slender::FREE,
            Support::Tailstock => whirl::slender::TAILSTOCK,
            Support::Behind => whirl::slender::BEHIND,
        }
    }
}

/// A bar that sticks out.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Bar {
    /// How far.
    pub length: Length,
    /// What holds its far end.
    pub support: Support,
    /// Its outside diameter, where that is not the setup's: when drilling, boring or milling.
    pub stock: Option<Length>,
    /// Bore of a tube.
    pub bore: Option<Length>,
}

/// What is done at the end of a thread.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum HalfNut {
    /// Opened by hand, in the runout.
    Opened,
    /// Kept closed, the spindle stopped: threads foreign to the leadscrew.
    Closed,
    /// The thread is cut away from the shoulder, the spindle in reverse.
    Away,
}

impl HalfNut {
    /// All of them.
    pub const ALL: [HalfNut; 3] = [HalfNut::Opened, HalfNut::Closed, HalfNut::Away];

    /// The word that names it in files and commands.
    pub const fn id(self) -> &'static str {
        match self {
            HalfNut::Opened => "opened",
            HalfNut::Closed => "closed",
            HalfNut::Away => "away",
        }
    }
    /// The case of that name.
    pub fn from_id(id: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|h| h.id() == id)
    }
}

/// A thread.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Thread {
    /// Way of the tool in a turn.
    pub lead: Length,
    /// Room for the tool behind the thread's end, where it runs up to a shoulder.
    pub runout: Option<Length>,
    /// What is done there; both cases are weighed where it is not said.
    pub half_nut: Option<HalfNut>,
}

/// Reads a lead: `1.75 mm`, `0.05 in` or `20 tpi`, 0.05 mm to 100 mm.
pub fn lead(text: &str) -> Result<Length, Rejected> {
    let (low, high) = (0.05, 100.0);
    let refuse = |why: UnitError| {
        let allowed = format_args!("a number with mm, in or tpi, {low} mm to {high} mm");
        Rejected::new("lead", text, why.problem(), allowed)
    };
    let lead = match split(text) {
        Ok((n, "tpi")) if n > 0.0 => Length::from_mm(pitch_of(n)),
        Ok((_, "tpi")) => Err(UnitError::NotPositive),
        _ => text.parse::<Length>(),
    };
    lead.and_then(|l| {
        (low..=high)
            .contains(&l.mm())
            .then_some(l)
            .ok_or(UnitError::OutOfRange)
    })
    .map_err(refuse)
}

/// Reads a length of this name and range, mm.
pub fn length(field: &str, text: &str, (low, high): (f32, f32)) -> Result<Length, Rejected> {
    text.parse::<Length>()
        .and_then(|l| {
            (low..=high)
                .contains(&l.mm())
                .then_some(l)
                .ok_or(UnitError::OutOfRange)
        })
        .map_err(|why| {
            let allowed = format_args!("a number with mm or in, {low} mm to {high} mm");
            Rejected::new(field, text, why.problem(), allowed)
        })
}

/// A chuck's jaws, as entered from its papers.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Jaws {
    count: f32,
    mass_kg: f32,
    radius_mm: f32,
    grip_n: f32,
}

impl Jaws {
    /// `count` jaws of `mass_kg` each, their mass centres at `radius_mm`, the whole chuck gripping with `grip_n` at rest.
    ///
    /// # Errors
    /// Names the value that is out of range.
    pub fn new(count: u8, mass_kg: f32, radius_mm: f32, grip_n: f32) -> Result<Self, Rejected> {
        Ok(Jaws {
            count: in_range("jaws", f32::from(count), (2.0, 8.0), "jaws")?,
            mass_kg: in_range("jaw-mass", mass_kg, (0.001, 100.0), "kg")?,
            radius_mm: in_range("jaw-radius", radius_mm, (1.0, 1000.0), "mm")?,
            grip_n: in_range("grip", grip_n, (10.0, 1e6), "N")?,
        })
    }
    /// Reads how many jaws, the mass of one (`0.8 kg`), the radius of its mass centre (`60 mm`) and the grip (`15 kN`, `900 N`).
    pub fn parse(count: &str, mass: &str, radius: &str, grip: &str) -> Result<Self, Rejected> {
        let count = count
            .trim()
            .parse::<u8>()
            .map_err(|_| Rejected::new("jaws", count, "is no whole number", "2 to 8 jaws"))?;
        let kg = |unit: &str| match unit {
            "kg" => Some(1.0),
            "g" => Some(0.001),
            "lb" => Some(0.453_592_37),
            _ => None,
        };
        let newton = |unit: &str| match unit {
            "N" => Some(1.0),
            "kN" => Some(1000.0),
            "lbf" => Some(4.448_222),
            _ => None,
        };
        let allowed = format_args!("a number with kg, g or lb, 0.001 kg to 100 kg");
        let mass = number("jaw-mass", mass, kg, allowed, (0.001, 100.0))?;
        let radius = length("jaw-radius", radius, (1.0, 1000.0))?.mm();
        let allowed = format_args!("a number with N, kN or lbf, 10 N to 1000 kN");
        let grip = number("grip", grip, newton, allowed, (10.0, 1e6))?;
        Jaws::new(count, mass, radius, grip)
    }
    /// How many.
    pub const fn count(&self) -> f32 {
        self.count
    }
    /// Mass of one, kg.
    pub const fn mass_kg(&self) -> f32 {
        self.mass_kg
    }
    /// Where its mass centre turns, mm from the axis.
    pub const fn radius_mm(&self) -> f32 {
        self.radius_mm
    }
    /// Grip at rest, N.
    pub const fn grip_n(&self) -> f32 {
        self.grip_n
    }
}

fn in_range(field: &str, value: f32, (low, high): (f32, f32), unit: &str) -> Result<f32, Rejected> {
    if (low..=high).contains(&value) {
        Ok(value)
    } else {
        let allowed = format_args!("{low} to {high} {unit}");
        Err(Rejected::new(field, value, "is out of range", allowed))
    }
}

/// Reads a number whose unit `factor` knows.
fn number(
    field: &str,
    text: &str,
    factor: impl Fn(&str) -> Option<f32>,
    allowed: core::fmt::Arguments<'_>,
    (low, high): (f32, f32),
) -> Result<f32, Rejected> {
    let value = match split(text) {
        Ok((_, "")) => Err(UnitError::NoUnit),
        Ok((n, unit)) => factor(unit).map(|f| n * f).ok_or(UnitError::UnknownUnit),
        Err(e) => Err(e),
    };
    value
        .and_then(|v| match v {
            v if v <= 0.0 => Err(UnitError::NotPositive),
            v if (low..=high).contains(&v) => Ok(v),
            _ => Err(UnitError::OutOfRange),
        })
        .map_err(|why| Rejected::new(field, text, why.problem(), allowed))
}
