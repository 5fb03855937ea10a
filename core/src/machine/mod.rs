//! The machine's profile: drive, holders, limits, sensor.
//!
//! [`MachineSpec`] is what stands in a profile file, unchecked; [`Machine`] is what the rest of core works with.
//! The only way from one to the other is [`Machine::new`], so a `Machine` is always sound.

mod motor;
mod spec;

use core::num::NonZeroU16;

use heapless::{String, Vec};

use crate::error::{Rejected, text};
use crate::units::{Decimal, Rpm, UnitSystem};

pub use motor::{DEFAULT_EFFICIENCY, Motor, NoLoad};
pub use spec::{
    HolderKind, HolderSpec, MachineKind, MachineSpec, MotorKind, MotorSpec, RangeSpec, SensorSpec,
    SpindleNose, StepSpec,
};

/// The most steps that a profile may list.
pub const MAX_STEPS: usize = 32;
/// The most ranges of a variable drive.
pub const MAX_RANGES: usize = 8;
/// The most workholders that a profile may list.
pub const MAX_HOLDERS: usize = 10;
/// The most feeds that a profile may list.
pub const MAX_FEEDS: usize = 48;
/// The most pulses in one revolution that the sensor may give; 120-tooth discs are published practice.
pub const MAX_PULSES: u16 = 240;

/// Loaded speeds differ from the plate: at most 6 % above it, mechanical and electrical tolerance together
/// (ISO 229:1973, limits of rotational speeds; from memory).
pub const ABOVE_PLATE: f32 = 1.06;
/// And at most 2 % below it, at rated load (the same standard, from memory).
pub const BELOW_PLATE_LOADED: f32 = 0.98;
/// How far a loaded spindle may fall below its plate and still be explained by that step: further than at rated load, for a
/// heavy cut stretches belt and slip further (common practice, no source).
pub const BELOW_PLATE: f32 = 0.85;

/// Label of a step or range as the machine's own plates show it; it may name several levers.
pub type Label = String<32>;

/// One speed of a stepped drive.
#[derive(Clone, Debug, PartialEq)]
pub struct Step {
    /// What the machine's plates say.
    pub label: Label,
    /// Speed on the plate.
    pub rpm: Rpm,
    /// The motor's power in this step, kW, where it has one of its own.
    pub kw: Option<f32>,
    /// The motor's rated slip in this step, a share of its synchronous speed, where it is known.
    pub rated_slip: Option<f32>,
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
    /// Where constant torque ends and constant power begins.
    pub base: Rpm,
    /// Slowest speed for long, where the motor's cooling sets one.
    pub cool: Option<Rpm>,
}

/// How the spindle's speed is chosen.
#[derive(Clone, Debug, PartialEq)]
pub enum Drive {
    /// By gears or belts: these speeds and no others, slowest first.
    Stepped(Vec<Step, MAX_STEPS>),
    /// Freely within ranges, slowest first.
    Variable(Vec<Range, MAX_RANGES>),
}

impl Drive {
    /// The fastest step, or the top of the fastest range: both stand last.
    pub fn fastest(&self) -> Rpm {
        match self {
            Drive::Stepped(steps) => steps.last().map(|s| s.rpm),
            Drive::Variable(ranges) => ranges.last().map(|r| r.high),
        }
        .unwrap_or(Rpm::ZERO)
    }

    /// The slowest step, or the bottom of the slowest range: both stand first.
    pub fn slowest(&self) -> Rpm {
        match self {
            Drive::Stepped(steps) => steps.first().map(|s| s.rpm),
            Drive::Variable(ranges) => ranges.first().map(|r| r.low),
        }
        .unwrap_or(Rpm::ZERO)
    }
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
    motor: Option<Motor>,
    feeds: Vec<f32, MAX_FEEDS>,
    half_nut_stop_s: Option<f32>,
    nose: SpindleNose,
}

const SPEED: (f32, f32) = (1.0, 100_000.0);

