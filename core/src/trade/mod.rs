//! The trade's knowledge: materials, tools, operations, and the cutting speed for each combination.
//!
//! Stored are published ranges with our place in them ([`Row`]): the turning speed for a material and a tool, and
//! rows for other operations where a source states one. Everything else is a chain of [`Factor`]s on the nearest
//! stored row, each with its own source. A combination without a basis is refused.
//!
//! Every advised speed obeys one rule against what was published for the same tool, hardness and cut: not above the
//! top of the range, and not below 0.6 of its bottom.

mod direct;
pub mod edge;
mod factor;
pub mod feed;
mod material;
mod operation;
mod source;
pub mod stock;
mod tool;
mod turning;

use core::fmt;

pub use factor::{Factor, Factors};
pub use material::{IsoGroup, Material};
pub use operation::Operation;
pub use source::{Confidence, Source};
pub use tool::{Coolant, Tool};

use crate::units::SurfaceSpeed;

/// A published cutting speed and our place in it.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Row {
    /// What is cut.
    pub material: Material,
    /// With what.
    pub tool: Tool,
    /// How.
    pub operation: Operation,
    /// As published, from slowest to fastest.
    pub range: (SurfaceSpeed, SurfaceSpeed),
    /// What we advise.
    pub ours: SurfaceSpeed,
    /// Hardness, depth and feed where the source states them, and why we sit where we sit.
    pub why: &'static str,
    /// Where the range is from.
    pub source: Source,
}

/// How a cutting speed came about: a stored row times factors.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Basis {
    /// The stored row; its material, tool and operation may differ from those asked for, the factors say why.
    pub row: &'static Row,
    /// What it was multiplied by.
    pub factors: Factors,
}

/// Prints `15.24 to 18.29 m/min for tool steel ...: why; source`, then a line for each factor.
impl fmt::Display for Basis {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Row {
            material,
            tool,
            operation,
            range: (low, high),
            ours,
            why,
            source,
        } = self.row;
        write!(f, "{material}, {tool}, {operation}: published {low}")?;
        if low != high {
            write!(f, " to {high}")?;
        }
        write!(f, ", ours {ours}; {why}; source: {source}")?;
        for factor in self.factors.iter() {
            write!(f, "\n{factor}")?;
        }
        Ok(())
    }
}

/// The cutting speed for one combination.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct CuttingSpeed {
    /// The published range, with the factors applied.
    pub range: (SurfaceSpeed, SurfaceSpeed),
    /// What we advise.
    pub ours: SurfaceSpeed,
    /// How it came about.
    pub how: Basis,
}

/// Why there is no cutting speed for a combination.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Refusal {
    /// In a sentence, with what to do instead.
    pub reason: &'static str,
}

impl fmt::Display for Refusal {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.reason)
    }
}

impl core::error::Error for Refusal {}

/// The cutting speed for this combination, or why there is none.
///
/// # Errors
/// [`Refusal`] when no published row, and no factor on one, covers the combination.
pub fn cutting_speed(
    material: Material,
    tool: Tool,
    operation: Operation,
    coolant: Coolant,
) -> Result<CuttingSpeed, Refusal> {
    factor::refuse_coolant(material, coolant)?;
    let mut cell = Cell {
        material,
        tool,
        operation,
    };
    let mut factors = Factors::default();
    let row = loop {
        factor::refuse(cell)?;
        if let Some(row) = cell.row() {
            break row;
        }
        let (nearer, factor) = factor::nearer(cell)?;
        // No chain is longer than the place for it (there is a test over all combinations).
        factors = factors.and(factor).ok_or(factor::NO_BASIS)?;
        cell = nearer;
    };
    if let Some(factor) = factor::coolant(material, tool, coolant) {
        factors = factors.and(factor).ok_or(factor::NO_BASIS)?;
    }
    let by = factors.product();
    let (low, high) = row.range;
    Ok(CuttingSpeed {
        range: (low.scaled(by), high.scaled(by)),
        ours: row.ours.scaled(by),
        how: Basis { row, factors },
    })
}

/// Every stored row, turning first.
pub fn rows() -> impl Iterator<Item = &'static Row> {
    [
        turning::STEEL,
        turning::STAINLESS_AND_IRON,
        turning::OTHERS,
        direct::FINISHING,
        direct::DRILLING,
        direct::THREADING,
        direct::MILLING,
    ]
    .into_iter()
    .flatten()
}

/// A place in the table.
#[derive(Clone, Copy, PartialEq, Eq)]
struct Cell {
    material: Material,
    tool: Tool,
    operation: Operation,
}

impl Cell {
    /// What is stored for it.
    fn row(self) -> Option<&'static Row> {
        rows().find(|r| {
            r.material == self.material && r.tool == self.tool && r.operation == self.operation
        })
    }
}

/// A range as published in ft/min.
const fn ft(low: f32, high: f32) -> (SurfaceSpeed, SurfaceSpeed) {
    (
        SurfaceSpeed::of_table_ft_min(low),
        SurfaceSpeed::of_table_ft_min(high),
    )
}

/// A range as published in m/min.
const fn m(low: f32, high: f32) -> (SurfaceSpeed, SurfaceSpeed) {
    (
        SurfaceSpeed::of_table_m_min(low),
        SurfaceSpeed::of_table_m_min(high),
    )
}
