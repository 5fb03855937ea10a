//! One picture in memory, in the order in which the displays' controllers keep it.

use core::convert::Infallible;

use embedded_graphics::pixelcolor::BinaryColor;
use embedded_graphics::prelude::*;
use embedded_graphics::primitives::Rectangle;
use rimrate_core::screen::{HEIGHT, WIDTH};

/// Columns of a page.
pub(crate) const COLUMNS: usize = WIDTH as usize;
/// Pages: rows of bytes, each eight pixels high, the lowest bit on top.
pub(crate) const PAGES: usize = HEIGHT as usize / 8;

/// 128 x 64 pixels.
#[derive(Clone, PartialEq, Eq)]
pub(crate) struct Frame(pub(crate) [[u8; COLUMNS]; PAGES]);

impl Frame {
    /// All dark.
    pub(crate) const DARK: Frame = Frame([[0; COLUMNS]; PAGES]);
}

impl OriginDimensions for Frame {
    fn size(&self) -> Size {
        Size::new(WIDTH, HEIGHT)
    }
}

impl DrawTarget for Frame {
    type Color = BinaryColor;
    type Error = Infallible;

    #[inline]
    fn draw_iter<I: IntoIterator<Item = Pixel<BinaryColor>>>(
        &mut self,
        pixels: I,
    ) -> Result<(), Infallible> {
        for Pixel(at, color) in pixels {
            // Negative coordinates become large ones and fall outside.
            let (x, y) = (at.x as usize, at.y as usize);
            if let Some(byte) = self.0.get_mut(y / 8).and_then(|page| page.get_mut(x)) {
                match color {
                    BinaryColor::On => *byte |= 1 << (y % 8),
                    BinaryColor::Off => *byte &= !(1 << (y % 8)),
                }
            }
        }
        Ok(())
    }

    /// Eight rows at a time: a bar or a cleared picture costs a tenth.
    fn fill_solid(&mut self, area: &Rectangle, color: BinaryColor) -> Result<(), Infallible> {
        let area = area.intersection(&self.bounding_box());
        let Some(last) = area.bottom_right() else {
            return Ok(());
        };
        // Inside the bounding box, hence not negative.
        let (left, top) = (area.top_left.x as usize, area.top_left.y as usize);
        let (right, bottom) = (last.x as usize, last.y as usize);
        for (number, page) in self.0.iter_mut().enumerate() {
            let (first, end) = (number * 8, number * 8 + 7);
            if bottom < first || top > end {
                continue;
            }
            let from_top = 0xff_u8 << top.saturating_sub(first);
            let to_bottom = 0xff_u8 >> end.saturating_sub(bottom);
            let mask = from_top & to_bottom;
            for byte in page.iter_mut().take(right + 1).skip(left) {
                match color {
                    BinaryColor::On => *byte |= mask,
                    BinaryColor::Off => *byte &= !mask,
                }
            }
        }
        Ok(())
    }

    fn clear(&mut self, color: BinaryColor) -> Result<(), Infallible> {
        let byte = if color.is_on() { 0xff } else { 0 };
        self.0.iter_mut().for_each(|page| page.fill(byte));
        Ok(())
    }
}
