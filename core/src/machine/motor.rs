//! What the motor gives at the spindle, and whether it pulls a cut.

use super::{ABOVE_PLATE, Drive, Machine, MachineSpec, MotorKind, in_range};
use crate::error::Rejected;
use crate::physics::{power, slip};
use crate::units::Rpm;

/// Share of the motor's power that reaches the cut of a belt-and-gear headstock (common practice, no source: 0.7 to 0.8).
pub const DEFAULT_EFFICIENCY: f32 = 0.75;

/// A sound motor.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Motor {
    /// How it is fed.
    pub kind: MotorKind,
    /// Power on its plate, kW.
    pub kw: f32,
    /// Share of it that reaches the cut.
    pub efficiency: f32,
}

impl Motor {
    /// Power at the cut, kW.
    pub fn at_cut(&self) -> f32 {
        self.kw * self.efficiency
    }
}

/// Why the load of a machine cannot be told from its speed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum NoLoad {
    /// The profile has no motor.
    NoMotor,
    /// An inverter or a regulated drive makes up for the slip.
    Drive,
    /// Without fixed steps a lower speed may be a lower setting.
    NoSteps,
    /// The motor's rated speed is not in the profile.
    NoRatedSpeed,
}

impl NoLoad {
    /// The reason in at most 17 characters, as a line of the Choose page has them.
    pub const fn words(self) -> &'static str {
        match self {
            NoLoad::NoMotor => "no motor known",
            NoLoad::Drive => "no: drive-fed",
            NoLoad::NoSteps => "no: not in steps",
            NoLoad::NoRatedSpeed => "no motor rpm",
        }
    }
}

/// The rated slip of a plate's speed.
fn rated_slip(rpm: f32) -> Result<f32, Rejected> {
    slip::rated(rpm).ok_or_else(|| {
        Rejected::new(
            "rated_rpm",
            rpm,
            "is no rated speed of an induction motor",
            "0.5 to 12 % below 750, 900, 1000, 1200, 1500, 1800, 3000 or 3600 rpm",
        )
    })
}

/// Gives every step the rated slip of the motor in it, where that runs on the mains.
pub(super) fn slips(spec: &MachineSpec, drive: &mut Drive) -> Result<(), Rejected> {
    let kind = spec.motor.as_ref().map(|m| m.kind);
    let of_motor = match spec.motor.as_ref().and_then(|m| m.rated_rpm) {
        // The plate of a motor on an inverter may say anything: nothing follows from it.
        Some(rpm) if kind != Some(MotorKind::Inverter) => {
            Some(rated_slip(rpm).map_err(|e| e.within("motor"))?)
        }
        _ => None,
    };
    let Drive::Stepped(steps) = drive else {
        return Ok(());
    };
    for (i, (step, spec)) in steps.iter_mut().zip(&spec.steps).enumerate() {
        step.rated_slip = match (spec.kw, spec.rated_rpm) {
            (None, None) => of_motor,
            // Each speed of a two-speed motor has a slip of its own.
            (Some(_), None) => None,
            (Some(_), Some(rpm)) => {
                Some(rated_slip(rpm).map_err(|e| e.within(format_args!("step[{i}]")))?)
            }
            (None, Some(rpm)) => {
                return Err(Rejected::new(
                    "rated_rpm",
                    rpm,
                    "stands beside no power of its own",
                    "only with kw in the same step; else rated_rpm of the motor",
                )
                .within(format_args!("step[{i}]")));
            }
        };
    }
    Ok(())
}

pub(super) fn motor(spec: &MachineSpec) -> Result<Option<Motor>, Rejected> {
    let stray = |field, what| {
        Rejected::new(
            field,
            what,
            "does not fit this motor",
            "motor.kind two-speed for kw in a step, inverter for base_rpm and cool_rpm in a range",
        )
    };
    let kind = spec.motor.as_ref().map(|m| m.kind);
    if kind != Some(MotorKind::TwoSpeed)
        && let Some(i) = spec.steps.iter().position(|s| s.kw.is_some())
    {
        return Err(stray("kw", "a power of its own").within(format_args!("step[{i}]")));
    }
    if kind != Some(MotorKind::Inverter)
        && let Some(i) = spec
            .ranges
            .iter()
            .position(|r| r.base_rpm.is_some() || r.cool_rpm.is_some())
    {
        return Err(stray("base_rpm", "a base or cooling speed").within(format_args!("range[{i}]")));
    }
    let Some(motor) = &spec.motor else {
        return Ok(None);
    };
    let inside = |e: Rejected| e.within("motor");
    let kw = in_range("kw", motor.kw, (0.02, 100.0), "kW").map_err(inside)?;
    for (i, step) in spec.steps.iter().enumerate() {
        if let Some(own) = step.kw {
            in_range(
                "kw",
                own,
                (0.02, kw),
                "kW, the motor's greater power being the most",
            )
            .map_err(|e| e.within(format_args!("step[{i}]")))?;
        }
    }
    let efficiency = motor.efficiency.unwrap_or(DEFAULT_EFFICIENCY);
    Ok(Some(Motor {
        kind: motor.kind,
        kw,
        efficiency: in_range("efficiency", efficiency, (0.2, 1.0), "of the motor's power")
            .map_err(inside)?,
    }))
}

