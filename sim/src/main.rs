//! The `rimrate` command.

#![forbid(unsafe_code)]

use std::io::{self, Write};
use std::path::PathBuf;
use std::process::ExitCode;

use clap::{CommandFactory, FromArgMatches, Parser, Subcommand};
use rimrate_core::error::{Rejected, text};
use rimrate_core::machine;
use rimrate_core::tacho::Config;
use rimrate_sim::advise::Advise;
use rimrate_sim::fail::Fail;
use rimrate_sim::play::{self, Keep};
use rimrate_sim::replay;
use rimrate_sim::scenario::Scenario;
use rimrate_sim::terminal;

const DEMO: &str = include_str!("../scenarios/shift.toml");

#[derive(Parser)]
#[command(
    name = "rimrate",
    version,
    about = "Spindle speed for manual machine tools: what to set, what really turns, and whether that is right",
    long_about = "Spindle speed for manual machine tools: what to set, what really turns, and whether that is right.\n\n\
        Without a command it plays a demo shift on a simulated lathe: live at a terminal, as a log elsewhere.\n\
        Advisory only: it guards nothing. What is marked on holder, tool or machine always wins.",
    after_help = "Examples:\n  \
        rimrate\n  \
        rimrate advise --material mild-steel --tool hss --operation rough-turning --diameter \"25 mm\"\n  \
        rimrate play shift.toml --csv shift.csv --frames frames\n  \
        rimrate replay capture.vcd --pulses 2 --csv readings.csv\n\n\
        Exit status: 0 done, 1 an expectation of a scenario was missed, 2 the input is wrong."
)]
struct Cli {
    #[command(subcommand)]
    command: Option<Command>,
}

#[derive(Subcommand)]
enum Command {
    /// Say what to set for a cut, and why not faster.
    #[command(after_help = "Examples:\n  \
        rimrate advise --material mild-steel --tool hss --operation rough-turning --diameter \"25 mm\"\n  \
        rimrate advise --material brass --tool hss --operation drilling --diameter \"1/8 in\" --machine drill-press --json\n  \
        rimrate advise --material grey-cast-iron --tool carbide --operation facing --diameter \"150 mm\" --holder faceplate --cap 400\n  \
        rimrate advise --material low-alloy-steel --tool carbide --operation rough-turning --diameter \"50 mm\" --depth \"4 mm\"\n  \
        rimrate advise --material mild-steel --tool coated-carbide --operation finish-turning --diameter \"50 mm\" --box-speed \"250 m/min\" --life \"2 h\" --ra \"1.6 um\"\n  \
        rimrate advise --material mild-steel --tool hss --operation threading --diameter \"12 mm\" --lead \"1.75 mm\" --runout \"6 mm\"\n  \
        rimrate advise --list")]
    Advise(Box<Advise>),
    /// Play a scenario file without a face, as fast as it goes.
    #[command(after_help = "Examples:\n  \
        rimrate play shift.toml\n  \
        rimrate play shift.toml --csv shift.csv --vcd shift.vcd --frames frames")]
    Play {
        /// The scenario file (TOML).
        file: PathBuf,
        /// Keep the readings as CSV: time_s, rpm, signal.
        #[arg(long, value_name = "FILE")]
        csv: Option<PathBuf>,
        /// Keep the panel's picture every half second, as PNG files in this folder.
        #[arg(long, value_name = "DIR")]
        frames: Option<PathBuf>,
        /// Keep the sensor's line as a capture (VCD).
        #[arg(long, value_name = "FILE")]
        vcd: Option<PathBuf>,
    },
    /// Read a logic analyser's capture of a hall sensor through the instrument's tacho.
    #[command(after_help = "Examples:\n  \
        rimrate replay capture.vcd --pulses 2\n  \
        rimrate replay capture.vcd --pulses 1 --signal D0 --brake 1500 --slowest 20 --csv readings.csv\n\n\
        The line is low while a magnet faces the sensor. CSV columns: time_s, rpm, signal; a row every 50 ms;\n\
        rpm is 0 when still and empty when lost.")]
    Replay {
        /// The capture (IEEE 1364 VCD).
        capture: PathBuf,
        /// Pulses in one revolution, 1 to 240.
        #[arg(long, value_name = "N")]
        pulses: String,
        /// Name of the sensor's signal, where the capture has several.
        #[arg(long, value_name = "NAME")]
        signal: Option<String>,
        /// Hardest stop of the machine, rpm per second.
        #[arg(long, value_name = "RPM_PER_S", default_value_t = machine::DEFAULT_BRAKE_RPM_PER_S.to_string())]
        brake: String,
        /// Slowest speed worth reading, rpm.
        #[arg(long, value_name = "RPM", default_value_t = machine::DEFAULT_SLOWEST_RPM.to_string())]
        slowest: String,
        /// Keep the readings as CSV: time_s, rpm, signal.
        #[arg(long, value_name = "FILE")]
        csv: Option<PathBuf>,
    },
}

