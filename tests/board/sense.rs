//! What the board measures, against what was put in.

use rimrate_core::panel::Knob;
use rimrate_core::tacho::{Reading, Signal};
use rimrate_core::time::{Edge, EdgeKind, Instant};
use rimrate_sim::rig::{Rig, Touch};

use crate::rig::{Emulator, Start};
use crate::support::{STARTED_MS, inverted, setup, spin, wide_board, wide_machine};

/// Largest error of a steady speed, as a share: 200 ppm. Crystals of this class are within 30 ppm (Raspberry Pi Pico data
/// sheet, appendix B); the emulator's is exact, so all of this is the method's.
const STEADY: f64 = 2e-4;

/// Runs at a steady speed and gives the last reading.
fn read(board: &mut Emulator, rpm: f64, pulses: u32, ms: u64) -> Reading {
    let from = board.now() + 3_000_000;
    board.edges(&spin(rpm, pulses, from, from + ms * 1_000_000));
    board.run_ms(ms);
    board.reading()
}

fn steady(pulses: u32, slow_turns: f64) {
    for (rpm, turns) in [
        (20.0, slow_turns),
        (97.3, 5.0),
        (640.0, 8.0),
        (3000.0, 30.0),
        (6000.0, 60.0),
    ] {
        // Revolutions enough for a start and a calm reading.
        let ms = (turns * 60e3 / rpm).max(800.0) as u64;
        let mut board = wide_board(pulses, 25.0);
        let reading = read(&mut board, rpm, pulses, ms);
        let speed = f64::from(reading.speed.expect("is turning").get());
        let (error, said) = (speed / rpm - 1.0, f64::from(reading.uncertainty));
        println!(
            "{rpm} rpm, {pulses} pulses: read {speed}, error {:.1} ppm, uncertainty {:.1} ppm",
            error * 1e6,
            said * 1e6
        );
        assert_eq!(
            reading.signal,
            Signal::Turning,
            "{rpm} rpm with {pulses} pulses"
        );
        // Never better than the crystal, and on clean edges nearly as good once there is a line.
        let most = if turns < 5.0 { 0.11 } else { STEADY };
        assert!(
            said > 25e-6 && said <= most,
            "{rpm} rpm with {pulses} pulses: {said}"
        );
        assert!(
            error.abs() <= STEADY,
            "{rpm} rpm with {pulses} pulses: read {speed}"
        );
        assert_eq!(board.count("lost"), 0);
        assert!(board.resets.is_empty());
    }
}

#[test]
fn steady_speed_with_one_pulse() {
    steady(1, 5.0);
}

#[test]
fn steady_speed_with_two_pulses() {
    steady(2, 3.0);
}

#[test]
fn steady_speed_with_six_pulses() {
    steady(6, 2.0);
}

#[test]
fn steady_speed_with_sixty_pulses() {
    steady(60, 2.0);
}

/// 20,000 pulses/s, the limit: every edge arrives, while the picture is drawn and a knob turns.
#[test]
fn no_edge_is_lost_at_the_limit() {
    const SECONDS: u64 = 10;
    let pulses = 200;
    let rpm = 20_000.0 * 60.0 / f64::from(pulses);
    let mut board = wide_board(pulses, 25.0);
    let from = board.now() + 10_000_000;
    let edges = spin(rpm, pulses, from, from + SECONDS * 1_000_000_000);
    board.edges(&edges);
    for _ in 0..SECONDS {
        board.touch(rimrate_sim::rig::Touch::Turn(
            rimrate_core::panel::Knob::Right,
            5,
        ));
        board.run_ms(1000);
    }
    board.run_ms(1200);
    println!(
        "{} of {} edges, {} windows lost",
        board.count("edges"),
        edges.len(),
        board.count("lost")
    );
    assert_eq!(board.count("edges"), edges.len() as u64);
    assert_eq!(board.count("lost"), 0);
    let end = from + SECONDS * 1_000_000_000;
    let reading = board
        .lines("reading ")
        .rfind(|l| l.at < end)
        .expect("was turning");
    let reading = &reading.text;
    assert!(reading.contains(&format!("calm {rpm}")), "{reading}");
}

