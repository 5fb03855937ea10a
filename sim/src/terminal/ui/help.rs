//! The help over everything else.

use ratatui::Frame;
use ratatui::layout::Rect;
use ratatui::style::{Style, Stylize};
use ratatui::text::{Line, Span};
use ratatui::widgets::{Clear, Paragraph};

use super::boxed;
use crate::terminal::keys::{GROUPS, Group};

const WIDTH: u16 = 76;
const HEIGHT: u16 = 24;
const COLUMN: u16 = 36;

pub(super) fn draw(frame: &mut Frame<'_>, area: Rect) {
    let place = Rect {
        x: area.x + (area.width - WIDTH) / 2,
        y: area.y + (area.height - HEIGHT) / 2,
        width: WIDTH,
        height: HEIGHT,
    };
    let block = boxed("Keys; time stands while you read");
    let inside = block.inner(place);
    frame.render_widget(Clear, place);
    frame.render_widget(block, place);

    let split = GROUPS.len().div_ceil(2);
    let (left, right) = GROUPS.split_at(split);
    for (x, groups) in [(1, left), (1 + COLUMN, right)] {
        let column = Rect {
            x: inside.x + x,
            width: COLUMN,
            ..inside
        };
        frame.render_widget(Paragraph::new(lines(groups)), column);
    }
    let foot = vec![
        Line::from("A touch of knob or lathe takes over from the shift; Enter goes back."),
        Line::from("Rimrate advises; it guards nothing and stops nothing. At a real lathe,"),
        Line::from("what is marked on holder, tool and machine always wins, and gears are"),
        Line::from("shifted at rest only."),
    ];
    let rows = foot.len() as u16;
    let below = Rect {
        x: inside.x + 1,
        y: inside.bottom() - rows,
        width: inside.width - 1,
        height: rows,
    };
    frame.render_widget(Paragraph::new(foot).dim(), below);
}

fn lines(groups: &[Group]) -> Vec<Line<'static>> {
    let mut lines = Vec::new();
    for group in groups {
        lines.push(Line::from(group.title.bold()));
        for key in group.keys {
            lines.push(Line::from(vec![
                Span::styled(format!("  {:<6}", key.shown), Style::new().bold()),
                Span::raw(key.does),
            ]));
        }
        lines.push(Line::default());
    }
    lines
}
