//! A scenario on the desk and on the board at once: the same verdicts, lamps and pictures.

use std::collections::VecDeque;
use std::path::Path;

use rimrate_core::beacon::Outputs;
use rimrate_core::machine::Machine;
use rimrate_core::tacho::Reading;
use rimrate_core::time::{Edge, Instant};
use rimrate_core::verdict::Verdict;
use rimrate_sim::frame::Frame;
use rimrate_sim::play::{Keep, play_on};
use rimrate_sim::rig::{Desk, Rig, Touch};
use rimrate_sim::scenario::Scenario;

use crate::rig::{CONTACT, Emulator, Start};
use crate::support::{STARTED_MS, profile};

/// How much later or earlier the board may be.
const TOLERANCE_MS: usize = 100;
/// A picture that has stood this long on the desk must be the board's, too.
const STANDS_MS: u64 = 250;

/// Both boxes. The desk answers; the board is compared.
struct Both {
    desk: Desk,
    board: Emulator,
    /// Verdicts of the desk in the last steps.
    verdicts: VecDeque<Verdict>,
    frames_since: Instant,
    frame: Frame,
    /// The board's knobs are still being turned.
    turning_until: Instant,
    compared: usize,
    worst: Vec<String>,
}

impl Rig for &mut Both {
    fn run(&mut self, edges: &[Edge], now: Instant) {
        self.desk.run(edges, now);
        self.board.run(edges, now);
        if now.nanos() < STARTED_MS * 1_000_000 {
            return;
        }
        self.verdicts.push_back(self.desk.verdict());
        // The bench takes slices of 5 ms.
        if self.verdicts.len() > TOLERANCE_MS / 5 {
            self.verdicts.pop_front();
        }
        let at = now.nanos() as f64 / 1e9;
        let settled = now >= self.turning_until;
        if settled && self.verdicts.iter().all(|v| *v != self.board.verdict()) {
            self.worst.push(format!(
                "{at:.3} s: desk {:?}, board {:?}",
                self.desk.verdict(),
                self.board.verdict()
            ));
        }
        if self.desk.frame() != &self.frame || !settled {
            self.frame = *self.desk.frame();
            self.frames_since = now;
        }
        if now.since(self.frames_since).millis() == STANDS_MS {
            self.compared += 1;
            if self.board.frame() != &self.frame {
                self.worst.push(format!(
                    "{at:.3} s: desk {:?}board {:?}",
                    self.frame,
                    self.board.frame()
                ));
            }
        }
    }

    fn touch(&mut self, touch: Touch) {
        self.desk.touch(touch);
        self.board.touch(touch);
        if let Touch::Turn(_, detents) = touch {
            let turning = 4 * CONTACT * u64::from(detents.unsigned_abs());
            self.turning_until =
                Instant::from_nanos(self.board.now() + turning + TOLERANCE_MS as u64 * 1_000_000);
        }
    }
    fn power_cycle(&mut self) {
        // The board does not remember a setup yet: the comparison ends before.
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

fn compare(seconds: f64) {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("../sim/scenarios/shift.toml");
    let mut scenario = Scenario::load(&path).unwrap_or_else(|e| panic!("{e}"));
    scenario.seconds = seconds;
    scenario.expectations.retain(|e| e.until <= seconds);
    let machine = profile("geared-lathe");
    let mut both = Both {
        desk: Desk::new(
            Machine::new(machine.clone()).expect("is sound"),
            Some(scenario.setup),
        ),
        board: Emulator::start(Start {
            machine: Some((machine, Some(scenario.setup))),
            ..Start::default()
        }),
        verdicts: VecDeque::new(),
        frames_since: Instant::ZERO,
        frame: Frame::new(),
        turning_until: Instant::ZERO,
        compared: 0,
        worst: Vec::new(),
    };
    let summary = play_on(&scenario, &mut both, &Keep::default()).unwrap_or_else(|e| panic!("{e}"));
    println!(
        "{} pictures compared, {} pulses, awake {:.1} %",
        both.compared,
        summary.pulses,
        both.board.awake as f64 / (seconds * 1.25e6)
    );
    assert!(summary.missed.is_empty(), "{:#?}", summary.missed);
    assert!(
        both.compared > seconds as usize / 5,
        "{} pictures",
        both.compared
    );
    assert!(both.worst.is_empty(), "{}", both.worst.join("\n"));
    assert!(both.board.resets.is_empty());
}

/// The first part of the demo shift: power-up, the advised step, a cut, another material, brake, a notice, too fast, mute.
#[test]
fn the_shift_begins_alike_on_desk_and_board() {
    compare(54.0);
}

/// All of it up to the break.
#[test]
#[ignore = "three minutes of device time: cargo test -p rimrate-tests --features board -- --ignored"]
fn the_whole_shift_is_alike_on_desk_and_board() {
    compare(184.0);
}
