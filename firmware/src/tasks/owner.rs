//! The owner of the instrument: events in, effects out.

use embassy_futures::select::{Either, select};
use embassy_futures::yield_now;
use embassy_rp::Peri;
use embassy_rp::peripherals::FLASH;
use embassy_time::{Duration, Instant as Now, Timer};
use embedded_graphics::pixelcolor::BinaryColor;
use embedded_graphics::prelude::DrawTarget;
use rimrate_core::beacon::Outputs;
use rimrate_core::instrument::{Event, Instrument};
use rimrate_core::machine::Machine;
use rimrate_core::setup::Setup;
use rimrate_core::tacho::{Rejected, Signal};
use rimrate_core::time::Instant;
use rimrate_core::verdict::Verdict;
use rimrate_flash::profile;
use rimrate_flash::stored::Stored;
use static_cell::StaticCell;

use super::sense::{Sense, now};
use super::{MESSAGES, Message, knobs, screen};
use crate::board::{Capture, FLASH_BYTES, Signs};
use crate::fault::{Cause, Task, at_work, check_in};
use crate::notice;

/// Edges are fetched this often while they come. With a picture being drawn in between an over-speed is shown within 5 ms.
const FETCH: Duration = Duration::from_millis(2);
/// The instrument is asked what to do at most this often on account of edges that keep their rhythm: a reading costs as much
/// as twenty edges.
const ASK: Duration = Duration::from_millis(10);
/// Edges are fetched this often when none has come for [`REST`].
const FETCH_AT_REST: Duration = Duration::from_millis(10);
const REST: Duration = Duration::from_secs(1);
/// The board's own lamp changes in this beat.
const BEAT: Duration = Duration::from_millis(125);
/// The reading is logged this often while the spindle may turn, the counts when they have changed.
const LOG: Duration = Duration::from_millis(250);
const LOG_COUNTS: Duration = Duration::from_secs(1);

/// Runs for ever.
#[embassy_executor::task]
pub(crate) async fn run(owner: &'static mut Owner) -> ! {
    loop {
        check_in(Task::Owner);
        let more = at_work(Task::Owner, || owner.step());
        if more {
            yield_now().await;
        } else if let Either::First(message) =
            select(MESSAGES.receive(), Timer::at(owner.wake_at())).await
        {
            owner.hear(message);
            while let Ok(message) = MESSAGES.try_receive() {
                owner.hear(message);
            }
        }
    }
}

/// The instrument and everything around it.
pub(crate) struct Owner {
    instrument: &'static mut Instrument,
    sense: Sense,
    signs: Signs,
    stored: Stored,
    /// Shown, and the relay held open, until a knob is pressed.
    cause: Cause,
    /// The picture has to be drawn though the instrument has not changed.
    repaint: bool,
    display: bool,
    stuck: bool,
    next_poll: Now,
    last_poll: Now,
    last_fetch: Now,
    last_edge: Now,
    verdict: Verdict,
    signal: Signal,
    next_log: Now,
    next_count: Now,
    counted: Counts,
    beat: u32,
    next_beat: Now,
}

/// What is worth a line in the log when it changes.
#[derive(Clone, Copy, PartialEq, Default)]
struct Counts {
    edges: u32,
    lost: u32,
    rejected: Rejected,
    illegal: u32,
    unheard: u32,
}

/// The machine's profile as `build.rs` packed it: in flash, under this name, on its own.
#[used]
#[unsafe(no_mangle)]
static RIMRATE_PROFILE: [u8; 2048] = *include_bytes!(concat!(env!("OUT_DIR"), "/profile.bin"));

fn packed_profile() -> &'static [u8] {
    // As it is in flash, not as the compiler remembers it.
    core::hint::black_box(&RIMRATE_PROFILE)
}

