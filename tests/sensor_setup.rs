//! Finding the pulses in a revolution: the maths of both ways, hands that turn a spindle past a simulated sensor, and the
//! whole box through the flow. That a spindle turns at -2 % to +6 % of its plate is ISO 229's (from memory); ten turns by
//! hand, and what is allowed there, is common practice, no source.

#[path = "sensor_setup/mistakes.rs"]
mod mistakes;

use proptest::prelude::*;
use rimrate_core::instrument::Event;
use rimrate_core::machine::MAX_PULSES;
use rimrate_core::panel::{Knob, Page};
use rimrate_core::sensor_setup::{
    CLEAR, Fit, Hand, Miscount, Passages, counted, fit, of_ten_turns,
};
use rimrate_core::setup::{Pulses, Setup};
use rimrate_core::tacho::Signal;
use rimrate_core::time::{Duration, Edge, Instant};
use rimrate_core::verdict::Verdict;
use rimrate_sim::frame::Frame;
use rimrate_sim::random::Random;
use rimrate_sim::sensor::profile::{Piece, Profile};
use rimrate_sim::sensor::{Fault, Sensor, SensorSpec};
use rimrate_tests::{Clocked, Spindle, at, bar, machine, rpm};

fn pulses(n: u32) -> Pulses {
    Pulses::new(n as u16).unwrap()
}

#[test]
fn a_number_of_pulses_is_refused_with_field_value_and_range() {
    assert_eq!(Pulses::new(1).unwrap().get().get(), 1);
    assert_eq!(Pulses::new(MAX_PULSES).unwrap().get().get(), 240);
    for n in [0, MAX_PULSES + 1, u16::MAX] {
        let refused = Pulses::new(n).unwrap_err().to_string();
        let want = format!("pulses: `{n}` is out of range; allowed: 1 to 240 in a revolution");
        assert_eq!(refused, want);
    }
}

/// Every count of passages that anybody can come to: within one of ten times a whole number from 1 to 240 it is that number,
/// and nothing else is.
#[test]
fn ten_turns_are_ten_times_a_whole_number_but_for_one() {
    for n in 1..=u32::from(MAX_PULSES) {
        for passages in 10 * n - 1..=10 * n + 1 {
            assert_eq!(of_ten_turns(passages), Ok(pulses(n)), "{passages}");
        }
        for passages in 10 * n + 2..10 * n + 9 {
            let want = if n == 240 {
                Miscount::TooMany
            } else {
                Miscount::Between(10 * n, 10 * n + 10)
            };
            assert_eq!(of_ten_turns(passages), Err(want), "{passages}");
        }
    }
    assert_eq!(of_ten_turns(0), Err(Miscount::Nothing));
    for passages in 1..9 {
        assert_eq!(of_ten_turns(passages), Err(Miscount::Between(0, 10)));
    }
    for passages in [2409, 2410, 2411, u32::MAX - 5, u32::MAX] {
        assert_eq!(of_ten_turns(passages), Err(Miscount::TooMany));
    }
}

/// A hand that turns a chuck ten whole turns: pulls of uneven length and speed, from rest to rest, with pauses of any length
/// at any place, and where the sensor chatters, each edge in up to seven pieces.
fn turned_by_hand(magnets: u32, chatter: bool, seed: u64) -> (Vec<Edge>, Instant) {
    let mut chance = Random::new(seed, 0x7475_726e);
    let ideal = SensorSpec::ideal(magnets);
    let spec = SensorSpec {
        jitter_ns: 2_000.0,
        hysteresis: 0.05 * ideal.width,
        chatter_zone: 0.5f64.min(ideal.width / 10.0),
        ..ideal
    };
    let mut sensor = Sensor::new(spec, seed);
    sensor.set(Fault::Chatter, chatter);
    let mut spindle = Profile::new(chance.uniform());
    let end = spindle.angle + 10.0;
    let slow = chance.chance(0.5);
    let mut edges = Vec::new();
    let mut run = |spindle: &mut Profile, secs, from_rpm, to_rpm| {
        let piece = Piece {
            secs,
            from_rpm,
            to_rpm,
        };
        spindle.run(&piece, &mut sensor, &mut |edge| edges.push(edge));
    };
    run(&mut spindle, 1.0, 0.0, 0.0);
    while spindle.angle < end - 1e-6 {
        let turn = chance.between(0.15, 0.5).min(end - spindle.angle);
        let fastest = if slow {
            chance.between(4.0, 40.0)
        } else {
            chance.between(20.0, 70.0)
        };
        let half = turn / (fastest / 60.0);
        run(&mut spindle, half, 0.0, fastest);
        run(&mut spindle, half, fastest, 0.0);
        run(&mut spindle, chance.between(0.1, 2.0), 0.0, 0.0);
    }
    (edges, spindle.now)
}

