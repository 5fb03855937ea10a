//! The Run page: what is cut, how fast the spindle turns, whether that is right, what to set.
//!
//! ```text
//!  mild steel     work 25 mm      material, and the diameter named for what it is
//!   ___                 RIGHT     speed in digits 36 pixels high; the verdict in words
//!  |   ...                        (reversed where it warns)
//!  |   ...             [|| ] heavy how hard the motor works, where that is told
//!  |___               set 280     the step to choose
//!  ____|_______|__v____|_____     where the speed lies: slow, best and fast marked, each octave the same width
//!  best 344: cutting speed        the best speed and what holds it
//!  A-2, back gear in              the step's label; when slow or fast, what to move: stop; B-2 to A-3
//! ```

use core::fmt;

use eg_seven_segment::SevenSegmentStyleBuilder;
use embedded_graphics::mono_font::MonoFont;
use embedded_graphics::mono_font::ascii::{FONT_4X6, FONT_6X13_BOLD};
use embedded_graphics::pixelcolor::BinaryColor;
use embedded_graphics::prelude::*;
use embedded_graphics::primitives::{Line, PrimitiveStyle, Rectangle};
use embedded_graphics::text::{Alignment, Text};
use heapless::String;

use super::{View, WIDTH, digits, fitting, line, write};
use crate::advice::{Excess, FAST_ABOVE, Pick, Shift};
use crate::error::text;
use crate::load::Mark;
use crate::panel::Field;
use crate::units::{Decimal, Rpm};
use crate::verdict::Verdict;

/// Left edge of the right-hand column.
const COLUMN: i32 = 86;
const COLUMN_WIDTH: u32 = WIDTH - COLUMN as u32;
const DIGITS_TOP: i32 = 8;
const DIGITS_HEIGHT: u32 = 36;
/// The scale's line; ticks and pointer stand on it, two rows high.
const SCALE: i32 = 47;
/// The two lines at the bottom.
const LINES: [i32; 2] = [48, 56];
/// Characters of the smaller font in a line.
const LAST_LINE: usize = 32;
/// The scale spans one octave to each side of the best speed.
const OCTAVES: f32 = 1.0;

