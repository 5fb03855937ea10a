//! The Why page: what holds the speed down, the lowest bound first and reversed, then how far the next ones stand above it.
//!
//! ```text
//!  rpm   what holds the speed down
//! [  81 motor power   limit ]      the bound that binds
//!   366 cutting speed   +349%      what would bind if it were gone, and how much faster that would be
//!  2500 holder rating     x31
//!   275 carbide rubs    least      lower bounds
//!  edge used, turning    34%      how much of the edge's life is used, and what was counted
//! ```

use embedded_graphics::mono_font::ascii::FONT_5X8;
use embedded_graphics::pixelcolor::BinaryColor;
use embedded_graphics::prelude::*;
use embedded_graphics::primitives::{PrimitiveStyle, Rectangle};
use embedded_graphics::text::Alignment;
use heapless::{String, Vec};

use super::{View, WIDTH, line, write};
use crate::advice::{Advice, Excess, Side};
use crate::error::text;
use crate::units::Decimal;

/// Rows below the first that fit.
pub(crate) const ROWS: usize = 5;
/// Right end of the speeds: five digits.
const RPM: i32 = 25;
/// Left end of the reasons.
const REASON: i32 = 31;
const BINDING_TOP: i32 = 10;
const LINE: i32 = 8;
const MOST: usize = 20;

/// One row.
struct Row {
    rpm: String<8>,
    reason: &'static str,
    right: String<8>,
}

/// How many rows there are below the binding one.
pub(crate) fn rows_below(advice: &Advice) -> usize {
    // All bounds but the binding one, and the edge's account.
    advice.bounds.len().saturating_sub(1) + usize::from(advice.cut.edge.is_some())
}

pub(super) fn draw<D: DrawTarget<Color = BinaryColor>>(
    view: &View<'_>,
    first: u8,
    target: &mut D,
) -> Result<(), D::Error> {
    let advice = view.advice;
    let whole = |value: f32| {
        let value = libm::roundf(value);
        if value < 99_999.5 {
            text(Decimal { value, decimals: 0 })
        } else {
            text("many")
        }
    };
    let below = rows_below(advice);
    let title = if below > ROWS {
        "rpm   limits, lowest  turn: more"
    } else {
        "rpm   what holds the speed down"
    };
    line(title, 0, target)?;

    let ranked = advice.ranked();
    let mut rows: Vec<Row, MOST> = Vec::new();
    // As many places as there are bounds, and one more.
    let mut add = |row: Row| {
        let _ = rows.push(row);
    };
    for (bound, above) in ranked.iter().skip(1) {
        add(Row {
            rpm: whole(bound.at.get()),
            reason: bound.reason.short(),
            right: text(Excess(*above).short()),
        });
    }
    for bound in advice.bounds.iter().filter(|b| b.side == Side::Lower) {
        add(Row {
            rpm: whole(bound.at.get()),
            reason: bound.reason.short(),
            right: text("least"),
        });
    }
    if advice.cut.edge.is_some() {
        add(Row {
            rpm: text("edge"),
            reason: view.edge.counted().words(),
            right: text(format_args!("{}%", view.edge.percent().min(999))),
        });
    }

    if let Some((bound, _)) = ranked.first() {
        let back = Rectangle::new(Point::new(0, BINDING_TOP), Size::new(WIDTH, 10));
        back.into_styled(PrimitiveStyle::with_fill(BinaryColor::On))
            .draw(target)?;
        let row = Row {
            rpm: whole(bound.at.get()),
            reason: bound.reason.short(),
            right: text("limit"),
        };
        show(&row, BINDING_TOP + 1, BinaryColor::Off, target)?;
    }
    let skipped = usize::from(first).min(below.saturating_sub(ROWS));
    for (i, row) in (0..).zip(rows.iter().skip(skipped).take(ROWS)) {
        show(row, BINDING_TOP + 13 + LINE * i, BinaryColor::On, target)?;
    }
    Ok(())
}

fn show<D: DrawTarget<Color = BinaryColor>>(
    row: &Row,
    y: i32,
    ink: BinaryColor,
    target: &mut D,
) -> Result<(), D::Error> {
    let font = &FONT_5X8;
    let mut put = |words: &str, x: i32, alignment| {
        write(words, font, Point::new(x, y), alignment, ink, target)
    };
    put(&row.rpm, RPM, Alignment::Right)?;
    put(row.reason, REASON, Alignment::Left)?;
    put(&row.right, WIDTH as i32 - 2, Alignment::Right)
}
