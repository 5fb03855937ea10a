//! The fields of a setup as a knob turns them, and as the screen words them.

use core::fmt;

use crate::advice::{Advice, Pick};
use crate::machine::{ABOVE_PLATE, Machine};
use crate::setup::{Diameter, Setup};
use crate::trade::{Coolant, Material, Operation, Tool};
use crate::units::{Decimal, Length, MM_PER_INCH, Rpm, UnitSystem};

/// A field of the setup.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Field {
    /// The work's material.
    Material,
    /// The diameter that the edge meets.
    Diameter,
    /// What is done.
    Operation,
    /// The tool's material.
    Tool,
    /// Cutting fluid.
    Coolant,
    /// What holds the work.
    Holder,
    /// The operator's cap.
    Cap,
    /// Whether the load is shown.
    Load,
}

impl Field {
    /// The fields of the Choose page, top to bottom.
    pub const CHOOSE: [Field; 6] = [
        Field::Operation,
        Field::Tool,
        Field::Holder,
        Field::Cap,
        Field::Coolant,
        Field::Load,
    ];

    /// The field `detents` further on the Choose page; its ends stop.
    pub(super) fn stepped(self, detents: i8) -> Self {
        stepped(&Field::CHOOSE, self, detents)
    }

    /// The field's name on the screen.
    pub const fn label(self) -> &'static str {
        match self {
            Field::Material => "material",
            Field::Diameter => "diameter",
            Field::Operation => "job",
            Field::Tool => "tool",
            Field::Coolant => "fluid",
            Field::Holder => "held by",
            Field::Cap => "my cap",
            Field::Load => "load",
        }
    }

    /// Turns the field's value by some detents; its ends stop.
    pub(super) fn turn(self, detents: i8, setup: &mut Setup, machine: &Machine, advice: &Advice) {
        match self {
            Field::Material => setup.material = stepped(&Material::ALL, setup.material, detents),
            Field::Diameter => {
                setup.diameter = turned_diameter(setup.diameter, detents, machine.units())
            }
            Field::Operation => {
                setup.operation = stepped(&Operation::ALL, setup.operation, detents)
            }
            Field::Tool => setup.tool = stepped(&Tool::ALL, setup.tool, detents),
            Field::Coolant => setup.coolant = stepped(&Coolant::ALL, setup.coolant, detents),
            Field::Holder => {
                let last = machine.holders().len().saturating_sub(1) as i16;
                let holder = (i16::from(setup.holder) + i16::from(detents)).clamp(0, last);
                // Both ends fit: a machine has at most MAX_HOLDERS holders.
                let holder = holder as u8;
                setup.cap_is_old |= setup.cap.is_some() && holder != setup.holder;
                setup.holder = holder;
            }
            Field::Cap => {
                setup.cap = Some(turned_cap(setup.cap, detents, machine, advice));
                setup.cap_is_old = false;
            }
            // Where it cannot be told the value says why, and stays.
            Field::Load if detents != 0 => {
                setup.load = detents > 0 && machine.tells_load().is_ok();
            }
            Field::Load => {}
        }
    }

    /// The field's value as the screen shows it.
    pub fn value<'a>(self, setup: &'a Setup, machine: &'a Machine) -> impl fmt::Display + 'a {
        Value {
            field: self,
            setup,
            machine,
            unit: true,
        }
    }

    /// The field's change: `was 25, now 30 mm`.
    pub(super) fn change<'a>(
        self,
        before: &'a Setup,
        after: &'a Setup,
        machine: &'a Machine,
    ) -> impl fmt::Display + 'a {
        Change(
            Value {
                field: self,
                setup: before,
                machine,
                unit: false,
            },
            Value {
                field: self,
                setup: after,
                machine,
                unit: true,
            },
        )
    }
}

struct Change<'a>(Value<'a>, Value<'a>);

impl fmt::Display for Change<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "was {}, now {}", self.0, self.1)
    }
}

struct Value<'a> {
    field: Field,
    setup: &'a Setup,
    machine: &'a Machine,
    unit: bool,
}

impl fmt::Display for Value<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let setup = self.setup;
        match self.field {
            Field::Material => f.write_str(setup.material.label()),
            Field::Diameter => {
                let length = setup.diameter.length();
                match (self.machine.units(), self.unit) {
                    (system, true) => length.display(system).fmt(f),
                    (UnitSystem::Metric, false) => Decimal {
                        value: length.mm(),
                        decimals: 3,
                    }
                    .fmt(f),
                    (UnitSystem::Inch, false) => Decimal {
                        value: length.inch(),
                        decimals: 4,
                    }
                    .fmt(f),
                }
            }
            Field::Operation => f.write_str(setup.operation.label()),
            Field::Tool => f.write_str(setup.tool.label()),
            Field::Coolant => f.write_str(setup.coolant.id()),
            Field::Holder => match self.machine.holders().get(usize::from(setup.holder)) {
                Some(holder) => f.write_str(&holder.name),
                None => f.write_str("unknown"),
            },
            Field::Cap => match setup.cap {
                None => f.write_str("none"),
                Some(cap) if self.unit => cap.fmt(f),
                Some(cap) => Decimal {
                    value: cap.get(),
                    decimals: 0,
                }
                .fmt(f),
            },
            Field::Load => f.write_str(match (self.machine.tells_load(), setup.load) {
                (Err(why), _) => why.words(),
                (Ok(()), true) => "shown",
                (Ok(()), false) => "off",
            }),
        }
    }
}

