//! The Sensor page, for whoever sets the sensor up: the magnets on their circle, what was no pulse and why, how well they sit.
//!
//! ```text
//!  2 a turn       12345 pulses
//!   . o .   joined    3 sliver   12     what was not counted, by kind
//!  .     .  noise     0 twice     0
//!  .     .  extra     1 merged    0
//!  .     .  shaken    0 missed    4
//!   . o .   close     0 order     0
//!  1.02 deg off  3.1 us  to 600000      worst magnet, jitter, highest speed that can be measured
//! ```

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
use crate::units::Decimal;

/// Middle of the spindle, its radius, and that of the magnets' circle.
const MIDDLE: Point = Point::new(22, 32);
const SPINDLE: f32 = 13.0;
const RADIUS: f32 = 18.0;
/// More discs than this run into one another.
const DISCS: u16 = 24;
/// Left ends of the two columns of counts.
const COLUMNS: [i32; 2] = [46, 88];
const TOP: i32 = 12;
const LINE: i32 = 8;

pub(super) fn draw<D: DrawTarget<Color = BinaryColor>>(
    view: &View<'_>,
    target: &mut D,
) -> Result<(), D::Error> {
    let sensor = view.sensor;
    let set: String<16> = text(format_args!("{} a turn", sensor.pulses));
    write(
        &set,
        &FONT_5X8,
        Point::zero(),
        Alignment::Left,
        BinaryColor::On,
        target,
    )?;
    let counted: String<18> = text(format_args!("{} pulses", sensor.counted));
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
            let words: String<11> = text(format_args!("{kind} {}", Short(count)));
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

    let off: String<12> = match sensor.placement {
        Some(degrees) => text(format_args!(
            "{} deg off",
            Decimal {
                value: degrees,
                decimals: 1
            }
        )),
        None => text("place ?"),
    };
    let jitter: String<10> = match sensor.jitter {
        Some(s) => text(format_args!(
            "{} us",
            Decimal {
                value: s * 1e6,
                decimals: 0
            }
        )),
        None => text("jitter ?"),
    };
    let highest = Decimal {
        value: sensor.highest.get(),
        decimals: 0,
    };
    line(format_args!("{off}  {jitter}  to {highest}"), 56, target)
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