fn main() -> ExitCode {
    let result = match parse().command {
        None => shift(),
        Some(Command::Advise(advise)) => advise.run(&mut io::stdout().lock()),
        Some(Command::Play {
            file,
            csv,
            frames,
            vcd,
        }) => play(&file, &Keep { csv, frames, vcd }),
        Some(Command::Replay {
            capture,
            pulses,
            signal,
            brake,
            slowest,
            csv,
        }) => config(&pulses, &brake, &slowest).and_then(|config| {
            let outcome = replay::replay(&capture, config, signal.as_deref(), csv.as_deref())?;
            print(|out| outcome.report(out))
        }),
    };
    match result {
        Ok(()) => ExitCode::SUCCESS,
        Err(fail) => {
            // One line, whatever was typed.
            eprintln!("error: {}", fail.to_string().replace(['\n', '\r'], " "));
            ExitCode::from(fail.status())
        }
    }
}

/// Reads the command line. A value may begin with a minus sign: it is then refused by name and range, not as an option.
fn parse() -> Cli {
    let command = Cli::command().mut_subcommands(|command| {
        command.mut_args(|arg| {
            let value = !arg.is_positional() && arg.get_action().takes_values();
            arg.allow_hyphen_values(value)
        })
    });
    Cli::from_arg_matches(&command.get_matches()).unwrap_or_else(|e| e.exit())
}

fn shift() -> Result<(), Fail> {
    let scenario = Scenario::parse(DEMO, "the built-in shift", None)?;
    if terminal::somebody_watches() {
        return terminal::run(&scenario);
    }
    finish(&scenario, &Keep::default())
}

fn play(file: &std::path::Path, keep: &Keep) -> Result<(), Fail> {
    finish(&Scenario::load(file)?, keep)
}

fn finish(scenario: &Scenario, keep: &Keep) -> Result<(), Fail> {
    let summary = play::play(scenario, keep)?;
    print(|out| play::report(scenario, &summary, out))?;
    match summary.missed.len() {
        0 => Ok(()),
        n => Err(Fail::Missed(format!(
            "{n} of {} expectations missed",
            scenario.expectations.len()
        ))),
    }
}

fn config(pulses: &str, brake: &str, slowest: &str) -> Result<Config, Fail> {
    Ok(Config {
        pulses: option("pulses", pulses, machine::pulses, machine::pulses(0))?,
        brake_rpm_per_s: option("brake", brake, machine::braking, machine::braking(0.0))?,
        slowest: option("slowest", slowest, machine::slowest, machine::slowest(0.0))?,
    })
}

/// Reads an option's number and checks it. `zero` is what the check says of 0: it knows what is allowed.
fn option<N: std::str::FromStr, T>(
    name: &str,
    word: &str,
    check: impl Fn(N) -> Result<T, Rejected>,
    zero: Result<T, Rejected>,
) -> Result<T, Fail> {
    let checked = match word.parse() {
        Ok(number) => check(number),
        Err(_) => zero.map_err(|e| Rejected {
            problem: "is not allowed",
            ..e
        }),
    };
    checked.map_err(|e| {
        Fail::input(Rejected {
            field: text(name),
            value: text(word),
            ..e
        })
    })
}

/// Prints to standard output; somebody who closes the pipe has read enough.
fn print(write: impl FnOnce(&mut io::StdoutLock<'_>) -> io::Result<()>) -> Result<(), Fail> {
    let mut out = io::stdout().lock();
    match write(&mut out).and_then(|()| out.flush()) {
        Err(e) if e.kind() != io::ErrorKind::BrokenPipe => Err(Fail::input(format!("output: {e}"))),
        _ => Ok(()),
    }
}
