//! Our tacho beside published methods, on seeded captures: one table, and a plot with `--plot FILE.svg`.
//!
//! ```text
//! cargo bench -p rimrate-tests --bench tacho
//! cargo bench -p rimrate-tests --bench tacho -- --plot tests/benches/error-by-window.svg
//! ```
//!
//! Instructions an edge are those of the host as callgrind counts them (Valgrind must be there): the difference between two
//! captures of the same kind, one longer than the other, run by this very program.

use std::cell::RefCell;
use std::collections::VecDeque;
use std::process::Command;

use rimrate_core::tacho::Tacho;
use rimrate_core::time::{Duration, Edge, EdgeKind, Instant};
use rimrate_sim::sensor::Fault;
use rimrate_sim::sensor::profile::Piece;
use rimrate_tests::capture::{Capture, PLACED_6, bound, seconds};
use rimrate_tests::methods::{
    EndPoints, GateCount, LeastSquares, Method, OnePeriod, PulsesOverTime,
};

mod plot;

/// The window of the bound and of all methods that have one, s; or three revolutions.
const WINDOW: f64 = 0.5;
/// The clock of the M/T method, as on the chip.
const CLOCK_HZ: f64 = 125e6;

/// Every method by its name here.
const METHODS: [&str; 7] = [
    "count in a 1 s gate",
    "one period",
    "M/T",
    "end points",
    "least squares",
    "ours, calm",
    "ours, fast",
];

/// A method fed with edges.
enum Fed {
    Published(Box<dyn Method>),
    Ours(Box<Tacho>, bool),
}

impl Fed {
    fn new(name: &str, capture: &Capture) -> Fed {
        let n = capture.sensor.magnets;
        let ours = |fast| Fed::Ours(Box::new(Tacho::new(capture.config())), fast);
        match name {
            "count in a 1 s gate" => Fed::Published(Box::new(GateCount::new(n, 1.0))),
            "one period" => Fed::Published(Box::new(OnePeriod::new(n))),
            "M/T" => Fed::Published(Box::new(PulsesOverTime::new(n, WINDOW, CLOCK_HZ))),
            "end points" => Fed::Published(Box::new(EndPoints::new(n, WINDOW))),
            "least squares" => Fed::Published(Box::new(LeastSquares::new(n, WINDOW))),
            "ours, calm" => ours(false),
            "ours, fast" => ours(true),
            _ => panic!("method `{name}` is none of {METHODS:?}"),
        }
    }
    fn push(&mut self, edge: Edge) {
        match self {
            Fed::Published(method) if edge.kind == EdgeKind::Fall => {
                method.fall(seconds(edge.at.since(Instant::ZERO)));
            }
            Fed::Published(_) => {}
            Fed::Ours(tacho, _) => tacho.push(edge),
        }
    }
    fn speed(&mut self, now: Instant) -> Option<f64> {
        match self {
            Fed::Published(method) => method.speed(seconds(now.since(Instant::ZERO))),
            Fed::Ours(tacho, fast) => {
                let reading = tacho.reading(now, |_| true);
                let speed = if *fast { reading.quick } else { reading.speed };
                speed.map(|n| f64::from(n.get()))
            }
        }
    }
}

/// Looks at a method every `every`: time, speed, falls in the last window.
fn watch(
    name: &str,
    capture: &Capture,
    every: Duration,
    window: f64,
    mut see: impl FnMut(f64, Option<f64>, usize),
) {
    let mut fed = Fed::new(name, capture);
    let mut falls = VecDeque::new();
    let mut next = Instant::ZERO;
    let mut look = |fed: &mut Fed, falls: &mut VecDeque<Instant>, until: Instant| {
        while next < until {
            while falls
                .front()
                .is_some_and(|&f| seconds(next.since(f)) >= window)
            {
                falls.pop_front();
            }
            see(
                seconds(next.since(Instant::ZERO)),
                fed.speed(next),
                falls.len(),
            );
            next += every;
        }
    };
    let end = capture.play(&mut |edge| {
        look(&mut fed, &mut falls, edge.at);
        if edge.kind == EdgeKind::Fall {
            falls.push_back(edge.at);
        }
        fed.push(edge);
    });
    look(&mut fed, &mut falls, end);
}

/// A sensor to compare the methods on, at a speed.
struct Case {
    name: &'static str,
    sensor: Capture,
    speed: f64,
    sigma: f64,
    faults: Vec<(Fault, bool)>,
}

