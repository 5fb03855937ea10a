//! The machine's profile: drive, holders, limits, sensor.
//!
//! [`MachineSpec`] is what stands in a profile file, unchecked; [`Machine`] is what the rest of core works with.
//! The only way from one to the other is [`Machine::new`], so a `Machine` is always sound.

use core::num::NonZeroU16;

use heapless::{String, Vec};

use crate::error::{Rejected, text};
use crate::units::{Decimal, Rpm, UnitSystem};

/// The most steps that a profile may list.
pub const MAX_STEPS: usize = 32;
/// The most ranges of a variable drive.
pub const MAX_RANGES: usize = 8;
/// The most workholders that a profile may list.
pub const MAX_HOLDERS: usize = 10;
/// The most pulses in one revolution that the sensor may give; 120-tooth discs are published practice.
pub const MAX_PULSES: u16 = 240;

/// Loaded speeds differ from the plate: at most 6 % above it, mechanical and electrical tolerance together
/// (ISO 229:1973, limits of rotational speeds; from memory).
pub const ABOVE_PLATE: f32 = 1.06;
/// How far a loaded spindle may fall below its plate and still be explained by that step. ISO 229 allows 2 % at
/// rated load; a heavy cut stretches belt and slip further (common practice, no source).
pub const BELOW_PLATE: f32 = 0.85;

/// Label of a step or range as the machine's own plates show it; it may name several levers.
pub type Label = String<32>;

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
#[derive(Clone, Debug, PartialEq)]
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
}

/// One range of a variable drive, as written in a profile.
#[derive(Clone, Debug, PartialEq)]
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
    /// Slowest speed worth reading, rev/min; where missing 10.
    #[cfg_attr(feature = "serde", serde(default))]
    pub slowest_rpm: Option<f32>,
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

/// One speed of a stepped drive.
#[derive(Clone, Debug, PartialEq)]
pub struct Step {
    /// What the machine's plates say.
    pub label: Label,
    /// Speed on the plate.
    pub rpm: Rpm,
}

/// One range of a variable drive.
#[derive(Clone, Debug, PartialEq)]
pub struct Range {
    /// What the machine's plates say.
    pub label: Label,
    /// Slowest speed.
    pub low: Rpm,
    /// Fastest speed.
    pub high: Rpm,
}

/// How the spindle's speed is chosen.
#[derive(Clone, Debug, PartialEq)]
pub enum Drive {
    /// By gears or belts: these speeds and no others, slowest first.
    Stepped(Vec<Step, MAX_STEPS>),
    /// Freely within ranges, slowest first.
    Variable(Vec<Range, MAX_RANGES>),
}

/// A workholder.
#[derive(Clone, Debug, PartialEq)]
pub struct Holder {
    /// Which kind.
    pub kind: HolderKind,
    /// What this shop calls it.
    pub name: String<24>,
    /// The speed stamped on it, if one is.
    pub rated: Option<Rpm>,
}

/// A sound machine profile.
#[derive(Clone, Debug, PartialEq)]
pub struct Machine {
    name: String<40>,
    kind: MachineKind,
    units: UnitSystem,
    drive: Drive,
    top_speed: Rpm,
    holders: Vec<Holder, MAX_HOLDERS>,
    pulses: NonZeroU16,
    brake_rpm_per_s: f32,
    slowest: Rpm,
}

const SPEED: (f32, f32) = (1.0, 100_000.0);

impl Machine {
    /// Checks a profile. The error names the field by its path in the profile file.
    pub fn new(spec: MachineSpec) -> Result<Self, Rejected> {
        let drive = drive(&spec)?;
        let fastest = match &drive {
            Drive::Stepped(steps) => steps.last().map(|s| s.rpm),
            Drive::Variable(ranges) => ranges
                .iter()
                .map(|r| r.high)
                .reduce(|a, b| if a > b { a } else { b }),
        }
        .unwrap_or(Rpm::ZERO);
        let top_speed = match spec.top_speed_rpm {
            None => fastest.scaled(ABOVE_PLATE),
            Some(n) => {
                let top = speed("top_speed_rpm", n)?;
                if top < fastest {
                    return Err(Rejected::new(
                        "top_speed_rpm",
                        Decimal {
                            value: n,
                            decimals: 3,
                        },
                        "is below the fastest speed of the drive",
                        format_args!("{fastest} or more"),
                    ));
                }
                top
            }
        };
        Ok(Machine {
            name: named("name", spec.name)?,
            kind: spec.kind,
            units: spec.units,
            top_speed,
            holders: holders(spec.holders)?,
            pulses: pulses(spec.sensor.pulses).map_err(|e| e.within("sensor"))?,
            brake_rpm_per_s: braking(spec.brake_rpm_per_s.unwrap_or(DEFAULT_BRAKE_RPM_PER_S))?,
            slowest: slowest(spec.slowest_rpm.unwrap_or(DEFAULT_SLOWEST_RPM))?,
            drive,
        })
    }

