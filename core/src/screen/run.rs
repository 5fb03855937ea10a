//! The Run page: what is cut, how fast the spindle turns, whether that is right, what to set.
//!
//! ```text
//!  mild steel     work 25 mm      material, and the diameter named for what it is
//!   ___                 RIGHT     speed in digits 36 pixels high; the verdict in words
//!  |   ...                        (reversed where it warns)
//!  |___               set 280     the step to choose
//!  ----|-------|--^----|-----     where the speed lies: slow, best and fast marked, each octave the same width
//!  best 344: cutting speed        the best speed and what holds it
//!  A-2, back gear in              the step's label
//! ```

use core::fmt;

use eg_seven_segment::SevenSegmentStyleBuilder;
use embedded_graphics::mono_font::MonoFont;
use embedded_graphics::mono_font::ascii::{FONT_5X8, FONT_7X13_BOLD};
use embedded_graphics::pixelcolor::BinaryColor;
use embedded_graphics::prelude::*;
use embedded_graphics::primitives::{Line, PrimitiveStyle, Rectangle, Triangle};
use embedded_graphics::text::{Alignment, Text};
use heapless::String;
use micromath::F32Ext;

use super::{View, WIDTH, digits, fitting, line, write};
use crate::advice::{FAST_ABOVE, Pick};
use crate::error::text;
use crate::panel::Field;
use crate::units::{Decimal, Rpm};
use crate::verdict::Verdict;

/// Left edge of the right-hand column.
const COLUMN: i32 = 86;
const COLUMN_WIDTH: u32 = WIDTH - COLUMN as u32;
const DIGITS_TOP: i32 = 9;
const DIGITS_HEIGHT: u32 = 36;
/// Upper edge of the scale.
const SCALE_TOP: i32 = 46;
/// The scale spans one octave to each side of the best speed.
const OCTAVES: f32 = 1.0;

pub(super) fn draw<D: DrawTarget<Color = BinaryColor>>(
    view: &View<'_>,
    target: &mut D,
) -> Result<(), D::Error> {
    head(view, target)?;
    speed(view, target)?;
    verdict(view.verdict, target)?;
    scale(view, target)?;
    match view.notice {
        Some(notice) => match notice.text.split_once(", ") {
            Some((was, now)) if notice.text.len() > 25 => {
                line(was, 48, target)?;
                line(now, 56, target)
            }
            _ => line(&notice.text, 52, target),
        },
        None => advice(view, target),
    }
}

/// Material at the left, diameter at the right, in one font.
fn head<D: DrawTarget<Color = BinaryColor>>(
    view: &View<'_>,
    target: &mut D,
) -> Result<(), D::Error> {
    let word = view.setup.operation.diameter_word();
    let right: String<24> = text(format_args!(
        "{word} {}",
        Field::Diameter.value(view.setup, view.machine)
    ));
    let left = view.setup.material.label();
    let both: String<48> = text(format_args!("{left} {right}"));
    let font = fitting(&both, WIDTH);
    write(
        left,
        font,
        Point::zero(),
        Alignment::Left,
        BinaryColor::On,
        target,
    )?;
    write(
        &right,
        font,
        Point::new(WIDTH as i32 - 1, 0),
        Alignment::Right,
        BinaryColor::On,
        target,
    )
}

fn speed<D: DrawTarget<Color = BinaryColor>>(
    view: &View<'_>,
    target: &mut D,
) -> Result<(), D::Error> {
    let words: String<8> = match digits(view.reading) {
        Some(n) => text(format_args!("{n:>4}")),
        None => text("----"),
    };
    // Four digits in 83 pixels, or seven in as many.
    let (width, spacing, segment) = if words.len() <= 4 {
        (18, 3, 4)
    } else {
        (9, 3, 2)
    };
    let style = SevenSegmentStyleBuilder::new()
        .digit_size(Size::new(width, DIGITS_HEIGHT))
        .digit_spacing(spacing)
        .segment_width(segment)
        .segment_color(BinaryColor::On)
        .build();
    let baseline = Point::new(0, DIGITS_TOP + DIGITS_HEIGHT as i32);
    Text::new(&words, baseline, style).draw(target).map(|_| ())
}

/// At most six letters a line.
const fn words(verdict: Verdict) -> (&'static str, &'static str) {
    match verdict {
        Verdict::Danger => ("DANGER", ""),
        Verdict::Unconfirmed => ("PRESS", "A KNOB"),
        Verdict::Lost => ("SIGNAL", "LOST"),
        Verdict::Doubtful => ("PULSES", "DOUBT"),
        Verdict::NoPulses => ("NO", "PULSES"),
        Verdict::Fast => ("FAST", ""),
        Verdict::NoAdvice => ("NO", "ADVICE"),
        Verdict::NeedsCap => ("SET A", "CAP"),
        Verdict::RunUp => ("RUN UP", ""),
        Verdict::Slow => ("SLOW", ""),
        Verdict::Right => ("RIGHT", ""),
    }
}

