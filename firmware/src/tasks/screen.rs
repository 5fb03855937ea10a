//! Brings frames to the display: only what has changed, and everything anew every ten seconds.
//!
//! A contactor's noise can change a register or a byte of the display's memory without any error on the bus; nothing but
//! writing everything again repairs that.

use core::cell::RefCell;

use embassy_futures::select::{Either, select};
use embassy_sync::blocking_mutex::ThreadModeMutex;
use embassy_sync::blocking_mutex::raw::ThreadModeRawMutex;
use embassy_sync::signal::Signal;
use embassy_time::{Duration, Instant, Timer, WithTimeout};
use embedded_hal_async::i2c::I2c;

use super::{MESSAGES, Message};
use crate::board::Display;
use crate::fault::{Task, check_in};
use crate::frame::{COLUMNS, Frame, PAGES};
use crate::oled::Oled;

/// The picture that the owner has drawn last.
static FRAME: ThreadModeMutex<RefCell<Frame>> = ThreadModeMutex::new(RefCell::new(Frame::DARK));
static CHANGED: Signal<ThreadModeRawMutex, ()> = Signal::new();

/// Everything is sent anew this often.
const REFRESH: Duration = Duration::from_secs(10);
/// A full page takes 135 bytes of 22.5 us, 3.04 ms, and ten turns of this task, each of which may wait for a step of the
/// owner; a bus that needs much longer is stuck.
const PATIENCE: Duration = Duration::from_millis(100);
/// A display that does not answer is tried this often.
const RETRY: Duration = Duration::from_millis(200);
/// Longest time without a check-in.
const CHECK_IN: Duration = Duration::from_millis(200);
/// Unchanged bytes that are cheaper sent than skipped: head and address of a write of its own.
const BRIDGE: usize = 8;

/// Draws the next picture into the frame and has it sent. The last one drawn wins.
pub(crate) fn draw(paint: impl FnOnce(&mut Frame)) {
    FRAME.lock(|frame| paint(&mut frame.borrow_mut()));
    CHANGED.signal(());
}

/// Why a session with the display ended.
#[derive(defmt::Format)]
enum Gone {
    Silent,
    Stuck,
}

/// Runs for ever.
#[embassy_executor::task]
pub(crate) async fn run(mut display: Display) -> ! {
    let mut answered = true;
    loop {
        let mut session = Session {
            oled: Oled::new(display.open()),
            shown: Frame::DARK,
            answered,
        };
        // A session never ends well.
        let Err(gone) = session.run().await;
        if session.answered {
            defmt::warn!("display: {}", gone);
            MESSAGES.send(Message::Display(false)).await;
        }
        answered = false;
        check_in(Task::Screen);
        if !display.free().await {
            defmt::debug!("display: data line low");
        }
        Timer::after(RETRY).await;
    }
}

struct Session<I> {
    oled: Oled<I>,
    /// What the display's memory holds.
    shown: Frame,
    answered: bool,
}

impl<I: I2c> Session<I> {
    async fn run(&mut self) -> Result<core::convert::Infallible, Gone> {
        let mut wanted = Frame::DARK;
        loop {
            let refresh = Instant::now() + REFRESH;
            patiently(self.oled.set_up()).await?;
            FRAME.lock(|frame| wanted.clone_from(&frame.borrow()));
            for (page, row) in wanted.0.iter().enumerate() {
                patiently(self.oled.write(page, 0, row)).await?;
            }
            self.shown.clone_from(&wanted);
            patiently(self.oled.switch_on()).await?;
            if !self.answered {
                self.answered = true;
                defmt::info!("display: answers");
                MESSAGES.send(Message::Display(true)).await;
            }
            while Instant::now() < refresh {
                check_in(Task::Screen);
                let until = refresh.min(Instant::now() + CHECK_IN);
                if let Either::First(()) = select(CHANGED.wait(), Timer::at(until)).await {
                    FRAME.lock(|frame| wanted.clone_from(&frame.borrow()));
                    self.send_changes(&wanted).await?;
                }
            }
        }
    }

    async fn send_changes(&mut self, wanted: &Frame) -> Result<(), Gone> {
        for page in 0..PAGES {
            let (Some(new), Some(old)) = (wanted.0.get(page), self.shown.0.get_mut(page)) else {
                continue;
            };
            let mut from = 0;
            while let Some((start, end)) = changed(old, new, from) {
                let Some(piece) = new.get(start..end) else {
                    break;
                };
                patiently(self.oled.write(page, start, piece)).await?;
                from = end;
            }
            old.clone_from(new);
        }
        Ok(())
    }
}

/// The next stretch from `from` on in which two rows differ, small agreements included.
fn changed(old: &[u8; COLUMNS], new: &[u8; COLUMNS], from: usize) -> Option<(usize, usize)> {
    let differs = |i: &usize| old.get(*i) != new.get(*i);
    let start = (from..COLUMNS).find(differs)?;
    let mut end = start + 1;
    while let Some(next) = (end..COLUMNS.min(end + BRIDGE)).find(differs) {
        end = next + 1;
    }
    Some((start, end))
}

async fn patiently<E>(step: impl Future<Output = Result<(), E>>) -> Result<(), Gone> {
    check_in(Task::Screen);
    match step.with_timeout(PATIENCE).await {
        Ok(Ok(())) => Ok(()),
        Ok(Err(_)) => Err(Gone::Silent),
        Err(_) => Err(Gone::Stuck),
    }
}
