//! The Sensor page, for whoever sets the sensor up: the magnets on their circle, what was no pulse and why, how well they sit.
//!
//! ```text
//!  2 a turn       12345 pulses         or, where they are not the profile's: profile says 1
//!   . o .   joined    3 sliver   12     what was not counted, by kind
//!  .     .  noise     0 twice     0
//!  .     .  extra     1 merged    0
//!  .     .  shaken    0 missed    4
//!   . o .   close     0 order     0
//!           to 600000 x214 spare        highest speed that can be measured, and how far the fastest step is below it
//!  1.02 deg off  3.1 us  turn: count    worst magnet, jitter; a knob leads on to the pages that count the pulses
//! ```
//!
//! While the spindle runs steadily at a speed that no step explains, the last line tells what contradicts the number above.

use core::fmt;

use embedded_graphics::mono_font::ascii::{FONT_4X6, FONT_5X8};
use embedded_graphics::pixelcolor::BinaryColor;
use embedded_graphics::prelude::*;
use embedded_graphics::primitives::{Circle, PrimitiveStyle};
use embedded_graphics::text::Alignment;
use heapless::String;
use micromath::F32Ext;

use super::{View, WIDTH, line, write};
use crate::error::text;
use crate::tacho::Signal;
use crate::units::Decimal;

/// Middle of the spindle, its radius, and that of the magnets' circle.
const MIDDLE: Point = Point::new(22, 32);
const SPINDLE: f32 = 13.0;
const RADIUS: f32 = 18.0;
/// More discs than this run into one another.
const DISCS: u16 = 24;
/// Left ends of the two columns of counts.
const COLUMNS: [i32; 2] = [46, 88];
const TOP: i32 = 11;
const BOTTOM: i32 = 56;
const LINE: i32 = 7;
/// Left end of the line below them: it may be longer than both.
const SPARE: i32 = 44;

pub(super) fn draw<D: DrawTarget<Color = BinaryColor>>(
    view: &View<'_>,
    target: &mut D,
) -> Result<(), D::Error> {
    let sensor = view.sensor;
    let set: String<32> = text(format_args!("{} a turn", sensor.pulses));
    write(
        &set,
        &FONT_5X8,
        Point::zero(),
        Alignment::Left,
        BinaryColor::On,
        target,
    )?;
    let own = view.machine.pulses();
    let counted: String<32> = if sensor.pulses == own {
        text(format_args!("{} pulses", sensor.counted))
    } else {
        text(format_args!("profile says {own}"))
    };
    let right = Point::new(WIDTH as i32 - 1, 0);
    write(
        &counted,
        &FONT_5X8,
        right,
        Alignment::Right,
        BinaryColor::On,
        target,
    )?;

    magnets(sensor.pulses.get(), target)?;

    let r = &sensor.rejected;
    let kinds = [
        [("joined", r.joined), ("sliver", r.slivers)],
        [("noise", r.noise), ("twice", r.doubled)],
        [("extra", r.extra), ("merged", r.merged)],
        [("shaken", r.shaken), ("missed", r.missing)],
        [("close", r.too_close), ("order", r.disordered)],
    ];
    for (row, pair) in (0..).zip(kinds) {
        for (column, (kind, count)) in COLUMNS.into_iter().zip(pair) {
            // Ten characters of four pixels are a column.
            let words: String<32> = text(format_args!("{kind} {}", Short(count)));
            let at = Point::new(column, TOP + LINE * row);
            write(
                &words,
                &FONT_4X6,
                at,
                Alignment::Left,
                BinaryColor::On,
                target,
            )?;
        }
    }

    let fastest = view.machine.drive().fastest();
    let spare = Spare(sensor.highest.get(), fastest.get());
    let spare: String<32> = text(format_args!("{spare}"));
    write(
        &spare,
        &FONT_4X6,
        Point::new(SPARE, TOP + 5 * LINE),
        Alignment::Left,
        BinaryColor::On,
        target,
    )?;

    let unexplained = view
        .reading
        .speed
        .filter(|&n| view.reading.signal == Signal::Doubtful && !view.machine.explains(n));
    if let Some(speed) = unexplained {
        // The number of pulses and their rate are both certain; that they make this speed is not.
        let rate = speed.rev_per_s() * f32::from(sensor.pulses.get());
        let decimals = if rate < 100.0 { 1 } else { 0 };
        let rate = Decimal {
            value: rate,
            decimals,
        };
        let words = format_args!("{rate} pulses/s fit no step");
        return line(words, BOTTOM, target);
    }
    let off: String<32> = match sensor.placement {
        Some(degrees) => text(format_args!(
            "{} deg off",
            Decimal {
                value: degrees,
                decimals: 1
            }
        )),
        None => text("place ?"),
    };
    let jitter: String<32> = match sensor.jitter {
        Some(s) if s < 9.9995e-3 => text(format_args!(
            "{} us",
            Decimal {
                value: s * 1e6,
                decimals: 0
            }
        )),
        Some(s) => text(format_args!(
            "{} ms",
            Decimal {
                value: s * 1e3,
                decimals: 0
            }
        )),
        None => text("jitter ?"),
    };
    let left: String<32> = text(format_args!("{off} {jitter}"));
    let y = BOTTOM + 1;
    let ends = [
        (left.as_str(), 0, Alignment::Left),
        ("turn: count", WIDTH as i32 - 1, Alignment::Right),
    ];
    for (words, x, alignment) in ends {
        let at = Point::new(x, y);
        write(words, &FONT_4X6, at, alignment, BinaryColor::On, target)?;
    }
    Ok(())
}

