//! What to set for a cut, as text or JSON.

mod answer;
mod details;
mod list;

use std::io::{self, Write};
use std::path::PathBuf;

use clap::Args;
use rimrate_core::advice::{advise, refuse_machine};
use rimrate_core::machine::Machine;
use rimrate_core::setup::{Diameter, Setup};
use rimrate_core::trade::{Coolant, Material, Operation, Tool};

use crate::fail::Fail;
use crate::profile;
use crate::scenario::{find_holder, parse_cap};

use answer::Answer;
use details::DetailOptions;

/// What `rimrate advise` asks for.
#[derive(Args, Debug)]
pub struct Advise {
    /// Print the known materials, tools and operations with their cutting speeds and sources.
    #[arg(long, exclusive = true)]
    list: bool,
    /// Work material, such as mild-steel (see --list).
    #[arg(long, required_unless_present = "list")]
    material: Option<String>,
    /// Tool material: hss, cobalt-hss, carbide or coated-carbide.
    #[arg(long, required_unless_present = "list")]
    tool: Option<String>,
    /// Operation, such as rough-turning or drilling (see --list).
    #[arg(long, required_unless_present = "list")]
    operation: Option<String>,
    /// Largest diameter that the edge meets: "25 mm", "1 in", "3/8 in".
    #[arg(long, required_unless_present = "list")]
    diameter: Option<String>,
    /// Workholder of the machine, by kind or name; the profile's first where missing.
    #[arg(long)]
    holder: Option<String>,
    /// Highest speed that you allow, rpm; an unrated holder needs one.
    #[arg(long)]
    cap: Option<String>,
    /// Cutting fluid at the edge: flood or dry.
    #[arg(long, default_value = "flood")]
    coolant: String,
    /// Machine: geared-lathe, variable-lathe, drill-press, or a profile file.
    #[arg(long, default_value = "geared-lathe")]
    machine: PathBuf,
    /// Print JSON instead of text.
    #[arg(long)]
    json: bool,
    #[command(flatten)]
    details: DetailOptions,
}

impl Advise {
    /// Answers on `out`.
    pub fn run(&self, out: &mut impl Write) -> Result<(), Fail> {
        let text = if self.list {
            list::list()
        } else {
            let machine = profile::load(&self.machine)?;
            let setup = self.setup(&machine)?;
            let advice = advise(&setup, &machine);
            let cutting = advice.cutting.as_ref().map_err(|refusal| {
                Fail::input(format!(
                    "{} with {} in {}: no cutting speed is known: {refusal}",
                    setup.operation.id(),
                    setup.tool.id(),
                    setup.material.id()
                ))
            })?;
            let answer = Answer {
                setup: &setup,
                machine: &machine,
                advice: &advice,
                cutting,
            };
            if self.json {
                format!("{:#}\n", answer.json())
            } else {
                answer.text()
            }
        };
        match out.write_all(text.as_bytes()) {
            // Somebody who closes the pipe has read enough.
            Err(e) if e.kind() != io::ErrorKind::BrokenPipe => {
                Err(Fail::input(format!("output: {e}")))
            }
            _ => Ok(()),
        }
    }

    fn setup(&self, machine: &Machine) -> Result<Setup, Fail> {
        let word = |option: &Option<String>| option.clone().unwrap_or_default();
        let holder = match &self.holder {
            Some(word) => find_holder(machine, word).map_err(Fail::input)?,
            None => 0,
        };
        let tool = known(
            "tool",
            &word(&self.tool),
            Tool::from_id,
            &Tool::ALL.map(Tool::id),
        )?;
        let operation = known(
            "operation",
            &word(&self.operation),
            Operation::from_id,
            &Operation::ALL.map(Operation::id),
        )?;
        refuse_machine(operation, machine.kind()).map_err(|refusal| {
            let allowed: Vec<&str> = Operation::ALL
                .into_iter()
                .filter(|&o| refuse_machine(o, machine.kind()).is_ok())
                .map(Operation::id)
                .collect();
            Fail::input(format!(
                "operation: `{}` does not go with this machine: {refusal}; allowed: {}",
                operation.id(),
                allowed.join(", ")
            ))
        })?;
        let diameter = Diameter::parse(&word(&self.diameter)).map_err(Fail::input)?;
        Ok(Setup {
            material: known(
                "material",
                &word(&self.material),
                Material::from_id,
                &Material::ALL.map(Material::id),
            )?,
            tool,
            operation,
            coolant: known(
                "coolant",
                &self.coolant,
                Coolant::from_id,
                &Coolant::ALL.map(Coolant::id),
            )?,
            diameter,
            holder,
            cap: self
                .cap
                .as_deref()
                .map(parse_cap)
                .transpose()
                .map_err(Fail::input)?,
            cap_is_old: false,
            pulses: None,
            load: false,
            details: {
                let holder = machine.holders().get(usize::from(holder)).map(|h| h.kind);
                self.details.read(diameter, tool, operation, holder)?
            },
        })
    }
}

fn known<T>(
    field: &str,
    word: &str,
    from: impl Fn(&str) -> Option<T>,
    all: &[&str],
) -> Result<T, Fail> {
    from(word).ok_or_else(|| {
        Fail::input(format!(
            "{field}: `{word}` is unknown; allowed: {}",
            all.join(", ")
        ))
    })
}
