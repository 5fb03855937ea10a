//! The panel's picture: 128 x 64 pixels, as text, as PNG, and searched for words.

use std::convert::Infallible;
use std::io::Write;

use embedded_graphics::mono_font::ascii::{FONT_4X6, FONT_5X8, FONT_6X13_BOLD};
use embedded_graphics::mono_font::{MonoFont, MonoTextStyle};
use embedded_graphics::pixelcolor::BinaryColor;
use embedded_graphics::prelude::*;
use embedded_graphics::text::{Baseline, Text};
use rimrate_core::screen::{HEIGHT, WIDTH};

/// A picture of the panel: a number a row, its lowest bit the leftmost pixel.
#[derive(Clone, Copy, PartialEq, Eq)]
pub struct Frame {
    rows: [u128; HEIGHT as usize],
}

// One bit for each pixel of a row.
const _: () = assert!(WIDTH == u128::BITS);

impl Default for Frame {
    fn default() -> Self {
        Frame {
            rows: [0; HEIGHT as usize],
        }
    }
}

impl Frame {
    /// All dark.
    pub fn new() -> Self {
        Self::default()
    }

    /// Whether a pixel is lit; dark outside of the panel.
    pub fn lit(&self, x: u32, y: u32) -> bool {
        x < WIDTH
            && self
                .rows
                .get(y as usize)
                .is_some_and(|row| row >> x & 1 == 1)
    }

    /// Makes it dark.
    pub fn clear(&mut self) {
        self.rows.fill(0);
    }

    /// Sets one pixel, if it is on the panel.
    pub fn set(&mut self, x: u32, y: u32, lit: bool) {
        if x < WIDTH
            && let Some(row) = self.rows.get_mut(y as usize)
        {
            *row = *row & !(1 << x) | u128::from(lit) << x;
        }
    }

    /// Two rows of pixels in one row of half-block characters: a person can read it, and its changes, in a diff.
    pub fn to_text(&self) -> String {
        let mut text = String::new();
        for y in (0..HEIGHT).step_by(2) {
            let row: String = (0..WIDTH)
                .map(|x| match (self.lit(x, y), self.lit(x, y + 1)) {
                    (false, false) => ' ',
                    (true, false) => '▀',
                    (false, true) => '▄',
                    (true, true) => '█',
                })
                .collect();
            text.push_str(row.trim_end());
            text.push('\n');
        }
        text
    }

    /// A grey-scale PNG, every pixel a square of `scale` pixels with a thin gap, on a dark border.
    pub fn write_png(&self, out: impl Write, scale: u32) -> Result<(), png::EncodingError> {
        const LIT: u8 = 235;
        const DARK: u8 = 22;
        let border = 2 * scale;
        let (width, height) = (WIDTH * scale + 2 * border, HEIGHT * scale + 2 * border);
        let mut pixels = vec![DARK; (width * height) as usize];
        for y in border..height - border {
            for x in border..width - border {
                let (px, py) = (x - border, y - border);
                let gap = scale > 2 && (px % scale == scale - 1 || py % scale == scale - 1);
                if !gap && self.lit(px / scale, py / scale) {
                    pixels[(y * width + x) as usize] = LIT;
                }
            }
        }
        let mut encoder = png::Encoder::new(out, width, height);
        encoder.set_color(png::ColorType::Grayscale);
        encoder.set_depth(png::BitDepth::Eight);
        let mut writer = encoder.write_header()?;
        writer.write_image_data(&pixels)?;
        writer.finish()
    }

    /// Whether these words stand anywhere on the panel, in one of its fonts, plain or reversed.
    pub fn shows(&self, words: &str) -> bool {
        [&FONT_5X8, &FONT_4X6, &FONT_6X13_BOLD]
            .into_iter()
            .any(|font| self.shows_in(words, font))
    }

    fn shows_in(&self, words: &str, font: &MonoFont<'_>) -> bool {
        let size = font.character_size;
        let width = words.chars().count() as u32 * size.width;
        if words.is_empty() || width > WIDTH {
            return false;
        }
        let mut pattern = Frame::new();
        let style = MonoTextStyle::new(font, BinaryColor::On);
        let Ok(_) =
            Text::with_baseline(words, Point::zero(), style, Baseline::Top).draw(&mut pattern);
        let ink = pattern.rows.iter().fold(0, |ink, row| ink | row);
        if ink == 0 {
            return false;
        }
        // Blank columns and rows at the pattern's edge belong to the neighbours.
        let left = ink.trailing_zeros();
        let columns = u128::MAX >> (ink.leading_zeros() + left);
        let inked = |row: &&u128| **row != 0;
        let top = pattern.rows.iter().take_while(|row| !inked(row)).count();
        let bottom = pattern
            .rows
            .iter()
            .rposition(|row| *row != 0)
            .unwrap_or(top);
        let pattern: Vec<u128> = pattern.rows[top..=bottom]
            .iter()
            .map(|row| row >> left)
            .collect();
        self.rows.windows(pattern.len()).any(|rows| {
            (0..WIDTH - columns.count_ones() + 1).any(|x| {
                let same = |reversed: u128| {
                    rows.iter()
                        .zip(&pattern)
                        .all(|(row, wanted)| (row >> x ^ reversed) & columns == *wanted)
                };
                same(0) || same(u128::MAX)
            })
        })
    }
}

impl std::fmt::Debug for Frame {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "\n{}", self.to_text())
    }
}

impl OriginDimensions for Frame {
    fn size(&self) -> Size {
        Size::new(WIDTH, HEIGHT)
    }
}

impl DrawTarget for Frame {
    type Color = BinaryColor;
    type Error = Infallible;

    fn draw_iter<I>(&mut self, pixels: I) -> Result<(), Infallible>
    where
        I: IntoIterator<Item = Pixel<BinaryColor>>,
    {
        for Pixel(at, color) in pixels {
            if let (Ok(x), Ok(y)) = (u32::try_from(at.x), u32::try_from(at.y)) {
                self.set(x, y, color.is_on());
            }
        }
        Ok(())
    }
}
