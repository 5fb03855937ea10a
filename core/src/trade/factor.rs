//! From a combination that is not stored to the nearest one that is: factors and refusals.

use core::fmt;

use super::source::{ARMY, Source};
use super::{Cell, Coolant, IsoGroup, Material, Operation, Refusal, Tool};

/// A multiplier, with its source.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Factor {
    /// What it stands for, and why this much.
    pub what: &'static str,
    /// The multiplier.
    pub by: f32,
    /// Where it is from.
    pub source: Source,
}

/// Prints `x 0.50 reaming, from drilling: ...; source: ...`.
impl fmt::Display for Factor {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "x {:.2} {}; source: {}", self.by, self.what, self.source)
    }
}

/// The factors of one cutting speed, in the order in which they were found: at most six.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Factors([Option<Factor>; 6]);

impl Factors {
    /// These and one more; `None` when there is no room.
    pub(super) fn and(mut self, factor: Factor) -> Option<Self> {
        *self.0.iter_mut().find(|place| place.is_none())? = Some(factor);
        Some(self)
    }
    /// One after the other.
    pub fn iter(&self) -> impl Iterator<Item = &Factor> {
        self.0.iter().flatten()
    }
    /// All of them multiplied; 1 if there is none.
    pub fn product(&self) -> f32 {
        self.iter().map(|f| f.by).product()
    }
}

/// What is said when nothing better is known.
pub(super) const NO_BASIS: Refusal = Refusal {
    reason: "no published speed was found for this combination",
};

/// Combinations that make no sense, with what to do instead.
pub(super) fn refuse(
    Cell {
        material,
        tool,
        operation,
    }: Cell,
) -> Result<(), Refusal> {
    let reason = match (operation, material) {
        (_, Material::UnknownSteel) if tool.is_carbide() => {
            "unknown steel is cut with high-speed steel only: its speed would be guessed, and carbide chips where high-speed steel warns by wearing; find out what it is"
        }
        (Operation::DieThreading, _) if tool.is_carbide() => {
            "dies are made of high-speed or carbon steel: choose hss"
        }
        (Operation::HoleSawing, _) if tool.is_carbide() => {
            "no published speed was found for hole saws with carbide teeth, which chip when fed by hand: take the maker's, or choose hss"
        }
        (Operation::Tapping, _) if tool.is_carbide() => {
            "carbide taps break when a manual machine stops and reverses: choose hss"
        }
        (Operation::Knurling, _) if tool.is_carbide() => {
            "knurls are rolls of high-speed steel: choose hss"
        }
        (Operation::Knurling, Material::TemperedSteel | Material::HardSteel) => {
            "steel this hard, or that may be, ruins knurls: no knurling"
        }
        (
            Operation::Knurling,
            Material::GreyCastIron | Material::Thermoset | Material::Magnesium,
        ) => "too brittle to be knurled: the surface crumbles",
        (
            _,
            Material::Aluminium
            | Material::Magnesium
            | Material::ZincAlloy
            | Material::Thermoset
            | Material::Thermoplastic,
        ) if tool == Tool::CoatedCarbide => {
            "no published speed was found, and the honed edge of coated inserts is blunt for this: choose carbide or hss"
        }
        _ => return Ok(()),
    };
    Err(Refusal { reason })
}

/// Coolants that a material forbids.
pub(super) fn refuse_coolant(material: Material, coolant: Coolant) -> Result<(), Refusal> {
    match (material, coolant) {
        (Material::Magnesium, Coolant::Flood) => Err(Refusal {
            reason: "flood coolant is mostly water, and water with magnesium frees hydrogen and feeds fire: cut magnesium dry",
        }),
        _ => Ok(()),
    }
}

