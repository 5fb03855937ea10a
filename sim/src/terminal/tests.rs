//! The live view without a terminal: keys to actions, and what is drawn on a grid of cells.

use std::time::Duration;

use ratatui::Terminal;
use ratatui::backend::TestBackend;
use rimrate_core::tacho::Signal;
use rimrate_core::verdict::Verdict;

use super::app::{App, Mode, Who};
use super::keys::{Command, Hand};
use super::ui;
use crate::play::{self, Keep};
use crate::rig::Rig;
use crate::scenario::{FaultName, KnobName, MotorTo, Scenario};

const SHIFT: &str = include_str!("../../scenarios/shift.toml");

fn shift() -> Scenario {
    Scenario::parse(SHIFT, "shift", None).unwrap()
}

/// Lets so much real time pass as pictures come.
fn wait(app: &mut App<'_>, ms: u64) {
    let pace = u64::from(app.pace());
    let end = app.clock_ms() + ms * pace;
    while app.clock_ms() < end {
        app.advance(Duration::from_millis(10));
    }
}

fn hand(app: &mut App<'_>, hand: Hand) {
    app.command(Command::Hand(hand));
}

fn screen(app: &App<'_>, width: u16, height: u16) -> Vec<String> {
    let mut terminal = Terminal::new(TestBackend::new(width, height)).unwrap();
    terminal.draw(|frame| ui::draw(frame, app)).unwrap();
    let buffer = terminal.backend().buffer();
    let row = |y| (0..width).map(|x| buffer[(x, y)].symbol()).collect();
    (0..height).map(row).collect()
}

fn shows(screen: &[String], words: &str) {
    assert!(
        screen.iter().any(|row| row.contains(words)),
        "no `{words}` in\n{}",
        screen.join("\n")
    );
}

#[test]
fn the_live_shift_is_the_run_without_a_face() {
    let scenario = shift();
    let summary = play::play(&scenario, &Keep::default()).unwrap();
    assert!(summary.missed.is_empty(), "{:?}", summary.missed);
    let mut app = App::new(&scenario);
    // At an uneven beat, as pictures come.
    while app.mode() == Mode::Shift {
        app.advance(Duration::from_micros(33_337));
    }
    // At rest at the end, so that the last picture's beat adds no pulse.
    assert!((0..40).contains(&(app.clock_ms() - app.length_ms())));
    assert_eq!(app.bench().pulses(), summary.pulses);
    let last = summary.changes.last().unwrap();
    assert_eq!(app.bench().rig.verdict(), last.1);
    assert!(app.told().any(|t| t.text == "the box says: danger"));
}

#[test]
fn a_touch_takes_over_and_enter_goes_back_to_where_the_shift_was() {
    let scenario = shift();
    let mut app = App::new(&scenario);
    wait(&mut app, 18_000);
    let rpm = app.bench().lathe().speed_rpm();
    let (pulses, picture) = (app.bench().pulses(), *app.bench().rig.frame());
    assert!(app.bench().cut().is_some());

    hand(&mut app, Hand::Motor(MotorTo::Off));
    assert_eq!(app.mode(), Mode::Hands);
    wait(&mut app, 12_000);
    // The shift would have braked and shifted by now; nobody's hands did.
    assert_eq!(app.bench().lathe().speed_rpm(), 0.0);
    assert_eq!(app.bench().gear(), "A-1, back gear out");
    assert_eq!(app.left_at_ms(), 18_000);

    app.command(Command::Resume);
    assert_eq!((app.mode(), app.clock_ms()), (Mode::Shift, 18_000));
    assert_eq!(app.bench().pulses(), pulses);
    assert_eq!(app.bench().lathe().speed_rpm(), rpm);
    assert!(app.bench().rig.frame() == &picture);
}

#[test]
fn after_the_shift_the_lathe_is_yours_until_q() {
    let scenario = shift();
    let mut app = App::new(&scenario);
    for _ in 0..scenario.notes.len() {
        app.command(Command::NextStage);
    }
    assert_eq!(app.mode(), Mode::Over);
    wait(&mut app, 1_000);
    assert!(app.story().contains("q quits"), "{}", app.story());
    // The job was remembered; a press confirms it.
    assert_eq!(app.bench().rig.verdict(), Verdict::Unconfirmed);
    hand(&mut app, Hand::Press(KnobName::Right));
    wait(&mut app, 200);
    assert_eq!(app.bench().rig.verdict(), Verdict::NoPulses);
    assert!(!app.quit());
    app.command(Command::Quit);
    assert!(app.quit());
}

