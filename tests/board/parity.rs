//! Every scenario on the desk and on the board at once: the same verdicts, lamps and pictures.
//!
//! The tolerance is 100 ms in time, either way, and nothing else: what the board shows at a moment, the desk has shown
//! within 100 ms of it, and the other way round where it stood for a look of the instrument; a picture that one of them shows unchanged for all of these 200 ms, the
//! other shows in their middle, pixel for pixel.

use std::collections::VecDeque;
use std::path::{Path, PathBuf};
use std::sync::Mutex;
use std::time;

use rimrate_core::beacon::Outputs;
use rimrate_core::machine::MachineSpec;
use rimrate_core::tacho::Reading;
use rimrate_core::time::{Edge, Instant};
use rimrate_core::verdict::Verdict;
use rimrate_sim::bench::SLICE;
use rimrate_sim::frame::Frame;
use rimrate_sim::play::{Keep, play_on};
use rimrate_sim::rig::{Desk, Rig, Touch};
use rimrate_sim::scenario::Scenario;

use crate::rig::{CONTACT, Emulator, Start};
use crate::support::{STARTED_MS, UNFED, profile};

/// How much later or earlier the board may be, ns.
const TOLERANCE: u64 = 100_000_000;
/// The instrument is asked this often while the spindle may turn, ns, and the desk's more often: what stood for a shorter
/// time there, the board may miss.
const LOOK: u64 = 20_000_000;
/// Pulses shorter than this, ns, the capture may miss: it looks at the line every third cycle of 8 ns. The input's filter lets
/// none of them through.
const CAPTURE: u64 = 24;
/// The buzzer's pitch comes out of a divider, in whole microseconds a period.
const PITCH: f64 = 0.01;
/// The board tells its counts once a second, and not at once, ns.
const COUNTED: u64 = 1_100_000_000;
/// At least this much mixed work is done in a run of all checks, s.
const MIXED_WORK: f64 = 300.0;

/// What a box showed at a moment.
#[derive(Clone, Copy)]
struct Shown {
    at: u64,
    verdict: Verdict,
    outputs: Outputs,
    frame: Frame,
    /// Since when it shows this picture.
    since: u64,
}

/// What a box showed in the last while.
#[derive(Default)]
struct History(VecDeque<Shown>);

impl History {
    fn note(&mut self, rig: &impl Rig, at: u64) {
        let frame = *rig.frame();
        let last = self.0.back().filter(|s| s.frame == frame);
        self.0.push_back(Shown {
            at,
            verdict: rig.verdict(),
            outputs: rig.outputs(),
            frame,
            since: last.map_or(at, |s| s.since),
        });
        while self.0.front().is_some_and(|s| s.at + 2 * TOLERANCE < at) {
            self.0.pop_front();
        }
    }

    /// What was shown at the moment whose tolerance ends now; `None` while that is not whole.
    fn middle(&self) -> Option<&Shown> {
        let (first, last) = (self.0.front()?.at, self.0.back()?.at);
        (last - first >= 2 * TOLERANCE)
            .then(|| self.0.iter().find(|s| s.at + TOLERANCE >= last))
            .flatten()
    }

    /// For how long verdict and outputs stood as they were at that moment.
    fn stood_for(&self, shown: &Shown) -> u64 {
        let other = |s: &&Shown| s.verdict != shown.verdict || s.outputs != shown.outputs;
        let before = self.0.iter().rev().filter(|s| s.at < shown.at).find(other);
        let after = self.0.iter().filter(|s| s.at > shown.at).find(other);
        match (before, after) {
            // From the look after the one before.
            (Some(before), Some(after)) => after.at - before.at - SLICE.nanos(),
            _ => TOLERANCE,
        }
    }

    /// The picture that stood for all the time.
    fn stood(&self) -> Option<&Frame> {
        let (first, last) = (self.0.front()?, self.0.back()?);
        (last.since <= first.at).then_some(&last.frame)
    }

    /// Says in what `shown` differs from all of it.
    fn lacks(&self, shown: &Shown) -> Option<String> {
        if self.0.iter().all(|s| s.verdict != shown.verdict) {
            return Some(format!("verdict {:?}", shown.verdict));
        }
        if !self.0.iter().any(|s| alike(&s.outputs, &shown.outputs)) {
            return Some(format!("{:?}", shown.outputs));
        }
        self.stood()
            .filter(|stood| **stood != shown.frame)
            .map(|stood| format!("{:?}where for 200 ms it was {stood:?}", shown.frame))
    }
}

