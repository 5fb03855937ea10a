//! The panel's picture: 128 x 64 pixels, as text, as PNG, and searched for words.

use std::convert::Infallible;
use std::io::Write;

use embedded_graphics::mono_font::ascii::{FONT_4X6, FONT_5X8, FONT_7X13_BOLD};
use embedded_graphics::mono_font::{MonoFont, MonoTextStyle};
use embedded_graphics::pixelcolor::BinaryColor;
use embedded_graphics::prelude::*;
use embedded_graphics::text::{Baseline, Text};
use rimrate_core::screen::{HEIGHT, WIDTH};

/// A picture of the panel. Row by row, one byte a pixel: it is small, and simple wins.
#[derive(Clone, PartialEq, Eq)]
pub struct Frame {
    lit: Vec<bool>,
}

impl Default for Frame {
    fn default() -> Self {
        Frame {
            lit: vec![false; (WIDTH * HEIGHT) as usize],
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
                .lit
                .get((y * WIDTH + x) as usize)
                .copied()
                .unwrap_or(false)
    }

    /// Makes it dark.
    pub fn clear(&mut self) {
        self.lit.fill(false);
    }

    /// Sets one pixel, if it is on the panel.
    pub fn set(&mut self, x: u32, y: u32, lit: bool) {
        if x < WIDTH
            && let Some(pixel) = self.lit.get_mut((y * WIDTH + x) as usize)
        {
            *pixel = lit;
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
        [&FONT_5X8, &FONT_4X6, &FONT_7X13_BOLD]
            .into_iter()
            .any(|font| self.shows_in(words, font))
    }

    fn shows_in(&self, words: &str, font: &MonoFont<'_>) -> bool {
        let size = font.character_size;
        let (width, height) = (words.chars().count() as u32 * size.width, size.height);
        if words.is_empty() || width > WIDTH {
            return false;
        }
        let mut pattern = Frame::new();
        let style = MonoTextStyle::new(font, BinaryColor::On);
        let Ok(_) =
            Text::with_baseline(words, Point::zero(), style, Baseline::Top).draw(&mut pattern);
        // Blank columns and rows at the pattern's edge belong to the neighbours.
        let inked = |x: u32, y: u32| pattern.lit(x, y);
        let (Some(right), Some(top), Some(bottom), Some(left)) = (
            (0..width).rev().find(|&x| (0..height).any(|y| inked(x, y))),
            (0..height).find(|&y| (0..width).any(|x| inked(x, y))),
            (0..height).rev().find(|&y| (0..width).any(|x| inked(x, y))),
            (0..width).find(|&x| (0..height).any(|y| inked(x, y))),
        ) else {
            return false;
        };
        let (w, h) = (right - left + 1, bottom - top + 1);
        let matches = |dx: u32, dy: u32, reversed: bool| {
            (0..h).all(|y| {
                (0..w).all(|x| inked(x + left, y + top) == (self.lit(x + dx, y + dy) != reversed))
            })
        };
        (0..=HEIGHT - h)
            .any(|dy| (0..=WIDTH - w).any(|dx| matches(dx, dy, false) || matches(dx, dy, true)))
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
