//! What is cut.

use core::fmt;

/// The main groups of ISO 513, by which cutting materials are chosen.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[cfg_attr(feature = "serde", derive(serde::Serialize, serde::Deserialize))]
pub enum IsoGroup {
    /// Steel.
    P,
    /// Stainless steel.
    M,
    /// Cast iron.
    K,
    /// Non-ferrous metals and non-metallic materials.
    N,
    /// Heat-resistant alloys and titanium.
    S,
    /// Hardened materials. No material of the table is in it: no basis was read for steel above 45 HRC.
    H,
}

impl IsoGroup {
    /// The letter.
    pub const fn letter(self) -> &'static str {
        match self {
            IsoGroup::P => "P",
            IsoGroup::M => "M",
            IsoGroup::K => "K",
            IsoGroup::N => "N",
            IsoGroup::S => "S",
            IsoGroup::H => "H",
        }
    }
}

/// A work material. Each stands for the hardness that [`Material::brinell`] states.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[cfg_attr(
    feature = "serde",
    derive(serde::Serialize, serde::Deserialize),
    serde(rename_all = "kebab-case")
)]
pub enum Material {
    /// Steel of which nothing is known.
    UnknownSteel,
    /// Resulphurised and rephosphorised or leaded: 1212 to 1215, 12L14.
    FreeMachiningSteel,
    /// Resulphurised: 1108 to 1151.
    ResulphurisedSteel,
    /// Low carbon: 1009 to 1025.
    MildSteel,
    /// 1030 to 1055.
    MediumCarbonSteel,
    /// 1060 to 1095, annealed.
    HighCarbonSteel,
    /// 4012 to 9310, annealed.
    LowAlloySteel,
    /// Quenched and tempered, 275 to 325 HB.
    TemperedSteel,
    /// Quenched and tempered, 325 to 425 HB.
    HardSteel,
    /// Annealed tool steel.
    ToolSteel,
    /// 302, 304, 309, 310, 314, 316.
    StainlessAustenitic,
    /// 303, 416, 420F, 430F.
    StainlessFreeMachining,
    /// Ferritic and martensitic: 420, 430, 431, 440, 442, 446.
    StainlessFerritic,
    /// Precipitation-hardening, solution treated.
    StainlessPrecipitation,
    /// Grey cast iron.
    GreyCastIron,
    /// Nodular (spheroidal graphite) cast iron.
    DuctileIron,
    /// Malleable cast iron.
    MalleableIron,
    /// Aluminium and its alloys.
    Aluminium,
    /// Leaded brass.
    FreeCuttingBrass,
    /// Ordinary and hard brass.
    Brass,
    /// Ordinary bronze and gunmetal.
    Bronze,
    /// High-tensile bronze.
    ToughBronze,
    /// Copper.
    Copper,
    /// Magnesium alloys.
    Magnesium,
    /// Zinc alloys.
    ZincAlloy,
    /// Thermosetting plastics.
    Thermoset,
    /// Thermoplastics.
    Thermoplastic,
    /// Nickel-copper alloy (monel).
    NickelCopper,
    /// Commercially pure titanium.
    TitaniumPure,
    /// Alpha-beta titanium alloys.
    TitaniumAlloy,
}

impl Material {
    /// All of them, in the order a knob turns through: by group, softer before harder.
    pub const ALL: [Material; 30] = [
        Material::UnknownSteel,
        Material::FreeMachiningSteel,
        Material::ResulphurisedSteel,
        Material::MildSteel,
        Material::MediumCarbonSteel,
        Material::HighCarbonSteel,
        Material::LowAlloySteel,
        Material::TemperedSteel,
        Material::HardSteel,
        Material::ToolSteel,
        Material::StainlessFreeMachining,
        Material::StainlessAustenitic,
        Material::StainlessFerritic,
        Material::StainlessPrecipitation,
        Material::GreyCastIron,
        Material::DuctileIron,
        Material::MalleableIron,
        Material::Aluminium,
        Material::FreeCuttingBrass,
        Material::Brass,
        Material::Bronze,
        Material::ToughBronze,
        Material::Copper,
        Material::Magnesium,
        Material::ZincAlloy,
        Material::Thermoset,
        Material::Thermoplastic,
        Material::NickelCopper,
        Material::TitaniumPure,
        Material::TitaniumAlloy,
    ];