/// One step towards a stored row, and what it costs.
pub(super) fn nearer(cell: Cell) -> Result<(Cell, Factor), Refusal> {
    if cell.material == Material::UnknownSteel {
        let taken = Cell {
            material: Material::HardSteel,
            ..cell
        };
        return Ok((taken, UNKNOWN_STEEL));
    }
    // Where the hand, and not the edge, limits the speed, carbide gains little: it follows high-speed steel even if it
    // has a turning speed of its own.
    let by_hand = matches!(
        cell.operation,
        Operation::Drilling
            | Operation::Reaming
            | Operation::Countersinking
            | Operation::Tapping
            | Operation::Threading
    );
    let has_turning_row = Cell {
        operation: Operation::RoughTurning,
        ..cell
    }
    .row()
    .is_some();
    if has_turning_row && !(by_hand && cell.tool.is_carbide()) {
        let (operation, factor) = of_operation(cell.operation).ok_or(NO_BASIS)?;
        Ok((Cell { operation, ..cell }, factor))
    } else {
        let (tool, factor) = of_tool(cell, by_hand).ok_or(NO_BASIS)?;
        Ok((Cell { tool, ..cell }, factor))
    }
}

const UNKNOWN_STEEL: Factor = Factor {
    what: "unknown steel, as the slowest steel of the table",
    by: 1.0,
    source: Source::common_practice(),
};

/// The operation whose speed this one is taken from.
pub(super) fn of_operation(operation: Operation) -> Option<(Operation, Factor)> {
    let (from, what, by, source) = match operation {
        Operation::RoughTurning => return None,
        Operation::FinishTurning => (
            Operation::RoughTurning,
            "finish turning: 0.04 in and 0.007 in/rev against 0.15 in and 0.015 in/rev is published as 1.26 to 1.29",
            1.25,
            Source::read(
                "The Ferrous Metals Data Book, ch. 9, table 9-5, 135/105 and 725/575 ft/min at 175-225 HB",
            ),
        ),
        Operation::Facing => (
            Operation::RoughTurning,
            "facing, at the largest diameter: the cut of turning",
            1.0,
            Source::common_practice(),
        ),
        Operation::Boring => (
            Operation::RoughTurning,
            "boring: slender bar, chips and heat stay in the hole",
            0.75,
            Source::common_practice(),
        ),
        Operation::Drilling => (
            Operation::RoughTurning,
            "drilling: published as 0.77 to 1.0 of turning, a little below that",
            0.75,
            Source::read(
                "handbook table of HSS speeds for turning, milling, drilling and reaming carbon and alloy steels, vm68.com/stuff/sfpm.html",
            ),
        ),
        Operation::Reaming => (
            Operation::Drilling,
            "reaming, from drilling: about half",
            0.5,
            Source::read("War Department TM 1-420, Lathes, par. 37a(1)"),
        ),
        Operation::Tapping => (
            Operation::Drilling,
            "tapping, from drilling: a quarter, there must be time to stop and reverse",
            0.25,
            Source::common_practice(),
        ),
        Operation::Threading => (
            Operation::RoughTurning,
            "single-point threading: published pairs lie at 0.3 to 0.5 of turning",
            0.4,
            ARMY,
        ),
        Operation::Parting => (
            Operation::RoughTurning,
            "parting off: thin blade, hot slot, chips that jam",
            0.5,
            Source::common_practice(),
        ),
        Operation::Knurling => (
            Operation::RoughTurning,
            "knurling: the rolls press and skid above it",
            0.4,
            Source::common_practice(),
        ),
        Operation::Milling => (
            Operation::RoughTurning,
            "milling: published as 0.8 to 1.4 of turning, here as turning: cutters cost more than edges",
            1.0,
            Source::read(
                "The Ferrous Metals Data Book, ch. 9, tables 9-2, 9-3, 9-8, 9-9; handbook table, vm68.com/stuff/sfpm.html",
            ),
        ),
        Operation::Countersinking => (
            Operation::Drilling,
            "countersinking, from drilling: a third to a half, long edges chatter",
            0.4,
            Source::common_practice(),
        ),
        Operation::HoleSawing => (
            Operation::Drilling,
            "hole saw, from drilling: thin teeth, and chips stay in the kerf",
            0.6,
            Source::common_practice(),
        ),
        Operation::FlyCutting => (
            Operation::Milling,
            "fly cutting, from milling: one point strikes once in every turn",
            0.8,
            Source::common_practice(),
        ),
        Operation::DieThreading => (
            Operation::Tapping,
            "die, as a tap: there must be time to stop and reverse",
            1.0,
            Source::common_practice(),
        ),
    };
    Some((from, Factor { what, by, source }))
}