/// The capture's count wraps with its first tick and every 51.5 s; the chip's timer passes 2^32 us (71.6 min) in the middle.
#[test]
fn speed_is_right_across_both_wraps() {
    let rpm = 640.0;
    let mut board = Emulator::start(Start {
        machine: Some((wide_machine(2), Some(setup(25.0)))),
        timer_us: (1 << 32) - 5_000_000,
        ..Start::default()
    });
    board.run_ms(STARTED_MS);
    let from = board.now();
    board.edges(&spin(rpm, 2, from, 8_000_000_000));
    board.run_until(8_000_000_000);
    let readings: Vec<f32> = board
        .lines("reading Turning")
        .map(|l| {
            l.text
                .split_whitespace()
                .nth(3)
                .expect("a speed")
                .parse()
                .expect("a number")
        })
        .collect();
    assert!(readings.len() > 20, "{} readings", readings.len());
    for speed in readings {
        assert!((f64::from(speed) / rpm - 1.0).abs() <= STEADY, "{speed}");
    }
    assert_eq!(
        board.lines("reading Lost").count() + board.lines("reading Doubtful").count(),
        0
    );
    assert_eq!(board.count("lost"), 0);
}

/// A silence longer than the count's whole range (51.5 s) leaves no doubt about the time of the pulses after it; the next
/// wrap comes in the middle of them.
#[test]
fn speed_is_right_after_a_long_silence_and_across_the_next_wrap() {
    let mut board = wide_board(2, 25.0);
    let first = board.now() + 3_000_000;
    board.edges(&spin(640.0, 2, first, first + 500_000_000));
    board.run_until(101_000_000_000);
    assert_eq!(board.count("edges"), 22);
    // 103 s are two ranges.
    board.edges(&spin(320.0, 2, 101_500_000_000, 104_500_000_000));
    board.run_until(102_900_000_000);
    let before = board.reading().speed.expect("is turning").get();
    board.run_until(104_400_000_000);
    let after = board.reading().speed.expect("is turning").get();
    for speed in [before, after] {
        assert!((f64::from(speed) / 320.0 - 1.0).abs() <= STEADY, "{speed}");
    }
    assert_eq!(board.count("lost"), 0);
    assert!(board.resets.is_empty());
}

/// The DMA's first count ends in the middle of a run, as it does every 56 minutes at the limit.
#[test]
fn the_capture_goes_on_when_the_dma_count_ends() {
    let mut board = Emulator::start(Start {
        machine: Some((wide_machine(60), Some(setup(25.0)))),
        first_count: 4096,
        ..Start::default()
    });
    board.run_ms(STARTED_MS);
    let from = board.now() + 10_000_000;
    let edges = spin(3000.0, 60, from, from + 1_500_000_000);
    assert!(edges.len() > 4096 + 1000);
    board.edges(&edges);
    board.run_ms(2600);
    assert_eq!(board.count("edges"), edges.len() as u64);
    assert_eq!(board.count("lost"), 0);
    let early = board
        .lines("reading ")
        .filter(|l| l.at < from + 1_400_000_000 && !l.text.starts_with("reading Turning calm 3000"))
        .filter(|l| l.at > from + 300_000_000);
    assert_eq!(early.count(), 0, "{:?}", board.log);
}

/// More than the ring can hold while the owner does not look: the window is dropped and counted, and no wrong speed is read.
#[test]
fn an_overrun_is_counted_and_shows_no_wrong_speed() {
    let rpm = 640.0;
    let mut board = wide_board(2, 25.0);
    let from = board.now() + 3_000_000;
    board.edges(&spin(rpm, 2, from, from + 1_500_000_000));
    board.run_ms(1600);
    // A storm of 1 MHz on the line, as from a broken shield: 5 ms of it are 10,000 edges.
    let start = board.now();
    for i in 0..5_000 {
        board.pin_in(i * 1000, "sensor", false);
        board.pin_in(i * 1000 + 400, "sensor", true);
    }
    let from = start + 20_000_000;
    board.edges(&spin(rpm, 2, from, from + 2_000_000_000));
    board.run_ms(3300);
    println!("{} windows lost", board.count("lost"));
    assert!(board.count("lost") >= 1);
    // A start has no calm speed yet, written -1.
    let end = from + 2_000_000_000;
    let known = board
        .lines("reading Turning")
        .filter(|l| l.at < end && !l.text.contains("calm -1"));
    for line in known {
        let speed: f64 = line
            .text
            .split_whitespace()
            .nth(3)
            .expect("a speed")
            .parse()
            .expect("a number");
        assert!((speed / rpm - 1.0).abs() <= 0.01, "{}", line.text);
    }
    assert!(board.resets.is_empty());
}