/// The spindle, and round it a disc for each magnet, or the rim of a wheel with many teeth. Sine and cosine are micromath's:
/// within 0.003, which is a twentieth of a pixel here.
fn magnets<D: DrawTarget<Color = BinaryColor>>(count: u16, target: &mut D) -> Result<(), D::Error> {
    let outline = PrimitiveStyle::with_stroke(BinaryColor::On, 1);
    let circle =
        |radius: f32| Circle::with_center(MIDDLE, 2 * radius as u32 + 1).into_styled(outline);
    circle(SPINDLE).draw(target)?;
    if count > DISCS {
        return circle(RADIUS).draw(target);
    }
    let size = if count <= 12 { 7 } else { 3 };
    for magnet in 0..count {
        let angle = core::f32::consts::TAU * f32::from(magnet) / f32::from(count);
        let (x, y) = (RADIUS * F32Ext::sin(angle), -RADIUS * F32Ext::cos(angle));
        let at = MIDDLE + Point::new(F32Ext::round(x) as i32, F32Ext::round(y) as i32);
        Circle::with_center(at, size)
            .into_styled(PrimitiveStyle::with_fill(BinaryColor::On))
            .draw(target)?;
    }
    Ok(())
}

/// The highest speed that can be measured, beside the machine's fastest.
struct Spare(f32, f32);

impl fmt::Display for Spare {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Spare(highest, fastest) = *self;
        let whole = |value| Decimal { value, decimals: 0 };
        write!(f, "to {}", whole(highest))?;
        let times = highest / fastest;
        match times {
            x if x < 1.0 => write!(f, " < top {}", whole(fastest)),
            x if x < 9.95 => {
                let times = Decimal {
                    value: times,
                    decimals: 1,
                };
                write!(f, " x{times} spare")
            }
            x if x < 999.5 => write!(f, " x{} spare", whole(times)),
            _ => f.write_str(" ample"),
        }
    }
}

/// A count in at most three characters.
struct Short(u32);

impl fmt::Display for Short {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.0 {
            n if n < 1000 => write!(f, "{n}"),
            n if n < 100_000 => write!(f, "{}k", n / 1000),
            _ => f.write_str("++"),
        }
    }
}
