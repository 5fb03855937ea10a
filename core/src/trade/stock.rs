//! What a bar of each material weighs and how stiff it is, and how hard it cuts.

use super::Material;
use super::source::{CALLISTER, GERE, GERE_MEMORY, Source, VDI_GROUPS};
use crate::physics::cutting_force::Kienzle;

/// Stiffness and weight: the lower end of a published modulus and the upper end of a density, so that a bar bends sooner here
/// than in the shop.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Elastic {
    /// Young's modulus, GPa.
    pub e_gpa: f32,
    /// Density, kg/m3.
    pub rho: f32,
    /// Where from.
    pub source: Source,
}

/// Stiffness and weight of `material`.
pub const fn elastic(material: Material) -> Elastic {
    let (e_gpa, rho, source) = match material {
        Material::UnknownSteel
        | Material::FreeMachiningSteel
        | Material::ResulphurisedSteel
        | Material::MildSteel
        | Material::MediumCarbonSteel
        | Material::HighCarbonSteel
        | Material::LowAlloySteel
        | Material::TemperedSteel
        | Material::HardSteel
        | Material::ToolSteel => (207.0, 7870.0, CALLISTER),
        Material::StainlessAustenitic
        | Material::StainlessFreeMachining
        | Material::StainlessFerritic
        | Material::StainlessPrecipitation => (190.0, 8000.0, GERE_MEMORY),
        Material::GreyCastIron => (83.0, 7400.0, GERE_MEMORY),
        Material::DuctileIron | Material::MalleableIron => (150.0, 7400.0, GERE_MEMORY),
        Material::Aluminium => (70.0, 2800.0, GERE),
        Material::FreeCuttingBrass | Material::Brass => (96.0, 8600.0, GERE),
        Material::Bronze | Material::ToughBronze => (96.0, 8800.0, GERE),
        Material::Copper => (110.0, 8900.0, GERE),
        Material::Magnesium => (41.0, 1830.0, GERE),
        Material::ZincAlloy => (80.0, 6800.0, GERE_MEMORY),
        Material::Thermoset => (2.8, 1400.0, GERE_MEMORY),
        Material::Thermoplastic => (2.1, 1100.0, GERE),
        Material::NickelCopper => (170.0, 8800.0, GERE_MEMORY),
        Material::TitaniumPure | Material::TitaniumAlloy => (100.0, 4500.0, GERE),
    };
    Elastic { e_gpa, rho, source }
}

/// Force constants of a material, and their source.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Force {
    /// The constants, for a sharp carbide edge.
    pub kienzle: Kienzle,
    /// Where from.
    pub source: Source,
}

/// Force constants of `material`; `None` where none were found (magnesium, zinc, plastics, nickel-copper): then nothing is
/// said about power, rather than something guessed.
///
/// Three families of sources were laid side by side (there is a test): the groups of VDI 3323, the power constants of
/// Machinery's Handbook, and Kienzle's and Victor's own values. We use the first. It covers nearly all of our materials, it
/// is the only one that was read with both constants, and it lies within 30 % of the power constants where
/// hardness is the same. Kienzle's own values (from memory) are up to 45 % higher in steels: they were taken with little
/// rake, and the worn-edge and high-speed-steel factors that we apply cover that.
pub const fn force(material: Material) -> Option<Force> {
    let (kc11, mc) = match material {
        Material::FreeMachiningSteel | Material::ResulphurisedSteel | Material::MildSteel => {
            (1350.0, 0.21)
        }
        Material::MediumCarbonSteel => (1500.0, 0.22),
        Material::HighCarbonSteel => (1700.0, 0.24),
        Material::LowAlloySteel => (1775.0, 0.24),
        Material::TemperedSteel => (1725.0, 0.24),
        Material::HardSteel => (1800.0, 0.24),
        // The hardest steel cuts least, high-alloy steel takes most force: an unknown one may be either.
        Material::ToolSteel | Material::UnknownSteel => (2450.0, 0.23),
        Material::StainlessFreeMachining | Material::StainlessFerritic => (1875.0, 0.21),
        Material::StainlessAustenitic | Material::StainlessPrecipitation => (2150.0, 0.20),
        Material::GreyCastIron => (1225.0, 0.25),
        Material::DuctileIron => (1350.0, 0.28),
        Material::MalleableIron => (1225.0, 0.25),
        Material::Aluminium => (800.0, 0.25),
        Material::FreeCuttingBrass => (700.0, 0.27),
        // The groups say 700 here as well, half of what Groover's unit power says of brass and bronze at 0.25 mm (2.2 N m/mm3,
        // from memory): the higher, because a cut that was promised and stalls breaks the edge.
        Material::Brass | Material::Bronze | Material::ToughBronze | Material::Copper => {
            (1513.0, 0.27)
        }
        Material::TitaniumPure => (1700.0, 0.23),
        Material::TitaniumAlloy => (2110.0, 0.22),
        Material::Magnesium
        | Material::ZincAlloy
        | Material::Thermoset
        | Material::Thermoplastic
        | Material::NickelCopper => return None,
    };
    Some(Force {
        kienzle: Kienzle { kc11, mc },
        source: VDI_GROUPS,
    })
}

/// Sharma's drill-thrust factor K for a material; steel of about 200 HB is the only one that was read.
pub const fn thrust_factor(material: Material) -> Option<f32> {
    match material {
        Material::MildSteel
        | Material::MediumCarbonSteel
        | Material::ResulphurisedSteel
        | Material::FreeMachiningSteel
        | Material::LowAlloySteel => Some(1.1),
        _ => None,
    }
}
