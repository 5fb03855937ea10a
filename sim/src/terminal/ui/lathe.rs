//! Lamps, buzzer and relay, and the lathe's true state.

use ratatui::Frame;
use ratatui::layout::Rect;
use ratatui::style::{Color, Modifier, Style, Stylize};
use ratatui::text::{Line, Span};
use ratatui::widgets::{Paragraph, Wrap};
use rimrate_core::beacon::Outputs;

use super::boxed;
use super::plan::Plan;
use crate::lathe::MotorSwitch;
use crate::rig::Rig;
use crate::terminal::app::App;
use crate::terminal::words;

pub(super) fn draw(frame: &mut Frame<'_>, plan: &Plan, app: &App<'_>) {
    let outputs = app.bench().rig.outputs();
    if plan.frames {
        framed(
            frame,
            plan.signals,
            "Lamps, buzzer, relay",
            signals(outputs),
        );
        let width = usize::from(plan.lathe.width).saturating_sub(2);
        framed(frame, plan.lathe, "The lathe", state(app, width));
    } else {
        frame.render_widget(Paragraph::new(narrow_signals(outputs)), plan.signals);
        let state = Paragraph::new(narrow_state(app)).wrap(Wrap { trim: false });
        frame.render_widget(state, plan.lathe);
    }
}

fn framed(frame: &mut Frame<'_>, area: Rect, title: &str, lines: Vec<Line<'_>>) {
    let block = boxed(title);
    let inside = block.inner(area);
    frame.render_widget(block, area);
    frame.render_widget(Paragraph::new(lines), inside);
}

/// A lit lamp has a full symbol, brackets and its word in capitals; colour only repeats it.
fn lamp(lit: bool, signs: (&str, &str), word: &str, color: Color) -> Span<'static> {
    if lit {
        let style = Style::new()
            .fg(color)
            .add_modifier(Modifier::BOLD | Modifier::REVERSED);
        Span::styled(format!("[{} {:<5}]", signs.0, word.to_uppercase()), style)
    } else {
        Span::styled(format!(" {} {word:<5} ", signs.1), Style::new().dim())
    }
}

fn lamps(outputs: Outputs) -> [Span<'static>; 3] {
    [
        lamp(outputs.over, ("▲", "△"), "over", Color::Red),
        lamp(outputs.right, ("●", "○"), "right", Color::Green),
        lamp(outputs.under, ("▼", "▽"), "under", Color::Yellow),
    ]
}

fn buzzer(outputs: Outputs) -> Span<'static> {
    match outputs.buzzer_hz {
        Some(hz) => format!("BUZZ {hz} Hz").bold(),
        None => "buzzer quiet".dim(),
    }
}

fn relay(outputs: Outputs) -> Span<'static> {
    if outputs.relay {
        "RELAY CLOSED".bold()
    } else {
        "relay open".dim()
    }
}

fn signals(outputs: Outputs) -> Vec<Line<'static>> {
    let [over, right, under] = lamps(outputs);
    let gap = || Span::raw("   ");
    vec![
        Line::from(vec![Span::raw(" "), over, gap(), buzzer(outputs)]),
        Line::from(vec![Span::raw(" "), right]),
        Line::from(vec![Span::raw(" "), under, gap(), relay(outputs)]),
    ]
}

fn narrow_signals(outputs: Outputs) -> Vec<Line<'static>> {
    let mut lines: Vec<Line<'static>> = lamps(outputs).into_iter().map(Line::from).collect();
    lines.push(Line::from(buzzer(outputs)));
    lines.push(Line::from(relay(outputs)));
    lines
}

fn way(rpm: f64) -> &'static str {
    if rpm < 0.0 { " reverse" } else { "" }
}

fn switch(to: MotorSwitch) -> &'static str {
    match to {
        MotorSwitch::Off => "off",
        MotorSwitch::Forward => "forward",
        MotorSwitch::Reverse => "reverse",
    }
}