/// Warnings stand reversed: they are seen without colour and from the corner of the eye.
const fn warns(verdict: Verdict) -> bool {
    matches!(
        verdict,
        Verdict::Danger | Verdict::Fast | Verdict::Lost | Verdict::Doubtful
    )
}

fn verdict<D: DrawTarget<Color = BinaryColor>>(
    verdict: Verdict,
    target: &mut D,
) -> Result<(), D::Error> {
    const FONT: &MonoFont<'_> = &FONT_7X13_BOLD;
    let (first, second) = words(verdict);
    let ink = if warns(verdict) {
        let back = Rectangle::new(
            Point::new(COLUMN - 1, DIGITS_TOP),
            Size::new(COLUMN_WIDTH + 1, 26),
        );
        back.into_styled(PrimitiveStyle::with_fill(BinaryColor::On))
            .draw(target)?;
        BinaryColor::Off
    } else {
        BinaryColor::On
    };
    let middle = COLUMN + COLUMN_WIDTH as i32 / 2;
    if second.is_empty() {
        return write(
            first,
            FONT,
            Point::new(middle, DIGITS_TOP + 7),
            Alignment::Center,
            ink,
            target,
        );
    }
    write(
        first,
        FONT,
        Point::new(middle, DIGITS_TOP),
        Alignment::Center,
        ink,
        target,
    )?;
    write(
        second,
        FONT,
        Point::new(middle, DIGITS_TOP + 13),
        Alignment::Center,
        ink,
        target,
    )
}

/// A bar with ticks at slow, best and fast and a pointer at the speed. Its places are logarithms by micromath: within a few
/// percent of an octave, which is less than two pixels here, and far too coarse for anything that is computed with.
fn scale<D: DrawTarget<Color = BinaryColor>>(
    view: &View<'_>,
    target: &mut D,
) -> Result<(), D::Error> {
    let Some(best) = view.advice.best() else {
        return Ok(());
    };
    let ink = PrimitiveStyle::with_stroke(BinaryColor::On, 1);
    let (left, right, y) = (0, WIDTH as i32 - 1, SCALE_TOP + 1);
    Line::new(Point::new(left, y), Point::new(right, y))
        .into_styled(ink)
        .draw(target)?;

    let place = |n: Rpm| {
        let octaves =
            F32Ext::ln(n.get().max(1e-3) / best.get().max(1e-3)) / core::f32::consts::LN_2;
        let x = (octaves / OCTAVES + 1.0) / 2.0 * (right - left) as f32;
        // A float-to-integer cast saturates: any speed has a place.
        (x as i32).clamp(left, right)
    };
    let fast = view
        .advice
        .window
        .soft
        .map(|soft| soft.at.scaled(FAST_ABOVE));
    let hard = view.advice.window.hard.map(|hard| hard.at);
    let limit = [fast, hard]
        .into_iter()
        .flatten()
        .reduce(|a, b| if b < a { b } else { a });
    for tick in [Some(view.advice.slow_below()), Some(best), limit]
        .into_iter()
        .flatten()
    {
        let x = place(tick);
        Line::new(Point::new(x, y - 1), Point::new(x, y + 1))
            .into_styled(ink)
            .draw(target)?;
    }
    if let (Some(_), Some(n)) = (digits(view.reading), view.reading.speed) {
        let x = place(n).clamp(left + 2, right - 2);
        let pointer = Triangle::new(
            Point::new(x, y),
            Point::new(x - 2, y - 2),
            Point::new(x + 2, y - 2),
        );
        pointer
            .into_styled(PrimitiveStyle::with_fill(BinaryColor::On))
            .draw(target)?;
    }
    Ok(())
}

/// What to set, and why not faster.
fn advice<D: DrawTarget<Color = BinaryColor>>(
    view: &View<'_>,
    target: &mut D,
) -> Result<(), D::Error> {
    let advice = view.advice;
    if let Some(setting) = advice.pick.setting() {
        let set: String<10> = text(format_args!("set {}", Whole(setting.rpm)));
        let at = Point::new(COLUMN + COLUMN_WIDTH as i32 / 2, DIGITS_TOP + 28);
        write(
            &set,
            &FONT_5X8,
            at,
            Alignment::Center,
            BinaryColor::On,
            target,
        )?;
    }
    match &advice.cutting {
        Ok(_) => {
            let held_by = advice.window.high.reason.short();
            line(
                format_args!("best {}: {held_by}", Whole(advice.window.best())),
                48,
                target,
            )?;
        }
        Err(_) => line("no basis for a speed", 48, target)?,
    }
    match &advice.pick {
        Pick::Set(setting) => line(&setting.label, 56, target),
        Pick::TooFast { over_percent, .. } => line(
            format_args!("slowest is {over_percent:.0} % too fast"),
            56,
            target,
        ),
        Pick::NeedsCap => line("holder unrated: set a cap", 56, target),
        Pick::NoBasis(refusal) => line(refusal, 56, target),
    }
}

/// A speed without its unit, for places that name it.
struct Whole(Rpm);

impl fmt::Display for Whole {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        Decimal {
            value: self.0.get(),
            decimals: 0,
        }
        .fmt(f)
    }
}