#[test]
fn hands_drive_the_lathe() {
    let scenario = shift();
    let mut app = App::new(&scenario);
    hand(&mut app, Hand::Press(KnobName::Left));
    wait(&mut app, 500);
    for _ in 0..6 {
        hand(&mut app, Hand::Step(1));
    }
    assert_eq!(app.bench().gear(), "A-1, back gear out");
    hand(&mut app, Hand::Motor(MotorTo::Forward));
    wait(&mut app, 3_000);
    assert_eq!(app.bench().rig.verdict(), Verdict::Right);

    // Gears are shifted at rest only.
    hand(&mut app, Hand::Step(1));
    assert_eq!(app.bench().gear(), "A-1, back gear out");
    assert_eq!(app.told().last().unwrap().who, Who::Refusal);

    let free = app.bench().lathe().smooth_rpm();
    hand(&mut app, Hand::Cut { interrupted: false });
    wait(&mut app, 2_000);
    assert!(app.bench().lathe().smooth_rpm() < free);
    hand(&mut app, Hand::Cut { interrupted: true });
    assert_eq!(app.bench().cut().unwrap().times, Some(6));
    hand(&mut app, Hand::Cut { interrupted: true });
    assert!(app.bench().cut().is_none());

    // The foot stays on the brake until the spindle stands, and then leaves it.
    hand(&mut app, Hand::Brake);
    assert_eq!(app.bench().pedal(), 1.0);
    wait(&mut app, 1_000);
    assert_eq!(app.bench().lathe().smooth_rpm(), 0.0);
    assert_eq!(app.bench().pedal(), 0.0);

    hand(&mut app, Hand::Step(-1));
    assert_eq!(app.bench().gear(), "B-3, back gear in");
    hand(&mut app, Hand::Motor(MotorTo::Reverse));
    wait(&mut app, 3_000);
    assert!(app.bench().lathe().smooth_rpm() < -150.0);
}

#[test]
fn the_steps_end_at_both_ends() {
    let scenario = shift();
    let mut app = App::new(&scenario);
    for (by, end) in [(1, "B-3, back gear out"), (-1, "A-1, back gear in")] {
        for _ in 0..12 {
            hand(&mut app, Hand::Step(by));
        }
        assert_eq!(app.bench().gear(), end);
        assert_eq!(app.told().last().unwrap().text, "no further step");
    }
}

#[test]
fn a_dial_turns_where_there_are_no_steps() {
    let text = r#"
        title = "t"
        machine = "variable-lathe"
        seconds = 1
        [setup]
        material = "mild-steel"
        tool = "hss"
        operation = "facing"
        coolant = "dry"
        diameter = "20 mm"
        holder = "collet"
    "#;
    let scenario = Scenario::parse(text, "t", None).unwrap();
    let mut app = App::new(&scenario);
    hand(&mut app, Hand::Motor(MotorTo::Forward));
    for _ in 0..20 {
        hand(&mut app, Hand::Step(1));
    }
    wait(&mut app, 10_000);
    let fast = app.bench().lathe().smooth_rpm();
    for _ in 0..10 {
        hand(&mut app, Hand::Step(-1));
    }
    wait(&mut app, 10_000);
    let slow = app.bench().lathe().smooth_rpm();
    // Ten turns of 5 %.
    assert!(
        (fast / slow - 1.05f64.powi(10)).abs() < 0.05,
        "{fast} {slow}"
    );
}

#[test]
fn a_pulled_cable_is_a_lost_signal_and_can_be_plugged_in() {
    let scenario = shift();
    let mut app = App::new(&scenario);
    wait(&mut app, 78_000);
    hand(&mut app, Hand::Cable);
    assert_eq!(app.bench().faults(), [FaultName::StuckHigh]);
    wait(&mut app, 500);
    assert_eq!(app.bench().rig.reading().signal, Signal::Lost);
    hand(&mut app, Hand::Cable);
    wait(&mut app, 1_000);
    assert!(app.bench().faults().is_empty());
    assert_eq!(app.bench().rig.reading().signal, Signal::Turning);
}

