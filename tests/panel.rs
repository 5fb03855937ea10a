//! The two push-knobs: turns, presses, holds, and what the screen says about them. Times are those of the panel's manual.

#[path = "panel/counting.rs"]
mod counting;

use rimrate_core::advice::{Pick, advise};
use rimrate_core::machine::{Drive, Machine};
use rimrate_core::panel::{Bench, Field, HOLD, Knob, NOTICE, Page, Panel, Wish};
use rimrate_core::sensor_setup::SensorSetup;
use rimrate_core::setup::{Diameter, Life, Setup};
use rimrate_core::time::{Duration, Instant};
use rimrate_core::trade::{Coolant, Material, Operation, Tool};
use rimrate_core::units::{Length, Rpm};
use rimrate_tests::{at, bar, machine, rpm};

const JUST: Duration = Duration::from_nanos(1);

/// A panel with the setup that it changes and a clock.
struct Hand {
    panel: Panel,
    setup: Setup,
    machine: Machine,
    running: bool,
    sensor: SensorSetup,
    now: Instant,
}

impl Hand {
    fn new(machine: Machine, setup: Setup) -> Self {
        let mut hand = Hand {
            panel: Panel::new(false),
            setup,
            machine,
            running: false,
            sensor: SensorSetup::default(),
            now: at(100.0),
        };
        hand.click(Knob::Left);
        assert!(hand.panel.confirmed());
        assert_eq!(hand.panel.page(), Page::Run);
        hand
    }