/// The tool whose speed this one's is taken from.
fn of_tool(
    Cell {
        material,
        tool,
        operation,
    }: Cell,
    by_hand: bool,
) -> Option<(Tool, Factor)> {
    let (from, what, by, source) = match tool {
        Tool::Hss => return None,
        Tool::CobaltHss if operation == Operation::Knurling => (
            Tool::Hss,
            "cobalt: knurls press, heat is no limit",
            1.0,
            Source::common_practice(),
        ),
        Tool::CobaltHss if matches!(material.group(), IsoGroup::K | IsoGroup::N) => (
            Tool::Hss,
            "cobalt high-speed steel: where wear, and not heat, blunts the edge, cobalt gains nothing",
            1.0,
            Source::common_practice(),
        ),
        Tool::CobaltHss => (
            Tool::Hss,
            "cobalt high-speed steel keeps its hardness hotter: a modest gain",
            1.15,
            Source::common_practice(),
        ),
        Tool::Carbide if by_hand => (
            Tool::Hss,
            "uncoated carbide where the hand limits the speed: published for drills as 2 to 3 times high-speed steel",
            2.0,
            Source::read("US Navy NAVEDTRA 14345, drill-press section"),
        ),
        Tool::Carbide => (
            Tool::Hss,
            "uncoated carbide runs 2 to 3 times high-speed steel",
            2.5,
            Source::common_practice(),
        ),
        Tool::CoatedCarbide => (
            Tool::Carbide,
            "coated carbide as uncoated: no published speed for the coating was found, and it asks for no less",
            1.0,
            Source::common_practice(),
        ),
    };
    Some((from, Factor { what, by, source }))
}

/// What cutting dry costs; nothing is said under flood, which the published rows assume.
///
/// High-speed steel softens near 600 degrees C: in steel, stainless, titanium and nickel, whose heat goes into the edge,
/// fluid is what keeps it. Cast iron and brass are cut dry by habit, light metals and plastics do not get that hot, and
/// carbide stands the heat better than the shock of a broken stream: but not in titanium and nickel, whose published rows
/// are wet, whose heat stays in the edge, and of which titanium's chips burn.
pub(super) fn coolant(material: Material, tool: Tool, coolant: Coolant) -> Option<Factor> {
    let hot = !matches!(material.group(), IsoGroup::K | IsoGroup::N);
    let (what, by) = match (coolant, tool) {
        (Coolant::Flood, _) => return None,
        (Coolant::Dry, Tool::Hss | Tool::CobaltHss) if hot => (
            "dry: nothing carries the heat from an edge of high-speed steel",
            0.8,
        ),
        (Coolant::Dry, Tool::Hss | Tool::CobaltHss) => {
            ("dry: this material is commonly cut dry", 1.0)
        }
        (Coolant::Dry, Tool::Carbide | Tool::CoatedCarbide)
            if matches!(material.group(), IsoGroup::S) =>
        {
            (
                "dry: the published speed is a wet one, and the heat stays in the edge and in chips that may burn",
                0.8,
            )
        }
        (Coolant::Dry, Tool::Carbide | Tool::CoatedCarbide) => {
            ("dry: carbide is commonly run dry", 1.0)
        }
    };
    Some(Factor {
        what,
        by,
        source: Source::common_practice(),
    })
}