/// What a motor can do at the spindle of its machine.
impl Machine {
    /// Whether the load can be told from the spindle's speed: an induction motor on the mains, fixed steps, and a rated speed
    /// in the profile.
    ///
    /// # Errors
    /// The reason why not.
    pub fn tells_load(&self) -> Result<(), NoLoad> {
        match (self.motor().map(|m| m.kind), self.drive()) {
            (None, _) => Err(NoLoad::NoMotor),
            (Some(MotorKind::Inverter), _) => Err(NoLoad::Drive),
            (_, Drive::Variable(_)) => Err(NoLoad::NoSteps),
            (_, Drive::Stepped(steps)) => match steps.iter().any(|s| s.rated_slip.is_some()) {
                true => Ok(()),
                false => Err(NoLoad::NoRatedSpeed),
            },
        }
    }

    /// The torque, N m, that reaches the cut in the step or range of this label at `n`; `None` without a motor in the profile.
    pub fn torque_at(&self, label: &str, n: Rpm) -> Option<f32> {
        let motor = self.motor()?;
        let (kw, base) = match self.drive() {
            Drive::Variable(ranges) if motor.kind == MotorKind::Inverter => {
                let range = ranges.iter().find(|r| r.label == label)?;
                (motor.kw, range.base)
            }
            Drive::Variable(_) => (motor.kw, n),
            Drive::Stepped(steps) => {
                let step = steps.iter().find(|s| s.label == label)?;
                (step.kw.unwrap_or(motor.kw), n)
            }
        };
        let n = if base > n { base } else { n };
        Some(power::torque_of(kw * motor.efficiency, n.get().max(1.0)))
    }

    /// The fastest speed at which the power suffices for `torque` N m at the cut.
    pub fn power_limit(&self, torque: f32) -> Option<Rpm> {
        let motor = self.motor()?;
        Some(Rpm::saturating(power::speed_of(motor.at_cut(), torque)))
    }

    /// The fastest setting whose torque suffices for `torque` N m, where that is less than the power allows: inverters, whose
    /// torque is limited in each range, and the slower of two motor speeds. Where no setting pulls, the slowest setting's
    /// speed lessened in proportion, so that the slowest is by so much too fast.
    pub fn torque_limit(&self, torque: f32) -> Option<Rpm> {
        let motor = self.motor()?;
        let power = power::speed_of(motor.at_cut(), torque);
        let (found, slowest, gives) = match (motor.kind, self.drive()) {
            (MotorKind::Inverter, Drive::Variable(ranges)) => {
                let gives = |base: Rpm| power::torque_of(motor.at_cut(), base.get().max(1.0));
                let fits = ranges
                    .iter()
                    .filter(|r| gives(r.base) >= torque && r.low.get() <= power)
                    .map(|r| r.high.get())
                    .reduce(f32::max);
                let first = ranges.first()?;
                (fits, first.low, gives(first.base))
            }
            (MotorKind::TwoSpeed, Drive::Stepped(steps)) => {
                let gives = |s: &super::Step| {
                    power::torque_of(s.kw.unwrap_or(motor.kw) * motor.efficiency, s.rpm.get())
                };
                // A step turns up to so much above its plate and shall still lie inside of its own bound.
                let fits = steps
                    .iter()
                    .filter(|s| gives(s) >= torque)
                    .map(|s| s.rpm.scaled(ABOVE_PLATE).get());
                let first = steps.first()?;
                (fits.reduce(f32::max), first.rpm, gives(first))
            }
            _ => return None,
        };
        let limit = found.unwrap_or(slowest.get() * (gives / torque).min(0.99));
        (limit < power).then(|| Rpm::saturating(limit))
    }

    /// Whether the step or range of this label pulls `torque` N m at `n`; yes where nothing is known.
    pub(crate) fn pulls(&self, torque: Option<f32>, label: &str, n: Rpm) -> bool {
        match (torque, self.torque_at(label, n)) {
            // As much slack as single precision needs where the bound itself is the setting.
            (Some(needed), Some(gives)) => gives >= needed * 0.9999,
            _ => true,
        }
    }
}