/// A few kilobytes: it lives in a static of its own, and nobody else's frame holds it meanwhile.
#[inline(never)]
fn start_instrument(machine: &Machine, chosen: Option<Setup>) -> &'static mut Instrument {
    static INSTRUMENT: StaticCell<Instrument> = StaticCell::new();
    INSTRUMENT.init_with(|| Instrument::new(now(), machine.clone(), chosen))
}

impl Owner {
    /// Loads the machine's profile and starts the instrument on it.
    pub(crate) fn new(
        capture: Capture,
        signs: Signs,
        flash: Peri<'static, FLASH>,
        cause: Cause,
    ) -> Self {
        let (machine, start, mark) = profile::load(packed_profile());
        let mut stored = Stored::new(flash, FLASH_BYTES, mark);
        let (chosen, cause) = match (stored.load(start), cause) {
            (Ok(chosen), cause) => (chosen, cause),
            (Err(_), Cause::Power) => (None, Cause::Forgotten),
            (Err(_), cause) => (None, cause),
        };
        let pulses = chosen.map_or(machine.pulses(), |setup| setup.pulses_on(machine).get());
        defmt::info!("machine {=str} pulses {=u16}", machine.name(), pulses.get());
        let sense = Sense::new(capture, pulses.get());
        let start = Now::now();
        let instrument = start_instrument(machine, chosen);
        Owner {
            verdict: instrument.verdict(),
            instrument,
            sense,
            signs,
            stored,
            repaint: !matches!(cause, Cause::Power),
            cause,
            display: true,
            stuck: false,
            next_poll: start,
            last_poll: start,
            last_fetch: start,
            last_edge: start,
            signal: Signal::Still,
            next_log: start,
            next_count: start + LOG_COUNTS,
            counted: Counts::default(),
            beat: 0,
            next_beat: start,
        }
    }

    /// When to step again, at the latest.
    fn wake_at(&self) -> Now {
        let fetch = if self.last_fetch - self.last_edge < REST {
            FETCH
        } else {
            FETCH_AT_REST
        };
        self.next_poll.min(self.last_fetch + fetch)
    }

    /// Fetches edges, and where anything is due lets the instrument say what to do. Says whether more edges wait.
    #[inline(never)]
    fn step(&mut self) -> bool {
        let instrument = &mut *self.instrument;
        let taken = self
            .sense
            .take(|edges| instrument.handle(Instant::ZERO, Event::Edges(edges)));
        let time = Now::now();
        self.last_fetch = time;
        if taken.lost {
            defmt::error!("capture: window lost");
            instrument.handle(Instant::ZERO, Event::CaptureLost);
        }
        if taken.withheld {
            instrument.edges_withheld();
        }
        if taken.edges > 0 {
            self.last_edge = time;
            let ask = if instrument.is_urgent() {
                time
            } else {
                self.last_poll + ASK
            };
            self.next_poll = self.next_poll.min(ask);
        }
        if time >= self.next_poll || self.repaint {
            self.poll(taken.until);
        }
        if self.stored.waits() && !self.instrument.view().reading.is_running() {
            self.stored.go_on();
        }
        self.status(time);
        self.log(time);
        taken.more
    }

    fn hear(&mut self, message: Message) {
        match message {
            Message::Turn(knob, detents) => {
                self.instrument.handle(now(), Event::Turn(knob, detents));
            }
            Message::Press(knob) => {
                if !matches!(self.cause, Cause::Power) {
                    // That is all this press is: what it would confirm has not been seen.
                    defmt::info!("notice acknowledged");
                    self.cause = Cause::Power;
                    self.repaint = true;
                    return;
                }
                self.instrument.handle(now(), Event::Press(knob));
            }
            Message::Release(knob) => {
                self.instrument.handle(now(), Event::Release(knob));
                // It may have taken another number over.
                self.sense.expect(self.instrument.pulses());
            }
            Message::Stuck(knob, stuck) => {
                defmt::warn!("knob {} stuck {=bool}", knob, stuck);
                self.stuck = stuck;
            }
            Message::Display(answers) => self.display = answers,
        }
        // What a knob does shows at once.
        self.next_poll = Now::now();
    }

