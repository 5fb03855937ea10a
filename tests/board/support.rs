//! Machines, spindles and what several checks share.

use rimrate_core::machine::MachineSpec;
use rimrate_core::setup::Setup;
use rimrate_core::time::{Edge, EdgeKind, Instant};
use rimrate_tests::bar;

use crate::rig::{Emulator, Start};

/// The chip has started and the display shows something after this time, ms.
pub(crate) const STARTED_MS: u64 = 150;

/// The longest time between two feeds of the watchdog, ns: tasks check in every 250 ms at the latest, and the watchdog's
/// task looks every 100 ms.
pub(crate) const UNFED: u64 = 400_000_000;

/// A lathe whose drive reaches from 20 to 6000 rev/min, with some pulses in a revolution.
pub(crate) fn wide_machine(pulses: u32) -> MachineSpec {
    toml::from_str(&format!(
        "name = \"Wide-range lathe\"
kind = \"lathe\"
sensor = {{ pulses = {pulses} }}
[[range]]
label = \"one belt\"
low_rpm = 20.0
high_rpm = 6000.0
[[holder]]
kind = \"collet\"
rated_rpm = 8000.0"
    ))
    .expect("is a profile")
}

/// A board on that lathe, set up for a bar of mild steel, with its setup confirmed.
pub(crate) fn wide_board(pulses: u32, mm: f32) -> Emulator {
    confirmed(Start {
        machine: Some((wide_machine(pulses), Some(bar(mm)))),
        ..Start::default()
    })
}

/// A board whose setup has been confirmed with the left knob. 0.4 s have passed.
pub(crate) fn confirmed(start: Start) -> Emulator {
    let mut board = Emulator::start(start);
    board.run_ms(STARTED_MS);
    board.press(rimrate_core::panel::Knob::Left);
    board.run_ms(400 - STARTED_MS);
    board
}

/// Edges of an even spindle, ns, the last pulse whole: the line is low for a twelfth of the spacing with few pulses, for half with teeth.
pub(crate) fn spin(rpm: f64, pulses: u32, from: u64, until: u64) -> Vec<Edge> {
    let spacing = 60e9 / rpm / f64::from(pulses);
    let low = if pulses < 8 { 1.0 / 12.0 } else { 0.5 };
    let at = |t: f64| Instant::from_nanos(from + t.round() as u64);
    (0..)
        .map(|i| spacing * f64::from(i))
        .map(|t| [Edge::fall(at(t)), Edge::rise(at(t + low * spacing))])
        .take_while(|[_, rise]| rise.at.nanos() < until)
        .flatten()
        .collect()
}

/// Edges of a spindle that runs up evenly within a second and then turns evenly, ns, the last pulse whole.
pub(crate) fn run_up(rpm: f64, pulses: u32, from: u64, until: u64) -> Vec<Edge> {
    const RUN_UP: f64 = 1.0;
    let speed = rpm / 60.0;
    let at = |turns: f64| {
        let seconds = if turns < speed * RUN_UP / 2.0 {
            (2.0 * turns * RUN_UP / speed).sqrt()
        } else {
            turns / speed + RUN_UP / 2.0
        };
        Instant::from_nanos(from + (seconds * 1e9).round() as u64)
    };
    let turns = |i: f64| i / f64::from(pulses);
    (1..)
        .map(f64::from)
        .map(|i| {
            [
                Edge::fall(at(turns(i))),
                Edge::rise(at(turns(i + 1.0 / 12.0))),
            ]
        })
        .take_while(|[_, rise]| rise.at.nanos() < until)
        .flatten()
        .collect()
}

/// Edges of a spindle that turns evenly, runs down evenly within the last second, and stands at `until`.
pub(crate) fn run_down(rpm: f64, pulses: u32, from: u64, until: u64) -> Vec<Edge> {
    let mirrored = |at: Instant| Instant::from_nanos(from + until - at.nanos());
    run_up(rpm, pulses, from, until)
        .iter()
        .rev()
        .map(|e| match e.kind {
            EdgeKind::Fall => Edge::rise(mirrored(e.at)),
            EdgeKind::Rise => Edge::fall(mirrored(e.at)),
        })
        .collect()
}

/// The same as [`spin`], with every edge turned round: a sensor that is high at the magnet.
pub(crate) fn inverted(edges: &[Edge]) -> Vec<Edge> {
    use EdgeKind::{Fall, Rise};
    edges
        .iter()
        .map(|e| Edge {
            at: e.at,
            kind: if e.kind == Fall { Rise } else { Fall },
        })
        .collect()
}

/// A machine that comes with Rimrate, as its profile is written.
pub(crate) fn profile(name: &str) -> MachineSpec {
    let (_, text) = rimrate_sim::profile::BUILT_IN
        .iter()
        .find(|(n, _)| *n == name)
        .unwrap_or_else(|| panic!("no machine {name}"));
    toml::from_str(text).expect("is a profile")
}

/// A bar on the wide lathe, for a desk beside the board.
pub(crate) fn setup(mm: f32) -> Setup {
    bar(mm)
}