/// What a hand came to.
fn found(magnets: u32, chatter: bool, seed: u64) -> (u32, Result<Pulses, Miscount>) {
    let (edges, end) = turned_by_hand(magnets, chatter, seed);
    let mut passages = Passages::new(Instant::ZERO);
    edges.iter().for_each(|&edge| passages.push(edge));
    counted(&passages, end)
}

/// Hands come to the right number, and never to a wrong one, without chatter and with it. Where the teeth are fine and the
/// sensor chatters nothing is said.
#[test]
fn hands_that_pull_and_rest_come_to_the_right_number_and_never_to_another() {
    for (magnets, chatter, share) in [
        (1, false, 1.0),
        (2, false, 1.0),
        (3, false, 1.0),
        (6, false, 1.0),
        (12, false, 0.99),
        (60, false, 0.95),
        (240, false, 0.85),
        (1, true, 1.0),
        (2, true, 1.0),
        (3, true, 1.0),
        (6, true, 0.99),
        (12, true, 0.97),
        (24, true, 0.9),
        (60, true, 0.0),
        (240, true, 0.0),
    ] {
        let all = 400;
        let mut right = 0;
        for seed in 0..all {
            let (count, found) = found(magnets, chatter, seed);
            match found {
                Ok(found) => {
                    assert_eq!(
                        found,
                        pulses(magnets),
                        "hand {seed}, chatter {chatter}: {count}"
                    );
                    right += 1;
                }
                Err(Miscount::Chatter) => assert!(chatter && magnets > 24),
                Err(Miscount::Between(..) | Miscount::TooMany) => {}
                Err(Miscount::Nothing) => panic!("hand {seed} passed {magnets} magnets"),
            }
        }
        assert!(
            right == 0 || !chatter || magnets <= 24,
            "{magnets} fine teeth"
        );
        let right = right as f64 / all as f64;
        assert!(
            right >= share,
            "{magnets} magnets, chatter {chatter}: {right}"
        );
    }
}

/// Every number of magnets once, a magnet near the mark counted once more or once less.
#[test]
fn every_number_of_magnets_is_counted_by_hand() {
    let mut right = 0;
    for magnets in 1..=u32::from(MAX_PULSES) {
        match found(magnets, false, u64::from(magnets)).1 {
            Ok(found) => {
                assert_eq!(found, pulses(magnets));
                right += 1;
            }
            Err(why) => assert_ne!(why, Miscount::Nothing),
        }
    }
    assert!(right >= 220, "{right} of 240");
}

/// The slowest of hands: a tenth of a turn a minute, far below what the tacho reads.
#[test]
fn a_passage_counts_at_any_speed() {
    let mut passages = Passages::new(Instant::ZERO);
    let spacing = 300.0;
    for i in 0..20 {
        let fall = 1.0 + spacing * f64::from(i);
        passages.push(Edge::fall(at(fall)));
        assert_eq!(passages.count(at(fall + 10.0)), i, "under way");
        passages.push(Edge::rise(at(fall + 20.0)));
        assert_eq!(passages.count(at(fall + 21.0)), i + 1);
    }
}

/// A magnet that stands at the sensor at the start and at the end is one passage, not two and not none.
#[test]
fn a_magnet_at_the_mark_counts_once() {
    let mut passages = Passages::new(at(0.0));
    passages.push(Edge::rise(at(0.5)));
    for i in 1..10 {
        passages.push(Edge::fall(at(f64::from(i))));
        passages.push(Edge::rise(at(f64::from(i) + 0.1)));
    }
    passages.push(Edge::fall(at(10.0)));
    assert_eq!(passages.count(at(20.0)), 10);
}