// No speed is a whole number of rev/s: a gate would count that without an error, by chance.
fn cases() -> Vec<Case> {
    let case = |name, pulses, speed: f64| {
        let sigma = 0.02 / 360.0 * 60.0 / speed;
        Case {
            name,
            sensor: Capture::new(pulses).jitter(sigma),
            speed,
            sigma,
            faults: Vec::new(),
        }
    };
    let mut placed = case("6 magnets, each up to 3 degrees off, 607 rpm", 6, 607.37);
    placed.sensor = placed.sensor.placed(PLACED_6);
    let mut rippled = case("2 magnets, ripple of 0.3 %, 641 rpm", 2, 641.37);
    rippled.sensor = rippled.sensor.rippled(0.003);
    let mut chatter = case("2 magnets, chatter, 811 rpm", 2, 811.37);
    chatter.faults = vec![(Fault::Chatter, true)];
    let mut noise = case(
        "2 magnets, 60 spikes a second and 3 % missing, 811 rpm",
        2,
        811.37,
    );
    noise.sensor.sensor.spike_rate = 60.0;
    noise.sensor.sensor.dropout = 0.03;
    noise.faults = vec![(Fault::Spikes, true), (Fault::Dropouts, true)];
    vec![
        case("1 magnet, 47 rpm", 1, 47.37),
        case("1 magnet, 607 rpm", 1, 607.37),
        case("6 magnets, 607 rpm", 6, 607.37),
        placed,
        case("60 pulses, 607 rpm", 60, 607.37),
        case("60 pulses, 6007 rpm", 60, 6007.37),
        rippled,
        chatter,
        noise,
    ]
}

impl Case {
    /// Steady: rms and worst error, and rms over the bound.
    fn steady(&self, name: &str) -> (f64, f64, f64) {
        let turn = 60.0 / self.speed;
        let (settle, secs) = (f64::max(3.0, 6.0 * turn), f64::max(30.0, 60.0 * turn));
        let (mut count, mut squares, mut bounds, mut worst) = (0.0, 0.0, 0.0, 0.0_f64);
        let capture = self
            .sensor
            .clone()
            .seeded(7, 0.29)
            .then(Piece::steady(self.speed, 1.0))
            .with(Piece::steady(self.speed, settle - 1.0 + secs), &self.faults);
        let window = f64::max(WINDOW, 3.0 * turn);
        watch(
            name,
            &capture,
            Duration::from_millis(10),
            window,
            |at, speed, falls| {
                if at < settle {
                    return;
                }
                let error = speed.map_or(1.0, |n| n / self.speed - 1.0);
                let edges = if self.faults.is_empty() {
                    falls
                } else {
                    (window / turn * f64::from(capture.sensor.magnets)) as usize
                };
                let spacing = turn / f64::from(capture.sensor.magnets);
                count += 1.0;
                squares += error * error;
                bounds += bound(edges, self.sigma, spacing).powi(2);
                worst = worst.max(error.abs());
            },
        );
        ((squares / count).sqrt(), worst, (squares / bounds).sqrt())
    }

    /// Rms error while the speed rises by 3 % in a second, for two seconds.
    fn ramp(&self, name: &str) -> f64 {
        let (mut count, mut squares) = (0.0, 0.0);
        for seed in 0..8 {
            let (low, high) = (self.speed, 1.06 * self.speed);
            let steady = f64::max(3.0, 6.0 * 60.0 / self.speed);
            let capture = self
                .sensor
                .clone()
                .seeded(seed, 0.125 * seed as f64)
                .with(Piece::steady(low, steady), &self.faults)
                .then(Piece::ramp(low, high, 0.03 * low));
            watch(
                name,
                &capture,
                Duration::from_millis(10),
                1.0,
                |at, speed, _| {
                    if at > steady {
                        let error = speed.map_or(1.0, |n| n / capture.truth(at) - 1.0);
                        count += 1.0;
                        squares += error * error;
                    }
                },
            );
        }
        f64::sqrt(squares / count)
    }

    /// After a droop of 5 % in 150 ms, the time until the reading stays within 1 %, s: the worst of some.
    fn settling(&self, name: &str) -> f64 {
        let mut worst = 0.0_f64;
        for seed in 0..8 {
            let low = 0.95 * self.speed;
            let steady = f64::max(3.0, 6.0 * 60.0 / self.speed);
            let capture = self
                .sensor
                .clone()
                .seeded(seed, 0.125 * seed as f64)
                .with(Piece::steady(self.speed, steady), &self.faults)
                .then(Piece::ramp(self.speed, low, (self.speed - low) / 0.15))
                .then(Piece::steady(low, steady));
            watch(
                name,
                &capture,
                Duration::from_millis(2),
                1.0,
                |at, speed, _| {
                    let after = at - steady - 0.15;
                    if after > 0.0 && speed.is_none_or(|n| (n / low - 1.0).abs() > 0.01) {
                        worst = worst.max(after);
                    }
                },
            );
        }
        worst
    }

