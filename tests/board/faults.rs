//! Hung tasks, panics, stuck knobs: what is reset, what is kept, what stays open.

use rimrate_core::panel::Knob;
use rimrate_core::verdict::Verdict;
use rimrate_sim::rig::{Rig, Touch};

use crate::image::IMAGE;
use crate::rig::{Emulator, Start};
use crate::support::{setup, spin, wide_board, wide_machine};

/// Thumb: a branch to itself, and an undefined instruction (ARMv6-M architecture reference, A6.7.10 and A6.7.78).
const HANG: [u8; 2] = [0xfe, 0xe7];
const UNDEFINED: [u8; 2] = [0x00, 0xde];

/// Puts an instruction at the start of a function, and the old bytes back.
fn poison(board: &mut Emulator, function: &str, with: [u8; 2]) -> (u64, Vec<u8>) {
    let (at, _) = IMAGE.symbol(function);
    let before = board.peek(at, 2);
    board.poke(at, &with);
    (at, before)
}

/// Runs until the board is reset, at most so long.
fn until_reset(board: &mut Emulator, ms: u64) {
    for _ in 0..ms {
        if !board.resets.is_empty() {
            return;
        }
        board.run_ms(1);
    }
    panic!("no reset within {ms} ms");
}

/// A spindle far above what the collet allows: danger, the relay closes.
fn in_danger() -> Emulator {
    let mut board = wide_board(2, 25.0);
    let from = board.now() + 3_000_000;
    board.edges(&spin(9000.0, 2, from, from + 6_000_000_000));
    board.run_ms(800);
    assert_eq!(board.verdict(), Verdict::Danger);
    assert!(board.outputs().relay, "danger closes the relay");
    board
}

fn after_restart(mut board: Emulator) {
    board.run_ms(1500);
    // In danger still, but nobody has seen yet that the box restarted.
    assert_eq!(board.verdict(), Verdict::Danger);
    assert!(board.outputs().over || board.changes.iter().rev().take(8).any(|c| c.what == "over"));
    let reset = board.resets.last().expect("was reset").0;
    let closed = board
        .changes
        .iter()
        .any(|c| c.what == "relay" && c.value == 1 && c.at > reset);
    assert!(!closed, "the relay stays open until a knob is pressed");
    assert!(
        board.frame().shows("Press a knob to go on."),
        "{:?}",
        board.frame()
    );
    board.press(Knob::Left);
    board.run_ms(400);
    assert_eq!(board.lines("notice acknowledged").count(), 1);
    assert!(
        board.outputs().relay,
        "acknowledged: danger closes it again"
    );
    assert!(!board.frame().shows("Press a knob to go on."));
}

/// A task that never comes back starves the watchdog; the next start names it.
#[test]
fn a_hung_task_resets_the_box() {
    let mut board = in_danger();
    let hung = board.now();
    let (at, before) = poison(&mut board, OWNER_STEP, HANG);
    until_reset(&mut board, 1100);
    board.poke(at, &before);
    board.run_ms(300);
    let (when, why) = board.resets.first().expect("was reset").clone();
    println!("reset {} ms after the hang", (when - hung) / 1_000_000);
    assert_eq!(why, "timer");
    assert!(when - hung <= 1_000_000_000);
    let line = board
        .lines("start: after watchdog")
        .next()
        .expect("is logged");
    assert!(line.text.contains("owner"), "{}", line.text);
    assert!(
        board.frame().shows("RESTARTED: TASK HUNG"),
        "{:?}",
        board.frame()
    );
    after_restart(board);
}

