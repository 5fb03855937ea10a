//! Rimrate on the board: a thin driver around core's `Instrument`.
//!
//! ```text
//! sensor pin -> PIO -> DMA -> ring in RAM --(every 2 ms)--> owner --> lamps, buzzer, relay
//! knob pins  -> knobs (interrupt executor) --messages-----> owner --> frame --> screen --I2C--> display
//!                                          supervise <--check-ins-- all of them
//! ```
//!
//! Invariants:
//! - an edge gets its time from the PIO, never from a task: neither interrupts nor drawing reach a measurement;
//! - one task owns the `Instrument`; none of its steps takes longer than 5 ms but the one that keeps a setup, at rest; it never
//!   waits for the display;
//! - nothing is allocated; what is lost is counted, and a window with a loss in it is dropped as a whole;
//! - the relay is open after every reset, and stays open after a panic or a watchdog reset until a knob is pressed;
//! - the watchdog is fed only when every task has checked in.

#![no_std]
#![no_main]

mod board;
mod fault;
mod frame;
mod notice;
mod oled;
mod tasks;

use embassy_executor::{Executor, InterruptExecutor};
use embassy_rp::interrupt;
use embassy_rp::interrupt::{InterruptExt, Priority};
use rtt_target::ChannelMode;
use static_cell::StaticCell;

use board::Board;
use tasks::owner::Owner;

/// The version in `Cargo.toml`.
const VERSION: &str = env!("CARGO_PKG_VERSION");
/// The commit that the image was built from.
const BUILD: &str = env!("RIMRATE_BUILD");

static KNOBS: InterruptExecutor = InterruptExecutor::new();
static OWNER: StaticCell<Owner> = StaticCell::new();
static REST: StaticCell<Executor> = StaticCell::new();

#[interrupt]
unsafe fn SWI_IRQ_1() {
    // SAFETY: the only caller, and the interrupt is enabled by `KNOBS.start` alone.
    unsafe { KNOBS.on_interrupt() }
}

#[cortex_m_rt::entry]
fn main() -> ! {
    rtt_target::rtt_init_defmt!(ChannelMode::NoBlockSkip, 1024);
    let board = Board::start();
    let mut parts = board.wire();
    let cause = fault::last_reset(&parts.watchdog);
    // From here on nothing can hang for good, not even the start.
    tasks::supervise::start(&mut parts.watchdog);
    defmt::info!(
        "rimrate {=str} build {=str} on {=str}",
        VERSION,
        BUILD,
        board::NAME
    );
    match &cause {
        fault::Cause::Power | fault::Cause::Forgotten => defmt::info!("start: power-up"),
        fault::Cause::Panic(message) => defmt::error!("start: after panic: {=str}", message),
        fault::Cause::Starved(missing) => {
            defmt::error!("start: after watchdog, missing {}", missing)
        }
    }

    // Above everything else that this program handles, so that drawing does not hide a knob; below nothing that measures.
    interrupt::SWI_IRQ_1.set_priority(Priority::P3);
    let knobs = KNOBS.start(interrupt::SWI_IRQ_1);
    knobs.spawn(tasks::knobs::run(parts.knobs).expect("the first of its kind"));

    let owner = OWNER.init_with(|| Owner::new(parts.capture, parts.signs, parts.flash, cause));
    REST.init(Executor::new()).run(|rest| {
        rest.spawn(tasks::owner::run(owner).expect("the first of its kind"));
        rest.spawn(tasks::screen::run(parts.display).expect("the first of its kind"));
        rest.spawn(tasks::supervise::run(parts.watchdog).expect("the first of its kind"));
    })
}