    /// A run-up by 30 % in 1 s, and by which time after the true speed the reading is above the middle of it, s: the worst
    /// of some.
    fn over_speed(&self, name: &str) -> f64 {
        let mut worst = 0.0_f64;
        for seed in 0..8 {
            let (low, high) = (self.speed, 1.3 * self.speed);
            let steady = f64::max(3.0, 6.0 * 60.0 / self.speed);
            let capture = self
                .sensor
                .clone()
                .seeded(seed, 0.125 * seed as f64)
                .with(Piece::steady(low, steady), &self.faults)
                .then(Piece::ramp(low, high, high - low))
                .then(Piece::steady(high, steady));
            let crossed = steady + 0.5;
            let mut seen = None;
            watch(
                name,
                &capture,
                Duration::from_millis(2),
                1.0,
                |at, speed, _| {
                    let over = speed.is_some_and(|n| n > 1.15 * self.speed);
                    if over && at >= crossed - 0.25 && seen.is_none() {
                        seen = Some(at - crossed);
                    }
                },
            );
            worst = worst.max(seen.unwrap_or(f64::INFINITY));
        }
        worst
    }
}

/// Feeds a capture of so many turns of the case to the method, and reads it 50 times a second: what callgrind counts.
fn count(case: &Case, name: &str, turns: f64) {
    let secs = turns * 60.0 / case.speed;
    let capture = case
        .sensor
        .clone()
        .with(Piece::steady(case.speed, secs), &case.faults);
    let (edges, _) = capture.edges();
    // Everything but the method itself is done before.
    let fed = RefCell::new(Fed::new(name, &capture));
    feed_counted(&fed, &edges);
}

/// Counted alone, by its name.
#[inline(never)]
fn feed_counted(fed: &RefCell<Fed>, edges: &[Edge]) {
    let mut fed = fed.borrow_mut();
    let mut next = Instant::ZERO;
    for &edge in edges {
        fed.push(edge);
        if edge.at >= next {
            next = edge.at + Duration::from_millis(20);
            std::hint::black_box(fed.speed(edge.at));
        }
    }
}

/// Instructions an edge by callgrind, from two lengths; `None` where Valgrind is not there.
fn instructions(case: usize, sensor: &Case, name: &str) -> Option<f64> {
    let total = |turns: f64| -> Option<f64> {
        let output = Command::new("valgrind")
            .args(["--tool=callgrind", "--callgrind-out-file=/dev/null"])
            .arg("--toggle-collect=*feed_counted*")
            .arg(std::env::current_exe().ok()?)
            .args(["--count", &case.to_string(), name, &turns.to_string()])
            .output()
            .ok()?;
        let text = String::from_utf8_lossy(&output.stderr).into_owned();
        let line = text.lines().find(|l| l.contains("Collected"))?;
        line.rsplit(' ').next()?.parse().ok()
    };
    let turns = 2400.0 / f64::from(sensor.sensor.sensor.magnets);
    let more = total(3.0 * turns)? - total(turns)?;
    Some(more / (2.0 * 2.0 * turns * f64::from(sensor.sensor.sensor.magnets)))
}

fn main() {
    let args: Vec<String> = std::env::args()
        .skip(1)
        .filter(|a| a != "--bench")
        .collect();
    let words: Vec<&str> = args.iter().map(String::as_str).collect();
    match words.as_slice() {
        ["--count", case, name, turns] => {
            let case: usize = case.parse().expect("a number of a case");
            count(
                &cases()[case],
                name,
                turns.parse().expect("a number of turns"),
            );
        }
        ["--plot", file] => {
            let svg = plot::draw().expect("the plot can be drawn");
            std::fs::write(file, svg).expect("the plot can be written");
        }
        // `cargo test --benches` asks for a quick look.
        ["--test", ..] => table(&cases()[1..2]),
        _ => table(&cases()),
    }
}

fn table(cases: &[Case]) {
    println!(
        "Errors in % of the speed; the bound is that of all edges of the last max({WINDOW} s, 3 turns). Ramp: rms error in a run-up by 3 % a second."
    );
    println!(
        "Settling: within 1 % after a droop of 5 % in 150 ms. Over-speed: delay in a run-up by 30 % in 1 s."
    );
    println!("Instructions an edge: host, by callgrind, readings 50 times a second included.");
    for (number, case) in cases.iter().enumerate() {
        println!("\n{}", case.name);
        println!(
            "  {:20} {:>10} {:>10} {:>9} {:>8} {:>10} {:>12} {:>8}",
            "method",
            "rms %",
            "worst %",
            "of bound",
            "ramp %",
            "settling s",
            "over-speed s",
            "instr"
        );
        for name in METHODS {
            let (rms, worst, ratio) = case.steady(name);
            let instr =
                instructions(number, case, name).map_or("-".to_string(), |n| format!("{n:.0}"));
            println!(
                "  {name:20} {:>10.5} {:>10.5} {ratio:>9.2} {:>8.3} {:>10.3} {:>12.3} {instr:>8}",
                100.0 * rms,
                100.0 * worst,
                100.0 * case.ramp(name),
                case.settling(name),
                case.over_speed(name)
            );
        }
    }
}
