//! Scenario files: a machine, a setup, what happens when, and what must then be seen.

mod check;

use std::path::{Path, PathBuf};

use rimrate_core::machine::Machine;
use rimrate_core::panel::Knob;
use rimrate_core::setup::{self, Setup};
use rimrate_core::tacho::Signal;
use rimrate_core::trade::{Coolant, Material, Operation, Tool};
use rimrate_core::units::Rpm;
use rimrate_core::verdict::Verdict;
use serde::Deserialize;

use crate::fail::Fail;
use crate::profile;
use crate::sensor::{Fault, SensorSpec};

/// The longest scenario: a working day.
const LONGEST_S: f64 = 86_400.0;

/// A scenario as written.
#[derive(Clone, Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Written {
    title: String,
    machine: PathBuf,
    seconds: f64,
    #[serde(default)]
    seed: u64,
    setup: WrittenSetup,
    #[serde(default)]
    sensor: WrittenSensor,
    #[serde(default)]
    say: Vec<WrittenNote>,
    #[serde(default)]
    at: Vec<WrittenAction>,
    #[serde(default)]
    expect: Vec<WrittenExpectation>,
}

#[derive(Clone, Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct WrittenSetup {
    material: Material,
    tool: Tool,
    operation: Operation,
    coolant: Coolant,
    diameter: String,
    holder: String,
    cap: Option<String>,
    pulses: Option<u16>,
}

#[derive(Clone, Debug, Default, Deserialize)]
#[serde(deny_unknown_fields)]
struct WrittenSensor {
    magnets: Option<u32>,
    placement_deg: Option<Vec<f64>>,
    width_deg: Option<f64>,
    jitter_deg: Option<f64>,
    dropout: Option<f64>,
    spike_rate: Option<f64>,
    shake_hz: Option<f64>,
    shake_low: Option<f64>,
}

/// What happens from here on, in words for whoever watches.
#[derive(Clone, Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct WrittenNote {
    t: f64,
    text: String,
}

#[derive(Clone, Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct WrittenAction {
    t: f64,
    r#do: Action,
}

/// A knob, as scenarios name it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum KnobName {
    /// Material.
    Left,
    /// Diameter.
    Right,
}

impl From<KnobName> for Knob {
    fn from(name: KnobName) -> Self {
        match name {
            KnobName::Left => Knob::Left,
            KnobName::Right => Knob::Right,
        }
    }
}

/// Which way the motor's switch stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum MotorTo {
    /// Off.
    Off,
    /// Forward.
    Forward,
    /// Reverse.
    Reverse,
}

/// A fault of the sensor, as scenarios name it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum FaultName {
    /// Edges fall into pieces.
    Chatter,
    /// Drive noise.
    Spikes,
    /// Pulses missed at random.
    Dropouts,
    /// The first magnet has come off.
    MagnetLost,
    /// Cable off or sensor dead.
    StuckHigh,
    /// Short circuit.
    StuckLow,
    /// A parked magnet shakes regularly.
    ShakeRegular,
    /// A parked magnet shakes at random.
    ShakeRandom,
}

impl From<FaultName> for Fault {
    fn from(name: FaultName) -> Self {
        match name {
            FaultName::Chatter => Fault::Chatter,
            FaultName::Spikes => Fault::Spikes,
            FaultName::Dropouts => Fault::Dropouts,
            FaultName::MagnetLost => Fault::MagnetLost(0),
            FaultName::StuckHigh => Fault::StuckHigh,
            FaultName::StuckLow => Fault::StuckLow,
            FaultName::ShakeRegular => Fault::ShakeRegular,
            FaultName::ShakeRandom => Fault::ShakeRandom,
        }
    }
}

/// A cut as scenarios write it; it is made at the setup's diameter.
#[derive(Clone, Copy, Debug, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct CutSpec {
    /// Specific cutting force, N/mm2.
    pub specific_force: f64,
    /// Depth of cut, mm.
    pub depth_mm: f64,
    /// Feed per revolution, mm.
    pub feed_mm: f64,
    /// Engagements in a turn, for an interrupted cut.
    pub times: Option<u32>,
    /// Share of the turn in the metal, for an interrupted cut.
    pub share: Option<f64>,
}

