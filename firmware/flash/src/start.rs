//! What is chosen on the machine at the start, as written and packed. Shared with `build.rs`.

use rimrate_core::error::Rejected;
use rimrate_core::setup::{self, Diameter, Pulses, Setup};
use rimrate_core::trade::{Coolant, Material, Operation, Tool};
use rimrate_core::units::{Length, Rpm};

/// The setup that the box starts with, to be confirmed by its operator like a remembered one; unchecked.
#[derive(serde::Serialize, serde::Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct StartSpec {
    /// The work's material.
    material: Material,
    /// The tool's material.
    tool: Tool,
    /// What is done.
    operation: Operation,
    /// Whether cutting fluid reaches the edge.
    coolant: Coolant,
    /// The largest diameter that the edge meets, mm.
    diameter_mm: f32,
    /// Which of the machine's holders, counted from 0.
    holder: u8,
    /// The highest speed allowed, rev/min.
    #[serde(default)]
    cap_rpm: Option<f32>,
    /// Pulses in a revolution as counted on the machine; the profile's where missing.
    #[serde(default)]
    pulses: Option<u16>,
}

impl StartSpec {
    /// As it is kept over a power cut. `build.rs` has no use for it.
    #[allow(dead_code)]
    pub(crate) fn of(setup: &Setup) -> Self {
        StartSpec {
            material: setup.material,
            tool: setup.tool,
            operation: setup.operation,
            coolant: setup.coolant,
            diameter_mm: setup.diameter.mm(),
            holder: setup.holder,
            cap_rpm: setup.cap.map(|n| n.get()),
            pulses: setup.pulses.map(|n| n.get().get()),
        }
    }

    /// Checks it; the holder is checked by the instrument.
    pub(crate) fn check(&self) -> Result<Setup, Rejected> {
        let out_of_range =
            |field, value: f32, range| Rejected::new(field, value, "is out of range", range);
        let length = Length::from_mm(self.diameter_mm).map_err(|_| {
            out_of_range("start.diameter_mm", self.diameter_mm, "0.1 mm to 2000 mm")
        })?;
        let cap = match self.cap_rpm {
            None => None,
            Some(n) => {
                let n = Rpm::new(n)
                    .map_err(|_| out_of_range("start.cap_rpm", n, "1 rpm to 100000 rpm"))?;
                Some(setup::cap(n).map_err(|e| e.within("start"))?)
            }
        };
        let pulses = self
            .pulses
            .map(Pulses::new)
            .transpose()
            .map_err(|e| e.within("start"))?;
        Ok(Setup {
            material: self.material,
            tool: self.tool,
            operation: self.operation,
            coolant: self.coolant,
            diameter: Diameter::new(length).map_err(|e| e.within("start"))?,
            holder: self.holder,
            cap,
            cap_is_old: false,
            load: false,
            details: setup::Details::NONE,
            pulses,
        })
    }
}