proptest! {
    /// Whatever the line does, nothing is counted that is no low, and nothing panics.
    #[test]
    fn no_more_passages_than_lows(gaps in prop::collection::vec((0_u64..3_000_000_000, any::<bool>()), 0..200)) {
        let mut passages = Passages::new(Instant::ZERO);
        let (mut now, mut lows, mut low) = (0, 0, None);
        for (gap, falls) in gaps {
            now += gap;
            let time = Instant::from_nanos(now);
            passages.push(if falls { Edge::fall(time) } else { Edge::rise(time) });
            if low != Some(falls) {
                lows += u32::from(!falls);
                low = Some(falls);
            }
            prop_assert!(passages.count(time) <= lows);
        }
    }

    /// Where the plate says one number alone it is the true one, and up to nine pulses it says so anywhere from 2 % below the
    /// plate to 6 % above it.
    #[test]
    fn a_plate_never_means_a_wrong_number(
        n in 1_u32..=240,
        plate in 10.0_f32..6000.0,
        off in 0.98_f32..=1.06,
        share in 0.0_f32..0.01,
        error in -1.0_f32..=1.0,
    ) {
        let rate = n as f32 * plate * off / 60.0 * (1.0 + 0.99 * error * share);
        match fit(rate, share, rpm(plate)) {
            Fit::One(found) => prop_assert_eq!(found, pulses(n)),
            Fit::Several(from, to) => {
                prop_assert!(n > CLEAR, "{} a turn is clear", n);
                prop_assert!((from..=to).contains(&n));
            }
            Fit::Nothing(_) => prop_assert!(false, "{} a turn fits", n),
        }
    }
}

/// Both ends of what a loaded spindle does to its plate, for every number: up to nine it is clear, from 26 on at least two
/// numbers fit wherever in the band the spindle turns, for the band is 8 % wide.
#[test]
fn the_ends_of_the_band_and_what_is_ambiguous() {
    for n in 1..=u32::from(MAX_PULSES) {
        for off in [0.98, 1.0, 1.06] {
            let rate = n as f32 * 280.0 / 60.0 * off;
            match fit(rate, 1e-4, rpm(280.0)) {
                Fit::One(found) => {
                    assert_eq!(found, pulses(n));
                    assert!(n <= CLEAR, "{n} a turn cannot be told from {}", n + 1);
                }
                Fit::Several(from, to) => {
                    assert!(n > CLEAR && (from..=to).contains(&n), "{n} at {off}");
                    // No sensor gives more than 240.
                    let last = u32::from(MAX_PULSES);
                    assert!(from < to || n < 26 || to == last, "{n} at {off}");
                }
                Fit::Nothing(x) => panic!("{n} at {off}: {x}"),
            }
        }
    }
    // Outside of the band: half way between two numbers, a stop, and more than any sensor gives.
    for (a_turn, want) in [
        (1.5, 1.5),
        (2.5, 2.5),
        (3.4, 3.4),
        (0.5, 0.5),
        (0.0, 0.0),
        (300.0, 300.0),
    ] {
        let Fit::Nothing(x) = fit(a_turn * 280.0 / 60.0, 1e-4, rpm(280.0)) else {
            panic!("{a_turn} a turn is no number of pulses");
        };
        assert!((x - want).abs() < 1e-3);
    }
    // The rule is the band's: 6 % above the plate is one pulse, 7 % is none.
    assert_eq!(fit(1.06, 1e-4, rpm(60.0)), Fit::One(pulses(1)));
    assert!(matches!(fit(1.07, 1e-4, rpm(60.0)), Fit::Nothing(_)));
    assert_eq!(fit(0.98, 1e-4, rpm(60.0)), Fit::One(pulses(1)));
    assert!(matches!(fit(0.97, 1e-4, rpm(60.0)), Fit::Nothing(_)));
}

fn click(clocked: &mut Clocked, knob: Knob) {
    clocked.event(Event::Press(knob));
    clocked.rest(0.1);
    clocked.event(Event::Release(knob));
}

