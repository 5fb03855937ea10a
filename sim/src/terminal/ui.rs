//! Draws the app. What stands where follows from the terminal's size alone.

mod help;
mod lathe;
mod panel;
mod plan;

use ratatui::Frame;
use ratatui::layout::{Alignment, Constraint, Layout, Rect};
use ratatui::style::{Modifier, Style, Stylize};
use ratatui::text::{Line, Span};
use ratatui::widgets::{Block, BorderType, Paragraph, Wrap};

use super::app::{App, Mode, Told, Who};
use super::keys::GROUPS;
use super::words;
use plan::{Plan, SMALLEST};

/// Draws everything.
pub(super) fn draw(frame: &mut Frame<'_>, app: &App<'_>) {
    let area = frame.area();
    let Some(plan) = Plan::new(area) else {
        return too_small(frame, area);
    };
    title(frame, plan.title, app);
    panel::draw(frame, plan.panel, plan.dots, app);
    lathe::draw(frame, &plan, app);
    happening(frame, &plan, app);
    hints(frame, plan.hints);
    if app.help() {
        help::draw(frame, area);
    }
}

fn too_small(frame: &mut Frame<'_>, area: Rect) {
    let (width, height) = SMALLEST;
    let text = vec![
        Line::from("This terminal is too small.").bold(),
        Line::from(format!(
            "It has {} columns and {} rows;",
            area.width, area.height
        )),
        Line::from(format!("the lathe needs {width} and {height}.")),
        Line::from("Make it larger, or press q to quit."),
    ];
    frame.render_widget(Paragraph::new(text).wrap(Wrap { trim: true }), area);
}

fn boxed(title: &str) -> Block<'_> {
    Block::bordered()
        .border_type(BorderType::Rounded)
        .border_style(Style::new().dim())
        .title(Span::styled(format!(" {title} "), Style::new().bold()))
}

fn title(frame: &mut Frame<'_>, area: Rect, app: &App<'_>) {
    let scenario = app.scenario();
    let state = if app.paused() {
        "PAUSED"
    } else {
        match app.mode() {
            Mode::Shift => "shift plays",
            Mode::Hands => "YOUR HANDS",
            Mode::Over => "SHIFT OVER",
        }
    };
    let clock = match app.mode() {
        Mode::Shift => format!(
            "{} of {}",
            words::clock(app.clock_ms()),
            words::clock(app.length_ms())
        ),
        Mode::Hands => format!(
            "{} (shift at {})",
            words::clock(app.clock_ms()),
            words::clock(app.left_at_ms())
        ),
        Mode::Over => words::clock(app.clock_ms()),
    };
    let right = format!(" {clock}  x{}  {state} ", app.pace());
    let room = usize::from(area.width).saturating_sub(right.chars().count());
    let machine = scenario.machine.name();
    let left = [
        format!(" Rimrate  {}, {machine}", scenario.title),
        format!(" Rimrate  {}", scenario.title),
        " Rimrate".to_owned(),
    ]
    .into_iter()
    .find(|left| left.chars().count() <= room)
    .unwrap_or_default();
    let bar = Style::new().add_modifier(Modifier::REVERSED);
    frame.render_widget(Paragraph::new(left).style(bar), area);
    let width = (right.chars().count() as u16).min(area.width);
    let place = Rect {
        x: area.right() - width,
        width,
        ..area
    };
    frame.render_widget(
        Paragraph::new(right).style(bar).alignment(Alignment::Right),
        place,
    );
}

/// The sentence of this stage, and what happened last.
fn happening(frame: &mut Frame<'_>, plan: &Plan, app: &App<'_>) {
    let (story, events) = if plan.frames {
        let block = boxed("What happens");
        let inside = block.inner(plan.story);
        frame.render_widget(block, plan.story);
        let events = plan.events.map(|area| {
            let block = boxed("Events");
            let inside = block.inner(area);
            frame.render_widget(block, area);
            inside
        });
        (inside, events)
    } else {
        (plan.story, None)
    };
    // Without a place of their own the events take what the sentence leaves.
    let (story, events) = match events {
        Some(events) => (story, events),
        None => {
            // Lines end at words: some columns stay empty.
            let letters = app.story().chars().count() as u16;
            let sentence = letters / story.width.saturating_sub(8).max(1) + 1;
            let [story, events] =
                Layout::vertical([Constraint::Length(sentence), Constraint::Fill(1)]).areas(story);
            (story, events)
        }
    };
    let sentence = Paragraph::new(app.story().to_owned()).wrap(Wrap { trim: true });
    frame.render_widget(sentence.bold(), story);

    let mut lines: Vec<Line<'_>> = app
        .told()
        .rev()
        .filter(|told| told.who != Who::Story)
        .take(usize::from(events.height))
        .map(event)
        .collect();
    lines.reverse();
    frame.render_widget(Paragraph::new(lines), events);
}

fn event(told: &Told) -> Line<'_> {
    let mark = match told.who {
        Who::You => "> ",
        Who::Box => "= ",
        Who::Refusal => "! ",
        Who::Shift | Who::Story => "  ",
    };
    let at = Span::styled(format!("{:>5} ", words::clock(told.at)), Style::new().dim());
    let text = match told.times {
        1 => Span::raw(&told.text),
        n => Span::raw(format!("{}, {n} times", told.text)),
    };
    let text = match told.who {
        Who::Box | Who::Refusal => text.bold(),
        Who::Story | Who::Shift | Who::You => text,
    };
    Line::from(vec![at, Span::raw(mark), text])
}

/// The keys in short, over as many lines as there are.
fn hints(frame: &mut Frame<'_>, area: Rect) {
    let mut lines: Vec<String> = vec![String::new()];
    for group in GROUPS {
        let Some(last) = lines.last_mut() else { return };
        let gap = if last.is_empty() { 1 } else { 3 };
        let length = last.chars().count() + gap + group.hint.chars().count();
        if length <= usize::from(area.width) {
            last.push_str(&" ".repeat(gap));
            last.push_str(group.hint);
        } else {
            lines.push(format!(" {}", group.hint));
        }
    }
    let lines: Vec<Line<'_>> = lines.into_iter().map(Line::from).collect();
    frame.render_widget(Paragraph::new(lines).dim(), area);
}
