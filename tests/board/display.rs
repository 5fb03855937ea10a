//! What the display shows, and what happens when it does not.

use rimrate_core::panel::Knob;
use rimrate_core::time::Instant;
use rimrate_core::verdict::Verdict;
use rimrate_sim::frame::Frame;
use rimrate_sim::rig::{Desk, Rig, Touch};

use crate::rig::Start;
use crate::support::{confirmed, setup, spin, wide_board, wide_machine};

/// What a desk shows for the same edges.
fn desk_frame(rpm: f64, mm: f32, from: u64, until: u64) -> Frame {
    let machine = rimrate_core::machine::Machine::new(wide_machine(2)).expect("is sound");
    let mut desk = Desk::new(machine, Some(setup(mm)));
    let ms = |ms: u64| Instant::from_nanos(ms * 1_000_000);
    desk.run(&[], ms(150));
    desk.touch(Touch::Press(Knob::Left));
    desk.run(&[], ms(250));
    desk.touch(Touch::Release(Knob::Left));
    desk.run(&spin(rpm, 2, from, until), Instant::from_nanos(until));
    *desk.frame()
}

/// 640 rpm: pixel for pixel what the desk draws. The picture is left as PNG to be looked at.
#[test]
fn the_picture_is_the_desks() {
    let (rpm, mm) = (640.0, 16.0);
    let mut board = wide_board(2, mm);
    let (from, until) = (board.now() + 3_000_000, board.now() + 2_000_000_000);
    board.edges(&spin(rpm, 2, from, until));
    board.run_until(until);
    let folder = std::path::Path::new(env!("CARGO_TARGET_TMPDIR"));
    let png = folder.join("board-640rpm.png");
    let file = std::fs::File::create(&png).expect("the target folder can be written");
    board
        .frame()
        .write_png(file, 4)
        .expect("a PNG can be written");
    println!("{}", png.display());
    assert_ne!(board.frame(), &Frame::new(), "the display is dark");
    assert_eq!(board.frame(), &desk_frame(rpm, mm, from, until));
}

/// The other controller has four columns more and shows the middle.
#[test]
fn the_picture_is_the_same_on_an_sh1106() {
    let (rpm, mm) = (640.0, 16.0);
    let mut board = confirmed(Start {
        machine: Some((wide_machine(2), Some(setup(mm)))),
        sh1106: true,
        ..Start::default()
    });
    let (from, until) = (board.now() + 3_000_000, board.now() + 1_500_000_000);
    board.edges(&spin(rpm, 2, from, until));
    board.run_until(until);
    assert_eq!(board.frame(), &desk_frame(rpm, mm, from, until));
}

/// What stands is not sent again, and a change alone.
#[test]
fn a_changed_number_is_sent_alone() {
    let mut board = wide_board(2, 16.0);
    let (from, until) = (board.now() + 3_000_000, board.now() + 2_500_000_000);
    board.edges(&spin(640.0, 2, from, until));
    board.run_ms(2000);
    let before = board.display_bytes;
    // A second of a steady speed changes nothing, a knob's detent some lines.
    board.run_ms(400);
    assert_eq!(
        board.display_bytes, before,
        "a picture that stands is not sent again"
    );
    board.touch(Touch::Turn(Knob::Right, 1));
    board.run_ms(200);
    let sent = board.display_bytes - before;
    println!(
        "one detent: {sent} bytes; a full picture takes {}",
        8 * (7 + 128)
    );
    assert!(sent > 0 && sent < 8 * (7 + 128), "{sent}");
}

/// Unplugged while it warns: the lamp goes on warning, and the picture comes back by itself.
#[test]
fn the_lamp_warns_without_a_display_and_the_picture_returns() {
    let mut board = wide_board(2, 25.0);
    let (from, until) = (board.now() + 3_000_000, 12_000_000_000);
    // 25 mm of mild steel run at about 300 rpm: 900 is too fast.
    board.edges(&spin(900.0, 2, from, until));
    board.run_ms(1500);
    let warning = board.verdict();
    assert!(
        matches!(warning, Verdict::Fast | Verdict::Danger),
        "{warning:?}"
    );
    let before = *board.frame();
    board.display("unplugged");
    // A number must change for the firmware to notice, or the refresh comes.
    board.touch(Touch::Turn(Knob::Right, 1));
    board.run_ms(3000);
    assert_eq!(board.lines("display: ").count(), 1, "{:?}", board.log);
    let dark_from = board.now() - 2_000_000_000;
    let flashes = board
        .changes
        .iter()
        .filter(|c| c.what == "over" && c.value == 1 && c.at > dark_from)
        .count();
    assert!(flashes >= 2, "{flashes} flashes in 2 s");
    assert_eq!(board.verdict(), warning);
    board.touch(Touch::Turn(Knob::Right, -1));
    board.run_ms(100);
    board.display("none");
    let plugged = board.now();
    board.run_ms(4500);
    let back = board
        .lines("display: answers")
        .last()
        .expect("it answers again")
        .at;
    println!(
        "picture back {} ms after it was plugged in",
        (back - plugged) / 1_000_000
    );
    assert!(back - plugged < 1_000_000_000);
    assert_eq!(board.frame(), &before);
    assert!(board.resets.is_empty());
}

/// Missing from the start: the lamps say so while they have nothing else to say; everything else works.
#[test]
fn a_missing_display_is_shown_by_the_lamps() {
    let mut board = confirmed(Start {
        machine: Some((wide_machine(2), Some(setup(25.0)))),
        no_display: true,
        ..Start::default()
    });
    board.run_ms(4100);
    let since = board.now() - 4_000_000_000;
    for lamp in ["over", "under"] {
        let flashes = board
            .changes
            .iter()
            .filter(|c| c.what == lamp && c.value == 1 && c.at > since)
            .count();
        assert!(
            (3..=5).contains(&flashes),
            "{lamp}: {flashes} flashes in 4 s, two every 2 s"
        );
    }
    let from = board.now() + 3_000_000;
    board.edges(&spin(350.0, 2, from, from + 6_000_000_000));
    // Past the grace that a run-up is given.
    board.run_ms(5000);
    assert_eq!(board.verdict(), Verdict::Right);
    assert!(board.outputs().right && !board.outputs().over && !board.outputs().under);
}

/// A display that holds the data line is clocked free.
#[test]
fn a_stuck_bus_is_freed_by_nine_clocks() {
    let mut board = wide_board(2, 25.0);
    board.display("stuck");
    board.touch(Touch::Turn(Knob::Right, 1));
    board.run_ms(1500);
    assert_eq!(board.lines("display: Stuck").count(), 1, "{:?}", board.log);
    assert_eq!(board.lines("display: answers").count(), 1);
    assert!(board.resets.is_empty());
}

/// Noise on the supply turns pixels and a register over, and nothing reports it: within 10 s the picture is right again.
#[test]
fn a_corrupted_display_is_repaired_within_ten_seconds() {
    let mut board = wide_board(2, 25.0);
    board.run_ms(600);
    let before = *board.frame();
    board.display("corrupt");
    board.run_ms(100);
    assert_ne!(board.frame(), &before, "the fault can be seen");
    board.run_ms(10_100);
    assert_eq!(board.frame(), &before);
}