fn alike(a: &Outputs, b: &Outputs) -> bool {
    let silent = |o: &Outputs| Outputs {
        buzzer_hz: None,
        ..*o
    };
    let pitch = |o: &Outputs| o.buzzer_hz.map_or(0.0, f64::from);
    silent(a) == silent(b) && (pitch(a) - pitch(b)).abs() <= PITCH * pitch(a)
}

/// Both boxes. The desk answers; the board is compared.
struct Both {
    desk: Desk,
    board: Emulator,
    /// The board takes its time to start.
    compare_from: u64,
    seen: [History; 2],
    /// Detents that the board's knob passes later: a hand takes as long on the desk.
    detents: VecDeque<(Instant, Touch)>,
    edges: u64,
    /// How many came in which slice of the last while, and how many nobody can count: the board tells its count once a
    /// second, and starts anew at a power cut.
    recent: VecDeque<(u64, u64)>,
    uncounted: u64,
    /// Pulses, low or high, that the capture may miss.
    short: u64,
    compared: usize,
    different: Vec<String>,
}

impl Rig for &mut Both {
    fn run(&mut self, edges: &[Edge], now: Instant) {
        let mut left = edges;
        while let Some((at, touch)) = self.detents.front().copied().filter(|(at, _)| *at <= now) {
            self.detents.pop_front();
            let (due, later) = left.split_at(left.partition_point(|e| e.at <= at));
            self.desk.run(due, at);
            self.desk.touch(touch);
            left = later;
        }
        self.desk.run(left, now);
        self.board.run(edges, now);
        self.edges += edges.len() as u64;
        let short = |pair: &&[Edge]| pair[1].at.since(pair[0].at).nanos() < CAPTURE;
        self.short += edges.windows(2).filter(short).count() as u64;
        let at = now.nanos();
        self.recent.push_back((at, edges.len() as u64));
        while self.recent.front().is_some_and(|r| r.0 + COUNTED < at) {
            self.recent.pop_front();
        }
        if at < self.compare_from {
            self.uncounted += edges.len() as u64;
            return;
        }
        let [desk, board] = &mut self.seen;
        desk.note(&self.desk, at);
        board.note(&self.board, at);
        let (Some(d), Some(b)) = (desk.middle(), board.middle()) else {
            return;
        };
        self.compared += usize::from(desk.stood().is_some() || board.stood().is_some());
        let at = d.at as f64 / 1e9;
        // The lamps are set one after the other: what was seen once only, was seen between.
        if board.stood_for(b) > SLICE.nanos()
            && let Some(what) = desk.lacks(b)
        {
            self.different
                .push(format!("{at:.3} s: the board alone shows {what}"));
        }
        if desk.stood_for(d) >= LOOK
            && let Some(what) = board.lacks(d)
        {
            self.different
                .push(format!("{at:.3} s: the desk alone shows {what}"));
        }
    }

    fn touch(&mut self, touch: Touch) {
        self.board.touch(touch);
        if let Touch::Turn(knob, by) = touch {
            // A detent is passed with the last of its four contact changes.
            let passed = |i: u64| Instant::from_nanos(self.board.now() + (4 * i + 3) * CONTACT);
            let detents = (0..u64::from(by.unsigned_abs())).map(passed);
            self.detents
                .extend(detents.map(|at| (at, Touch::Turn(knob, by.signum()))));
        } else {
            self.desk.touch(touch);
        }
    }
    fn power_cycle(&mut self) {
        self.desk.power_cycle();
        self.board.power_cycle();
        self.uncounted += self.recent.drain(..).map(|r| r.1).sum::<u64>();
        self.compare_from = self.board.now() + STARTED_MS * 1_000_000;
        self.seen = Default::default();
    }
    fn frame(&self) -> &Frame {
        self.desk.frame()
    }
    fn outputs(&self) -> Outputs {
        self.desk.outputs()
    }
    fn verdict(&self) -> Verdict {
        self.desk.verdict()
    }
    fn reading(&self) -> Reading {
        self.desk.reading()
    }
}

/// What a scenario came to on both.
struct Outcome {
    file: PathBuf,
    seconds: f64,
    stack: u64,
    problems: Vec<String>,
}

