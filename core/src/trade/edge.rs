//! Taylor exponents by tool, the life that our speeds are taken to be stated for, and the slowest useful speed of carbide.

use super::factor::of_operation;
use super::source::{KALPAKJIAN_21, Source};
use super::{IsoGroup, Material, Operation, Tool};

/// Taylor's exponent for a tool, from the smallest to the largest published.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct TaylorRange {
    /// Smallest and largest.
    pub n: (f32, f32),
    /// Where from.
    pub source: Source,
}

/// The life, min, for which our own speeds count as stated. The rows do not say it; books of cutting data mean one to two
/// hours for high-speed steel and for carbide (common practice, no source), so this is their short end.
pub const TABLE_LIFE_MIN: f32 = 60.0;

/// Published exponents. Cobalt high-speed steel is taken as plain: no range of its own was found.
pub const fn taylor(tool: Tool) -> TaylorRange {
    let n = match tool {
        Tool::Hss | Tool::CobaltHss => (0.08, 0.2),
        Tool::Carbide => (0.2, 0.5),
        Tool::CoatedCarbide => (0.4, 0.6),
    };
    TaylorRange {
        n,
        source: KALPAKJIAN_21,
    }
}

/// The slowest cutting speed, m/min, at which carbide is worth running: below it chips weld to the edge and tear grains out,
/// or the edge ploughs (common practice, no source). `None` for high-speed steel, and where the hand, not the edge, sets the
/// speed.
pub const fn slowest_useful(material: Material, tool: Tool, operation: Operation) -> Option<f32> {
    if !tool.is_carbide() || !(operation.is_turning() || operation.is_milling()) {
        return None;
    }
    Some(match material.group() {
        IsoGroup::P | IsoGroup::N => 50.0,
        IsoGroup::M => 40.0,
        IsoGroup::K => 30.0,
        IsoGroup::S => 10.0,
        IsoGroup::H => 20.0,
    })
}

/// The slowest useful speed never stands above this share of the speed advised for the combination, so that the advice does
/// not contradict itself where hard steels run slowly anyway (our choice).
pub const SLOWEST_SHARE: f32 = 0.75;

/// The share of the speed printed on an insert's box that an operation takes; `None` where the print does not speak of the
/// operation at all.
///
/// Boxes speak of turning, or of milling on a cutter's inserts (common practice, no source). Facing is the cut of turning,
/// boring costs what it costs in the table, and finishing is not raised above the print.
pub fn box_share(operation: Operation) -> Option<f32> {
    match operation {
        Operation::RoughTurning
        | Operation::FinishTurning
        | Operation::Facing
        | Operation::Milling => Some(1.0),
        Operation::Boring => of_operation(operation).map(|(_, factor)| factor.by),
        _ => None,
    }
}
