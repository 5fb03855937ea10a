//! A machine's profile as it stands in a file, before any check.

use heapless::{String, Vec};

use super::{Label, MAX_FEEDS, MAX_HOLDERS, MAX_RANGES, MAX_STEPS};
use crate::units::UnitSystem;

/// What kind of machine the box sits on.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[cfg_attr(
    feature = "serde",
    derive(serde::Serialize, serde::Deserialize),
    serde(rename_all = "kebab-case")
)]
pub enum MachineKind {
    /// The work turns.
    Lathe,
    /// The cutter turns, the work is clamped.
    Mill,
    /// The drill turns, the work is clamped.
    DrillPress,
}

/// What holds the work, or the tool where the tool turns.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[cfg_attr(
    feature = "serde",
    derive(serde::Serialize, serde::Deserialize),
    serde(rename_all = "kebab-case")
)]
pub enum HolderKind {
    /// Self-centring chuck.
    ThreeJaw,
    /// Independent-jaw chuck.
    FourJaw,
    /// Collet chuck.
    Collet,
    /// Faceplate with clamped work.
    Faceplate,
    /// Between centres with a driver.
    BetweenCentres,
    /// Arbor or mandrel.
    Arbor,
    /// Drill chuck.
    DrillChuck,
    /// Taper straight in the spindle.
    Taper,
}

impl HolderKind {
    /// Every kind.
    pub const ALL: [HolderKind; 8] = [
        HolderKind::ThreeJaw,
        HolderKind::FourJaw,
        HolderKind::Collet,
        HolderKind::Faceplate,
        HolderKind::BetweenCentres,
        HolderKind::Arbor,
        HolderKind::DrillChuck,
        HolderKind::Taper,
    ];

    /// The word that a profile and a command line use.
    pub const fn id(self) -> &'static str {
        match self {
            HolderKind::ThreeJaw => "three-jaw",
            HolderKind::FourJaw => "four-jaw",
            HolderKind::Collet => "collet",
            HolderKind::Faceplate => "faceplate",
            HolderKind::BetweenCentres => "between-centres",
            HolderKind::Arbor => "arbor",
            HolderKind::DrillChuck => "drill-chuck",
            HolderKind::Taper => "taper",
        }
    }

    /// The trade's name.
    pub const fn name(self) -> &'static str {
        match self {
            HolderKind::ThreeJaw => "three-jaw chuck",
            HolderKind::FourJaw => "four-jaw chuck",
            HolderKind::Collet => "collet",
            HolderKind::Faceplate => "faceplate",
            HolderKind::BetweenCentres => "between centres",
            HolderKind::Arbor => "arbor",
            HolderKind::DrillChuck => "drill chuck",
            HolderKind::Taper => "spindle taper",
        }
    }
}

/// One speed of a stepped drive, as written in a profile.
#[derive(Clone, Debug, Default, PartialEq)]
#[cfg_attr(
    feature = "serde",
    derive(serde::Serialize, serde::Deserialize),
    serde(deny_unknown_fields)
)]
pub struct StepSpec {
    /// What the machine's plates say, e.g. `B-2, back gear in`.
    pub label: Label,
    /// Speed on the plate, rev/min.
    pub rpm: f32,
    /// The motor's power in this step, kW, for a motor of two speeds; the motor's own where missing.
    #[cfg_attr(feature = "serde", serde(default))]
    pub kw: Option<f32>,
    /// The motor's speed on its plate in a step that has a power of its own, rev/min; see [`MotorSpec::rated_rpm`].
    #[cfg_attr(feature = "serde", serde(default))]
    pub rated_rpm: Option<f32>,
}

/// One range of a variable drive, as written in a profile.
#[derive(Clone, Debug, Default, PartialEq)]
#[cfg_attr(
    feature = "serde",
    derive(serde::Serialize, serde::Deserialize),
    serde(deny_unknown_fields)
)]
pub struct RangeSpec {
    /// What the machine's plates say, e.g. `low belt`.
    pub label: Label,
    /// Slowest speed of the range, rev/min.
    pub low_rpm: f32,
    /// Fastest speed of the range, rev/min.
    pub high_rpm: f32,
    /// For a motor on an inverter, the spindle speed at which the motor gives its full power: below it the torque is constant,
    /// above it the power. The range's fastest where missing, which promises least.
    #[cfg_attr(feature = "serde", serde(default))]
    pub base_rpm: Option<f32>,
    /// For a motor on an inverter, the slowest spindle speed at which it may run for long: its fan turns with it.
    #[cfg_attr(feature = "serde", serde(default))]
    pub cool_rpm: Option<f32>,
}

/// One workholder, as written in a profile.
#[derive(Clone, Debug, PartialEq)]
#[cfg_attr(
    feature = "serde",
    derive(serde::Serialize, serde::Deserialize),
    serde(deny_unknown_fields)
)]
pub struct HolderSpec {
    /// Which kind.
    pub kind: HolderKind,
    /// What this shop calls it, to tell two of a kind apart; the kind's name where missing.
    #[cfg_attr(feature = "serde", serde(default))]
    pub name: Option<String<24>>,
    /// The speed stamped on it by its maker, rev/min; missing where nothing is stamped. Never guess one.
    #[cfg_attr(feature = "serde", serde(default))]
    pub rated_rpm: Option<f32>,
}

