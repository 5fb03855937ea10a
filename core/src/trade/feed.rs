//! The feed for an operation, where nobody enters one.

use super::source::{DATA_BOOK_9_8, DATA_BOOK_HARD, KALPAKJIAN_DRILLS, Source};
use super::{IsoGroup, Material, Operation};

/// A feed with its source.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct FeedRow {
    /// mm per revolution; mm per tooth when milling.
    pub mm: f32,
    /// Where from.
    pub source: Source,
}

/// From this stock diameter up the full feed; below it in proportion (USAF T.O. 1-1A-9, table 2-8: 1 in).
const FULL_STOCK_MM: f32 = 25.4;
/// No feed finer than this is proposed for turning: an edge that does not bite rubs (common practice, no source).
const FINEST_MM: f32 = 0.04;

/// The feed for `operation` at `diameter` mm; `lead` mm where a thread is cut, whose feed it is. `None` for a thread without
/// a lead.
pub fn feed(
    material: Material,
    operation: Operation,
    diameter: f32,
    lead: Option<f32>,
) -> Option<FeedRow> {
    let by_stock = (diameter / FULL_STOCK_MM).min(1.0);
    let turned = |mm: f32, source| FeedRow {
        mm: (mm * by_stock).max(FINEST_MM),
        source,
    };
    Some(match operation {
        // The feeds at which our speeds are published, smaller in proportion on thin stock.
        Operation::RoughTurning => turned(0.38, DATA_BOOK_HARD),
        Operation::FinishTurning => turned(0.18, DATA_BOOK_HARD),
        Operation::Facing => turned(0.2, Source::common_practice()),
        Operation::Boring => FeedRow {
            mm: 0.1,
            source: Source::common_practice(),
        },
        // Thin blades break when fed hard and rub when fed softly.
        Operation::Parting => FeedRow {
            mm: 0.05,
            source: Source::common_practice(),
        },
        Operation::Knurling => FeedRow {
            mm: 0.3,
            source: Source::common_practice(),
        },
        Operation::Drilling => drill(material, diameter),
        // Twice to three times the drill's.
        Operation::Reaming => FeedRow {
            mm: 2.0 * drill(material, diameter).mm,
            source: Source::common_practice(),
        },
        Operation::Countersinking | Operation::HoleSawing => FeedRow {
            mm: (0.5 * drill(material, diameter).mm).min(0.1),
            source: Source::common_practice(),
        },
        Operation::Tapping | Operation::DieThreading | Operation::Threading => FeedRow {
            mm: lead?,
            source: Source::common_practice(),
        },
        // Published for large face mills; small cutters bend and break, so a two-hundredth of their diameter at the
        // most (common practice, no source).
        Operation::Milling => FeedRow {
            mm: (diameter / 200.0).clamp(0.01, 0.15),
            source: DATA_BOOK_9_8,
        },
        Operation::FlyCutting => FeedRow {
            mm: 0.1,
            source: Source::common_practice(),
        },
    })
}

/// Twist drills: published at 1.5 mm and 12.5 mm, drawn straight between them; below in proportion to the diameter, above
/// level, because hands and small machines do not push harder.
fn drill(material: Material, d: f32) -> FeedRow {
    let (at_small, at_large) = match (material, material.group()) {
        (Material::TitaniumPure | Material::TitaniumAlloy, _) => (0.01, 0.15),
        (Material::Thermoset | Material::Thermoplastic, _) => (0.025, 0.1),
        (
            Material::FreeCuttingBrass
            | Material::Brass
            | Material::Bronze
            | Material::ToughBronze
            | Material::Copper,
            _,
        ) => (0.025, 0.25),
        // Stainless and nickel are not in the table; the lower end of the steels' keeps the drill whole.
        (_, IsoGroup::M | IsoGroup::S) => (0.02, 0.2),
        _ => (0.025, 0.3),
    };
    let (small, large) = (1.5, 12.5);
    let mm = if d < small {
        at_small * d / small
    } else {
        at_small + (at_large - at_small) * (d.min(large) - small) / (large - small)
    };
    FeedRow {
        mm: mm.max(0.001),
        source: KALPAKJIAN_DRILLS,
    }
}
