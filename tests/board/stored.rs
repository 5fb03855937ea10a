//! What the operator chose last outlives a power cut, whenever it comes, and never disturbs a measurement.

use std::convert::Infallible;

use embassy_futures::block_on;
use embedded_storage_async::nor_flash::{ErrorType, NorFlash, ReadNorFlash};
use rimrate_core::panel::Knob;
use rimrate_core::verdict::Verdict;
use rimrate_sim::rig::{Rig, Touch};
use sequential_storage::cache::Cache;
use sequential_storage::queue::{QueueConfig, QueueStorage};

use crate::rig::{Emulator, Start};
use crate::support::{UNFED, confirmed, run_down, setup, spin, wide_machine};

/// The last two sectors of 4 KiB (W25Q16JV data sheet, 6.1) of the Pico's 2 MiB.
const KEPT: u32 = 0x1f_e000;
const KEPT_BYTES: usize = 0x2000;
const XIP: u64 = 0x1000_0000;

fn board(slow_flash: bool) -> Emulator {
    confirmed(Start {
        machine: Some((wide_machine(2), Some(setup(25.0)))),
        slow_flash,
        ..Start::default()
    })
}

/// Turns the right knob and waits until the diameter has been kept.
fn choose(board: &mut Emulator, detents: i8) {
    let before = kept(board);
    board.touch(Touch::Turn(Knob::Right, detents));
    board.run_ms(2_600);
    assert_eq!(kept(board), before + 1, "{:?}", board.log);
}

fn kept(board: &Emulator) -> usize {
    board.lines("stored setup: kept").count()
}

/// Switches off and on; the picture is drawn then.
fn cycle(board: &mut Emulator) {
    board.power_cycle();
    board.run_ms(500);
    assert_eq!(board.verdict(), Verdict::Unconfirmed);
}

/// The two sectors as they are.
fn sectors(board: &mut Emulator) -> Vec<u8> {
    board.peek(XIP + u64::from(KEPT), KEPT_BYTES as u64)
}

/// Flash in this computer's memory; it wears no less than the real one.
struct Cells(Vec<u8>);

impl ErrorType for Cells {
    type Error = Infallible;
}
impl ReadNorFlash for Cells {
    const READ_SIZE: usize = 1;
    async fn read(&mut self, offset: u32, bytes: &mut [u8]) -> Result<(), Infallible> {
        let at = offset as usize;
        bytes.copy_from_slice(&self.0[at..at + bytes.len()]);
        Ok(())
    }
    fn capacity(&self) -> usize {
        self.0.len()
    }
}
impl NorFlash for Cells {
    const WRITE_SIZE: usize = 1;
    const ERASE_SIZE: usize = 4096;
    async fn erase(&mut self, from: u32, to: u32) -> Result<(), Infallible> {
        self.0[from as usize..to as usize].fill(0xff);
        Ok(())
    }
    async fn write(&mut self, offset: u32, bytes: &[u8]) -> Result<(), Infallible> {
        let at = offset as usize;
        for (cell, byte) in self.0[at..].iter_mut().zip(bytes) {
            *cell &= byte;
        }
        Ok(())
    }
}

/// Every record in the two sectors, oldest first, and the sectors with the last one appended again and again until `full`
/// sectors have room for none.
fn filled(sectors: Vec<u8>, full: usize) -> Vec<u8> {
    let config = QueueConfig::new(0..KEPT_BYTES as u32);
    let mut queue = QueueStorage::new(Cells(sectors), config, Cache::new_uncached());
    let mut bytes = [0; 64];
    let last = block_on(async {
        let mut records = queue.iter().await.expect("is sound");
        let mut last = Vec::new();
        while let Some(record) = records.next(&mut bytes).await.expect("is sound") {
            last = record.to_vec();
        }
        last
    });
    assert!(!last.is_empty(), "a record was written by the board");
    // A record has a head of 8 bytes, a sector a mark at each end.
    let rows = (4096 - 2) / (8 + last.len()) * full;
    while records_in(&mut queue) < rows {
        block_on(queue.push(&last, false)).expect("has room");
    }
    queue.destroy().0.0
}

fn records_in(
    queue: &mut QueueStorage<
        Cells,
        Cache<
            sequential_storage::cache::Uncached,
            sequential_storage::cache::Uncached,
            sequential_storage::cache::Uncached,
        >,
    >,
) -> usize {
    let mut bytes = [0; 64];
    block_on(async {
        let mut records = queue.iter().await.expect("is sound");
        let mut count = 0;
        while records.next(&mut bytes).await.expect("is sound").is_some() {
            count += 1;
        }
        count
    })
}