fn turn(clocked: &mut Clocked, knob: Knob, detents: i8) {
    clocked.event(Event::Turn(knob, detents));
}

/// A confirmed box on the geared lathe, whose profile says two pulses, on the page of the ten turns.
fn at_ten_turns(setup: Setup) -> Clocked {
    let mut clocked = Clocked::new(machine("geared-lathe"), Some(setup));
    for knob in [Knob::Left, Knob::Right, Knob::Left] {
        click(&mut clocked, knob);
    }
    turn(&mut clocked, Knob::Right, 1);
    assert_eq!(clocked.instrument.view().page, Page::TenTurns);
    clocked
}

/// Ten turns by hand past so many magnets.
fn count(clocked: &mut Clocked, magnets: u32) {
    count_as(clocked, magnets, 3);
}

/// The same by one of many hands.
fn count_as(clocked: &mut Clocked, magnets: u32, seed: u64) {
    click(clocked, Knob::Right);
    let start = clocked.now;
    let (edges, end) = turned_by_hand(magnets, false, seed);
    let edges: Vec<Edge> = edges
        .iter()
        .map(|edge| Edge {
            at: start + edge.at.since(Instant::ZERO),
            ..*edge
        })
        .collect();
    clocked.run(&edges, end.nanos() as f64 / 1e9);
    click(clocked, Knob::Right);
}

/// Lets a spindle with so many magnets turn.
fn spin(clocked: &mut Clocked, rpm: f64, magnets: u32, seconds: f64) {
    let from = clocked.now.nanos() as f64 / 1e9;
    let spindle = Spindle {
        pulses: magnets,
        ..Spindle::new(rpm)
    };
    let edges = spindle.edges(from, from + seconds);
    clocked.run(&edges, seconds);
}

fn shows(clocked: &Clocked, words: &str) {
    let mut frame = Frame::new();
    let Ok(()) = clocked.instrument.draw(&mut frame);
    assert!(frame.shows(words), "no `{words}` in\n{}", frame.to_text());
}

fn read(clocked: &Clocked) -> f32 {
    clocked.instrument.view().reading.speed.unwrap().get()
}

#[test]
fn ten_turns_by_hand_put_a_wrong_profile_right_and_outlive_a_power_cycle() {
    let mut clocked = at_ten_turns(bar(25.0));
    shows(&clocked, "CAUTION: lock out the supply, or");
    shows(&clocked, "motor off, out of gear. Key out.");
    shows(&clocked, "press right: start");
    count(&mut clocked, 3);
    let sensor = clocked.instrument.view().sensor_setup;
    assert!(matches!(sensor.hand(), Hand::Counted(29..=31, Ok(n)) if *n == pulses(3)));
    shows(&clocked, "3 a turn, in use 2");
    shows(&clocked, "press right: use 3");
    // Nothing has changed yet, and nothing is saved.
    assert_eq!(*clocked.instrument.view().setup, bar(25.0));
    clocked.rest(10.0);
    assert_eq!(clocked.saved(), []);
    click(&mut clocked, Knob::Right);
    let taken = clocked.now;
    let counted = Setup {
        pulses: Some(pulses(3)),
        ..bar(25.0)
    };
    assert_eq!(*clocked.instrument.view().setup, counted);
    assert_eq!(clocked.instrument.view().page, Page::Sensor);
    shows(&clocked, "3 a turn");
    shows(&clocked, "profile says 2");
    clocked.rest(20.0);
    assert_eq!(clocked.saved(), [(taken + Duration::from_secs(2), counted)]);
    // The right speed, now and after the box was off.
    spin(&mut clocked, 280.0, 3, 5.0);
    assert!((read(&clocked) / 280.0 - 1.0).abs() < 1e-3);
    clocked.power_cycle(machine("geared-lathe"), None);
    assert_eq!(clocked.instrument.view().sensor.pulses.get(), 3);
    click(&mut clocked, Knob::Left);
    spin(&mut clocked, 280.0, 3, 5.0);
    assert!((read(&clocked) / 280.0 - 1.0).abs() < 1e-3);
    assert_eq!(clocked.instrument.view().verdict, Verdict::Right);
}