pub(super) fn draw<D: DrawTarget<Color = BinaryColor>>(
    view: &View<'_>,
    target: &mut D,
) -> Result<(), D::Error> {
    head(view, target)?;
    speed(view, target)?;
    // A verdict of two lines leaves no room for it.
    let mark = view.load.filter(|_| words(view.verdict).1.is_empty());
    verdict(view.verdict, mark.is_some(), target)?;
    if let Some(mark) = mark {
        load(mark, ink(view.verdict), target)?;
    }
    if let Some(setting) = view.advice.pick.setting() {
        set(setting.rpm, target)?;
    }
    scale(view, target)?;
    let [first, second] = LINES;
    match view.notice {
        Some(notice) => match notice.text.split_once(", ") {
            Some((was, now)) if notice.text.len() > 25 => {
                line(was, first, target)?;
                line(now, second, target)
            }
            _ => line(&notice.text, (first + second) / 2, target),
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
    // No font inks its first row: the head begins at the very top.
    let top = if font.character_size.height < 8 {
        0
    } else {
        -1
    };
    write(
        left,
        font,
        Point::new(0, top),
        Alignment::Left,
        BinaryColor::On,
        target,
    )?;
    write(
        &right,
        font,
        Point::new(WIDTH as i32 - 1, top),
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
    // The baseline is the digits' last row.
    let baseline = Point::new(0, DIGITS_TOP + DIGITS_HEIGHT as i32 - 1);
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
    above_load: bool,
    target: &mut D,
) -> Result<(), D::Error> {
    const FONT: &MonoFont<'_> = &FONT_6X13_BOLD;
    let (first, second) = words(verdict);
    if warns(verdict) {
        let back = Rectangle::new(
            Point::new(COLUMN - 1, DIGITS_TOP),
            Size::new(COLUMN_WIDTH + 1, if above_load { 28 } else { 26 }),
        );
        back.into_styled(PrimitiveStyle::with_fill(BinaryColor::On))
            .draw(target)?;
    }
    let ink = ink(verdict);
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

/// What is written on the verdict's field.
const fn ink(verdict: Verdict) -> BinaryColor {
    if warns(verdict) {
        BinaryColor::Off
    } else {
        BinaryColor::On
    }
}

/// Three cells, bars as far as the motor works and dashes where it does not, over the mark's word; below a verdict of one
/// line.
fn load<D: DrawTarget<Color = BinaryColor>>(
    mark: Mark,
    ink: BinaryColor,
    target: &mut D,
) -> Result<(), D::Error> {
    const TOP: i32 = DIGITS_TOP + 18;
    let middle = COLUMN + COLUMN_WIDTH as i32 / 2;
    for (cell, from) in (0..).zip([Mark::Working, Mark::Heavy, Mark::Stalling]) {
        let at = Point::new(middle - 18 + 12 * cell, TOP + 1);
        let (at, size) = if mark >= from {
            (at, Size::new(11, 2))
        } else {
            (at + Point::new(4, 1), Size::new(3, 1))
        };
        Rectangle::new(at, size)
            .into_styled(PrimitiveStyle::with_fill(ink))
            .draw(target)?;
    }
    write(
        mark.word(),
        &FONT_4X6,
        Point::new(middle, TOP + 4),
        Alignment::Center,
        ink,
        target,
    )
}

/// The speed to set on the machine.
fn set<D: DrawTarget<Color = BinaryColor>>(rpm: Rpm, target: &mut D) -> Result<(), D::Error> {
    let set: String<10> = text(format_args!("set {}", Whole(rpm)));
    let at = Point::new(COLUMN + COLUMN_WIDTH as i32 / 2, DIGITS_TOP + 28);
    write(
        &set,
        fitting(&set, COLUMN_WIDTH),
        at,
        Alignment::Center,
        BinaryColor::On,
        target,
    )
}

/// A line with ticks at slow, best (the high one) and fast, and a pointer at the speed. Its places are logarithms from
/// `libm`: those of `micromath` are up to 11 pixels off (there is a test).
fn scale<D: DrawTarget<Color = BinaryColor>>(
    view: &View<'_>,
    target: &mut D,
) -> Result<(), D::Error> {
    let Some(best) = view.advice.best() else {
        return Ok(());
    };
    let ink = PrimitiveStyle::with_stroke(BinaryColor::On, 1);
    let (left, right) = (0, WIDTH as i32 - 1);
    Line::new(Point::new(left, SCALE), Point::new(right, SCALE))
        .into_styled(ink)
        .draw(target)?;

    let place = |n: Rpm| {
        let octaves = libm::log2f(n.get().max(1e-3) / best.get().max(1e-3));
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
    let slow = Some(view.advice.slow_below()).filter(|n| *n > Rpm::ZERO);
    for (tick, height) in [(slow, 1), (Some(best), 2), (limit, 1)] {
        if let Some(x) = tick.map(place) {
            Line::new(Point::new(x, SCALE - height), Point::new(x, SCALE - 1))
                .into_styled(ink)
                .draw(target)?;
        }
    }
    if let Some(n) = digits(view.reading) {
        let x = place(Rpm::saturating(n as f32)).clamp(left + 2, right - 2);
        for (half, above) in [(2, 2), (1, 1)] {
            let y = SCALE - above;
            Line::new(Point::new(x - half, y), Point::new(x + half, y))
                .into_styled(ink)
                .draw(target)?;
        }
    }
    Ok(())
}

/// What to set, and why not faster.
fn advice<D: DrawTarget<Color = BinaryColor>>(
    view: &View<'_>,
    target: &mut D,
) -> Result<(), D::Error> {
    let advice = view.advice;
    let [first, second] = LINES;
    if let Pick::NoBasis(refusal) = &advice.pick {
        return reason(refusal.reason, target);
    }
    let held_by = advice.window.high.reason.short();
    line(
        format_args!("best {}: {held_by}", Whole(advice.window.best())),
        first,
        target,
    )?;
    let moves = matches!(
        view.verdict,
        Verdict::Slow | Verdict::Fast | Verdict::Danger
    )
    .then(|| digits(view.reading))
    .flatten()
    // From the digits as they stand, so that the picture changes when they do.
    .and_then(|n| Shift::of(view.machine, advice, Rpm::saturating(n as f32)));
    match &advice.pick {
        Pick::Set(setting) => match moves {
            Some(moves) => line(moves.words(LAST_LINE), second, target),
            None => line(&setting.label, second, target),
        },
        Pick::TooFast { .. } if advice.nothing_pulls() => {
            line("no setting pulls this cut", second, target)
        }
        Pick::TooFast { over_percent, .. } => line(
            format_args!("slowest {} too fast", Excess(*over_percent)),
            second,
            target,
        ),
        Pick::NeedsCap => {
            let rated = view
                .machine
                .holders()
                .get(usize::from(view.setup.holder))
                .is_some_and(|h| h.rated.is_some());
            let why = if rated {
                "uneven work"
            } else {
                "holder unrated"
            };
            line(format_args!("{why}: set a cap"), second, target)
        }
        Pick::NoBasis(_) => Ok(()),
    }
}

/// Why there is no advice, in small letters where scale and lines would be. What does not fit is cut and ends in `~`.
fn reason<D: DrawTarget<Color = BinaryColor>>(
    reason: &str,
    target: &mut D,
) -> Result<(), D::Error> {
    const ROWS: [i32; 3] = [46, 52, 58];
    let mut words = reason.split_whitespace().peekable();
    for y in ROWS {
        let mut row: String<32> = String::new();
        while let Some(word) = words.peek() {
            let space = usize::from(!row.is_empty());
            if row.len() + space + word.len() > row.capacity() {
                break;
            }
            // Room was checked in the line above. A word longer than a row would be cut here with all that follows it.
            let _ = (space == 0 || row.push(' ').is_ok()) && row.push_str(word).is_ok();
            words.next();
        }
        if y == ROWS[2] && words.peek().is_some() {
            while row.push('~').is_err() && row.pop().is_some() {}
        }
        write(
            &row,
            &FONT_4X6,
            Point::new(0, y),
            Alignment::Left,
            BinaryColor::On,
            target,
        )?;
    }
    Ok(())
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