    /// The word that names it in files and commands.
    pub const fn id(self) -> &'static str {
        self.words().0
    }
    /// In full.
    pub const fn name(self) -> &'static str {
        self.words().1
    }
    /// For the small screen: at most 12 characters, ASCII.
    pub const fn label(self) -> &'static str {
        self.words().2
    }

    /// Id, name, label.
    const fn words(self) -> (&'static str, &'static str, &'static str) {
        match self {
            Material::UnknownSteel => ("unknown-steel", "unknown steel", "Unkn. steel"),
            Material::FreeMachiningSteel => (
                "free-machining-steel",
                "free-machining steel (1212 to 1215, 12L14)",
                "Free-m steel",
            ),
            Material::ResulphurisedSteel => (
                "resulphurised-steel",
                "resulphurised steel (1108 to 1151)",
                "Sulph. steel",
            ),
            Material::MildSteel => (
                "mild-steel",
                "mild steel, low carbon (1009 to 1025)",
                "Mild steel",
            ),
            Material::MediumCarbonSteel => (
                "medium-carbon-steel",
                "medium carbon steel (1030 to 1055)",
                "Med-C steel",
            ),
            Material::HighCarbonSteel => (
                "high-carbon-steel",
                "high carbon steel (1060 to 1095), annealed",
                "High-C steel",
            ),
            Material::LowAlloySteel => (
                "low-alloy-steel",
                "low-alloy steel (4012 to 9310), annealed",
                "Alloy steel",
            ),
            Material::TemperedSteel => (
                "tempered-steel",
                "steel quenched and tempered to 275-325 HB (29-35 HRC)",
                "Q+T steel",
            ),
            Material::HardSteel => (
                "hard-steel",
                "steel quenched and tempered to 325-425 HB (35-45 HRC)",
                "Hard steel",
            ),
            Material::ToolSteel => ("tool-steel", "tool steel, annealed", "Tool steel"),
            Material::StainlessAustenitic => (
                "stainless-austenitic",
                "austenitic stainless steel (302, 304, 310, 316)",
                "Stainl. aust",
            ),
            Material::StainlessFreeMachining => (
                "stainless-free-machining",
                "free-machining stainless steel (303, 416, 430F)",
                "Stainl. free",
            ),
            Material::StainlessFerritic => (
                "stainless-ferritic",
                "ferritic or martensitic stainless steel (420, 430, 440)",
                "Stainl. ferr",
            ),
            Material::StainlessPrecipitation => (
                "stainless-precipitation",
                "precipitation-hardening stainless steel, solution treated",
                "Stainl. PH",
            ),
            Material::GreyCastIron => ("grey-cast-iron", "grey cast iron", "Grey iron"),
            Material::DuctileIron => (
                "ductile-iron",
                "ductile (nodular) cast iron",
                "Ductile iron",
            ),
            Material::MalleableIron => ("malleable-iron", "malleable cast iron", "Malleable"),
            Material::Aluminium => ("aluminium", "aluminium and its alloys", "Aluminium"),
            Material::FreeCuttingBrass => (
                "free-cutting-brass",
                "free-cutting (leaded) brass",
                "Free brass",
            ),
            Material::Brass => ("brass", "brass, ordinary or hard", "Brass"),
            Material::Bronze => ("bronze", "bronze and gunmetal", "Bronze"),
            Material::ToughBronze => (
                "tough-bronze",
                "tough (high-tensile) bronze",
                "Tough bronze",
            ),
            Material::Copper => ("copper", "copper", "Copper"),
            Material::Magnesium => ("magnesium", "magnesium alloy", "Magnesium"),
            Material::ZincAlloy => ("zinc-alloy", "zinc alloy", "Zinc alloy"),
            Material::Thermoset => ("thermoset", "thermosetting plastic", "Thermoset"),
            Material::Thermoplastic => ("thermoplastic", "thermoplastic", "Thermoplast"),
            Material::NickelCopper => ("nickel-copper", "nickel-copper alloy (monel)", "Monel"),
            Material::TitaniumPure => ("titanium-pure", "titanium, commercially pure", "Ti pure"),
            Material::TitaniumAlloy => ("titanium-alloy", "titanium alloy, alpha-beta", "Ti alloy"),
        }
    }

    /// The material of that name.
    pub fn from_id(id: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|m| m.id() == id)
    }

    /// Its group in ISO 513.
    pub const fn group(self) -> IsoGroup {
        match self {
            Material::UnknownSteel
            | Material::FreeMachiningSteel
            | Material::ResulphurisedSteel
            | Material::MildSteel
            | Material::MediumCarbonSteel
            | Material::HighCarbonSteel
            | Material::LowAlloySteel
            | Material::TemperedSteel
            | Material::HardSteel
            | Material::ToolSteel => IsoGroup::P,
            Material::StainlessAustenitic
            | Material::StainlessFreeMachining
            | Material::StainlessFerritic
            | Material::StainlessPrecipitation => IsoGroup::M,
            Material::GreyCastIron | Material::DuctileIron | Material::MalleableIron => IsoGroup::K,
            Material::Aluminium
            | Material::FreeCuttingBrass
            | Material::Brass
            | Material::Bronze
            | Material::ToughBronze
            | Material::Copper
            | Material::Magnesium
            | Material::ZincAlloy
            | Material::Thermoset
            | Material::Thermoplastic => IsoGroup::N,
            Material::NickelCopper | Material::TitaniumPure | Material::TitaniumAlloy => {
                IsoGroup::S
            }
        }
    }

    /// The Brinell hardness, from and to, that the speeds hold for; `None` where the sources state none.
    pub const fn brinell(self) -> Option<(u16, u16)> {
        match self {
            Material::FreeMachiningSteel => Some((100, 200)),
            Material::ResulphurisedSteel => Some((100, 225)),
            Material::MildSteel | Material::MediumCarbonSteel | Material::HighCarbonSteel => {
                Some((125, 225))
            }
            Material::LowAlloySteel => Some((175, 275)),
            Material::TemperedSteel => Some((275, 325)),
            Material::HardSteel => Some((325, 425)),
            Material::ToolSteel => Some((200, 250)),
            Material::StainlessPrecipitation => Some((150, 200)),
            Material::GreyCastIron => Some((160, 220)),
            Material::DuctileIron => Some((140, 225)),
            Material::MalleableIron => Some((110, 200)),
            Material::ZincAlloy => Some((80, 100)),
            Material::TitaniumPure => Some((110, 200)),
            Material::TitaniumAlloy => Some((300, 360)),
            _ => None,
        }
    }

    /// What to mind with it, where there is something that hurts people or spoils the cut at once.
    pub const fn caution(self) -> Option<&'static str> {
        match self {
            Material::UnknownSteel => Some(
                "Not known: try a file first. What a file skates on is too hard for high-speed steel.",
            ),
            Material::StainlessAustenitic
            | Material::StainlessPrecipitation
            | Material::NickelCopper => {
                Some("Work-hardens when rubbed: sharp edge, keep feeding, never dwell.")
            }
            Material::Magnesium => Some(
                "Chips burn: sharp edge, coarse chips, sweep them up. No water on it, no coolant with water; keep dry sand or a class D extinguisher at hand.",
            ),
            Material::TitaniumPure | Material::TitaniumAlloy => Some(
                "Fine chips burn: sharp edge, keep feeding, sweep chips up. No water on a chip fire: dry sand or a class D extinguisher.",
            ),
            Material::GreyCastIron | Material::DuctileIron | Material::MalleableIron => Some(
                "Dust: mask, extraction, cover the ways. Get under the skin with the first cut.",
            ),
            Material::Thermoset => {
                Some("Dust: mask and extraction, above all with glass or cloth filling.")
            }
            Material::Thermoplastic => Some(
                "Melts and gives off fumes when rubbed, those of PVC and PTFE are poisonous: air it. Long strings wind up: stop to clear them.",
            ),
            Material::Copper | Material::Bronze | Material::ToughBronze => Some(
                "If it may be beryllium copper: its dust and fumes destroy lungs. No dry grinding, filing or sanding, wet chips, mask and extraction.",
            ),
            Material::ZincAlloy => {
                Some("Fine chips and dust burn, wet ones give off hydrogen: sweep them up.")
            }
            Material::FreeCuttingBrass => {
                Some("Leaded: wash hands before food. Grabs drills: little or no rake.")
            }
            _ => None,
        }
    }
}

impl fmt::Display for Material {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.name())
    }
}
