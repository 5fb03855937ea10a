//! Mixed work for a long time: speeds, knobs, a display that fails now and then.
//!
//! `RIMRATE_MINUTES=60 cargo test -p rimrate-tests --features board --test board -- --ignored endurance --nocapture`

use rimrate_core::panel::Knob;
use rimrate_sim::rig::{Rig, Touch};

use crate::support::{UNFED, run_up, wide_board};

/// A linear congruential generator (Knuth, The Art of Computer Programming, volume 2, 3.3.4: MMIX): only to have variety.
struct Dice(u64);

impl Dice {
    fn roll(&mut self, sides: u64) -> u64 {
        self.0 = self
            .0
            .wrapping_mul(6_364_136_223_846_793_005)
            .wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 33) % sides
    }
}

fn mixed_work(minutes: f64) {
    let started = std::time::Instant::now();
    let mut dice = Dice(20_261_201);
    let mut board = wide_board(6, 25.0);
    let end = (minutes * 60e9) as u64;
    let mut unplugged = 0_usize;
    while board.now() < end {
        // A job: up to ten seconds at one speed, then up to five at rest.
        let rpm = 50.0 + dice.roll(2950) as f64;
        let (from, run) = (board.now() + 2_000_000, 2_000 + dice.roll(8_000));
        board.edges(&run_up(rpm, 6, from, from + run * 1_000_000));
        for _ in 0..dice.roll(4) {
            let knob = if dice.roll(2) == 0 {
                Knob::Left
            } else {
                Knob::Right
            };
            board.touch(Touch::Turn(knob, dice.roll(7) as i8 - 3));
            board.run_ms(300);
        }
        if dice.roll(10) == 0 {
            unplugged += 1;
            board.display("unplugged");
            board.run_ms(1_000);
            board.display("none");
        }
        board.run_until(from + run * 1_000_000);
        let read = board.reading();
        if let Some(speed) = read.speed.filter(|_| run > 4_000) {
            let error = f64::from(speed.get()) / rpm - 1.0;
            assert!(error.abs() < 0.001, "{rpm}: read {speed}");
        }
        board.run_ms(1_000 + dice.roll(4_000));
        assert!(board.resets.is_empty(), "{:?}", board.log);
    }
    let stack = board.stack_used();
    println!(
        "{minutes} min in {:.0} s: awake {:.1} %, {} edges, {} windows lost, {unplugged} times without a display, watchdog fed \
         {} times, not for {} ms at most, stack {stack} bytes",
        started.elapsed().as_secs_f64(),
        board.awake as f64 / (minutes * 60.0 * 1.25e6),
        board.count("edges"),
        board.count("lost"),
        board.feeds,
        board.longest_unfed / 1_000_000,
    );
    assert!(board.longest_unfed <= UNFED, "{} ns", board.longest_unfed);
    assert_eq!(board.count("lost"), 0);
    assert_eq!(board.count("unheard"), 0);
}

#[test]
fn five_minutes_of_mixed_work() {
    mixed_work(5.0);
}

#[test]
#[ignore = "an hour of device time; RIMRATE_MINUTES sets another length"]
fn endurance() {
    let minutes = std::env::var("RIMRATE_MINUTES").map_or(60.0, |m| {
        m.parse()
            .unwrap_or_else(|e| panic!("RIMRATE_MINUTES: `{m}` is not a number of minutes ({e})"))
    });
    mixed_work(minutes);
}
