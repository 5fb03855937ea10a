//! What cuts, and what keeps it cool.

use core::fmt;

/// What the edge is made of.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[cfg_attr(
    feature = "serde",
    derive(serde::Serialize, serde::Deserialize),
    serde(rename_all = "kebab-case")
)]
pub enum Tool {
    /// Plain high-speed steel (M1, M2, M7).
    Hss,
    /// High-speed steel with cobalt (T15, M35, M42).
    CobaltHss,
    /// Uncoated cemented carbide, brazed or indexable.
    Carbide,
    /// Coated indexable carbide.
    CoatedCarbide,
}

impl Tool {
    /// All of them, in the order a knob turns through.
    pub const ALL: [Tool; 4] = [
        Tool::Hss,
        Tool::CobaltHss,
        Tool::Carbide,
        Tool::CoatedCarbide,
    ];

    /// The word that names it in files and commands.
    pub const fn id(self) -> &'static str {
        match self {
            Tool::Hss => "hss",
            Tool::CobaltHss => "cobalt-hss",
            Tool::Carbide => "carbide",
            Tool::CoatedCarbide => "coated-carbide",
        }
    }
    /// In full.
    pub const fn name(self) -> &'static str {
        match self {
            Tool::Hss => "high-speed steel",
            Tool::CobaltHss => "cobalt high-speed steel",
            Tool::Carbide => "uncoated carbide",
            Tool::CoatedCarbide => "coated carbide",
        }
    }
    /// For the small screen: at most 10 characters, ASCII.
    pub const fn label(self) -> &'static str {
        match self {
            Tool::Hss => "HSS",
            Tool::CobaltHss => "HSS-Co",
            Tool::Carbide => "Carbide",
            Tool::CoatedCarbide => "Coated",
        }
    }
    /// The tool of that name.
    pub fn from_id(id: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|t| t.id() == id)
    }
    /// Carbide, coated or not: hot-hard and brittle.
    pub const fn is_carbide(self) -> bool {
        matches!(self, Tool::Carbide | Tool::CoatedCarbide)
    }
}

impl fmt::Display for Tool {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.name())
    }
}

/// What runs over the cut.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[cfg_attr(
    feature = "serde",
    derive(serde::Serialize, serde::Deserialize),
    serde(rename_all = "kebab-case")
)]
pub enum Coolant {
    /// Nothing, or a brush now and then.
    Dry,
    /// A steady stream of cutting fluid.
    Flood,
}

impl Coolant {
    /// Both.
    pub const ALL: [Coolant; 2] = [Coolant::Dry, Coolant::Flood];

    /// The word that names it in files and commands.
    pub const fn id(self) -> &'static str {
        match self {
            Coolant::Dry => "dry",
            Coolant::Flood => "flood",
        }
    }
    /// In full.
    pub const fn name(self) -> &'static str {
        match self {
            Coolant::Dry => "dry",
            Coolant::Flood => "flood coolant",
        }
    }
    /// For the small screen: at most 10 characters, ASCII.
    pub const fn label(self) -> &'static str {
        match self {
            Coolant::Dry => "Dry",
            Coolant::Flood => "Flood",
        }
    }
    /// The coolant of that name.
    pub fn from_id(id: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|c| c.id() == id)
    }
}

impl fmt::Display for Coolant {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.name())
    }
}
