//! Plays a scenario without a face, as fast as it goes, and checks what it expects.

use std::collections::BTreeMap;
use std::io::{IsTerminal, Write};
use std::path::PathBuf;
use std::time;

use indicatif::{ProgressBar, ProgressStyle};
use rimrate_core::time::Instant;
use rimrate_core::units::Rpm;
use rimrate_core::verdict::Verdict;

use crate::bench::Bench;
use crate::fail::Fail;
use crate::record::{self, Capture, ROW_MS, Readings};
use crate::rig::{Desk, Rig};
use crate::scenario::{Expectation, Lamp, Scenario, Wanted};

/// Frames are kept this often, ms.
const FRAME_MS: u64 = 500;
/// Expectations that last are looked at this often, ms.
const LOOK_MS: u64 = 10;

/// Which files a run leaves.
#[derive(Clone, Debug, Default)]
pub struct Keep {
    /// Readings as CSV.
    pub csv: Option<PathBuf>,
    /// A folder of PNG frames.
    pub frames: Option<PathBuf>,
    /// The sensor's line as VCD.
    pub vcd: Option<PathBuf>,
}

/// What a run came to.
#[derive(Clone, Debug)]
pub struct Summary {
    /// Simulated seconds.
    pub simulated_s: f64,
    /// Seconds that it took.
    pub took_s: f64,
    /// Time in each verdict, s.
    pub verdicts: BTreeMap<&'static str, f64>,
    /// Changes of the verdict: when, to what, and the true speed.
    pub changes: Vec<(f64, Verdict, f64)>,
    /// Highest speed that was read.
    pub highest: Rpm,
    /// Pulses of the sensor.
    pub pulses: u64,
    /// Expectations that were met.
    pub met: usize,
    /// Expectations that were missed, in words.
    pub missed: Vec<String>,
}

impl Summary {
    /// How many times faster than real time it went.
    pub fn speed_up(&self) -> f64 {
        self.simulated_s / self.took_s.max(1e-9)
    }
}

/// Plays a scenario on the instrument in this process.
pub fn play(scenario: &Scenario, keep: &Keep) -> Result<Summary, Fail> {
    let desk = Desk::new(scenario.machine.clone(), Some(scenario.setup));
    play_on(scenario, desk, keep)
}

/// Plays a scenario on any box.
pub fn play_on<R: Rig>(scenario: &Scenario, rig: R, keep: &Keep) -> Result<Summary, Fail> {
    let started = time::Instant::now();
    let mut csv = keep.csv.as_deref().map(Readings::begin).transpose()?;
    let mut vcd = keep.vcd.as_deref().map(Capture::begin).transpose()?;
    if let Some(folder) = &keep.frames {
        std::fs::create_dir_all(folder)
            .map_err(|e| Fail::file(folder, format_args!("cannot be made: {e}")))?;
    }
    let mut bench = Bench::new(
        scenario.machine.clone(),
        scenario.sensor.clone(),
        scenario.seed,
        rig,
    );
    let end = at_ms((scenario.seconds * 1e3) as u64);
    let progress = progress(end.nanos());
    let mut log = Log::default();
    let mut watch = Watch::new(&scenario.expectations);
    let mut actions = scenario.actions.iter().peekable();
    let mut ms = 0;
    let mut captured: Result<(), Fail> = Ok(());

    loop {
        let now = bench.now();
        while let Some((_, action)) = actions.next_if(|(t, _)| seconds(now) + 1e-9 >= *t) {
            bench.act(action, &scenario.setup);
        }
        log.see(
            now,
            bench.rig.verdict(),
            bench.lathe().smooth_rpm(),
            bench.rig.reading().speed,
        );
        watch.look(seconds(now), &bench);
        if let Some(csv) = csv.as_mut().filter(|_| ms % ROW_MS == 0) {
            csv.row(now, &bench.rig.reading())?;
        }
        if let Some(folder) = keep.frames.as_ref().filter(|_| ms % FRAME_MS == 0) {
            record::picture(&folder.join(format!("{ms:07}ms.png")), bench.rig.frame())?;
        }
        if now >= end {
            break;
        }
        ms += LOOK_MS;
        bench.run(at_ms(ms).min(end), |edges| {
            if let (Some(vcd), Ok(())) = (vcd.as_mut(), &captured) {
                captured = vcd.edges(edges);
            }
        });
        if ms % 1000 == 0 {
            progress.set_position(bench.now().nanos());
        }
    }
    progress.finish_and_clear();
    captured?;
    csv.map(Readings::finish).transpose()?;
    vcd.map(|vcd| vcd.finish(end)).transpose()?;
    Ok(Summary {
        simulated_s: seconds(end),
        took_s: started.elapsed().as_secs_f64(),
        verdicts: log.verdicts,
        changes: log.changes,
        highest: log.highest,
        pulses: bench.pulses(),
        met: watch.met(),
        missed: watch.missed,
    })
}

fn at_ms(ms: u64) -> Instant {
    Instant::from_nanos(ms * 1_000_000)
}

fn seconds(at: Instant) -> f64 {
    at.nanos() as f64 / 1e9
}

/// A bar for runs that take longer than a second; nothing where nobody looks.
pub fn progress(length: u64) -> ProgressBar {
    if !std::io::stderr().is_terminal() {
        return ProgressBar::hidden();
    }
    let style = ProgressStyle::with_template("{bar:40} {percent} %  {eta} left");
    ProgressBar::new(length).with_style(style.unwrap_or_else(|_| ProgressStyle::default_bar()))
}

#[derive(Default)]
struct Log {
    verdicts: BTreeMap<&'static str, f64>,
    changes: Vec<(f64, Verdict, f64)>,
    highest: Rpm,
    last: Option<(f64, Verdict)>,
}