/// Ten cells; twice the rated torque and more fill them.
fn load_bar(load: f64) -> String {
    let full = ((load * 5.0).round() as usize).min(10);
    format!("{}{}", "█".repeat(full), "░".repeat(10 - full))
}

fn cut(app: &App<'_>) -> String {
    app.bench()
        .cut()
        .map_or("none".to_owned(), |cut| words::cut(&cut))
}

fn brake(app: &App<'_>) -> &'static str {
    if app.bench().pedal() > 0.0 {
        "FOOT DOWN"
    } else {
        "free"
    }
}

fn sensor(app: &App<'_>) -> String {
    let faults: Vec<&str> = app
        .bench()
        .faults()
        .iter()
        .map(|&f| words::fault(f))
        .collect();
    match faults.as_slice() {
        [] => "sensor sound".into(),
        all => all.join(", ").to_uppercase(),
    }
}

fn holder(app: &App<'_>) -> String {
    let holder = app.setup().holder;
    match app.bench().machine().holders().get(usize::from(holder)) {
        Some(holder) => match holder.rated {
            Some(rpm) => format!("{}, stamped {rpm}", holder.name),
            None => format!("{}, not stamped", holder.name),
        },
        None => "unknown".into(),
    }
}

/// Six lines.
fn state(app: &App<'_>, width: usize) -> Vec<Line<'static>> {
    let lathe = app.bench().lathe();
    let (rpm, motor, load) = (lathe.smooth_rpm(), lathe.motor_rpm(), lathe.load());
    let mut reading = words::reading(&app.bench().rig.reading());
    let mut bar = format!("  {}", load_bar(load));
    if width < 48 {
        bar.clear();
        reading = reading.replacen("box reads", "box", 1);
    }
    let line = |word: &str, value: String| {
        Line::from(vec![
            Span::styled(format!(" {word:<8}"), Style::new().dim()),
            Span::raw(value),
        ])
    };
    vec![
        line(
            "spindle",
            format!("{:.1} rpm{}  ({reading})", rpm.abs(), way(rpm)),
        ),
        line(
            "motor",
            format!(
                "{}, {:.0} rpm, load {:.0} %{bar}",
                switch(lathe.switch()),
                motor.abs(),
                100.0 * load
            ),
        ),
        line("levers", app.bench().gear().to_owned()),
        line("held by", holder(app)),
        line("cut", cut(app)),
        line("brake", format!("{};  {}", brake(app), sensor(app))),
    ]
}

/// The same in lines of thirteen letters.
fn narrow_state(app: &App<'_>) -> Vec<Line<'static>> {
    let lathe = app.bench().lathe();
    let rpm = lathe.smooth_rpm();
    let (first, second) = match app.bench().gear().split_once(", ") {
        Some((first, second)) => (first.to_owned(), second.to_owned()),
        None => (app.bench().gear().to_owned(), String::new()),
    };
    let holder = app
        .bench()
        .machine()
        .holders()
        .get(usize::from(app.setup().holder))
        .map_or("unknown", |holder| holder.name.as_str())
        .to_owned();
    let cut = match app.bench().cut() {
        None => "no cut".dim(),
        Some(cut) if cut.times.is_some() => "CUT, flats".bold(),
        Some(_) => "IN THE CUT".bold(),
    };
    let brake = match app.bench().pedal() > 0.0 {
        true => "BRAKE DOWN".bold(),
        false => "brake free".dim(),
    };
    let sensor = sensor(app);
    vec![
        Line::from(format!("true{:>5.0} rpm", rpm.abs())).bold(),
        Line::from(format!("motor{:>8}", switch(lathe.switch()))),
        Line::from(format!("  {:>7.0} rpm", lathe.motor_rpm().abs())),
        Line::from(format!("load{:>7.0} %", 100.0 * lathe.load())),
        Line::from(first),
        Line::from(second),
        Line::from(holder),
        Line::from(cut),
        Line::from(brake),
        Line::from(sensor),
    ]
}