    /// What this shop calls the machine.
    pub fn name(&self) -> &str {
        &self.name
    }
    /// Lathe, mill or drill press.
    pub fn kind(&self) -> MachineKind {
        self.kind
    }
    /// Units that its people read.
    pub fn units(&self) -> UnitSystem {
        self.units
    }
    /// How its speed is chosen.
    pub fn drive(&self) -> &Drive {
        &self.drive
    }
    /// The top speed that its maker allows.
    pub fn top_speed(&self) -> Rpm {
        self.top_speed
    }
    /// Its workholders, at least one.
    pub fn holders(&self) -> &[Holder] {
        &self.holders
    }
    /// Sensor pulses in one revolution.
    pub fn pulses(&self) -> NonZeroU16 {
        self.pulses
    }
    /// The hardest stop it can make, rev/min in a second.
    pub fn brake_rpm_per_s(&self) -> f32 {
        self.brake_rpm_per_s
    }
    /// The slowest speed worth reading.
    pub fn slowest(&self) -> Rpm {
        self.slowest
    }

    /// Finds a holder by this shop's name for it, or by its kind where only one is of that kind.
    pub fn holder_named(&self, word: &str) -> Option<u8> {
        let position = |found: &dyn Fn(&Holder) -> bool| self.holders.iter().position(found);
        let by_name = position(&|h| h.name.eq_ignore_ascii_case(word));
        let of_kind = |h: &&Holder| h.kind.id() == word;
        let by_kind = (self.holders.iter().filter(of_kind).count() == 1)
            .then(|| position(&|h| h.kind.id() == word))
            .flatten();
        by_name.or(by_kind).and_then(|i| u8::try_from(i).ok())
    }

    /// Whether some step or range, loaded or free, would turn the spindle at this speed.
    pub fn explains(&self, speed: Rpm) -> bool {
        let near = |low: Rpm, high: Rpm| {
            (low.scaled(BELOW_PLATE)..=high.scaled(ABOVE_PLATE)).contains(&speed)
        };
        match &self.drive {
            Drive::Stepped(steps) => steps.iter().any(|s| near(s.rpm, s.rpm)),
            Drive::Variable(ranges) => ranges.iter().any(|r| near(r.low, r.high)),
        }
    }
}

/// Foot brake or plug reversal; the hardest stop of common manual machines (common practice, no source).
pub const DEFAULT_BRAKE_RPM_PER_S: f32 = 3000.0;
/// No manual machine cuts slower (common practice, no source).
pub const DEFAULT_SLOWEST_RPM: f32 = 10.0;

/// Checks a number of pulses in one revolution.
pub fn pulses(n: u16) -> Result<NonZeroU16, Rejected> {
    NonZeroU16::new(n)
        .filter(|n| n.get() <= MAX_PULSES)
        .ok_or_else(|| {
            Rejected::new(
                "pulses",
                n,
                "is out of range",
                format_args!("1 to {MAX_PULSES} in a revolution"),
            )
        })
}

/// Checks a braking limit.
pub fn braking(rpm_per_s: f32) -> Result<f32, Rejected> {
    in_range(
        "brake_rpm_per_s",
        rpm_per_s,
        (10.0, 100_000.0),
        "rpm per second",
    )
}

/// Checks the slowest speed worth reading.
pub fn slowest(rpm: f32) -> Result<Rpm, Rejected> {
    in_range("slowest_rpm", rpm, (1.0, 1000.0), "rpm").map(Rpm::saturating)
}

fn in_range(field: &str, value: f32, (low, high): (f32, f32), unit: &str) -> Result<f32, Rejected> {
    if (low..=high).contains(&value) {
        Ok(value)
    } else {
        Err(Rejected::new(
            field,
            value,
            "is out of range",
            format_args!("{low} to {high} {unit}"),
        ))
    }
}

fn speed(field: &str, rpm: f32) -> Result<Rpm, Rejected> {
    in_range(field, rpm, SPEED, "rpm").map(Rpm::saturating)
}