    fn poll(&mut self, now: Instant) {
        self.last_poll = Now::now();
        let poll = self.instrument.poll(now);
        // Rounded up: woken before its time the instrument would only say so again.
        self.next_poll = Now::from_micros(poll.next.nanos().div_ceil(1000));
        if let Some(setup) = &poll.save {
            self.stored.keep(setup);
        }
        let mut outputs = poll.outputs;
        let verdict = self.instrument.verdict();
        if !self.display && is_dark(verdict) {
            outputs = without_display(outputs, self.beat);
        }
        outputs.relay &= matches!(self.cause, Cause::Power);
        self.signs.show(outputs);
        if verdict != self.verdict {
            self.verdict = verdict;
            defmt::info!("verdict {}", verdict);
        }
        if poll.redraw || self.repaint {
            self.repaint = false;
            self.paint();
        }
    }

    /// Draws the whole picture. The dearest step of all, a function of its own so that it can be measured.
    #[inline(never)]
    fn paint(&self) {
        screen::draw(|frame| {
            let Ok(()) = frame.clear(BinaryColor::Off);
            if notice::draw(&self.cause, frame).is_none() {
                let Ok(()) = self.instrument.draw(frame);
            }
        });
    }

    /// The board's own lamp: short and seldom while all is well.
    fn status(&mut self, time: Now) {
        if time < self.next_beat {
            return;
        }
        self.next_beat = time + BEAT;
        self.beat = self.beat.wrapping_add(1);
        let well = self.display && !self.stuck && matches!(self.cause, Cause::Power);
        self.signs.status(if well {
            self.beat.is_multiple_of(16)
        } else {
            self.beat.is_multiple_of(2)
        });
        if !self.display {
            // The lamp code has the same beat.
            self.next_poll = time;
        }
    }

    fn log(&mut self, time: Now) {
        let reading = self.instrument.reading();
        if time >= self.next_log || reading.signal != self.signal {
            self.next_log = time + LOG;
            if reading.is_running() || reading.signal != self.signal {
                self.signal = reading.signal;
                defmt::info!(
                    "reading {} calm {=f32} quick {=f32} overdue {=bool} uncertainty {=f32}",
                    reading.signal,
                    reading.speed.map_or(-1.0, |n| n.get()),
                    reading.quick.map_or(-1.0, |n| n.get()),
                    reading.overdue,
                    reading.uncertainty
                );
            }
        }
        if time >= self.next_count {
            self.next_count = time + LOG_COUNTS;
            let (edges, lost, _) = self.sense.counts();
            let (illegal, unheard) = knobs::counts();
            let counts = Counts {
                edges,
                lost,
                rejected: self.instrument.rejected(),
                illegal,
                unheard,
            };
            if counts != self.counted {
                self.counted = counts;
                defmt::info!(
                    "counts edges {=u32} lost {=u32} illegal {=u32} unheard {=u32} rejected {}",
                    edges,
                    lost,
                    illegal,
                    unheard,
                    counts.rejected
                );
            }
        }
    }
}

/// Whether this verdict leaves the lamps dark, or flashing only to ask for a look at the display.
fn is_dark(verdict: Verdict) -> bool {
    match verdict {
        Verdict::NoPulses
        | Verdict::RunUp
        | Verdict::Unconfirmed
        | Verdict::NeedsCap
        | Verdict::NoAdvice => true,
        Verdict::Danger
        | Verdict::Fast
        | Verdict::Slow
        | Verdict::Right
        | Verdict::Lost
        | Verdict::Doubtful => false,
    }
}

/// The lamp code for a display that does not answer: over and under together, two short flashes every two seconds. Warnings
/// come first: it shows only where the lamps have nothing of their own to say.
fn without_display(outputs: Outputs, beat: u32) -> Outputs {
    let on = matches!(beat % 16, 0 | 2);
    Outputs {
        over: on,
        under: on,
        ..outputs
    }
}
