//! Two rotary encoders with push switches.
//!
//! At rest a change of any contact wakes the task; while something moves it samples every millisecond. It runs above
//! the other tasks, so a knob is not missed while a picture is drawn.

use embassy_futures::select::{select, select_array};
use embassy_time::{Duration, Instant, Ticker, Timer};
use portable_atomic::{AtomicU32, Ordering};
use rimrate_core::panel::Knob;

use super::{MESSAGES, Message};
use crate::board::Encoder;
use crate::fault::{Task, at_work, check_in};

/// Sampling while something moves; a hand turns at most some 200 contact changes a second (common practice, no source).
const SAMPLE: Duration = Duration::from_millis(1);
/// Nothing has moved for this long: back to sleep.
const QUIET: Duration = Duration::from_millis(60);
/// Samples that have to agree before a push counts; contacts bounce up to 5 ms (common practice, no source).
const AGREE: u8 = 8;
/// Held longer than this it is not a hand (common practice, no source).
const STUCK: Duration = Duration::from_secs(10);
/// Longest time without a check-in.
const CHECK_IN: Duration = Duration::from_millis(200);
/// Contact changes from one detent to the next.
const DETENT: i8 = 4;

static ILLEGAL: AtomicU32 = AtomicU32::new(0);
static UNHEARD: AtomicU32 = AtomicU32::new(0);

/// Transitions that no encoder makes, and messages that found no room, since the start.
pub(crate) fn counts() -> (u32, u32) {
    (
        ILLEGAL.load(Ordering::Relaxed),
        UNHEARD.load(Ordering::Relaxed),
    )
}

/// Runs for ever.
#[embassy_executor::task]
pub(crate) async fn run(mut encoders: [Encoder; 2]) -> ! {
    let mut knobs = [State::new(Knob::Left), State::new(Knob::Right)];
    loop {
        check_in(Task::Knobs);
        let mut last_move = Instant::now();
        let mut ticks = Ticker::every(SAMPLE);
        loop {
            let now = Instant::now();
            let moved = at_work(Task::Knobs, || {
                let knobs = knobs.iter_mut().zip(&encoders);
                knobs.fold(false, |moved, (knob, pins)| knob.sample(now, pins) | moved)
            });
            if moved {
                last_move = now;
            } else if now - last_move >= QUIET {
                break;
            }
            check_in(Task::Knobs);
            ticks.next().await;
        }
        let [left, right] = &mut encoders;
        let contacts = select_array([
            left.a.wait_for_any_edge(),
            left.b.wait_for_any_edge(),
            left.push.wait_for_any_edge(),
            right.a.wait_for_any_edge(),
            right.b.wait_for_any_edge(),
            right.push.wait_for_any_edge(),
        ]);
        select(contacts, Timer::after(CHECK_IN)).await;
    }
}

struct State {
    knob: Knob,
    /// The contacts as two bits, closed is 1; `None` before the first sample.
    contacts: Option<u8>,
    /// Legal contact changes since the last detent; `None` after an illegal one, until the next detent.
    steps: Option<i8>,
    /// The push switch as it counts, and for how many samples it has been otherwise.
    down: bool,
    otherwise: u8,
    /// Since when the push switch is down.
    since: Instant,
    stuck: bool,
}

impl State {
    fn new(knob: Knob) -> Self {
        State {
            knob,
            contacts: None,
            steps: None,
            down: false,
            otherwise: 0,
            since: Instant::from_ticks(0),
            stuck: false,
        }
    }

    /// Takes a sample; says whether anything is moving.
    fn sample(&mut self, now: Instant, pins: &Encoder) -> bool {
        let contacts = u8::from(pins.a.is_low()) << 1 | u8::from(pins.b.is_low());
        let turning = self.contacts != Some(contacts);
        if let Some(before) = self.contacts.replace(contacts) {
            match step(before, contacts) {
                Some(step) => self.steps = self.steps.map(|s| s.saturating_add(step)),
                None => {
                    ILLEGAL.fetch_add(1, Ordering::Relaxed);
                    self.steps = None;
                }
            }
        }
        if contacts == 0 {
            // At a detent both contacts are open. Half-way and back is no turn.
            let steps = self.steps.replace(0).unwrap_or(0);
            if steps.abs() >= DETENT {
                tell(Message::Turn(self.knob, steps.signum()));
            }
        }

        let down = pins.push.is_low();
        self.otherwise = if down == self.down {
            0
        } else {
            self.otherwise + 1
        };
        if self.otherwise >= AGREE {
            self.otherwise = 0;
            self.down = down;
            self.since = now;
            let was_stuck = core::mem::take(&mut self.stuck);
            if was_stuck {
                tell(Message::Stuck(self.knob, false));
            } else if down {
                tell(Message::Press(self.knob));
            } else {
                tell(Message::Release(self.knob));
            }
        }
        if self.down && !self.stuck && now.saturating_duration_since(self.since) >= STUCK {
            // The instrument is let go of; the switch is heard again when it has opened.
            self.stuck = true;
            tell(Message::Release(self.knob));
            tell(Message::Stuck(self.knob, true));
        }
        turning || self.otherwise > 0
    }
}

/// One contact change: +1 clockwise, -1 against it, 0 for none, `None` where both contacts changed at once.
fn step(before: u8, after: u8) -> Option<i8> {
    // Clockwise the first contact closes first: 00, 10, 11, 01.
    match (before << 2 | after) & 0b1111 {
        0b0010 | 0b1011 | 0b1101 | 0b0100 => Some(1),
        0b0001 | 0b0111 | 0b1110 | 0b1000 => Some(-1),
        0b0000 | 0b0101 | 0b1010 | 0b1111 => Some(0),
        _ => None,
    }
}

fn tell(message: Message) {
    if MESSAGES.try_send(message).is_err() {
        UNHEARD.fetch_add(1, Ordering::Relaxed);
    }
}
