//! The Choose page: the rest of the setup, one field a line; the left knob moves the mark, the right one the value.

use embedded_graphics::mono_font::ascii::FONT_5X8;
use embedded_graphics::pixelcolor::BinaryColor;
use embedded_graphics::prelude::*;
use embedded_graphics::primitives::{PrimitiveStyle, Rectangle};
use embedded_graphics::text::Alignment;
use heapless::String;

use super::{View, WIDTH, write};
use crate::error::text;
use crate::panel::Field;

const LINE: i32 = 9;
const TOP: i32 = 10;
const VALUE: i32 = 42;

pub(super) fn draw<D: DrawTarget<Color = BinaryColor>>(
    view: &View<'_>,
    marked: Field,
    target: &mut D,
) -> Result<(), D::Error> {
    let on = PrimitiveStyle::with_fill(BinaryColor::On);
    write(
        "press: back to speed",
        &FONT_5X8,
        Point::zero(),
        Alignment::Left,
        BinaryColor::On,
        target,
    )?;
    for (row, field) in (0..).zip(Field::CHOOSE) {
        let y = TOP + LINE * row;
        let ink = if field == marked {
            Rectangle::new(Point::new(0, y), Size::new(WIDTH, LINE as u32))
                .into_styled(on)
                .draw(target)?;
            BinaryColor::Off
        } else {
            BinaryColor::On
        };
        // 17 characters of 5 pixels are left for the value.
        let value: String<17> = text(field.value(view.setup, view.machine));
        write(
            field.label(),
            &FONT_5X8,
            Point::new(2, y + 1),
            Alignment::Left,
            ink,
            target,
        )?;
        write(
            &value,
            &FONT_5X8,
            Point::new(VALUE, y + 1),
            Alignment::Left,
            ink,
            target,
        )?;
    }
    Ok(())
}