#[test]
fn what_was_learned_with_another_number_is_forgotten_and_nothing_is_green_meanwhile() {
    let mut clocked = at_ten_turns(bar(25.0));
    turn(&mut clocked, Knob::Left, 1);
    spin(&mut clocked, 280.0, 3, 8.0);
    assert!(
        (read(&clocked) / 420.0 - 1.0).abs() < 1e-3,
        "by the wrong profile"
    );
    // A-1, back gear out, is the seventh step. Two pulses and the step of 450, slowed, would give the same, so ten turns decide.
    turn(&mut clocked, Knob::Right, 7);
    assert_eq!(
        clocked.instrument.view().sensor_setup.plate(),
        Some(rpm(280.0))
    );
    spin(&mut clocked, 280.0, 3, 0.5);
    shows(&clocked, "14 pulses/s: 3 a turn");
    shows(&clocked, "3 a turn, in use 2");
    shows(&clocked, "or is it step 450 rpm?");
    click(&mut clocked, Knob::Right);
    assert_eq!(*clocked.instrument.view().setup, bar(25.0));
    clocked.rest(20.0);
    turn(&mut clocked, Knob::Left, -1);
    count(&mut clocked, 3);
    turn(&mut clocked, Knob::Left, 1);
    spin(&mut clocked, 280.0, 3, 8.0);
    shows(&clocked, "press right: use 3");
    let polls = clocked.polls.len();
    click(&mut clocked, Knob::Right);
    let view = clocked.instrument.view();
    assert_eq!(view.setup.pulses, Some(pulses(3)));
    assert_eq!(view.reading.signal, Signal::Lost, "it turned");
    assert_eq!((view.sensor.placement, view.sensor.counted), (None, 0));
    spin(&mut clocked, 280.0, 3, 6.0);
    assert!((read(&clocked) / 280.0 - 1.0).abs() < 1e-3);
    let green = clocked.polls[polls..]
        .iter()
        .position(|(_, p)| p.outputs.right);
    assert!(green.is_some_and(|at| at > 1), "{green:?}");
}

#[test]
fn timing_only_confirms_and_a_contradiction_is_told_with_both_numbers() {
    let mut clocked = at_ten_turns(bar(25.0));
    count(&mut clocked, 3);
    shows(&clocked, "not confirmed by plate");
    turn(&mut clocked, Knob::Left, 1);
    spin(&mut clocked, 280.0, 3, 8.0);
    turn(&mut clocked, Knob::Right, 7);
    spin(&mut clocked, 280.0, 3, 1.0);
    turn(&mut clocked, Knob::Left, -1);
    shows(&clocked, "by plate 3: agrees");
    shows(&clocked, "press right: use 3");
    // One magnet comes off after the count: neither number is taken over, on neither page, until one of both is found anew.
    turn(&mut clocked, Knob::Left, 1);
    spin(&mut clocked, 280.0, 2, 8.0);
    shows(&clocked, "by hand 3 a turn, but");
    shows(&clocked, "by plate 2");
    click(&mut clocked, Knob::Right);
    assert_eq!(clocked.instrument.view().page, Page::PlateSpeed);
    turn(&mut clocked, Knob::Left, -1);
    shows(&clocked, "by hand 3 a turn, but");
    shows(&clocked, "by plate 2");
    shows(&clocked, "press right: count again");
    count(&mut clocked, 2);
    assert_eq!(*clocked.instrument.view().setup, bar(25.0));
    shows(&clocked, "2 a turn, as in use");
    shows(&clocked, "by plate 2: agrees");
}

#[test]
fn a_plate_that_explains_nothing_or_several_numbers_offers_nothing() {
    for (magnets, spindle, words) in [
        (20, 280.0, "19 to 20: count by hand"),
        (2, 220.0, "no whole number: which step?"),
    ] {
        let mut clocked = at_ten_turns(bar(25.0));
        turn(&mut clocked, Knob::Left, 1);
        turn(&mut clocked, Knob::Right, 7);
        shows(&clocked, "not steady yet: 0 of 40");
        spin(&mut clocked, spindle, magnets, 8.0);
        shows(&clocked, words);
        click(&mut clocked, Knob::Right);
        let view = clocked.instrument.view();
        assert_eq!((view.page, *view.setup), (Page::PlateSpeed, bar(25.0)));
    }
}