fn played(file: &Path) -> Outcome {
    let started = time::Instant::now();
    let scenario = Scenario::load(file).unwrap_or_else(|e| panic!("{e}"));
    let mut both = Both {
        desk: Desk::new(scenario.machine.clone(), Some(scenario.setup)),
        board: Emulator::start(Start {
            machine: Some((machine_of(file), Some(scenario.setup))),
            ..Start::default()
        }),
        compare_from: STARTED_MS * 1_000_000,
        seen: Default::default(),
        detents: VecDeque::new(),
        edges: 0,
        recent: VecDeque::new(),
        uncounted: 0,
        short: 0,
        compared: 0,
        different: Vec::new(),
    };
    let summary = play_on(&scenario, &mut both, &Keep::default()).unwrap_or_else(|e| panic!("{e}"));
    let Both {
        mut board,
        edges,
        uncounted,
        short,
        compared,
        different,
        ..
    } = both;
    let seconds = scenario.seconds;
    let awake = board.awake as f64 / (seconds * 1.25e6);
    // The counts come once a second.
    board.run_ms(1200);
    let mut problems = summary.missed;
    let count = different.len();
    problems.extend(different.into_iter().take(3));
    let mut must = |holds: bool, what: String| problems.extend((!holds).then_some(what));
    must(count <= 3, format!("{count} differences in all"));
    must(board.resets.is_empty(), format!("{:?}", board.resets));
    must(compared > 0, "no picture stood".to_owned());
    for (name, range) in [
        ("edges", edges - 2 * short - uncounted..=edges),
        ("lost", 0..=0),
        ("unheard", 0..=0),
    ] {
        let counted = board.count(name);
        must(
            range.contains(&counted),
            format!("{name}: {counted}, not {range:?}"),
        );
    }
    let unfed = board.longest_unfed;
    must(
        unfed <= UNFED,
        format!("the watchdog was not fed for {unfed} ns"),
    );
    let stack = board.stack_used();
    println!(
        "{:<28} {seconds:>6.1} s in {:>5.1} s, {:>6} pulses, {compared:>5} of {:>5} looks with a standing picture, awake \
         {awake:.1} %, fed {} times, not for {} ms at most, stack {stack} bytes",
        name_of(file),
        started.elapsed().as_secs_f64(),
        summary.pulses,
        (seconds / 0.005) as u64,
        board.feeds,
        unfed / 1_000_000,
    );
    Outcome {
        file: file.to_owned(),
        seconds,
        stack,
        problems,
    }
}

fn name_of(file: &Path) -> String {
    file.file_name()
        .map_or_else(String::new, |n| n.display().to_string())
}

/// The profile of the scenario's machine as it is written: a file beside it, or one that comes with Rimrate.
fn machine_of(file: &Path) -> MachineSpec {
    let text = std::fs::read_to_string(file).expect("was read before");
    let written: toml::Table = text.parse().expect("was read before");
    let name = written["machine"].as_str().expect("is a text");
    match std::fs::read_to_string(file.with_file_name(name)) {
        Ok(profile) => toml::from_str(&profile).expect("is a profile"),
        Err(_) => profile(name),
    }
}

/// All files of the folder, on as many boards at once as there are processors.
#[test]
fn every_scenario_is_alike_on_desk_and_board() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("../sim/scenarios");
    let entries = std::fs::read_dir(&folder).expect("the folder can be read");
    let mut files: Vec<PathBuf> = entries
        .map(|e| e.expect("an entry of the folder").path())
        .filter(|path| path.extension().is_some_and(|e| e == "toml"))
        .collect();
    files.sort();
    assert!(files.len() >= 10, "{files:?}");
    // From the end on: the longest one is among the last.
    let (waiting, done) = (Mutex::new(files), Mutex::new(Vec::new()));
    std::thread::scope(|scope| {
        for _ in 0..std::thread::available_parallelism().map_or(1, usize::from) {
            scope.spawn(|| {
                loop {
                    let next = waiting.lock().expect("no other failed").pop();
                    let Some(file) = next else { break };
                    let outcome = played(&file);
                    done.lock().expect("no other failed").push(outcome);
                }
            });
        }
    });
    let done = done.into_inner().expect("no other failed");
    let seconds: f64 = done.iter().map(|o| o.seconds).sum();
    let stack = done.iter().map(|o| o.stack).max().unwrap_or(0);
    println!(
        "{} scenarios, {seconds:.0} s, stack {stack} bytes",
        done.len()
    );
    let problems: Vec<String> = done
        .iter()
        .flat_map(|o| {
            o.problems
                .iter()
                .map(|p| format!("{}: {p}", name_of(&o.file)))
        })
        .collect();
    assert!(problems.is_empty(), "{}", problems.join("\n"));
    assert!(seconds >= MIXED_WORK, "{seconds} s of mixed work");
}