#[test]
fn time_goes_at_a_pace_and_stands_when_told_to() {
    let scenario = shift();
    let mut app = App::new(&scenario);
    app.advance(Duration::from_millis(100));
    assert_eq!(app.clock_ms(), 100);
    app.command(Command::Pace);
    app.advance(Duration::from_millis(100));
    assert_eq!(app.clock_ms(), 600);
    app.command(Command::Pace);
    app.advance(Duration::from_millis(100));
    assert_eq!(app.clock_ms(), 2_600);
    app.command(Command::Pace);
    assert_eq!(app.pace(), 1);

    app.command(Command::Pause);
    app.advance(Duration::from_millis(100));
    app.command(Command::Pause);
    app.command(Command::Help);
    app.advance(Duration::from_millis(100));
    // The key that closes the help does nothing else.
    hand(&mut app, Hand::Brake);
    assert!(!app.help());
    assert_eq!((app.clock_ms(), app.mode()), (2_600, Mode::Shift));
    // A computer that slept is no lathe that ran.
    app.advance(Duration::from_secs(3600));
    assert!(app.clock_ms() <= 2_850);
}

#[test]
fn a_middling_terminal_shows_everything() {
    let scenario = shift();
    let mut app = App::new(&scenario);
    wait(&mut app, 18_000);
    let screen = screen(&app, 140, 40);
    let read = app.bench().rig.reading().speed.unwrap();
    shows(&screen, &format!("(box reads {:.0})", read.get()));
    for words in [
        "A morning in the Marrow Lane shop, Fennick geared lathe",
        "0:18 of 3:12  x1  shift plays",
        "The box on the headstock",
        "RIGHT: Mild steel, work 25 mm, set 280",
        "[● RIGHT]",
        " △ over ",
        " ▽ under",
        "buzzer quiet",
        "relay open",
        "spindle 28",
        "motor   forward, 14",
        "levers  A-1, back gear out",
        "held by three-jaw chuck, stamped 2500 rpm",
        "cut     2.5 mm deep, 0.25 mm a turn",
        "brake   free;  sensor sound",
        "A rough cut, 2.5 mm deep",
        "0:08 = the box says: right",
        "a s d left knob",
        "q quit",
    ] {
        shows(&screen, words);
    }
    // The digits of the speed, in braille.
    assert!(screen.iter().flat_map(|row| row.chars()).any(|c| c == '⣿'));
}

#[test]
fn the_smallest_terminal_shows_what_matters() {
    let scenario = shift();
    let mut app = App::new(&scenario);
    wait(&mut app, 18_000);
    hand(&mut app, Hand::Step(1));
    let screen = screen(&app, 80, 24);
    for words in [
        "YOUR HANDS",
        "[● RIGHT]",
        "buzzer quiet",
        "true  28",
        "motor forward",
        "back gear out",
        "three-jaw",
        "IN THE CUT",
        "brake free",
        "sensor sound",
        "Enter goes back to the shift",
        "! stop the spindle before shifting: b brakes",
        "a s d left knob",
        "q quit",
    ] {
        shows(&screen, words);
    }
}

#[test]
fn a_large_terminal_shows_every_pixel() {
    let scenario = shift();
    let mut app = App::new(&scenario);
    wait(&mut app, 41_000);
    for (width, height) in [(140, 45), (175, 40)] {
        let screen = screen(&app, width, height);
        for row in app.bench().rig.frame().to_text().lines() {
            shows(&screen, &format!("│{row:128}│"));
        }
        shows(&screen, "[▲ OVER ]");
        shows(&screen, "q quit");
        shows(&screen, "What happens");
    }
}

#[test]
fn a_terminal_that_is_too_small_says_so() {
    let scenario = shift();
    let app = App::new(&scenario);
    for (width, height) in [(79, 24), (80, 23)] {
        let screen = screen(&app, width, height);
        shows(&screen, "too small");
        shows(&screen, "80 and 24");
    }
}

#[test]
fn no_size_is_a_panic() {
    let scenario = shift();
    let mut app = App::new(&scenario);
    wait(&mut app, 41_000);
    app.command(Command::Help);
    for width in (1..220)
        .step_by(9)
        .chain([79, 80, 109, 110, 129, 130, 171, 172])
    {
        for height in [1, 2, 23, 24, 25, 29, 30, 37, 38, 44, 45, 47, 60] {
            screen(&app, width, height);
        }
    }
    shows(&screen(&app, 80, 24), "it guards nothing");
}
