//! Pages drawn from a [`View`], for any 1-bit target of 128 x 64 pixels.

mod choose;
mod count;
mod run;
mod sensor;
pub(crate) mod why;

use core::fmt;

use embedded_graphics::mono_font::ascii::{FONT_4X6, FONT_5X8};
use embedded_graphics::mono_font::{MonoFont, MonoTextStyle};
use embedded_graphics::pixelcolor::BinaryColor;
use embedded_graphics::prelude::*;
use embedded_graphics::text::{Alignment, Baseline, Text, TextStyleBuilder};
use heapless::String;

use crate::advice::Advice;
use crate::edge_account::EdgeAccount;
use crate::error::text;
use crate::load::Mark;
use crate::machine::Machine;
use crate::panel::{Notice, Page};
use crate::sensor_setup::SensorSetup;
use crate::setup::Setup;
use crate::tacho::{Health, Reading, Signal};
use crate::verdict::Verdict;

/// Width of the screen in pixels.
pub const WIDTH: u32 = 128;
/// Height of the screen in pixels.
pub const HEIGHT: u32 = 64;

/// Everything that a page shows.
#[derive(Clone, Copy, Debug)]
pub struct View<'a> {
    /// What is chosen.
    pub setup: &'a Setup,
    /// On which machine.
    pub machine: &'a Machine,
    /// What is advised for it.
    pub advice: &'a Advice,
    /// How fast the spindle turns.
    pub reading: &'a Reading,
    /// Whether that is right.
    pub verdict: Verdict,
    /// Which page.
    pub page: Page,
    /// What a knob has just changed.
    pub notice: Option<&'a Notice>,
    /// How much of the edge is used.
    pub edge: EdgeAccount,
    /// How hard the motor works, where that is switched on and known.
    pub load: Option<Mark>,
    /// How well the sensor works.
    pub sensor: Health,
    /// What is known about the pulses in a revolution.
    pub sensor_setup: &'a SensorSetup,
}

/// Draws the view's page on a cleared target. Nothing is drawn outside of 128 x 64.
pub fn draw<D: DrawTarget<Color = BinaryColor>>(
    view: &View<'_>,
    target: &mut D,
) -> Result<(), D::Error> {
    match view.page {
        Page::Run => run::draw(view, target),
        Page::Choose(field) => choose::draw(view, field, target),
        Page::Why(first) => why::draw(view, first, target),
        Page::Sensor => sensor::draw(view, target),
        Page::TenTurns => count::ten_turns(view, target),
        Page::PlateSpeed => count::plate_speed(view, target),
    }
}

/// The speed in whole rev/min as the digits show it, or `None` where there is none that can be believed.
pub fn digits(reading: &Reading) -> Option<u32> {
    match reading.signal {
        // Rounded; an Rpm is finite and not negative.
        Signal::Turning if !reading.overdue => reading
            .held
            .or(reading.speed)
            .map(|n| libm::roundf(n.get()) as u32),
        Signal::Turning | Signal::Still | Signal::Lost | Signal::Doubtful => None,
    }
}

/// The row of characters that a font fits across the screen, or the smaller font where it does not.
fn fitting(line: &str, pixels: u32) -> &'static MonoFont<'static> {
    if line.len() as u32 * FONT_5X8.character_size.width <= pixels {
        &FONT_5X8
    } else {
        &FONT_4X6
    }
}

/// Writes one line in the eight rows from `y` on, in the larger font that fits; what still does not fit is cut and ends
/// in `~`. Neither font inks the first of these rows.
fn line<D: DrawTarget<Color = BinaryColor>>(
    words: impl fmt::Display,
    y: i32,
    target: &mut D,
) -> Result<(), D::Error> {
    // 32 characters of 4 pixels fill the width.
    let line: String<32> = text(words);
    let font = fitting(&line, WIDTH);
    write(
        &line,
        font,
        Point::new(0, y + i32::from(font.character_size.height < 8)),
        Alignment::Left,
        BinaryColor::On,
        target,
    )
}

fn write<D: DrawTarget<Color = BinaryColor>>(
    words: &str,
    font: &MonoFont<'_>,
    at: Point,
    alignment: Alignment,
    color: BinaryColor,
    target: &mut D,
) -> Result<(), D::Error> {
    let style = TextStyleBuilder::new()
        .alignment(alignment)
        .baseline(Baseline::Top)
        .build();
    Text::with_text_style(words, at, MonoTextStyle::new(font, color), style)
        .draw(target)
        .map(|_| ())
}