/// Speeds that change are never timed: run-up to any step, with any number of magnets, and a press whenever something is
/// offered. What is taken over is the true number.
#[test]
fn a_spindle_that_is_not_steady_yet_is_not_timed() {
    let mut offered = 0;
    for magnets in 1..=20_u32 {
        for (detents, plate) in [(2_i8, 28.0), (5, 112.0), (7, 280.0), (10, 1120.0)] {
            for secs in [0.5, 3.0, 20.0] {
                let mut clocked = at_ten_turns(bar(25.0));
                turn(&mut clocked, Knob::Left, 1);
                turn(&mut clocked, Knob::Right, detents);
                let mut sensor = Sensor::new(SensorSpec::ideal(magnets), 1);
                let mut spindle = Profile::new(0.3);
                spindle.now = clocked.now;
                let mut edges = Vec::new();
                // Towards the speed as a motor comes up to it, ever slower, and then on at it.
                let mut from = 0.0;
                for i in 1..=40 {
                    let to = plate * (1.0 - (-f64::from(i) / 8.0).exp());
                    let piece = Piece {
                        secs: secs / 40.0,
                        from_rpm: from,
                        to_rpm: to,
                    };
                    spindle.run(&piece, &mut sensor, &mut |edge| edges.push(edge));
                    from = to;
                }
                spindle.run(&Piece::steady(plate, 8.0), &mut sensor, &mut |edge| {
                    edges.push(edge)
                });
                for edges in edges.chunks(8) {
                    let until = edges[edges.len() - 1].at.since(clocked.now);
                    clocked.run(edges, until.nanos() as f64 / 1e9);
                    match clocked.instrument.view().sensor_setup.fit() {
                        Some(Fit::One(found)) => {
                            assert_eq!(found, pulses(magnets), "{plate} rpm, up in {secs} s");
                            offered += 1;
                        }
                        Some(Fit::Several(..) | Fit::Nothing(_)) | None => {}
                    }
                }
            }
        }
    }
    assert!(offered > 1000, "{offered}");
}

#[test]
fn lost_edges_spoil_a_count_by_hand() {
    let mut clocked = at_ten_turns(bar(25.0));
    click(&mut clocked, Knob::Right);
    spin(&mut clocked, 30.0, 3, 2.0);
    clocked.event(Event::CaptureLost);
    spin(&mut clocked, 30.0, 3, 2.0);
    assert_eq!(*clocked.instrument.view().sensor_setup.hand(), Hand::Lost);
    shows(&clocked, "Pulses were lost while");
    click(&mut clocked, Knob::Right);
    assert!(matches!(
        clocked.instrument.view().sensor_setup.hand(),
        Hand::Counting(_)
    ));
    // Edges that the board held back are as good as lost.
    spin(&mut clocked, 30.0, 3, 2.0);
    clocked.instrument.edges_withheld();
    clocked.rest(0.5);
    assert_eq!(*clocked.instrument.view().sensor_setup.hand(), Hand::Lost);
}

/// A number that was taken over, and then a steady speed that no step of the profile explains: doubtful, never green, and the
/// Sensor page tells both numbers.
#[test]
fn a_speed_that_no_step_explains_contradicts_the_number_on_the_sensor_page() {
    let mut clocked = at_ten_turns(Setup {
        pulses: Some(pulses(3)),
        ..bar(15.0)
    });
    turn(&mut clocked, Knob::Left, -1);
    assert_eq!(clocked.instrument.view().page, Page::Sensor);
    // 345 rpm is more than 6 % above the step of 280 and more than 15 % below that of 450.
    let polls = clocked.polls.len();
    spin(&mut clocked, 345.0, 3, 6.0);
    let view = clocked.instrument.view();
    assert_eq!(
        (view.reading.signal, view.verdict),
        (Signal::Doubtful, Verdict::Doubtful)
    );
    shows(&clocked, "3 a turn");
    shows(&clocked, "profile says 2");
    shows(&clocked, "17.3 pulses/s fit no step");
    let last = &clocked.polls[polls..];
    assert!(last.iter().rev().take(50).all(|(_, p)| !p.outputs.right));
}