    fn with<T>(&mut self, act: impl FnOnce(&mut Panel, Instant, Bench<'_>) -> T) -> T {
        let advice = advise(&self.setup, &self.machine);
        let bench = Bench {
            setup: &mut self.setup,
            machine: &self.machine,
            advice: &advice,
            running: self.running,
            sensor: &mut self.sensor,
        };
        act(&mut self.panel, self.now, bench)
    }

    fn turn(&mut self, knob: Knob, detents: i8) {
        self.with(|panel, now, bench| panel.turn(now, knob, detents, bench));
    }
    fn press(&mut self, knob: Knob) {
        self.panel.press(self.now, knob);
    }
    fn release(&mut self, knob: Knob) -> Option<Wish> {
        self.with(|panel, now, bench| panel.release(now, knob, bench))
    }
    fn settle(&mut self) -> Option<Wish> {
        self.with(|panel, now, bench| panel.settle(now, bench))
    }
    fn click(&mut self, knob: Knob) {
        self.press(knob);
        self.now += Duration::from_millis(120);
        assert_eq!(self.release(knob), None);
    }
    /// Holds a knob until it counts, then lets go.
    fn hold(&mut self, knob: Knob) -> Option<Wish> {
        self.press(knob);
        self.now += HOLD;
        let wish = self.settle();
        self.now += Duration::from_secs(1);
        assert_eq!(self.release(knob), None);
        wish
    }
    fn notice(&self) -> Option<&str> {
        self.panel.notice().map(|n| n.text.as_str())
    }
}

fn lathe() -> Hand {
    Hand::new(machine("geared-lathe"), bar(25.0))
}

#[test]
fn on_the_run_page_the_left_knob_chooses_material_and_the_right_one_diameter() {
    let mut hand = lathe();
    let at = Material::ALL
        .iter()
        .position(|&m| m == Material::MildSteel)
        .unwrap();
    hand.turn(Knob::Left, 2);
    assert_eq!(hand.setup.material, Material::ALL[at + 2]);
    hand.turn(Knob::Left, -2);
    hand.turn(Knob::Right, 5);
    assert_eq!(hand.setup, bar(30.0));
    // Both lists stop at their ends.
    hand.turn(Knob::Left, i8::MIN);
    assert_eq!(hand.setup.material, Material::ALL[0]);
    hand.turn(Knob::Left, i8::MAX);
    assert_eq!(Some(&hand.setup.material), Material::ALL.last());
    for _ in 0..5 {
        hand.turn(Knob::Right, i8::MAX);
    }
    assert_eq!(hand.setup.diameter.mm(), Diameter::RANGE_MM.1);
    for _ in 0..5 {
        hand.turn(Knob::Right, i8::MIN);
    }
    assert_eq!(hand.setup.diameter.mm(), Diameter::RANGE_MM.0);
}

#[test]
fn left_opens_the_choose_page_right_the_why_page_and_a_press_goes_back() {
    let either = [Knob::Left, Knob::Right];
    for (knob, page, ways_back) in [
        (Knob::Left, Page::Choose(Field::Operation), &either[..]),
        (Knob::Right, Page::Why(0), &either[1..]),
    ] {
        for &back in ways_back {
            let mut hand = lathe();
            hand.click(knob);
            assert_eq!(hand.panel.page(), page);
            hand.click(back);
            assert_eq!(hand.panel.page(), Page::Run);
            assert_eq!(hand.setup, bar(25.0));
        }
    }
}

#[test]
fn on_the_why_page_turns_go_down_the_bounds_and_change_nothing() {
    let mut hand = lathe();
    hand.setup.tool = Tool::Carbide;
    hand.setup.cap = Some(rpm(2000.0));
    hand.setup.details.life = Some(Life::new("life", 120.0).unwrap());
    hand.setup.details.depth = Some(Length::from_mm(2.0).unwrap());
    let before = hand.setup;
    hand.click(Knob::Right);
    // Of seven bounds and the edge's account the first stands apart, five fit below it.
    let advice = advise(&hand.setup, &hand.machine);
    assert_eq!(advice.bounds.len(), 7);
    for (knob, detents, first) in [
        (Knob::Left, 1, 1),
        (Knob::Right, 1, 2),
        (Knob::Right, i8::MAX, 2),
        (Knob::Left, -1, 1),
        (Knob::Right, i8::MIN, 0),
    ] {
        hand.turn(knob, detents);
        assert_eq!(hand.panel.page(), Page::Why(first));
    }
    assert_eq!(hand.setup, before);
    // Holding the right knob here is for a new edge: the cap stays.
    assert_eq!(hand.hold(Knob::Right), Some(Wish::NewEdge));
    assert_eq!(hand.hold(Knob::Left), Some(Wish::Mute));
    assert_eq!(hand.setup, before);
    assert_eq!(hand.panel.page(), Page::Why(0));
}

#[test]
fn on_the_choose_page_the_left_knob_picks_a_field_and_the_right_one_its_value() {
    let mut hand = lathe();
    hand.click(Knob::Left);
    hand.turn(Knob::Right, 1);
    assert_eq!(hand.setup.operation, Operation::ALL[1]);
    hand.turn(Knob::Left, 1);
    assert_eq!(hand.panel.page(), Page::Choose(Field::Tool));
    hand.turn(Knob::Right, 2);
    assert_eq!(hand.setup.tool, Tool::ALL[2]);
    hand.turn(Knob::Left, 1);
    assert_eq!(hand.panel.page(), Page::Choose(Field::Holder));
    hand.turn(Knob::Right, 3);
    assert_eq!(hand.setup.holder, 3);
    hand.turn(Knob::Right, i8::MAX);
    let last = hand.machine.holders().len() - 1;
    assert_eq!(usize::from(hand.setup.holder), last);
    hand.turn(Knob::Left, 2);
    assert_eq!(hand.panel.page(), Page::Choose(Field::Coolant));
    hand.turn(Knob::Right, -1);
    assert_eq!(hand.setup.coolant, Coolant::Dry);
    hand.turn(Knob::Left, i8::MAX);
    assert_eq!(hand.panel.page(), Page::Choose(Field::Load));
    hand.turn(Knob::Right, 3);
    assert!(hand.setup.load);
    hand.turn(Knob::Right, 1);
    assert!(hand.setup.load, "the end stops");
    hand.turn(Knob::Right, -1);
    assert!(!hand.setup.load);
    hand.turn(Knob::Left, i8::MIN);
    assert_eq!(hand.panel.page(), Page::Choose(Field::Operation));
    // The page comes back with the field where it was.
    hand.turn(Knob::Left, 2);
    hand.click(Knob::Left);
    hand.click(Knob::Left);
    assert_eq!(hand.panel.page(), Page::Choose(Field::Holder));
    // Material and diameter were not touched.
    assert_eq!(hand.setup.material, Material::MildSteel);
    assert_eq!(hand.setup.diameter, bar(25.0).diameter);
}

#[test]
fn a_cap_begins_just_above_the_best_speed_and_is_taken_away_by_holding_the_right_knob() {
    let mut hand = lathe();
    hand.click(Knob::Left);
    hand.turn(Knob::Left, 3);
    assert_eq!(hand.panel.page(), Page::Choose(Field::Cap));
    hand.turn(Knob::Right, -1);
    // Best is 348.9 rpm; caps between 200 and 500 go in tens.
    assert_eq!(hand.setup.cap, Some(rpm(350.0)));
    hand.turn(Knob::Right, -2);
    assert_eq!(hand.setup.cap, Some(rpm(330.0)));
    hand.turn(Knob::Right, i8::MIN);
    assert_eq!(hand.setup.cap, Some(rpm(10.0)));
    assert_eq!(hand.hold(Knob::Right), None);
    assert_eq!(hand.setup.cap, None);
    // Neither page nor anything else was changed by the hold.
    assert_eq!(hand.panel.page(), Page::Choose(Field::Cap));
    assert_eq!(hand.setup, bar(25.0));
    // From the Run page too.
    hand.turn(Knob::Right, 1);
    hand.click(Knob::Left);
    assert!(hand.setup.cap.is_some());
    hand.hold(Knob::Right);
    assert_eq!((hand.setup.cap, hand.panel.page()), (None, Page::Run));
}

#[test]
fn an_unrated_holder_needs_a_cap_of_its_own_and_it_begins_slow() {
    let mut hand = lathe();
    let faceplate = hand.machine.holder_named("faceplate").unwrap() as i8;
    let pick = |hand: &Hand| advise(&hand.setup, &hand.machine).pick;
    // A cap typed for the three-jaw chuck,
    hand.click(Knob::Left);
    hand.turn(Knob::Left, 3);
    hand.turn(Knob::Right, 1);
    assert_eq!(hand.setup.cap, Some(rpm(350.0)));
    assert!(matches!(pick(&hand), Pick::Set(_)));
    // is none for the faceplate, though it still bounds the speed;
    hand.turn(Knob::Left, -1);
    hand.turn(Knob::Right, faceplate);
    assert_eq!(pick(&hand), Pick::NeedsCap);
    assert_eq!(hand.setup.cap, Some(rpm(350.0)));
    // and the one for the faceplate begins just above the slowest step, 18 rpm.
    hand.turn(Knob::Left, 1);
    hand.turn(Knob::Right, 1);
    assert_eq!(hand.setup.cap, Some(rpm(20.0)));
    assert!(matches!(pick(&hand), Pick::Set(s) if s.rpm == rpm(18.0)));
    // Back in a rated chuck nothing is asked for, and the cap stands.
    hand.turn(Knob::Left, -1);
    hand.turn(Knob::Right, -faceplate);
    assert!(matches!(pick(&hand), Pick::Set(_)));
    assert_eq!(hand.setup.cap, Some(rpm(20.0)));
}

#[test]
fn the_first_detent_sets_the_mark_above_the_best_speed_and_the_others_go_on_from_there() {
    for mm in [9.0, 25.0, 33.0, 120.0, 700.0] {
        let capped = |turns: &[i8]| {
            let mut hand = Hand::new(machine("geared-lathe"), bar(mm));
            hand.click(Knob::Left);
            hand.turn(Knob::Left, 3);
            turns.iter().for_each(|&n| hand.turn(Knob::Right, n));
            hand.setup.cap.unwrap().get()
        };
        let best = advise(&bar(mm), &machine("geared-lathe"))
            .window
            .best()
            .get();
        let first = capped(&[1]);
        assert!(
            first > best && first <= 1.06 * best + 10.0,
            "{mm} mm: {first}, best {best}"
        );
        assert_eq!(capped(&[-1]), first);
        // One quick turn of the knob is as many detents as slow ones.
        assert_eq!(capped(&[12]), capped(&[1, 11]));
        assert_eq!(capped(&[-3]), capped(&[-1, -2]));
    }
}

#[test]
fn a_hold_begins_after_its_time_and_a_shorter_press_is_a_press() {
    let mut hand = lathe();
    hand.press(Knob::Left);
    hand.now = hand.now + HOLD - JUST;
    assert_eq!(hand.settle(), None);
    assert_eq!(hand.release(Knob::Left), None);
    assert_eq!(hand.panel.page(), Page::Choose(Field::Operation));
    hand.click(Knob::Left);
    // The box asks to be woken exactly when the hold begins.
    hand.press(Knob::Left);
    let due = hand.now + HOLD;
    assert_eq!(hand.panel.next_change(), Some(due));
    hand.now = due;
    assert_eq!(hand.settle(), Some(Wish::Mute));
    assert_eq!(hand.settle(), None, "once");
    assert_eq!(hand.panel.next_change(), None);
    hand.now += Duration::from_secs(5);
    assert_eq!(hand.release(Knob::Left), None);
    assert_eq!(
        hand.panel.page(),
        Page::Run,
        "the release of a hold means nothing"
    );
    // Late polling loses no hold.
    hand.press(Knob::Left);
    hand.now += Duration::from_secs(3);
    assert_eq!(hand.release(Knob::Left), Some(Wish::Mute));
    assert_eq!(hand.panel.page(), Page::Run);
}

#[test]
fn the_two_knobs_do_not_disturb_one_another() {
    let mut hand = lathe();
    hand.setup.cap = Some(rpm(200.0));
    hand.press(Knob::Left);
    hand.now += Duration::from_millis(500);
    hand.press(Knob::Right);
    hand.now += Duration::from_millis(300);
    assert_eq!(hand.settle(), Some(Wish::Mute), "the left one is held");
    assert!(hand.setup.cap.is_some(), "the right one not yet");
    hand.now += Duration::from_millis(100);
    hand.release(Knob::Right);
    assert_eq!(hand.panel.page(), Page::Why(0));
    assert!(hand.setup.cap.is_some());
    hand.release(Knob::Left);
    assert_eq!(hand.panel.page(), Page::Why(0));
}

#[test]
fn a_change_while_the_spindle_runs_is_shown_for_three_seconds() {
    let mut hand = lathe();
    hand.turn(Knob::Right, 1);
    assert_eq!(hand.notice(), None, "at rest there is nothing to announce");
    hand.turn(Knob::Right, -1);
    hand.running = true;
    // Turns that follow one another are one change.
    for _ in 0..5 {
        hand.now += Duration::from_millis(200);
        hand.turn(Knob::Right, 1);
    }
    assert_eq!(hand.notice(), Some("was 25, now 30 mm"));
    let end = hand.now + NOTICE;
    assert_eq!(NOTICE, Duration::from_secs(3));
    assert_eq!(hand.panel.next_change(), Some(end));
    hand.now = end - JUST;
    hand.settle();
    assert_eq!(hand.notice(), Some("was 25, now 30 mm"));
    hand.now = end;
    hand.settle();
    assert_eq!((hand.notice(), hand.panel.next_change()), (None, None));
}

#[test]
fn a_change_after_the_notice_starts_from_what_it_is_now() {
    let mut hand = lathe();
    hand.running = true;
    hand.turn(Knob::Right, 5);
    assert_eq!(hand.notice(), Some("was 25, now 30 mm"));
    // Nothing was polled in between: the old notice is over all the same.
    hand.now += Duration::from_secs(60);
    hand.turn(Knob::Right, 1);
    assert_eq!(hand.notice(), Some("was 30, now 31 mm"));
}

#[test]
fn a_change_that_is_taken_back_is_no_change() {
    let mut hand = lathe();
    hand.running = true;
    hand.turn(Knob::Right, 5);
    hand.turn(Knob::Right, -5);
    assert_eq!(hand.setup, bar(25.0));
    assert_eq!(hand.notice(), None);
}

#[test]
fn every_field_announces_itself_in_its_own_words() {
    let mut hand = lathe();
    hand.running = true;
    hand.turn(Knob::Left, 1);
    let (was, now) = (Material::MildSteel.label(), hand.setup.material.label());
    assert_eq!(
        hand.notice(),
        Some(format!("was {was}, now {now}").as_str())
    );
    hand.turn(Knob::Right, 1);
    assert_eq!(hand.notice(), Some("was 25, now 26 mm"));
    hand.click(Knob::Left);
    hand.turn(Knob::Right, 4);
    assert_eq!(hand.notice(), Some("was Rough turn, now Drilling"));
    hand.turn(Knob::Left, 2);
    hand.turn(Knob::Right, 1);
    assert_eq!(
        hand.notice(),
        Some("was three-jaw chuck, now four-jaw chuck")
    );
    hand.turn(Knob::Left, 1);
    hand.turn(Knob::Right, 1);
    let cap = hand.setup.cap.unwrap();
    assert_eq!(hand.notice(), Some(format!("was none, now {cap}").as_str()));
    hand.hold(Knob::Right);
    assert_eq!(hand.notice(), None, "it was none and is none again");
    let was = cap.get();
    hand.setup.cap = Some(cap);
    hand.now += NOTICE;
    hand.hold(Knob::Right);
    assert_eq!(hand.notice(), Some(format!("was {was}, now none").as_str()));
}

#[test]
fn no_notice_is_cut_however_long_its_words() {
    for machine in rimrate_tests::machines() {
        let mut hand = Hand::new(machine, bar(25.0));
        hand.running = true;
        let check = |hand: &mut Hand, knob| {
            for by in [-60, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 60, -60] {
                hand.turn(knob, by);
                if let Some(text) = hand.notice() {
                    assert!(!text.contains('~'), "{text}");
                    assert!(
                        text.starts_with("was ") && text.contains(", now "),
                        "{text}"
                    );
                }
                hand.now += Duration::from_secs(4);
                hand.settle();
            }
        };
        check(&mut hand, Knob::Left);
        check(&mut hand, Knob::Right);
        hand.click(Knob::Left);
        for _ in Field::CHOOSE {
            check(&mut hand, Knob::Right);
            hand.turn(Knob::Left, 1);
        }
    }
}

#[test]
fn nothing_but_a_press_confirms_a_remembered_setup_and_the_first_does_nothing_else() {
    for knob in [Knob::Left, Knob::Right] {
        let fresh = || Hand {
            panel: Panel::new(false),
            setup: Setup {
                cap: Some(rpm(200.0)),
                ..bar(25.0)
            },
            machine: machine("geared-lathe"),
            running: false,
            sensor: SensorSetup::default(),
            now: at(1.0),
        };
        let mut hand = fresh();
        hand.turn(knob, 1);
        hand.now += Duration::from_secs(3600);
        hand.settle();
        assert!(!hand.panel.confirmed());
        let turned = hand.setup;
        hand.press(knob);
        assert!(!hand.panel.confirmed(), "on the release");
        hand.now += Duration::from_millis(100);
        assert_eq!(hand.release(knob), None);
        assert!(hand.panel.confirmed());
        assert_eq!((hand.panel.page(), hand.setup), (Page::Run, turned));

        let mut hand = fresh();
        assert_eq!(hand.hold(knob), None, "no mute, no cap taken away");
        assert!(hand.panel.confirmed());
        assert_eq!(hand.setup.cap, Some(rpm(200.0)));
        assert_eq!(hand.panel.page(), Page::Run);
        assert_eq!(hand.hold(knob), (knob == Knob::Left).then_some(Wish::Mute));
    }
}

/// Turns the diameter's knob detent by detent and gives every value, in mm.
fn scale(hand: &mut Hand, detents: i8) -> Vec<f32> {
    let mut seen = vec![hand.setup.diameter.mm()];
    loop {
        hand.turn(Knob::Right, detents);
        let mm = hand.setup.diameter.mm();
        if seen.last() == Some(&mm) {
            return seen;
        }
        seen.push(mm);
    }
}

/// Where a scale goes from one step to the next coarser one, and the step above.
fn assert_scale(seen: &[f32], unit: f32, steps: &[(f32, f32)]) {
    for pair in seen.windows(2) {
        let (a, b) = (pair[0] / unit, pair[1] / unit);
        let step = steps
            .iter()
            .rev()
            .find(|(from, _)| a >= from - 1e-3)
            .unwrap()
            .1;
        let want = ((a / step + 1e-2).floor() + 1.0) * step;
        assert!((b - want).abs() < 1e-3 * want, "{a} to {b}, not {want}");
    }
}

#[test]
fn the_diameter_scale_of_a_metric_machine() {
    let mut hand = Hand::new(machine("geared-lathe"), bar(0.1));
    let up = scale(&mut hand, 1);
    let steps = [
        (0.0, 0.1),
        (3.0, 0.5),
        (13.0, 1.0),
        (50.0, 5.0),
        (200.0, 10.0),
        (500.0, 50.0),
    ];
    assert_scale(&up, 1.0, &steps);
    assert_eq!(up.last(), Some(&2000.0));
    // From end to end within a few turns of a knob with 24 detents.
    assert!(up.len() < 200, "{}", up.len());
    let mut down = scale(&mut hand, -1);
    down.reverse();
    assert_eq!(down.len(), up.len());
    assert!(
        up.iter()
            .zip(&down)
            .all(|(a, b)| (a / b - 1.0).abs() < 1e-5)
    );
    // From between two marks to the next one either way.
    for (detents, want) in [(1, 26.0), (-1, 25.0), (2, 27.0)] {
        let mut hand = Hand::new(machine("geared-lathe"), bar(25.4));
        hand.turn(Knob::Right, detents);
        assert_eq!(hand.setup.diameter.mm(), want);
    }
}

#[test]
fn the_diameter_scale_of_an_inch_machine() {
    let press = machine("drill-press");
    let mut hand = Hand::new(press, bar(25.4 / 64.0));
    let up = scale(&mut hand, 1);
    let steps = [
        (0.0, 1.0 / 64.0),
        (0.5, 1.0 / 16.0),
        (2.0, 0.125),
        (4.0, 0.25),
        (8.0, 0.5),
        (20.0, 2.0),
    ];
    // The last step ends at the largest diameter, 2000 mm, which is no mark.
    assert_scale(&up[..up.len() - 1], 25.4, &steps);
    assert_eq!(up.last(), Some(&2000.0));
    for inch in [0.125_f32, 0.25, 0.375, 0.5, 0.75, 1.0, 1.5, 2.0, 3.0] {
        let mm = inch * 25.4;
        assert!(
            up.iter().any(|d| (d / mm - 1.0).abs() < 1e-5),
            "{inch} in is on the scale"
        );
    }
    hand.setup.diameter = Diameter::parse("1/2 in").unwrap();
    hand.running = true;
    hand.turn(Knob::Right, 1);
    assert_eq!(hand.notice(), Some("was 0.5, now 0.5625 in"));
}

#[test]
fn any_cap_that_the_knob_sets_is_a_cap() {
    for machine in rimrate_tests::machines() {
        let fastest = match machine.drive() {
            Drive::Stepped(steps) => steps.last().unwrap().rpm,
            Drive::Variable(ranges) => ranges.last().unwrap().high,
        };
        let mut hand = Hand::new(machine, bar(25.0));
        hand.click(Knob::Left);
        hand.turn(Knob::Left, 3);
        let mut before = Rpm::ZERO;
        hand.turn(Knob::Right, i8::MIN);
        hand.turn(Knob::Right, i8::MIN);
        while hand.setup.cap != Some(before) {
            before = hand.setup.cap.unwrap();
            rimrate_core::setup::cap(before).unwrap();
            hand.turn(Knob::Right, 1);
            assert!(hand.setup.cap.unwrap() >= before);
        }
        assert!(before > fastest, "every speed of the machine can be capped");
    }
}

#[test]
fn the_sensor_page_lies_behind_the_why_page() {
    let mut hand = lathe();
    hand.click(Knob::Right);
    hand.click(Knob::Left);
    assert_eq!((hand.panel.page(), hand.setup), (Page::Sensor, bar(25.0)));
    for knob in [Knob::Left, Knob::Right] {
        hand.click(knob);
        assert_eq!(hand.panel.page(), Page::Run);
        hand.click(Knob::Right);
        hand.click(Knob::Left);
    }
}
