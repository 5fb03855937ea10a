//! What the firmware costs: flash, RAM, cycles, time awake, latency. `cargo test -p rimrate-tests --features board --test
//! board budget -- --nocapture` prints all of it.
//!
//! Cycles are the emulator's and lower bounds: it has no cost for exception entry, flash cache misses or a busy bus. Sizes
//! are exact. The limits leave slack for real regressions only.

use rimrate_core::panel::Knob;
use rimrate_core::time::EdgeKind;
use rimrate_core::verdict::Verdict;
use rimrate_sim::rig::{Rig, Touch};

use crate::image::IMAGE;
use crate::rig::Emulator;
use crate::support::{spin, wide_board};

/// clk_sys, Hz.
const SYS_HZ: f64 = 125e6;

fn within(what: &str, value: f64, limit: f64, unit: &str) {
    println!("{what:<58} {value:>10.1} {unit:<7} limit {limit}");
    assert!(value <= limit, "{what}: {value} {unit}, limit {limit}");
}

/// Flash and static RAM by section.
#[test]
fn budget_of_flash_and_ram() {
    let sections = IMAGE.sections();
    let size = |names: &[&str]| -> f64 {
        names.iter().filter_map(|n| sections.get(*n)).sum::<u64>() as f64 / 1024.0
    };
    for (name, bytes) in sections.iter().filter(|(_, bytes)| **bytes > 0) {
        println!("  {name:<16} {bytes:>7} bytes");
    }
    within(
        "flash",
        size(&[
            ".boot2",
            ".vector_table",
            ".text",
            ".rodata",
            ".data",
            ".profile",
        ]),
        256.0,
        "KiB",
    );
    within(
        "static RAM, capture ring included, without stack",
        size(&[".data", ".bss", ".uninit", ".ring", ".keep"]),
        64.0,
        "KiB",
    );
}

/// Share of time awake, all-in, while the spindle turns steadily.
fn awake(rpm: f64, pulses: u32) -> (f64, Emulator) {
    let mut board = wide_board(pulses, 25.0);
    let from = board.now() + 3_000_000;
    board.edges(&spin(rpm, pulses, from, from + 3_100_000_000));
    board.run_ms(2000);
    let before = board.awake;
    board.run_ms(1000);
    ((board.awake - before) as f64, board)
}

#[test]
fn budget_of_time_awake() {
    let mut resting = wide_board(1, 25.0);
    resting.run_ms(1000);
    let before = resting.awake;
    resting.run_ms(1000);
    let rest = (resting.awake - before) as f64;
    within("awake at rest", rest / SYS_HZ * 100.0, 20.0, "%");
    let (one, _) = awake(3000.0, 1);
    within(
        "awake at 3000 rpm, 1 pulse",
        one / SYS_HZ * 100.0,
        20.0,
        "%",
    );
    let (sixty, mut board) = awake(3000.0, 60);
    println!(
        "{:<58} {:>10.1} %",
        "awake at 3000 rpm, 60 pulses",
        sixty / SYS_HZ * 100.0
    );
    within(
        "stack used at most",
        board.stack_used() as f64 / 1024.0,
        28.0,
        "KiB",
    );
    // 5,000 pulses/s: everything that is not there at rest, shared out over the pulses.
    let (fast, _) = awake(5000.0, 60);
    within(
        "cycles per pulse, all-in, at 5000 pulses/s",
        (fast - rest) / 5000.0,
        2500.0,
        "cycles",
    );
}

