//! Where everything stands, by the terminal's size.
//!
//! ```text
//! small, 80 x 24       medium, 110 x 30      tall, 130 x 45        wide, 172 x 40
//! title                title                 title                 title
//! panel  | signals     panel | signals       panel (large)         panel (large) | signals
//!        | lathe             | lathe                                             | lathe
//! what happens               | what happens  signals|lathe|what                  | what, events
//! keys                 events                keys                  keys
//!                      keys
//! ```

use ratatui::layout::{Constraint, Layout, Rect};

/// The smallest terminal, columns and rows.
pub(super) const SMALLEST: (u16, u16) = (80, 24);

/// How the panel's pixels are shown.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Dots {
    /// Two by four pixels a cell: 64 x 16 cells.
    Braille,
    /// One by two pixels a cell: 128 x 32 cells.
    Halves,
}

impl Dots {
    /// Cells with the frame round them.
    const fn size(self) -> (u16, u16) {
        match self {
            Dots::Braille => (66, 18),
            Dots::Halves => (130, 34),
        }
    }
}

/// The places.
#[derive(Clone, Copy, Debug)]
pub(super) struct Plan {
    pub(super) dots: Dots,
    /// Whether there is room for frames round signals, lathe and what happens.
    pub(super) frames: bool,
    pub(super) title: Rect,
    pub(super) panel: Rect,
    pub(super) signals: Rect,
    pub(super) lathe: Rect,
    pub(super) story: Rect,
    pub(super) events: Option<Rect>,
    pub(super) hints: Rect,
}

/// Rows of the framed signals, and of the framed lathe.
const SIGNALS: u16 = 5;
const LATHE: u16 = 8;

impl Plan {
    /// `None` where the terminal is too small.
    pub(super) fn new(area: Rect) -> Option<Self> {
        let has = |width, height| area.width >= width && area.height >= height;
        if has(172, 38) {
            Some(Self::wide(area))
        } else if has(130, 45) {
            Some(Self::tall(area))
        } else if has(110, 30) {
            Some(Self::medium(area))
        } else if has(SMALLEST.0, SMALLEST.1) {
            Some(Self::small(area))
        } else {
            None
        }
    }

    fn small(area: Rect) -> Self {
        let (width, height) = Dots::Braille.size();
        let [title, middle, story, hints] = rows(area, [1, height, area.height - height - 3, 2]);
        let [panel, side] = columns(middle, [width, middle.width - width]);
        let side = Rect {
            x: side.x + 1,
            width: side.width - 1,
            ..side
        };
        let [signals, lathe] = rows(side, [6, height - 6]);
        Plan {
            dots: Dots::Braille,
            frames: false,
            title,
            panel,
            signals,
            lathe,
            story: Rect {
                x: story.x + 1,
                width: story.width - 1,
                ..story
            },
            events: None,
            hints,
        }
    }

    fn medium(area: Rect) -> Self {
        let (width, height) = Dots::Braille.size();
        let free = area.height - 1 - height - 2;
        let [title, middle, events, hints] = rows(area, [1, height, free, 2]);
        let [panel, side] = columns(middle, [width, middle.width - width]);
        let [signals, lathe, story] = rows(side, [SIGNALS, LATHE, height - SIGNALS - LATHE]);
        Plan {
            dots: Dots::Braille,
            frames: true,
            title,
            panel,
            signals,
            lathe,
            story,
            events: Some(events),
            hints,
        }
    }

    fn tall(area: Rect) -> Self {
        let (width, height) = Dots::Halves.size();
        let free = area.height - 1 - height - 2;
        let [title, panel, below, hints] = rows(area, [1, height, free, 2]);
        let margin = (area.width - width) / 2;
        let panel = Rect {
            x: panel.x + margin,
            width,
            ..panel
        };
        let [signals, lathe, what] = columns(below, [34, 52, below.width - 86]);
        // The events may go where there is more than the sentence needs.
        let (story, events) = if what.height >= SIGNALS + 4 {
            let [story, events] = rows(what, [SIGNALS, what.height - SIGNALS]);
            (story, Some(events))
        } else {
            (what, None)
        };
        Plan {
            dots: Dots::Halves,
            frames: true,
            title,
            panel,
            signals,
            lathe,
            story,
            events,
            hints,
        }
    }

    fn wide(area: Rect) -> Self {
        let (width, height) = Dots::Halves.size();
        let [title, middle, hints] = rows(area, [1, area.height - 3, 2]);
        let [panel, side] = columns(middle, [width, middle.width - width]);
        let panel = Rect { height, ..panel };
        let free = side.height - SIGNALS - LATHE - 5;
        let [signals, lathe, story, events] = rows(side, [SIGNALS, LATHE, 5, free]);
        Plan {
            dots: Dots::Halves,
            frames: true,
            title,
            panel,
            signals,
            lathe,
            story,
            events: Some(events),
            hints,
        }
    }
}

fn rows<const N: usize>(area: Rect, heights: [u16; N]) -> [Rect; N] {
    Layout::vertical(heights.map(Constraint::Length)).areas(area)
}

fn columns<const N: usize>(area: Rect, widths: [u16; N]) -> [Rect; N] {
    Layout::horizontal(widths.map(Constraint::Length)).areas(area)
}
