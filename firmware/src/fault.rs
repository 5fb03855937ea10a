//! What went wrong before the last reset: kept in RAM that nothing initialises.
//!
//! Contents of the SRAM outlive a watchdog reset (RP2040 data sheet, 2.6.2 and 4.7); after power-up they are noise, which a
//! magic number and a checksum tell from a record. The record lies clear of what the boot ROM uses: see `memory/`.

use core::cell::UnsafeCell;
use core::fmt::Write;
use core::panic::PanicInfo;

use cortex_m_rt::{ExceptionFrame, exception};
use crc::{CRC_32_ISO_HDLC, Crc, NoTable};
use embassy_rp::watchdog::{ResetReason, Watchdog};
use heapless::String;
use portable_atomic::{AtomicBool, AtomicU32, Ordering};

use crate::board;

/// Longest message that is kept.
const LONGEST: usize = 200;
const MAGIC: u32 = 0x5249_4d52;
const CRC: Crc<u32, NoTable> = Crc::<u32, NoTable>::new(&CRC_32_ISO_HDLC);

/// The tasks that have to check in.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(crate) enum Task {
    /// The owner of the instrument.
    Owner = 1,
    /// The display's task.
    Screen = 2,
    /// The knobs' task.
    Knobs = 4,
}

/// A set of [`Task`]s.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(crate) struct Tasks(u32);

impl Tasks {
    /// Every task.
    const ALL: u32 = Task::Owner as u32 | Task::Screen as u32 | Task::Knobs as u32;

    /// Their names.
    pub(crate) fn names(self) -> String<24> {
        let mut names = String::new();
        for (task, name) in [
            (Task::Owner, "owner "),
            (Task::Screen, "screen "),
            (Task::Knobs, "knobs "),
        ] {
            if self.0 & task as u32 != 0 {
                // All three fit.
                let _ = names.push_str(name);
            }
        }
        names
    }
}

impl defmt::Format for Tasks {
    fn format(&self, f: defmt::Formatter<'_>) {
        defmt::write!(f, "{=str}", self.names());
    }
}

/// Why the program starts.
pub(crate) enum Cause {
    /// Power came on, or somebody reset the chip.
    Power,
    /// It panicked.
    Panic(String<LONGEST>),
    /// These tasks hung or had not checked in when the watchdog's time ran out.
    Starved(Tasks),
    /// Power came on, and what the operator chose before cannot be read.
    Forgotten,
}

#[repr(C)]
struct Record {
    magic: u32,
    crc: u32,
    length: u32,
    message: [u8; LONGEST],
}

struct Keep(UnsafeCell<Record>);
// SAFETY: touched by `last_reset` before any task runs, and by the panic handler with interrupts off.
unsafe impl Sync for Keep {}

#[unsafe(link_section = ".keep")]
static RECORD: Keep = Keep(UnsafeCell::new(Record {
    magic: 0,
    crc: 0,
    length: 0,
    message: [0; LONGEST],
}));
/// Who has checked in since the watchdog was fed; kept, so that it tells after a reset who had not.
#[unsafe(link_section = ".keep")]
static CHECKED_IN: AtomicU32 = AtomicU32::new(0);

/// Who is at work at this moment: of those one hangs when the watchdog's time runs out.
#[unsafe(link_section = ".keep")]
static AT_WORK: AtomicU32 = AtomicU32::new(0);

/// Does a piece of work that does not wait, and leaves a note who does it.
pub(crate) fn at_work<T>(task: Task, work: impl FnOnce() -> T) -> T {
    AT_WORK.fetch_or(task as u32, Ordering::Relaxed);
    let done = work();
    AT_WORK.fetch_and(!(task as u32), Ordering::Relaxed);
    done
}

/// Says that a task is alive.
pub(crate) fn check_in(task: Task) {
    CHECKED_IN.fetch_or(task as u32, Ordering::Relaxed);
}

/// Whether every task has checked in since this was last true.
pub(crate) fn all_checked_in() -> bool {
    critical_section::with(|_| {
        let all = CHECKED_IN.load(Ordering::Relaxed) & Tasks::ALL == Tasks::ALL;
        if all {
            CHECKED_IN.store(0, Ordering::Relaxed);
        }
        all
    })
}

/// Why the program starts; forgets it at the same time.
pub(crate) fn last_reset(watchdog: &Watchdog) -> Cause {
    // SAFETY: no task runs yet; any bits are a `Record`.
    let record = unsafe { RECORD.0.get().read_volatile() };
    let absent =
        Tasks((!CHECKED_IN.load(Ordering::Relaxed) | AT_WORK.load(Ordering::Relaxed)) & Tasks::ALL);
    CHECKED_IN.store(0, Ordering::Relaxed);
    AT_WORK.store(0, Ordering::Relaxed);
    // SAFETY: as above.
    unsafe { (&raw mut (*RECORD.0.get()).magic).write_volatile(0) };
    match watchdog.reset_reason() {
        None => Cause::Power,
        Some(ResetReason::TimedOut) => Cause::Starved(absent),
        Some(ResetReason::Forced) => {
            let text = record
                .message
                .get(..record.length as usize)
                .filter(|text| record.magic == MAGIC && CRC.checksum(text) == record.crc)
                .and_then(|text| core::str::from_utf8(text).ok())
                .unwrap_or("(no message was kept)");
            let mut message = String::new();
            let _ = message.push_str(text);
            Cause::Panic(message)
        }
    }
}

#[panic_handler]
fn panic(info: &PanicInfo<'_>) -> ! {
    static AGAIN: AtomicBool = AtomicBool::new(false);
    cortex_m::interrupt::disable();
    board::outputs_safe();
    // A panic while panicking, or inside the logger, must not recurse.
    if !AGAIN.swap(true, Ordering::Relaxed) {
        let mut message: String<LONGEST> = String::new();
        let place = info.location();
        // What does not fit is cut.
        let _ = write!(
            message,
            "{}:{} {}",
            place
                .map_or("?", |p| p.file())
                .rsplit('/')
                .next()
                .unwrap_or("?"),
            place.map_or(0, |p| p.line()),
            info.message()
        );
        let mut record = Record {
            magic: MAGIC,
            crc: CRC.checksum(message.as_bytes()),
            length: message.len() as u32,
            message: [0; LONGEST],
        };
        for (to, from) in record.message.iter_mut().zip(message.bytes()) {
            *to = from;
        }
        // SAFETY: interrupts are off.
        unsafe { RECORD.0.get().write_volatile(record) };
    }
    board::restart()
}

/// A fault of the processor becomes a panic, which is kept and reported.
#[exception]
unsafe fn HardFault(frame: &ExceptionFrame) -> ! {
    panic!("hard fault at {:#010x}", frame.pc());
}