/// The entry `detents` further in a list; its ends stop.
fn stepped<T: Copy + PartialEq>(all: &[T], current: T, detents: i8) -> T {
    let at = all.iter().position(|&x| x == current).unwrap_or(0) as i32;
    let last = all.len().saturating_sub(1) as i32;
    let to = (at + i32::from(detents)).clamp(0, last);
    all.get(to as usize).copied().unwrap_or(current)
}

/// A scale with coarser steps higher up: from each limit on, the step beside it.
type Scale = [(f32, f32)];

/// Millimetres: finer than a drill set at the small end, coarser than a rule at the large one.
const SCALE_MM: &Scale = &[
    (0.0, 0.1),
    (3.0, 0.5),
    (13.0, 1.0),
    (50.0, 5.0),
    (200.0, 10.0),
    (500.0, 50.0),
];
/// Inches: sixty-fourths for drills, then sixteenths, eighths, quarters and whole ones.
const SCALE_INCH: &Scale = &[
    (0.0, 1.0 / 64.0),
    (0.5, 1.0 / 16.0),
    (2.0, 1.0 / 8.0),
    (4.0, 0.25),
    (8.0, 0.5),
    (20.0, 2.0),
];
/// Caps and plates in rev/min.
const SCALE_RPM: &Scale = &[(0.0, 5.0), (200.0, 10.0), (500.0, 50.0), (2000.0, 100.0)];

/// Moves a value along its scale, to the next mark and then from mark to mark.
fn turned(scale: &Scale, value: f32, detents: i8) -> f32 {
    let step_from = |v: f32, up: bool| {
        let reached = |&&(limit, _): &&(f32, f32)| {
            if up {
                v >= limit * 0.999_9
            } else {
                v > limit * 1.000_1
            }
        };
        scale
            .iter()
            .rev()
            .find(reached)
            .or(scale.first())
            .map_or(1.0, |&(_, step)| step)
    };
    let mut v = value;
    for _ in 0..detents.unsigned_abs() {
        let up = detents > 0;
        let step = step_from(v, up);
        // A value that stands on a mark, but for rounding, goes on to the next one.
        let marks = v / step;
        let next = if up {
            libm::floorf(marks + 1e-3) + 1.0
        } else {
            libm::ceilf(marks - 1e-3) - 1.0
        };
        v = next * step;
    }
    v
}

/// A speed moved along the scale of caps.
pub(super) fn turned_rpm(speed: Rpm, detents: i8) -> Rpm {
    Rpm::saturating(turned(SCALE_RPM, speed.get(), detents))
}

fn turned_diameter(diameter: Diameter, detents: i8, units: UnitSystem) -> Diameter {
    match units {
        UnitSystem::Metric => Diameter::nearest(turned(SCALE_MM, diameter.mm(), detents)),
        UnitSystem::Inch => {
            let inch = turned(SCALE_INCH, diameter.length().inch(), detents);
            // Exact factor, so a mark of the scale stays a mark.
            Diameter::nearest(Length::from_inch(inch).map_or(inch * MM_PER_INCH, Length::mm))
        }
    }
}

/// The first detent from no cap sets it to the scale's next mark above the best speed: a spindle that runs right is not in
/// danger because somebody begins to type. Where a cap is needed because nobody knows what the holder allows, it begins
/// above the machine's slowest setting instead: no single detent makes a fast step right. The others move it from there.
fn turned_cap(cap: Option<Rpm>, detents: i8, machine: &Machine, advice: &Advice) -> Rpm {
    let (lowest, highest) = (10.0, 10_000.0);
    let from = |speed: Rpm| {
        let first = turned(SCALE_RPM, speed.get(), 1);
        turned(SCALE_RPM, first, detents - detents.signum())
    };
    let rpm = match cap {
        _ if advice.pick == Pick::NeedsCap => from(machine.drive().slowest().scaled(ABOVE_PLATE)),
        Some(cap) => turned(SCALE_RPM, cap.get(), detents),
        None => from(advice.window.best()),
    };
    Rpm::saturating(rpm.clamp(lowest, highest))
}