/// What somebody does, or what happens.
#[derive(Clone, Debug, PartialEq, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Action {
    /// Turns a knob.
    Turn {
        /// Which.
        knob: KnobName,
        /// Detents, clockwise positive.
        by: i8,
    },
    /// Presses a knob shortly.
    Press(KnobName),
    /// Holds a knob for a second.
    Hold(KnobName),
    /// Throws the motor's switch.
    Motor(MotorTo),
    /// Runs the motor for some seconds.
    Jog(f64),
    /// Turns the spindle by hand, the motor off: so many turns, pull by pull.
    HandTurn(f64),
    /// Moves the levers to a step, by its label; stepped drives only.
    Lever(String),
    /// Turns the speed dial, rpm of the spindle; variable drives only.
    Dial(f64),
    /// Engages a cut.
    Cut(CutSpec),
    /// Takes the tool out of the cut.
    Uncut,
    /// Foot brake, 0 to 1.
    Brake(f64),
    /// Stops by reversing the motor.
    Plug,
    /// A fault of the sensor begins.
    Fault(FaultName),
    /// A fault of the sensor ends.
    Mend(FaultName),
    /// The box is switched off and on.
    PowerCycle,
}

#[derive(Clone, Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct WrittenExpectation {
    t: f64,
    until: Option<f64>,
    verdict: Option<String>,
    never: Option<String>,
    signal: Option<String>,
    rpm: Option<f64>,
    within_percent: Option<f64>,
    text: Option<String>,
    lamp: Option<Lamp>,
    relay: Option<bool>,
}

/// One of the three lamps.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Lamp {
    /// The upper one.
    Over,
    /// The middle one.
    Right,
    /// The lower one.
    Under,
}

/// What must be seen.
#[derive(Clone, Debug, PartialEq)]
pub enum Wanted {
    /// This verdict.
    Verdict(Verdict),
    /// Any verdict but this.
    NeverVerdict(Verdict),
    /// This signal.
    Signal(Signal),
    /// The true speed, or a given one, within some percent.
    Speed {
        /// The speed; the simulated truth where missing.
        rpm: Option<f64>,
        /// How close.
        within_percent: f64,
    },
    /// These words on the panel.
    Text(String),
    /// This lamp lit.
    Lamp(Lamp),
    /// The relay closed or open.
    Relay(bool),
}

/// What must be seen from `from` until `until`, both in seconds.
#[derive(Clone, Debug, PartialEq)]
pub struct Expectation {
    /// From when.
    pub from: f64,
    /// Until when; the same as `from` for one moment.
    pub until: f64,
    /// What.
    pub wanted: Wanted,
}

/// A sound scenario.
#[derive(Clone, Debug)]
pub struct Scenario {
    /// What it shows.
    pub title: String,
    /// On which machine.
    pub machine: Machine,
    /// How long it takes, s.
    pub seconds: f64,
    /// Seed of everything random.
    pub seed: u64,
    /// What the box remembers at the start.
    pub setup: Setup,
    /// The sensor on the spindle.
    pub sensor: SensorSpec,
    /// What it is all about from a time on, in words, in order of time.
    pub notes: Vec<(f64, String)>,
    /// What happens, in order of time.
    pub actions: Vec<(f64, Action)>,
    /// What must be seen, in order of time.
    pub expectations: Vec<Expectation>,
}

impl Scenario {
    /// Reads a scenario file; a machine's path is relative to it.
    pub fn load(path: &Path) -> Result<Self, Fail> {
        let text = std::fs::read_to_string(path)
            .map_err(|e| Fail::file(path, format_args!("cannot be read: {e}")))?;
        Self::parse(&text, &path.display().to_string(), path.parent())
    }