impl Log {
    fn see(&mut self, now: Instant, verdict: Verdict, truth: f64, speed: Option<Rpm>) {
        let now = seconds(now);
        if let Some((since, last)) = self.last {
            *self.verdicts.entry(last.id()).or_default() += now - since;
        }
        if self.last.is_none_or(|(_, last)| last != verdict) {
            self.changes.push((now, verdict, truth));
        }
        self.last = Some((now, verdict));
        if let Some(speed) = speed.filter(|&n| n > self.highest) {
            self.highest = speed;
        }
    }
}

struct Watch<'a> {
    expectations: &'a [Expectation],
    done: Vec<bool>,
    failed: Vec<bool>,
    missed: Vec<String>,
}

impl<'a> Watch<'a> {
    fn new(expectations: &'a [Expectation]) -> Self {
        let none = vec![false; expectations.len()];
        Watch {
            expectations,
            done: none.clone(),
            failed: none,
            missed: Vec::new(),
        }
    }

    fn met(&self) -> usize {
        self.failed.iter().filter(|&&failed| !failed).count()
    }

    fn look<R: Rig>(&mut self, now: f64, bench: &Bench<R>) {
        for (i, expectation) in self.expectations.iter().enumerate() {
            let over = now > expectation.until + 1e-9;
            if now + 1e-9 < expectation.from || self.failed[i] || over && self.done[i] {
                continue;
            }
            self.done[i] = true;
            if let Err(seen) = check(&expectation.wanted, bench) {
                self.failed[i] = true;
                self.missed.push(format!("at {now:.2} s: {seen}"));
            }
        }
    }
}

/// `Err` says what was expected and what was seen.
fn check<R: Rig>(wanted: &Wanted, bench: &Bench<R>) -> Result<(), String> {
    let rig = &bench.rig;
    let same = |ok: bool, wanted: &dyn std::fmt::Display, seen: &dyn std::fmt::Display| {
        if ok {
            Ok(())
        } else {
            Err(format!("expected {wanted}, saw {seen}"))
        }
    };
    match wanted {
        Wanted::Verdict(verdict) => same(
            rig.verdict() == *verdict,
            &format!("verdict {}", verdict.id()),
            &rig.verdict().id(),
        ),
        Wanted::NeverVerdict(verdict) => same(
            rig.verdict() != *verdict,
            &format!("any verdict but {}", verdict.id()),
            &rig.verdict().id(),
        ),
        Wanted::Signal(signal) => {
            let seen = rig.reading().signal;
            same(
                seen == *signal,
                &format!("signal {}", signal.id()),
                &seen.id(),
            )
        }
        Wanted::Speed {
            rpm,
            within_percent,
        } => {
            let rpm = rpm.unwrap_or_else(|| bench.lathe().smooth_rpm().abs());
            let seen = rig.reading().speed.map(|n| f64::from(n.get()));
            let close = seen.is_some_and(|n| (n - rpm).abs() <= within_percent / 100.0 * rpm);
            let seen = seen.map_or("no speed".to_owned(), |n| format!("{n:.2} rpm"));
            same(
                close,
                &format!("{rpm:.2} rpm within {within_percent} %"),
                &seen,
            )
        }
        // The picture is put into words only where they are needed.
        Wanted::Text(words) if rig.frame().shows(words) => Ok(()),
        Wanted::Text(words) => same(
            false,
            &format!("`{words}` on the panel"),
            &format!("\n{}", rig.frame().to_text()),
        ),
        Wanted::Lamp(lamp) => {
            let outputs = rig.outputs();
            let (lit, name) = match lamp {
                Lamp::Over => (outputs.over, "over"),
                Lamp::Right => (outputs.right, "right"),
                Lamp::Under => (outputs.under, "under"),
            };
            same(lit, &format!("lamp {name} lit"), &"dark")
        }
        Wanted::Relay(closed) => {
            let word = |closed| if closed { "closed" } else { "open" };
            let seen = rig.outputs().relay;
            same(
                seen == *closed,
                &format!("relay {}", word(*closed)),
                &word(seen),
            )
        }
    }
}

/// Prints a run: each stage in a sentence and each change of the verdict in it, then what it came to.
pub fn report(scenario: &Scenario, summary: &Summary, out: &mut impl Write) -> std::io::Result<()> {
    writeln!(
        out,
        "{}, on the {}",
        scenario.title,
        scenario.machine.name()
    )?;
    let mut notes = scenario.notes.iter().peekable();
    for (at, verdict, truth) in &summary.changes {
        while let Some((_, note)) = notes.next_if(|(t, _)| t <= at) {
            writeln!(out, "{note}")?;
        }
        writeln!(
            out,
            "  {at:8.2} s  {:<11}  spindle at {truth:6.1} rpm",
            verdict.id()
        )?;
    }
    for (_, note) in notes {
        writeln!(out, "{note}")?;
    }
    for missed in &summary.missed {
        writeln!(out, "  MISSED {missed}")?;
    }
    let times: Vec<String> = summary
        .verdicts
        .iter()
        .map(|(v, s)| format!("{v} {s:.1} s"))
        .collect();
    writeln!(out, "verdicts: {}", times.join(", "))?;
    writeln!(
        out,
        "highest speed read {}, {} pulses, {} of {} expectations met",
        summary.highest,
        summary.pulses,
        summary.met,
        scenario.expectations.len()
    )?;
    writeln!(
        out,
        "{:.1} s simulated in {:.3} s: {:.0} times real time",
        summary.simulated_s,
        summary.took_s,
        summary.speed_up()
    )
}
