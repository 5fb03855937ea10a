//! The panel's pixels in character cells.

use ratatui::Frame;
use ratatui::buffer::Buffer;
use ratatui::layout::Rect;
use ratatui::style::Stylize;
use ratatui::widgets::Widget;
use rimrate_core::panel::{Field, Page};
use rimrate_core::screen::{HEIGHT, WIDTH};

use super::boxed;
use super::plan::Dots;
use crate::frame::Frame as Picture;
use crate::rig::Rig;
use crate::terminal::app::App;

pub(super) fn draw(frame: &mut Frame<'_>, area: Rect, dots: Dots, app: &App<'_>) {
    let mut block = boxed("The box on the headstock");
    // Small letters are hard to read in braille: the frame repeats the most important words.
    if dots == Dots::Braille {
        block = block.title_bottom(format!(" {} ", gist(app)).bold());
    }
    let inside = block.inner(area);
    frame.render_widget(block, area);
    let picture = app.bench().rig.frame();
    frame.render_widget(Pixels { picture, dots }, inside);
}

/// Verdict, work and advice in one line.
fn gist(app: &App<'_>) -> String {
    let view = app.bench().rig.instrument().view();
    let word = view.verdict.id().to_uppercase();
    if let Some(notice) = view.notice {
        return format!("{word}: {}", notice.text);
    }
    if let Page::Choose(field) = view.page {
        let value = field.value(view.setup, view.machine);
        return format!("{word}; {}: {value}", field.label());
    }
    let setup = view.setup;
    let set = match view.advice.pick.setting() {
        Some(setting) => format!("set {:.0}", setting.rpm.get()),
        None => "nothing to set".into(),
    };
    let word_for = setup.operation.diameter_word();
    let material = setup.material.label();
    let diameter = Field::Diameter.value(setup, view.machine);
    format!("{word}: {material}, {word_for} {diameter}, {set}")
}

struct Pixels<'a> {
    picture: &'a Picture,
    dots: Dots,
}

impl Widget for Pixels<'_> {
    fn render(self, area: Rect, buffer: &mut Buffer) {
        let (across, down) = match self.dots {
            Dots::Braille => (2, 4),
            Dots::Halves => (1, 2),
        };
        for y in 0..HEIGHT / down {
            for x in 0..WIDTH / across {
                let (left, top) = (x * across, y * down);
                let lit = |dx, dy| self.picture.lit(left + dx, top + dy);
                let sign = match self.dots {
                    Dots::Braille => braille(lit),
                    Dots::Halves => halves(lit),
                };
                let at = (area.x + x as u16, area.y + y as u16);
                if let Some(cell) = buffer.cell_mut(at) {
                    cell.set_char(sign);
                }
            }
        }
    }
}

fn halves(lit: impl Fn(u32, u32) -> bool) -> char {
    match (lit(0, 0), lit(0, 1)) {
        (false, false) => ' ',
        (true, false) => '▀',
        (false, true) => '▄',
        (true, true) => '█',
    }
}

/// Unicode's braille patterns: U+2800 and a bit for each dot, numbered down the left column, then down the right, and the
/// lowest two last.
fn braille(lit: impl Fn(u32, u32) -> bool) -> char {
    const DOTS: [(u32, u32); 8] = [
        (0, 0),
        (0, 1),
        (0, 2),
        (1, 0),
        (1, 1),
        (1, 2),
        (0, 3),
        (1, 3),
    ];
    let bits = DOTS
        .iter()
        .enumerate()
        .filter(|&(_, &(x, y))| lit(x, y))
        .fold(0, |bits, (i, _)| bits | 1 << i);
    match bits {
        0 => ' ',
        bits => char::from_u32(0x2800 + bits).unwrap_or(' '),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn braille_dots_are_where_unicode_has_them() {
        // The Unicode Standard, block "Braille Patterns": dots-1 U+2801, dots-4 U+2808, dots-7 U+2840, dots-8 U+2880.
        let only = |x, y| braille(|a, b| (a, b) == (x, y));
        assert_eq!(only(0, 0), '\u{2801}');
        assert_eq!(only(1, 0), '\u{2808}');
        assert_eq!(only(0, 3), '\u{2840}');
        assert_eq!(only(1, 3), '\u{2880}');
        assert_eq!(braille(|_, _| true), '\u{28ff}');
        assert_eq!(braille(|_, _| false), ' ');
    }
}