impl Machine {
    /// Checks a profile. The error names the field by its path in the profile file.
    pub fn new(spec: MachineSpec) -> Result<Self, Rejected> {
        let mut drive = drive(&spec)?;
        let fastest = drive.fastest();
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
        let motor = motor::motor(&spec)?;
        motor::slips(&spec, &mut drive)?;
        Ok(Machine {
            name: named("name", spec.name)?,
            kind: spec.kind,
            units: spec.units,
            top_speed,
            holders: holders(spec.holders)?,
            pulses: pulses(spec.sensor.pulses).map_err(|e| e.within("sensor"))?,
            brake_rpm_per_s: braking(spec.brake_rpm_per_s.unwrap_or(DEFAULT_BRAKE_RPM_PER_S))?,
            slowest: slowest_of(spec.slowest_rpm, &drive)?,
            motor,
            feeds: feeds(spec.feeds_mm)?,
            half_nut_stop_s: spec
                .half_nut_stop_s
                .map(|t| in_range("half_nut_stop_s", t, (0.1, 60.0), "s"))
                .transpose()?,
            nose: spec.spindle_nose.unwrap_or_default(),
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

    /// The motor, where the profile has it.
    pub fn motor(&self) -> Option<&Motor> {
        self.motor.as_ref()
    }
    /// Feeds of the gearbox, mm per revolution, finest first; empty where the feed is by hand.
    pub fn feeds(&self) -> &[f32] {
        &self.feeds
    }
    /// Time from switching off to standstill, s, where somebody has taken it.
    pub fn half_nut_stop_s(&self) -> Option<f32> {
        self.half_nut_stop_s
    }
    /// How the chuck sits on the spindle.
    pub fn nose(&self) -> SpindleNose {
        self.nose
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

    /// The step that the spindle seems to turn in: of those that explain the speed the nearest, in ratio; `None` for a
    /// variable drive and for a speed that no step explains.
    pub fn step_at(&self, speed: Rpm) -> Option<&Step> {
        let Drive::Stepped(steps) = &self.drive else {
            return None;
        };
        // A loaded spindle runs below its plate far more often than above it.
        let apart = |s: &Step| {
            let ratio = speed.get() / s.rpm.get().max(f32::MIN_POSITIVE);
            if ratio > 1.0 {
                ratio
            } else {
                1.0 / ratio.max(f32::MIN_POSITIVE)
            }
        };
        steps
            .iter()
            .filter(|s| (s.rpm.scaled(BELOW_PLATE)..=s.rpm.scaled(ABOVE_PLATE)).contains(&speed))
            .reduce(|a, b| if apart(b) < apart(a) { b } else { a })
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

/// The slowest speed worth reading on a drive: what is slower counts as still, so every setting, loaded, must be above it.
fn slowest_of(written: Option<f32>, drive: &Drive) -> Result<Rpm, Rejected> {
    let loaded = drive.slowest().scaled(BELOW_PLATE);
    let Some(n) = written else {
        return Ok(Rpm::saturating(
            DEFAULT_SLOWEST_RPM.min(loaded.get()).max(1.0),
        ));
    };
    let slowest = slowest(n)?;
    if slowest > loaded {
        return Err(Rejected::new(
            "slowest_rpm",
            n,
            "would take the slowest setting for still",
            format_args!("at most {loaded}, 0.85 of the slowest setting"),
        ));
    }
    Ok(slowest)
}

fn in_range(field: &str, value: f32, range: (f32, f32), unit: &str) -> Result<f32, Rejected> {
    in_range_of(format_args!("{field}"), value, range, unit)
}

fn in_range_of(
    field: core::fmt::Arguments<'_>,
    value: f32,
    (low, high): (f32, f32),
    unit: &str,
) -> Result<f32, Rejected> {
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
        let _ = steps.push(Step {
            label,
            rpm,
            kw: spec.kw,
            rated_slip: None,
        });
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
        let within = |field, rpm: Option<f32>| {
            rpm.map(|n| in_range(field, n, (spec.low_rpm, spec.high_rpm), "rpm, the range's"))
                .transpose()
                .map(|n| n.map(Rpm::saturating))
        };
        let base = within("base_rpm", spec.base_rpm).map_err(inside)?;
        let cool = within("cool_rpm", spec.cool_rpm).map_err(inside)?;
        let _ = ranges.push(Range {
            label,
            low,
            high,
            base: base.unwrap_or(high),
            cool,
        });
    }
    Ok(ranges)
}

fn feeds(specs: Vec<f32, MAX_FEEDS>) -> Result<Vec<f32, MAX_FEEDS>, Rejected> {
    let mut before = 0.0;
    for (i, &mm) in specs.iter().enumerate() {
        let field = format_args!("feeds_mm[{i}]");
        let mm = in_range_of(field, mm, (0.005, 10.0), "mm per revolution")?;
        if mm <= before {
            return Err(Rejected::new(
                field,
                mm,
                "is not coarser than the feed before it",
                format_args!("above {before} mm, finest first"),
            ));
        }
        before = mm;
    }
    Ok(specs)
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
