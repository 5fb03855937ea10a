//! What the firmware costs: flash, RAM, cycles, time awake, latency. `cargo test -p rimrate-tests --features board --test
//! board budget -- --nocapture` prints all of it.
//!
//! Cycles are the emulator's and lower bounds: it has no cost for exception entry, flash cache misses or a busy bus. Sizes
//! are exact. The limits leave slack for real regressions only.

use rimrate_core::panel::Knob;
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
    // The goal is 2,500, and it is not reached: this limit only tells when it gets worse.
    within(
        "cycles per pulse, all-in, at 5000 pulses/s (goal 2500)",
        (fast - rest) / 5000.0,
        4800.0,
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

/// From the edge that completes the second interval at a dangerous speed to the lamp, while a picture is drawn and a knob
/// turns; several phases against the owner's beat.
#[test]
fn budget_of_the_over_speed_latency() {
    let mut worst: f64 = 0.0;
    for phase in 0..8_u64 {
        let mut board = wide_board(2, 25.0);
        let start = board.now() + 3_000_000;
        let jump = start + 2_000_000_000 + phase * 700_000;
        let mut edges = spin(300.0, 2, start, jump);
        // The last pulse before the jump begins the first interval at the new speed.
        let last = edges
            .iter()
            .rev()
            .find(|e| e.kind == rimrate_core::time::EdgeKind::Fall)
            .expect("turns")
            .at
            .nanos();
        edges.retain(|e| e.at.nanos() <= last);
        let fast = spin(9000.0, 2, last, last + 500_000_000);
        let second = last + 2 * (60e9 / 9000.0 / 2.0_f64).round() as u64;
        edges.extend_from_slice(&fast[1..]);
        board.edges(&edges);
        board.run_until(last - 40_000_000);
        board.touch(Touch::Turn(Knob::Right, 6));
        board.run_until(last + 300_000_000);
        assert_eq!(board.verdict(), Verdict::Danger);
        let lamp = board
            .changes
            .iter()
            .find(|c| c.what == "over" && c.value == 1 && c.at > last)
            .expect("lights");
        worst = worst.max((lamp.at as f64 - second as f64) / 1e6);
    }
    within("over-speed to lamp, worst of 8", worst, 20.0, "ms");
}