/// The sensor, as written in a profile.
#[derive(Clone, Debug, PartialEq)]
#[cfg_attr(
    feature = "serde",
    derive(serde::Serialize, serde::Deserialize),
    serde(deny_unknown_fields)
)]
pub struct SensorSpec {
    /// Pulses in one revolution of the spindle.
    pub pulses: u16,
}

/// How the motor is fed, which says what it gives at which speed.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[cfg_attr(
    feature = "serde",
    derive(serde::Serialize, serde::Deserialize),
    serde(rename_all = "kebab-case")
)]
pub enum MotorKind {
    /// Straight from the mains: the same power in every step.
    #[default]
    Mains,
    /// From an inverter or a regulated drive: constant torque up to its base speed, constant power above.
    Inverter,
    /// From the mains with two speeds: a power for each.
    TwoSpeed,
}

/// The motor, as written in a profile.
#[derive(Clone, Debug, PartialEq)]
#[cfg_attr(
    feature = "serde",
    derive(serde::Serialize, serde::Deserialize),
    serde(deny_unknown_fields)
)]
pub struct MotorSpec {
    /// Power on the motor's plate, kW.
    pub kw: f32,
    /// How it is fed; from the mains where missing.
    #[cfg_attr(feature = "serde", serde(default))]
    pub kind: MotorKind,
    /// Share of the power that reaches the cut; 0.75 where missing.
    #[cfg_attr(feature = "serde", serde(default))]
    pub efficiency: Option<f32>,
    /// The motor's own speed on its plate, rev/min, at rated load: it tells the rated slip. For an induction motor on the
    /// mains; without it nothing is said about the load. The synchronous speeds of its frequency are not meant.
    #[cfg_attr(feature = "serde", serde(default))]
    pub rated_rpm: Option<f32>,
}

/// How chuck or faceplate sit on the spindle.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[cfg_attr(
    feature = "serde",
    derive(serde::Serialize, serde::Deserialize),
    serde(rename_all = "kebab-case")
)]
pub enum SpindleNose {
    /// Screwed on: in reverse it may come off.
    #[default]
    Threaded,
    /// With cam locks.
    Cam,
    /// On a taper with a drawing nut.
    Taper,
    /// Bolted.
    Bolted,
}

/// A machine's profile as written, before any check.
#[derive(Clone, Debug, PartialEq)]
#[cfg_attr(
    feature = "serde",
    derive(serde::Serialize, serde::Deserialize),
    serde(deny_unknown_fields)
)]
pub struct MachineSpec {
    /// What this shop calls the machine.
    pub name: String<40>,
    /// Lathe, mill or drill press.
    pub kind: MachineKind,
    /// Units that its people read.
    #[cfg_attr(feature = "serde", serde(default))]
    pub units: UnitSystem,
    /// Top speed allowed by the machine's maker, rev/min; where missing, 1.06 of the fastest plate speed.
    #[cfg_attr(feature = "serde", serde(default))]
    pub top_speed_rpm: Option<f32>,
    /// Hardest stop that the machine can make, rev/min in a second; where missing 3000 (foot brake, plug reversal).
    #[cfg_attr(feature = "serde", serde(default))]
    pub brake_rpm_per_s: Option<f32>,
    /// Slowest speed worth reading, rev/min, below every setting; where missing 10, or less where a setting is slower.
    #[cfg_attr(feature = "serde", serde(default))]
    pub slowest_rpm: Option<f32>,
    /// The motor; without it nothing is said about power.
    #[cfg_attr(feature = "serde", serde(default))]
    pub motor: Option<MotorSpec>,
    /// Feeds of the gearbox, mm per revolution, finest first; empty where the feed is by hand.
    #[cfg_attr(feature = "serde", serde(default))]
    pub feeds_mm: Vec<f32, MAX_FEEDS>,
    /// Time, s, from switching off to standstill, for threads cut with the half-nut kept closed.
    #[cfg_attr(feature = "serde", serde(default))]
    pub half_nut_stop_s: Option<f32>,
    /// How the chuck sits on the spindle; screwed on where missing, which allows least.
    #[cfg_attr(feature = "serde", serde(default))]
    pub spindle_nose: Option<SpindleNose>,
    /// The sensor on the spindle.
    pub sensor: SensorSpec,
    /// Speeds of a stepped drive, slowest first; empty for a variable drive.
    #[cfg_attr(feature = "serde", serde(default, rename = "step"))]
    pub steps: Vec<StepSpec, MAX_STEPS>,
    /// Ranges of a variable drive, slowest first; empty for a stepped drive.
    #[cfg_attr(feature = "serde", serde(default, rename = "range"))]
    pub ranges: Vec<RangeSpec, MAX_RANGES>,
    /// The workholders.
    #[cfg_attr(feature = "serde", serde(rename = "holder"))]
    pub holders: Vec<HolderSpec, MAX_HOLDERS>,
}