/// Everything that the knobs can change; the press is asked for anew each time.
#[test]
fn a_setup_outlives_power_cuts() {
    let mut board = board(false);
    assert_eq!(board.lines("stored setup: none").count(), 1);
    assert!(board.frame().shows("work 25 mm"));
    board.watch(&[("write", "rimrate_flash::stored::Stored::go_on")]);
    choose(&mut board, 5);
    let write = board.calls.last().expect("was written").1 as f64 / 125e3;
    println!("a setup is written in {write:.1} ms");
    assert!(write < 5.0, "{write} ms");
    board.touch(Touch::Turn(Knob::Left, 2));
    board.run_ms(2_600);
    assert_eq!(kept(&board), 2);
    for _ in 0..2 {
        cycle(&mut board);
        assert!(board.frame().shows("work 30 mm"), "{:?}", board.frame());
        assert!(board.frame().shows("High-C steel"), "{:?}", board.frame());
    }
    assert_eq!(board.lines("stored setup: read").count(), 2);
    assert!(board.resets.is_empty());
    // What has been changed for less than two seconds is forgotten.
    board.press(Knob::Left);
    board.run_ms(500);
    board.touch(Touch::Turn(Knob::Right, 2));
    board.run_ms(1_000);
    cycle(&mut board);
    assert!(board.frame().shows("work 30 mm"), "{:?}", board.frame());
}

/// The operator is told, presses, and sees the most cautious setup, which that press has not confirmed.
fn acknowledge_the_loss(board: &mut Emulator) {
    assert_eq!(board.lines("stored setup: unreadable").count(), 1);
    for words in ["WHAT WAS CHOSEN IS LOST", "the pulses in a turn on"] {
        assert!(board.frame().shows(words), "{:?}", board.frame());
    }
    board.press(Knob::Left);
    board.run_ms(500);
    assert!(board.frame().shows("work 25.4 mm"), "{:?}", board.frame());
    assert_eq!(board.verdict(), Verdict::Unconfirmed);
}

/// The only record is damaged: the most cautious setup, a line in the log, and the next one is kept again.
#[test]
fn a_damaged_record_falls_back_to_the_most_cautious_setup() {
    let mut board = board(false);
    choose(&mut board, 5);
    let record = sectors(&mut board)
        .iter()
        .rposition(|&b| b != 0xff)
        .expect("something was written");
    let at = XIP + u64::from(KEPT) + record as u64;
    let byte = board.peek(at, 1)[0];
    board.poke(at, &[byte ^ 0x10]);
    cycle(&mut board);
    acknowledge_the_loss(&mut board);
    board.press(Knob::Left);
    board.run_ms(500);
    choose(&mut board, 1);
    let shown = *board.frame();
    cycle(&mut board);
    assert_eq!(board.lines("stored setup: read").count(), 1);
    assert_ne!(board.frame(), &shown, "unconfirmed again");
    assert!(!board.frame().shows("work 25.4 mm"), "{:?}", board.frame());
}

/// The sectors hold something else: noise, or a record of another form or profile.
#[test]
fn what_it_did_not_write_is_not_read() {
    let noise = |i: u32| (i.wrapping_mul(0x9e37_79b1) >> 24) as u8;
    let noise: Vec<u8> = (0..KEPT_BYTES as u32).map(noise).collect();
    for slow in [false, true] {
        let mut board = board(slow);
        board.poke(XIP + u64::from(KEPT), &noise);
        cycle(&mut board);
        acknowledge_the_loss(&mut board);
        board.press(Knob::Left);
        board.run_ms(500);
        choose(&mut board, 3);
        cycle(&mut board);
        assert_eq!(board.lines("stored setup: read").count(), 1);
        assert!(board.resets.is_empty(), "{:?}", board.log);
    }
    // The same two sectors under another profile.
    let mut first = board(false);
    choose(&mut first, 5);
    let record = sectors(&mut first);
    let mut other = confirmed(Start {
        machine: Some((wide_machine(6), Some(setup(25.0)))),
        ..Start::default()
    });
    other.poke(XIP + u64::from(KEPT), &record);
    cycle(&mut other);
    assert_eq!(other.lines("stored setup: of another profile").count(), 1);
    assert!(other.frame().shows("work 25 mm"), "{:?}", other.frame());
}

