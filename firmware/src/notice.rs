//! What the display shows after a panic, a watchdog reset or the loss of what was chosen, until a knob is pressed.

use core::fmt::Write;

use embedded_graphics::mono_font::MonoTextStyle;
use embedded_graphics::mono_font::ascii::FONT_5X8;
use embedded_graphics::pixelcolor::BinaryColor;
use embedded_graphics::prelude::*;
use embedded_graphics::text::{Baseline, Text};
use heapless::String;

use crate::fault::Cause;
use crate::frame::Frame;
use crate::{BUILD, VERSION};

/// Characters of a row in the 5 x 8 font.
const ROW: usize = 25;
/// Rows left for the message.
const ROWS: usize = 4;

/// In whole rows.
const FORGOTTEN: &str = concat!(
    "Choose again, and look at",
    "the pulses in a turn on  ",
    "the Sensor page.         "
);

/// Draws the notice; `None` where there is nothing to say.
pub(crate) fn draw(cause: &Cause, frame: &mut Frame) -> Option<()> {
    let (title, message) = match cause {
        Cause::Power => return None,
        Cause::Panic(message) => ("RESTARTED AFTER A FAULT", message.clone()),
        Cause::Starved(missing) => {
            let mut message = String::new();
            let _ = write!(message, "no answer from: {}", missing.names());
            ("RESTARTED: TASK HUNG", message)
        }
        Cause::Forgotten => {
            let mut message = String::new();
            let _ = message.write_str(FORGOTTEN);
            ("WHAT WAS CHOSEN IS LOST", message)
        }
    };
    let mut build: String<ROW> = String::new();
    let _ = write!(build, "{VERSION} {BUILD}");
    let style = MonoTextStyle::new(&FONT_5X8, BinaryColor::On);
    let mut row = 0;
    let mut line = |words: &str| {
        // Drawing on a frame does not fail.
        let _ = Text::with_baseline(words, Point::new(0, row), style, Baseline::Top).draw(frame);
        row += 8;
    };
    line(title);
    line(&build);
    let mut rest = message.as_str();
    for _ in 0..ROWS {
        // The message is cut between characters; a panic's own text is ASCII as a rule.
        let end = (0..=ROW.min(rest.len()))
            .rev()
            .find(|&i| rest.is_char_boundary(i))
            .unwrap_or(0);
        let (now, later) = rest.split_at(end);
        line(now);
        rest = later;
    }
    line("Relay is held open.");
    line("Press a knob to go on.");
    Some(())
}