fn named<const N: usize>(field: &str, label: String<N>) -> Result<String<N>, Rejected> {
    let ok = !label.trim().is_empty() && label.chars().all(|c| c == ' ' || c.is_ascii_graphic());
    if ok {
        Ok(label)
    } else {
        Err(Rejected::new(
            field,
            &label,
            "cannot be shown on the screen",
            format_args!("1 to {N} printable ASCII characters"),
        ))
    }
}

fn drive(spec: &MachineSpec) -> Result<Drive, Rejected> {
    match (spec.steps.as_slice(), spec.ranges.as_slice()) {
        (steps @ [_, ..], []) => Ok(Drive::Stepped(stepped(steps)?)),
        ([], ranges @ [_, ..]) => Ok(Drive::Variable(variable(ranges)?)),
        ([], []) => Err(Rejected::new(
            "step",
            "none",
            "leaves the machine without a speed",
            "1 to 32 steps, or 1 to 8 ranges",
        )),
        _ => Err(Rejected::new(
            "range",
            "some",
            "stands beside steps",
            "either steps or ranges, not both",
        )),
    }
}

fn stepped(specs: &[StepSpec]) -> Result<Vec<Step, MAX_STEPS>, Rejected> {
    let mut steps: Vec<Step, MAX_STEPS> = Vec::new();
    for (i, spec) in specs.iter().enumerate() {
        let inside = |e: Rejected| e.within(format_args!("step[{i}]"));
        let label = named("label", spec.label.clone()).map_err(inside)?;
        let rpm = speed("rpm", spec.rpm).map_err(inside)?;
        if steps.iter().any(|s| s.label == label) {
            return Err(inside(Rejected::new(
                "label",
                &label,
                "stands twice",
                "a label of its own for each step",
            )));
        }
        if let Some(before) = steps.last().filter(|s| s.rpm >= rpm) {
            return Err(inside(Rejected::new(
                "rpm",
                spec.rpm,
                "is not faster than the step before it",
                format_args!("above {}, slowest step first", before.rpm),
            )));
        }
        // As many places as the specification has.
        let _ = steps.push(Step { label, rpm });
    }
    Ok(steps)
}

fn variable(specs: &[RangeSpec]) -> Result<Vec<Range, MAX_RANGES>, Rejected> {
    let mut ranges: Vec<Range, MAX_RANGES> = Vec::new();
    for (i, spec) in specs.iter().enumerate() {
        let inside = |e: Rejected| e.within(format_args!("range[{i}]"));
        let label = named("label", spec.label.clone()).map_err(inside)?;
        let low = speed("low_rpm", spec.low_rpm).map_err(inside)?;
        let high = speed("high_rpm", spec.high_rpm).map_err(inside)?;
        if ranges.iter().any(|r| r.label == label) {
            return Err(inside(Rejected::new(
                "label",
                &label,
                "stands twice",
                "a label of its own for each range",
            )));
        }
        if high <= low {
            return Err(inside(Rejected::new(
                "high_rpm",
                spec.high_rpm,
                "is not above the range's slowest speed",
                format_args!("above {low}"),
            )));
        }
        if let Some(before) = ranges.last().filter(|r| r.low >= low || r.high >= high) {
            return Err(inside(Rejected::new(
                "low_rpm",
                spec.low_rpm,
                "does not continue the range before it",
                format_args!(
                    "low above {}, high above {}, slowest range first",
                    before.low, before.high
                ),
            )));
        }
        let _ = ranges.push(Range { label, low, high });
    }
    Ok(ranges)
}

fn holders(specs: Vec<HolderSpec, MAX_HOLDERS>) -> Result<Vec<Holder, MAX_HOLDERS>, Rejected> {
    if specs.is_empty() {
        return Err(Rejected::new(
            "holder",
            "none",
            "leaves the machine without a workholder",
            "1 to 10 workholders",
        ));
    }
    let mut holders: Vec<Holder, MAX_HOLDERS> = Vec::new();
    for (i, spec) in specs.into_iter().enumerate() {
        let inside = |e: Rejected| e.within(format_args!("holder[{i}]"));
        let name =
            named("name", spec.name.unwrap_or_else(|| text(spec.kind.name()))).map_err(inside)?;
        let rated = spec
            .rated_rpm
            .map(|n| speed("rated_rpm", n))
            .transpose()
            .map_err(inside)?;
        if holders.iter().any(|h| h.name.eq_ignore_ascii_case(&name)) {
            return Err(inside(Rejected::new(
                "name",
                &name,
                "stands twice",
                "a name of its own for each workholder",
            )));
        }
        let _ = holders.push(Holder {
            kind: spec.kind,
            name,
            rated,
        });
    }
    Ok(holders)
}