#[test]
fn budget_of_a_picture() {
    let mut board = wide_board(2, 25.0);
    board.watch(&[
        ("paint", "rimrate_firmware::tasks::owner::Owner::paint"),
        ("step", "rimrate_firmware::tasks::owner::Owner::step"),
        ("advise", "rimrate_core::advice::advise"),
    ]);
    let from = board.now() + 3_000_000;
    board.edges(&spin(640.0, 2, from, from + 3_000_000_000));
    board.run_ms(1500);
    for detents in [1, 1, 1, -3] {
        board.touch(Touch::Turn(Knob::Right, detents));
        board.run_ms(250);
    }
    board.press(Knob::Left);
    board.run_ms(500);
    let most = |name: &str| {
        let calls: Vec<f64> = board
            .calls
            .iter()
            .filter(|c| c.0 == name)
            .map(|c| c.1 as f64)
            .collect();
        assert!(!calls.is_empty(), "{name} was never called");
        calls.into_iter().fold(0.0, f64::max)
    };
    within(
        "cycles to draw a full picture, at most",
        most("paint") / 1000.0,
        600.0,
        "k",
    );
    println!(
        "{:<58} {:>10.1} k",
        "cycles of advise, at most",
        most("advise") / 1000.0
    );
    within(
        "longest step of the owner, picture included",
        most("step") / SYS_HZ * 1000.0,
        5.0,
        "ms",
    );
}

/// Cycles to bring changed areas to the display: everything awake during a detent's change, less rest and drawing.
#[test]
fn budget_of_a_partial_flush() {
    let mut board = wide_board(2, 25.0);
    board.run_ms(600);
    let before = board.awake;
    board.run_ms(200);
    let rest = board.awake - before;
    board.watch(&[("paint", "rimrate_firmware::tasks::owner::Owner::paint")]);
    let (before, calls, bytes) = (board.awake, board.calls.len(), board.display_bytes);
    board.touch(Touch::Turn(Knob::Right, 1));
    board.run_ms(200);
    let drawn: u64 = board.calls[calls..].iter().map(|c| c.1).sum();
    let spent = (board.awake - before - rest - drawn) as f64;
    println!(
        "{:<58} {:>10}",
        "bytes of that change",
        board.display_bytes - bytes
    );
    // The knob's own 80 ms of sampling are in it.
    within(
        "cycles of a knob's detent and the change it sends",
        spent / 1000.0,
        200.0,
        "k",
    );
}

/// From the edge that completes the second interval at too high a speed to the lamp, while a picture is drawn and a knob
/// turns; several phases against the owner's beat. Nobody's spindle becomes three times as fast at once: it is the hardest case.
#[test]
fn budget_of_the_over_speed_latency() {
    for pulses in [1, 2, 6, 60] {
        let worst = (0..6_u64)
            .map(|phase| over_speed_latency(pulses, phase * 1_700_000))
            .fold(f64::MIN, f64::max);
        let what = format!("over-speed to lamp, {pulses} pulses, worst of 6");
        within(&what, worst, 20.0, "ms");
    }
}

fn over_speed_latency(pulses: u32, phase: u64) -> f64 {
    let (slow, fast) = (300.0, 1000.0);
    let mut board = wide_board(pulses, 25.0);
    let start = board.now() + 3_000_000 + phase;
    let mut edges = spin(slow, pulses, start, start + 2_000_000_000);
    // The last pulse at the old speed begins the first interval at the new one.
    let last = edges.iter().rev().find(|e| e.kind == EdgeKind::Fall);
    let last = last.expect("turns").at.nanos();
    edges.retain(|e| e.at.nanos() <= last);
    edges.extend_from_slice(&spin(fast, pulses, last, last + 500_000_000)[1..]);
    board.edges(&edges);
    let second = last + (2.0 * 60e9 / fast / f64::from(pulses)).round() as u64;
    // A picture is drawn for every detent; there and back, they leave the advice as it was.
    board.run_until(second - 60_000_000);
    for detents in [1, -1, 1, -1] {
        board.touch(Touch::Turn(Knob::Right, detents));
        board.run_until(board.now() + 25_000_000);
    }
    board.run_until(second + 300_000_000);
    assert_eq!(board.verdict(), Verdict::Fast);
    let mut lit = board
        .changes
        .iter()
        .filter(|c| c.what == "over" && c.at > start);
    let lamp = lit.next().expect("lights");
    assert!(
        lamp.value == 1 && lamp.at > last,
        "it lights for the speed alone"
    );
    (lamp.at as f64 - second as f64) / 1e6
}
