//! What to set for a cut, as text or JSON.

use std::fmt::Write as _;
use std::io::{self, Write};
use std::path::PathBuf;

use clap::Args;
use rimrate_core::advice::{Advice, Kind, Pick, Side, advise};
use rimrate_core::machine::{Drive, Holder, Machine, MachineKind};
use rimrate_core::physics::cutting_speed::surface_speed_m_min;
use rimrate_core::setup::{Diameter, Setup};
use rimrate_core::trade::{self, Coolant, CuttingSpeed, Material, Operation, Tool};
use rimrate_core::units::UnitSystem;
use serde_json::{Value, json};

use crate::fail::Fail;
use crate::profile;
use crate::scenario::{find_holder, parse_cap};

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
}

impl Advise {
    /// Answers on `out`.
    pub fn run(&self, out: &mut impl Write) -> Result<(), Fail> {
        let text = if self.list {
            list()
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
        Ok(Setup {
            material: known(
                "material",
                &word(&self.material),
                Material::from_id,
                &Material::ALL.map(Material::id),
            )?,
            tool: known(
                "tool",
                &word(&self.tool),
                Tool::from_id,
                &Tool::ALL.map(Tool::id),
            )?,
            operation: known(
                "operation",
                &word(&self.operation),
                Operation::from_id,
                &Operation::ALL.map(Operation::id),
            )?,
            coolant: known(
                "coolant",
                &self.coolant,
                Coolant::from_id,
                &Coolant::ALL.map(Coolant::id),
            )?,
            diameter: Diameter::parse(&word(&self.diameter)).map_err(Fail::input)?,
            holder,
            cap: self
                .cap
                .as_deref()
                .map(parse_cap)
                .transpose()
                .map_err(Fail::input)?,
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

struct Answer<'a> {
    setup: &'a Setup,
    machine: &'a Machine,
    advice: &'a Advice,
    cutting: &'a CuttingSpeed,
}

impl Answer<'_> {
    fn holder(&self) -> Option<&Holder> {
        self.machine.holders().get(usize::from(self.setup.holder))
    }

    /// The cautions that go with this cut, most pressing first.
    fn cautions(&self) -> Vec<String> {
        let mut cautions = Vec::new();
        if self.advice.pick == Pick::NeedsCap {
            cautions.push(format!(
                "The {} has no stamped speed: set none until you know what it and the work allow, then give it as a cap.",
                self.holder().map_or("holder", |h| h.name.as_str())
            ));
        }
        if let Some(caution) = self.setup.material.caution() {
            cautions.push(caution.to_owned());
        }
        if let Some(short) = self.advice.short_percent().filter(|&p| p > 30.0) {
            cautions.push(format!(
                "The machine stays {short:.0} % below the best speed: feed by hand more slowly in proportion, small drills break."
            ));
        }
        if self.setup.operation == Operation::Facing || self.setup.operation == Operation::Parting {
            cautions.push("The speed is for the outside; towards the centre a faster one would be right: do not shift in mid-cut.".into());
        }
        cautions.push(match self.machine.kind() {
            MachineKind::Lathe => "Stop the spindle before shifting; chuck key out; work gripped to depth and turned once by hand.".into(),
            MachineKind::Mill | MachineKind::DrillPress => {
                "Stop the spindle before shifting; work clamped; chuck key out; sleeves and gloves away.".to_owned()
            }
        });
        cautions.push("Advisory only: what is marked on holder, tool or machine, and their makers' limits, always win.".into());
        cautions
    }

    fn json(&self) -> Value {
        let advice = self.advice;
        let window = &advice.window;
        let round = |x: f32| (f64::from(x) * 100.0).round() / 100.0;
        let bounds: Vec<Value> = advice
            .bounds
            .iter()
            .map(|b| {
                json!({
                    "rpm": round(b.at.get()),
                    "reason": b.reason.code(),
                    "kind": b.kind.code(),
                    "side": match b.side { Side::Upper => "upper", Side::Lower => "lower" },
                    "text": b.to_string(),
                })
            })
            .collect();
        let setting = |s: &rimrate_core::advice::Setting| json!({ "label": s.label.as_str(), "rpm": round(s.rpm.get()) });
        let (pick, nearest) = match &advice.pick {
            Pick::Set(s) => (setting(s), Value::Null),
            Pick::TooFast {
                nearest,
                over_percent,
            } => {
                let mut nearest = setting(nearest);
                nearest["over_percent"] = json!(round(*over_percent));
                (Value::Null, nearest)
            }
            Pick::NeedsCap | Pick::NoBasis(_) => (Value::Null, Value::Null),
        };
        json!({
            "material": self.setup.material.id(),
            "tool": self.setup.tool.id(),
            "operation": self.setup.operation.id(),
            "coolant": self.setup.coolant.id(),
            "diameter_mm": self.setup.diameter.mm(),
            "machine": self.machine.name(),
            "holder": self.holder().map(|h| h.name.as_str()),
            "surface_speed_m_min": round(self.cutting.ours.m_min()),
            "surface_speed_range_m_min": [round(self.cutting.range.0.m_min()), round(self.cutting.range.1.m_min())],
            "window_rpm": {
                "low": window.low.map_or(0.0, |b| round(b.at.get())),
                "best": round(window.best().get()),
                "high": round(window.high.at.get()),
            },
            "held_by": window.high.reason.code(),
            "bounds": bounds,
            "pick": pick,
            "nearest": nearest,
            "needs_cap": advice.pick == Pick::NeedsCap,
            "conflict": window.conflict(),
            "cautions": self.cautions(),
        })
    }

    fn text(&self) -> String {
        let (setup, advice, cutting) = (self.setup, self.advice, self.cutting);
        let mut text = String::new();
        let mut say = |line: std::fmt::Arguments<'_>| {
            // Writing into a String cannot fail.
            let _ = writeln!(text, "{line}");
        };
        let speed = |v: rimrate_core::units::SurfaceSpeed| {
            format!(
                "{} ({})",
                v.display(UnitSystem::Metric),
                v.display(UnitSystem::Inch)
            )
        };
        say(format_args!(
            "{}, {}, {}, {} {}, {}",
            setup.material.name(),
            setup.tool.name(),
            setup.operation.name(),
            setup.operation.diameter_word(),
            setup.diameter.length().display(self.machine.units()),
            match setup.coolant {
                Coolant::Flood => "with cutting fluid",
                Coolant::Dry => "dry",
            }
        ));
        say(format_args!(
            "on the {}, held by {}",
            self.machine.name(),
            match self.holder() {
                Some(Holder {
                    name,
                    rated: Some(n),
                    ..
                }) => format!("{name}, stamped {n}"),
                Some(Holder {
                    name, rated: None, ..
                }) => format!("{name}, which has no stamped speed"),
                None => "nothing".to_owned(),
            }
        ));
        say(format_args!(
            "cutting speed  {}: {}",
            speed(cutting.ours),
            cutting.how
        ));
        say(format_args!(
            "best speed     {}, held by the {}",
            advice.window.best(),
            advice.window.high.reason.words()
        ));
        match &advice.pick {
            Pick::Set(s) => {
                let v = surface_speed_m_min(s.rpm, setup.diameter);
                let how = match self.machine.drive() {
                    Drive::Stepped(_) => "set the step   ",
                    Drive::Variable(_) => "set the drive  ",
                };
                say(format_args!(
                    "{how}{} at {}: the edge then runs at {v:.1} m/min",
                    s.label, s.rpm
                ));
                say(format_args!(
                    "reads right    from {} to {}",
                    advice.slow_below(),
                    self.right_until()
                ));
            }
            Pick::TooFast {
                nearest,
                over_percent,
            } => say(format_args!(
                "set no step    even the slowest, {} at {}, is {over_percent:.0} % too fast",
                nearest.label, nearest.rpm
            )),
            Pick::NeedsCap => {
                say(format_args!(
                    "set no step    nothing reads right until you give a cap (--cap): the holder is unrated"
                ));
            }
            Pick::NoBasis(refusal) => say(format_args!("set no step    {refusal}")),
        }
        say(format_args!("bounds         lowest first"));
        let mut bounds = advice.bounds.to_vec();
        bounds.sort_by(|a, b| a.at.get().total_cmp(&b.at.get()));
        for bound in bounds {
            let kind = match bound.kind {
                Kind::Hard => "something may break loose beyond it",
                Kind::Soft => "edge, finish or motor suffer beyond it",
            };
            say(format_args!("  {bound} ({kind})"));
        }
        for caution in self.cautions() {
            say(format_args!("caution        {caution}"));
        }
        text
    }

    /// Where the verdict leaves right upwards.
    fn right_until(&self) -> rimrate_core::units::Rpm {
        let window = &self.advice.window;
        let fast = window
            .soft
            .map(|b| b.at.scaled(rimrate_core::advice::FAST_ABOVE));
        let hard = window.hard.map(|b| b.at);
        [fast, hard]
            .into_iter()
            .flatten()
            .reduce(|a, b| if b < a { b } else { a })
            .unwrap_or(window.best())
    }
}

/// Every known combination with its range, where we sit in it, and the source.
fn list() -> String {
    let mut text = String::from("materials (ISO 513 group, identifier, name)\n");
    for m in Material::ALL {
        let _ = writeln!(
            text,
            "  {}  {:<24} {}",
            m.group().letter(),
            m.id(),
            m.name()
        );
    }
    text.push_str("tools\n");
    for t in Tool::ALL {
        let _ = writeln!(text, "  {:<27} {}", t.id(), t.name());
    }
    text.push_str("operations\n");
    for o in Operation::ALL {
        let _ = writeln!(
            text,
            "  {:<27} {}, by the diameter of the {}",
            o.id(),
            o.name(),
            o.diameter_word()
        );
    }
    text.push_str("cutting speeds with fluid, m/min: ours, from the published range, and how\n");
    for m in Material::ALL {
        for t in Tool::ALL {
            for o in Operation::ALL {
                let place = format!("{} {} {}", m.id(), t.id(), o.id());
                let coolant = if trade::cutting_speed(m, t, o, Coolant::Flood).is_ok() {
                    Coolant::Flood
                } else {
                    Coolant::Dry
                };
                let _ = match trade::cutting_speed(m, t, o, coolant) {
                    Ok(c) => writeln!(
                        text,
                        "  {place:<52} {:7.1}  from {:.1} to {:.1}{}: {}",
                        c.ours.m_min(),
                        c.range.0.m_min(),
                        c.range.1.m_min(),
                        if coolant == Coolant::Dry { ", dry" } else { "" },
                        c.how
                    ),
                    Err(refusal) => writeln!(text, "  {place:<52} refused: {refusal}"),
                };
            }
        }
    }
    text
}
