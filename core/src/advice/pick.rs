//! What to set on the machine.

use super::Window;
use crate::machine::{ABOVE_PLATE, Drive, Label, Machine, Range};
use crate::trade::Refusal;
use crate::units::Rpm;

/// A speed that the machine can be set to.
#[derive(Clone, Debug, PartialEq)]
pub struct Setting {
    /// The label of the step or range.
    pub label: Label,
    /// The step's plate speed, or the speed to set within the range.
    pub rpm: Rpm,
}

/// What to set on the machine, or why nothing is advised.
#[derive(Clone, Debug, PartialEq)]
pub enum Pick {
    /// Set this.
    Set(Setting),
    /// Even the machine's slowest is too fast.
    TooFast {
        /// The slowest setting, the nearest to what is allowed.
        nearest: Setting,
        /// How far it lies above the fastest setting allowed, percent.
        over_percent: f32,
    },
    /// A cap must be typed: the holder has no stamped speed, or the work is off balance or strikes the edge.
    NeedsCap,
    /// There is no basis for a cutting speed.
    NoBasis(Refusal),
}

impl Pick {
    /// The setting, where one is advised.
    pub fn setting(&self) -> Option<&Setting> {
        match self {
            Pick::Set(setting) => Some(setting),
            _ => None,
        }
    }
}

/// Stepped drive: the fastest step that fits. Variable drive: the target itself, in the fastest range that has it;
/// in a gap between two ranges the top of the lower one. A step or range that does not pull `torque`, N m, and a range in
/// which the motor would not cool itself, is passed over where a slower one does better.
pub(super) fn pick(window: &Window, machine: &Machine, torque: Option<f32>) -> Pick {
    let drive = machine.drive();
    let limit = window.fastest_plate();
    let reach = if window.best() < limit {
        window.best()
    } else {
        limit
    };
    let (fitting, slowest) = match drive {
        Drive::Stepped(steps) => (
            steps
                .iter()
                .rev()
                .find(|s| s.rpm <= reach && machine.pulls(torque, &s.label, s.rpm))
                .or_else(|| steps.iter().rev().find(|s| s.rpm <= reach))
                .map(|s| (&s.label, s.rpm)),
            steps.first().map(|s| (&s.label, s.rpm)),
        ),
        Drive::Variable(ranges) => {
            let hard = window
                .hard
                .map_or(Rpm::MAX, |b| b.at.scaled(1.0 / ABOVE_PLATE));
            let target = if window.best() < hard {
                window.best()
            } else {
                hard
            };
            let at = |r: &Range| if target < r.high { target } else { r.high };
            let fits = |r: &&Range| r.low <= target && machine.pulls(torque, &r.label, at(r));
            let cool = |r: &&Range| r.cool.is_none_or(|cool| cool <= at(r));
            let mut fast_first = ranges.iter().rev();
            (
                fast_first
                    .find(|r| fits(r) && cool(r))
                    .or_else(|| ranges.iter().rev().find(fits))
                    .or_else(|| ranges.iter().rev().find(|r| r.low <= target))
                    .map(|r| (&r.label, at(r))),
                ranges.first().map(|r| (&r.label, r.low)),
            )
        }
    };
    let setting = |(label, rpm): (&Label, Rpm)| Setting {
        label: label.clone(),
        rpm,
    };
    match (fitting, slowest) {
        (Some(found), _) => Pick::Set(setting(found)),
        (None, Some(slowest)) => Pick::TooFast {
            over_percent: (slowest.1.get() / reach.get().max(f32::MIN_POSITIVE) - 1.0) * 100.0,
            nearest: setting(slowest),
        },
        // A machine has at least one step or range; without any there is nothing to allow.
        (None, None) => Pick::NeedsCap,
    }
}