/// A sensor that is high at the magnet is noticed and read all the same.
#[test]
fn a_sensor_wired_inverted_is_reported_and_read() {
    let rpm = 640.0;
    let mut board = wide_board(2, 25.0);
    let from = board.now() + 3_000_000;
    board.edges(&inverted(&spin(rpm, 2, from, from + 2_500_000_000)));
    board.run_ms(2500);
    assert_eq!(board.lines("sensor: inverted true").count(), 1);
    let reading = board.reading();
    assert_eq!(reading.signal, Signal::Turning);
    let speed = f64::from(reading.speed.expect("is turning").get());
    assert!((speed / rpm - 1.0).abs() <= STEADY, "{speed}");
}

/// Ten turns by hand past a wheel of 60 teeth, in pulls of a fifth of a turn, that hold the line low for this share.
fn turn_wheel(board: &mut Emulator, low_ms: u64) {
    const MS: u64 = 1_000_000;
    let mut at = board.now() + 200 * MS;
    let mut edges = Vec::new();
    for pull in 0..50 {
        for _ in 0..12 {
            edges.push(Edge::fall(Instant::from_nanos(at)));
            edges.push(Edge::rise(Instant::from_nanos(at + low_ms * MS)));
            at += 20 * MS;
        }
        at += (150 + 50 * (pull * pull % 7)) * MS;
    }
    board.edges(&edges);
    board.run_ms((at - board.now()) / MS + 200);
}

/// On a machine that is said to have two magnets, teeth with narrow gaps look like a sensor that is wired the other way round,
/// and edges are held back: a count by hand then says so and gives no number. Once the number of teeth is in use they do not.
#[test]
fn teeth_that_look_inverted_spoil_a_count_by_hand() {
    let mut board = wide_board(2, 25.0);
    let press = |board: &mut Emulator, knob| {
        board.press(knob);
        board.run_ms(200);
    };
    press(&mut board, Knob::Right);
    press(&mut board, Knob::Left);
    board.touch(Touch::Turn(Knob::Left, 1));
    board.run_ms(200);
    press(&mut board, Knob::Right);
    assert!(board.frame().shows("press right: turns done"));
    turn_wheel(&mut board, 16);
    assert!(
        board.frame().shows("Pulses were lost while"),
        "{:?}",
        board.frame()
    );
    press(&mut board, Knob::Right);
    turn_wheel(&mut board, 10);
    press(&mut board, Knob::Right);
    assert!(
        board.frame().shows("60 a turn, in use 2"),
        "{:?}",
        board.frame()
    );
    press(&mut board, Knob::Right);
    assert!(board.frame().shows("profile says 2"), "{:?}", board.frame());
    turn_wheel(&mut board, 16);
    let from = board.now() + 3_000_000;
    let low = |edge: Edge| match edge.kind {
        EdgeKind::Fall => edge,
        // 2.7 ms of 3.3.
        EdgeKind::Rise => Edge::rise(Instant::from_nanos(edge.at.nanos() + 1_000_000)),
    };
    let edges: Vec<Edge> = spin(300.0, 60, from, from + 1_500_000_000)
        .into_iter()
        .map(low)
        .collect();
    board.edges(&edges);
    board.run_ms(1500);
    assert_eq!(board.lines("sensor: inverted").count(), 0);
    let speed = board.reading().speed.map_or(0.0, |n| f64::from(n.get()));
    assert!((speed / 300.0 - 1.0).abs() <= STEADY, "{speed}");
    assert_eq!(board.count("lost"), 0);
    assert!(board.resets.is_empty());
}

/// A line that never moves, high or low, through the wrap of the count: no pulses, no reset.
#[test]
fn a_line_that_never_moves_reads_as_no_pulses() {
    for level in [true, false] {
        let mut board = wide_board(1, 25.0);
        board.pin_in(1_000_000, "sensor", level);
        board.run_ms(7_000);
        assert_eq!(board.reading().signal, Signal::Still, "level {level}");
        assert!(board.count("edges") <= 1);
        assert!(board.resets.is_empty());
    }
}