/// A fault of the processor is a panic; the panic's message outlives the reset, and is shown and logged.
#[test]
fn a_panic_is_kept_and_shown() {
    let mut board = in_danger();
    let (at, before) = poison(&mut board, OWNER_STEP, UNDEFINED);
    // It comes by within a few milliseconds, and the reset follows at once.
    until_reset(&mut board, 20);
    board.poke(at, &before);
    board.run_ms(300);
    assert_eq!(board.resets.len(), 1, "{:?}", board.resets);
    assert_eq!(board.resets[0].1, "forced");
    let line = board.lines("start: after panic").next().expect("is logged");
    let place = format!("hard fault at {at:#010x}");
    assert!(line.text.contains(&place), "{}", line.text);
    assert!(
        board.frame().shows("RESTARTED AFTER A FAULT"),
        "{:?}",
        board.frame()
    );
    // The message stands in rows of 25 characters.
    let message = line
        .text
        .trim_start_matches("start: after panic: ")
        .to_owned();
    for row in message.as_bytes().chunks(25) {
        let row = std::str::from_utf8(row).expect("is ASCII").trim();
        assert!(board.frame().shows(row), "{row}: {:?}", board.frame());
    }
    assert_eq!(
        board.lines("rimrate ").count(),
        2,
        "version and build at each start"
    );
    after_restart(board);
}

/// At power-up, in danger from the first pulse on, nothing closes the relay before the setup allows it; at a plain start no
/// press is needed.
#[test]
fn the_relay_is_open_at_power_up() {
    let board = in_danger();
    let first = board
        .changes
        .iter()
        .find(|c| c.what == "relay" && c.value == 1)
        .expect("closes");
    let danger = board.lines("verdict Danger").next().expect("is logged").at;
    assert!(first.at + 5_000_000 >= danger && first.at <= danger);
}

/// A knob's contacts bounce, jump and jam: no turn that was not made, no press that was not held.
#[test]
fn knobs_are_debounced_and_their_faults_counted() {
    let mut board = wide_board(2, 25.0);
    board.run_ms(500);
    let before = *board.frame();
    // Both contacts at once, three times: no encoder does that.
    for i in 0..3_u64 {
        for name in ["knob_left_a", "knob_left_b"] {
            board.pin_in(i * 20_000_000, name, false);
            board.pin_in(i * 20_000_000 + 10_000_000, name, true);
        }
    }
    // A push switch that only chatters.
    for i in 0..20_u64 {
        board.pin_in(100_000_000 + i * 3_000_000, "knob_right_push", i % 2 == 1);
    }
    board.run_ms(1700);
    assert_eq!(board.frame(), &before, "nothing has been turned or pressed");
    assert!(
        board.count("illegal") >= 3,
        "{} illegal",
        board.count("illegal")
    );

    // Half a detent and back.
    board.pin_in(0, "knob_right_a", false);
    board.pin_in(20_000_000, "knob_right_a", true);
    board.run_ms(300);
    assert_eq!(board.frame(), &before);
    // Ten detents forth and back, fast.
    board.touch(Touch::Turn(Knob::Right, 10));
    board.run_ms(400);
    assert_ne!(board.frame(), &before);
    board.touch(Touch::Turn(Knob::Right, -10));
    board.run_ms(400);
    assert_eq!(board.frame(), &before);
}

/// A push switch that jams is let go of after 10 s, said, and heard again when it opens; the other knob works all along.
#[test]
fn a_stuck_knob_leaves_the_rest_working() {
    let mut board = Emulator::start(Start {
        machine: Some((wide_machine(2), Some(setup(25.0)))),
        ..Start::default()
    });
    board.run_ms(500);
    board.touch(Touch::Press(Knob::Left));
    board.run_ms(10_500);
    assert_eq!(
        board.lines("knob Left stuck true").count(),
        1,
        "{:?}",
        board.log
    );
    let before = *board.frame();
    board.press(Knob::Right);
    board.run_ms(500);
    assert_ne!(board.frame(), &before, "the right knob opens the choices");
    board.touch(Touch::Release(Knob::Left));
    board.run_ms(500);
    assert_eq!(board.lines("knob Left stuck false").count(), 1);
    assert!(board.resets.is_empty());
}

const OWNER_STEP: &str = "rimrate_firmware::tasks::owner::Owner::step";