/// Cut at any moment of a write, and of an erasure: the old setup or the new one.
#[test]
fn a_power_cut_while_writing_leaves_the_old_or_the_new() {
    for full in [0, 2] {
        let mut first = board(false);
        choose(&mut first, 5);
        let sectors = match full {
            0 => sectors(&mut first),
            _ => filled(sectors(&mut first), full),
        };
        let prepared = || {
            let mut board = board(false);
            board.poke(XIP + u64::from(KEPT), &sectors);
            cycle(&mut board);
            assert!(board.frame().shows("work 30 mm"), "{:?}", board.frame());
            board.press(Knob::Left);
            board.run_ms(500);
            board.touch(Touch::Turn(Knob::Right, 2));
            board
        };
        let mut whole = prepared();
        let turned = whole.now();
        whole.run_ms(2_600);
        let line = whole.lines("stored setup: kept").last().expect("is kept");
        let written = line.at - turned;
        // Two or three programmed pieces, before them an erasure where both sectors are full.
        let took = if full == 0 { 5_000_000 } else { 55_000_000 };
        let mut seen = [0, 0];
        for i in 0..8 {
            let mut board = prepared();
            board.cut_power(written + 500_000 - took + took * i / 7);
            board.run_ms(3_000);
            let new = board.frame().shows("work 32 mm");
            assert!(
                new || board.frame().shows("work 30 mm"),
                "{full} {i}: {:?}",
                board.frame()
            );
            seen[usize::from(new)] += 1;
            assert_eq!(board.lines("stored setup: read").count(), 2);
            // And it can be written again.
            board.press(Knob::Left);
            board.run_ms(500);
            choose(&mut board, 1);
            assert!(board.resets.is_empty());
        }
        println!(
            "{full} sectors full: the old one {} times, the new one {} times",
            seen[0], seen[1]
        );
        assert!(seen[0] > 0 && seen[1] > 0);
    }
}

/// A confirmed board with the slowest flash, whose sectors are so full that the next setup needs one erased.
fn about_to_erase() -> Emulator {
    let mut first = board(false);
    choose(&mut first, 5);
    let full = filled(sectors(&mut first), 2);
    let mut board = board(true);
    board.poke(XIP + u64::from(KEPT), &full);
    cycle(&mut board);
    board.press(Knob::Left);
    board.run_ms(500);
    board
}

/// While the spindle turns nothing is written and no step is long; at rest even the slowest flash starves nothing.
#[test]
fn nothing_is_written_while_the_spindle_turns() {
    let mut board = about_to_erase();
    board.watch(&[("step", "rimrate_firmware::tasks::owner::Owner::step")]);
    let from = board.now() + 3_000_000;
    board.edges(&run_down(640.0, 2, from, from + 12_000_000_000));
    board.run_ms(1_000);
    board.touch(Touch::Turn(Knob::Right, 2));
    board.run_ms(11_000);
    assert_eq!(kept(&board), 0);
    let turning = board.calls.iter().map(|c| c.1).max().expect("steps");
    assert!(turning <= 625_000, "{turning} cycles are more than 5 ms");
    let calls = board.calls.len();
    let stopped = board.now();
    while kept(&board) == 0 && board.now() < stopped + 5_000_000_000 {
        board.run_ms(20);
    }
    assert_eq!(kept(&board), 1, "{:?}", board.log);
    let longest = board.calls[calls..].iter().map(|c| c.1).max().unwrap_or(0);
    println!(
        "longest step while turning {:.1} ms, at rest with the slowest flash {:.0} ms, watchdog not fed for {} ms at most",
        turning as f64 / 125e3,
        longest as f64 / 125e3,
        board.longest_unfed / 1_000_000
    );
    assert!(longest as f64 / 125e3 > 400.0, "{longest}: it was erased");
    assert!(board.resets.is_empty());
    assert!(board.longest_unfed <= UNFED + 450_000_000);
    cycle(&mut board);
    assert!(board.frame().shows("work 32 mm"), "{:?}", board.frame());
}

/// The motor is started at the very moment at which the flash is busy: no edge is lost, and none is misplaced.
#[test]
fn edges_are_captured_while_the_flash_is_busy() {
    let mut board = about_to_erase();
    board.touch(Touch::Turn(Knob::Right, 2));
    let turned = board.now();
    board.run_ms(1_900);
    // From before the end of the erasure until long after it.
    let edges = spin(640.0, 2, turned + 2_120_000_000, turned + 6_000_000_000);
    board.edges(&edges);
    board.run_ms(2_500);
    let line = board.lines("stored setup: kept").last().expect("is kept");
    println!("kept {} ms after the turn", (line.at - turned) / 1_000_000);
    assert!(line.at > turned + 2_350_000_000, "was busy meanwhile");
    let speed = board.reading().speed.expect("is turning");
    assert!(
        (f64::from(speed.get()) / 640.0 - 1.0).abs() < 2e-4,
        "{speed}"
    );
    board.run_ms(4_000);
    assert_eq!(board.count("lost"), 0);
    assert_eq!(board.count("edges"), edges.len() as u64);
    assert!(board.resets.is_empty());
}