    /// Reads a scenario's text.
    pub fn parse(text: &str, origin: &str, folder: Option<&Path>) -> Result<Self, Fail> {
        let written: Written =
            toml::from_str(text).map_err(|e| profile::not_toml(text, origin, &e))?;
        let fail = |field: &str, value: &dyn std::fmt::Display, allowed: &str| {
            Fail::input(format!(
                "{origin}: {field}: `{value}` is not allowed; allowed: {allowed}"
            ))
        };
        let beside = folder
            .map(|f| f.join(&written.machine))
            .filter(|p| p.is_file());
        let machine = profile::load(beside.as_deref().unwrap_or(&written.machine))?;
        if !(0.1..=LONGEST_S).contains(&written.seconds) {
            return Err(fail("seconds", &written.seconds, "0.1 to 86400"));
        }
        let setup = written
            .setup
            .check(&machine)
            .map_err(|e| Fail::input(format!("{origin}: setup.{e}")))?;
        let sensor = written
            .sensor
            .check(&machine)
            .map_err(|(f, v, a)| fail(f, &v, a))?;

        let mut notes = Vec::new();
        for (i, WrittenNote { t, text }) in written.say.into_iter().enumerate() {
            if !(0.0..=written.seconds).contains(&t) {
                return Err(fail(
                    &format!("say[{i}].t"),
                    &t,
                    "0 to the scenario's seconds",
                ));
            }
            notes.push((t, text));
        }
        notes.sort_by(|a, b| a.0.total_cmp(&b.0));

        let mut actions = Vec::new();
        for (i, WrittenAction { t, r#do }) in written.at.into_iter().enumerate() {
            let field = |name: &str| format!("at[{i}].{name}");
            if !(0.0..=written.seconds).contains(&t) {
                return Err(fail(&field("t"), &t, "0 to the scenario's seconds"));
            }
            check::action(&r#do, &machine)
                .map_err(|(name, value, allowed)| fail(&field(name), &value, &allowed))?;
            actions.push((t, r#do));
        }
        actions.sort_by(|a, b| a.0.total_cmp(&b.0));

        let mut expectations = Vec::new();
        for (i, wanted) in written.expect.into_iter().enumerate() {
            let (from, until) = (wanted.t, wanted.until.unwrap_or(wanted.t));
            if !(0.0..=written.seconds).contains(&from)
                || !(from..=written.seconds).contains(&until)
            {
                return Err(fail(
                    &format!("expect[{i}].t"),
                    &from,
                    "0 to the scenario's seconds, not after `until`",
                ));
            }
            let all = wanted
                .check()
                .map_err(|(f, v, a)| fail(&format!("expect[{i}].{f}"), &v, &a))?;
            expectations.extend(all.into_iter().map(|wanted| Expectation {
                from,
                until,
                wanted,
            }));
        }
        expectations.sort_by(|a, b| a.from.total_cmp(&b.from));
        Ok(Scenario {
            title: written.title,
            machine,
            seconds: written.seconds,
            seed: written.seed,
            setup,
            sensor,
            notes,
            actions,
            expectations,
        })
    }
}

/// Reads a cap; the error is one line.
pub fn parse_cap(text: &str) -> Result<Rpm, String> {
    let rpm: Rpm = text
        .parse()
        .map_err(|e| format!("cap: `{text}` {e}; allowed: 1 rpm to 100000 rpm"))?;
    setup::cap(rpm).map_err(|e| e.to_string())
}

/// Finds a holder; the error lists those that the machine has.
pub fn find_holder(machine: &Machine, word: &str) -> Result<u8, String> {
    machine.holder_named(word).ok_or_else(|| {
        let known: Vec<String> = machine
            .holders()
            .iter()
            .map(|h| format!("{} ({})", h.kind.id(), h.name))
            .collect();
        format!(
            "holder: `{word}` is not on this machine, or not the only one of its kind; allowed: {}",
            known.join(", ")
        )
    })
}
