//! The whole box as it is driven: events in, what is to be done out. The clock is the test's.

use proptest::collection::vec;
use proptest::prelude::*;
use rimrate_core::instrument::Event;
use rimrate_core::panel::{HOLD, Knob, Page};
use rimrate_core::setup::Setup;
use rimrate_core::tacho::Signal;
use rimrate_core::time::{Duration, Edge, EdgeKind, Instant};
use rimrate_core::trade::Operation;
use rimrate_core::verdict::Verdict;
use rimrate_sim::frame::Frame;
use rimrate_tests::{Clocked, Spindle, at, bar, machine, machines, rpm};

fn click(clocked: &mut Clocked, knob: Knob) {
    clocked.event(Event::Press(knob));
    clocked.rest(0.1);
    clocked.event(Event::Release(knob));
}

/// Holds a knob for a second.
fn hold(clocked: &mut Clocked, knob: Knob) {
    clocked.event(Event::Press(knob));
    clocked.rest(1.0);
    clocked.event(Event::Release(knob));
}

/// A confirmed box on the geared lathe, 0.1 s after power-up.
fn confirmed(setup: Setup) -> Clocked {
    let mut clocked = Clocked::new(machine("geared-lathe"), Some(setup));
    click(&mut clocked, Knob::Left);
    clocked
}

fn verdict(clocked: &Clocked) -> Verdict {
    clocked.instrument.view().verdict
}

fn seconds(at: Instant) -> f64 {
    at.nanos() as f64 / 1e9
}

#[test]
fn a_remembered_setup_comes_back_and_waits_for_a_press() {
    let setup = Setup {
        operation: Operation::Facing,
        holder: 1,
        cap: Some(rpm(300.0)),
        ..bar(60.0)
    };
    let mut clocked = Clocked::new(machine("geared-lathe"), Some(setup));
    assert_eq!(*clocked.instrument.view().setup, setup);
    assert_eq!(verdict(&clocked), Verdict::Unconfirmed);
    // At the advised step, and for as long as it takes: not green.
    let step = clocked
        .instrument
        .view()
        .advice
        .pick
        .setting()
        .unwrap()
        .rpm
        .get();
    clocked.spin(f64::from(step), 20.0);
    assert_eq!(verdict(&clocked), Verdict::Unconfirmed);
    assert!(clocked.polls.iter().all(|(_, p)| !p.outputs.right));
    click(&mut clocked, Knob::Right);
    // The spindle went on meanwhile, as far as the box knows.
    clocked.spin(f64::from(step), 2.0);
    assert_eq!(verdict(&clocked), Verdict::Right);
    assert_eq!(clocked.instrument.view().page, Page::Run);
    assert!(clocked.last().outputs.right);
    assert_eq!(clocked.saved(), [], "nothing was changed, nothing is kept");
}

#[test]
fn without_a_memory_it_starts_with_the_most_cautious_setup() {
    let clocked = Clocked::new(machine("drill-press"), None);
    assert_eq!(*clocked.instrument.view().setup, Setup::CAUTIOUS);
    assert_eq!(verdict(&clocked), Verdict::Unconfirmed);
}

#[test]
fn a_remembered_holder_that_the_machine_does_not_have_becomes_the_first() {
    let setup = Setup {
        holder: 200,
        ..bar(25.0)
    };
    let clocked = Clocked::new(machine("drill-press"), Some(setup));
    assert_eq!(*clocked.instrument.view().setup, bar(25.0));
}

#[test]
fn an_unconfirmed_box_warns_of_danger_all_the_same() {
    let setup = Setup {
        cap: Some(rpm(200.0)),
        ..bar(25.0)
    };
    let mut clocked = Clocked::new(machine("geared-lathe"), Some(setup));
    clocked.spin(250.0, 3.0);
    assert_eq!(verdict(&clocked), Verdict::Danger);
    assert!(clocked.last().outputs.relay);
}

#[test]
fn a_setup_is_handed_out_once_two_seconds_after_its_last_change() {
    let mut clocked = confirmed(bar(25.0));
    clocked.rest(0.9);
    clocked.event(Event::Turn(Knob::Right, 1));
    clocked.rest(1.5);
    clocked.event(Event::Turn(Knob::Right, 4));
    assert_eq!(clocked.now, at(2.5));
    clocked.rest(1.999);
    assert_eq!(clocked.saved(), []);
    assert!(clocked.last().next <= at(4.5));
    clocked.rest(100.0);
    assert_eq!(clocked.saved(), [(at(4.5), bar(30.0))]);
    // The same for a cap taken away by a hold.
    let mut clocked = confirmed(Setup {
        cap: Some(rpm(200.0)),
        ..bar(25.0)
    });
    clocked.event(Event::Press(Knob::Right));
    let due = clocked.now + HOLD + Duration::from_secs(2);
    clocked.rest(60.0);
    assert_eq!(clocked.saved(), [(due, bar(25.0))]);
}

/// Keeping may hold the box up: not while the spindle may turn, whatever the signal is then.
#[test]
fn a_setup_that_was_changed_while_turning_is_handed_out_at_rest() {
    let mut clocked = confirmed(bar(25.0));
    clocked.spin(290.0, 3.0);
    clocked.event(Event::Turn(Knob::Right, 1));
    clocked.spin(290.0, 30.0);
    assert_eq!(clocked.saved(), []);
    assert_eq!(clocked.instrument.view().reading.signal, Signal::Turning);
    let stopped = clocked.now;
    clocked.rest(20.0);
    let saved = clocked.saved();
    assert_eq!(saved.len(), 1, "{saved:?}");
    let (at, setup) = saved[0];
    assert_eq!(setup.diameter, bar(26.0).diameter);
    assert!(at > stopped);
    let before = clocked.polls.iter().rev().find(|(t, _)| *t < at);
    assert!(before.is_some_and(|(_, poll)| poll.save.is_none()));
    // Asked for no more often on its account than otherwise.
    let asked = clocked.polls.iter().filter(|(t, _)| *t < stopped).count();
    let mut other = confirmed(bar(25.0));
    other.spin(290.0, 33.0);
    assert!(asked <= other.polls.len() + 20, "{asked} times");
}

/// A signal that is lost stays so until pulses come: a cap or a counted number must not wait for that.
#[test]
fn a_setup_is_handed_out_ten_seconds_after_the_last_pulse_of_a_lost_signal() {
    let mut clocked = confirmed(bar(25.0));
    clocked.spin(1400.0, 3.0);
    clocked.event(Event::Turn(Knob::Right, 1));
    clocked.spin(1400.0, 1.0);
    clocked.rest(9.8);
    assert_eq!(clocked.instrument.view().reading.signal, Signal::Lost);
    assert_eq!(clocked.saved(), []);
    clocked.rest(0.4);
    assert_eq!(clocked.saved().len(), 1);
    assert_eq!(clocked.saved()[0].1.diameter, bar(26.0).diameter);
    clocked.rest(60.0);
    assert_eq!(clocked.saved().len(), 1);
}

#[test]
fn what_was_kept_is_what_the_next_start_shows() {
    let mut clocked = confirmed(bar(25.0));
    clocked.event(Event::Turn(Knob::Left, 3));
    clocked.event(Event::Turn(Knob::Right, -4));
    clocked.rest(6.0);
    let kept = clocked.saved()[0].1;
    assert_eq!(kept, *clocked.instrument.view().setup);
    let again = Clocked::new(machine("geared-lathe"), Some(kept));
    assert_eq!(*again.instrument.view().setup, kept);
    assert_eq!(verdict(&again), Verdict::Unconfirmed);
}

#[test]
fn a_change_is_announced_only_while_the_spindle_runs() {
    let mut clocked = confirmed(bar(25.0));
    clocked.event(Event::Turn(Knob::Right, 5));
    assert!(clocked.instrument.view().notice.is_none());
    clocked.event(Event::Turn(Knob::Right, -5));
    clocked.spin(280.0, 3.0);
    clocked.event(Event::Turn(Knob::Right, 5));
    let began = clocked.now;
    let shown = |c: &Clocked| c.instrument.view().notice.map(|n| n.text.to_string());
    assert_eq!(shown(&clocked).as_deref(), Some("was 25, now 30 mm"));
    assert!(clocked.last().redraw);
    clocked.spin(280.0, 2.999);
    assert_eq!(shown(&clocked).as_deref(), Some("was 25, now 30 mm"));
    clocked.spin(280.0, 0.002);
    assert_eq!(shown(&clocked), None);
    // It went exactly in time, and the picture with it.
    let (_, end) = clocked
        .polls
        .iter()
        .find(|(t, _)| *t == began + Duration::from_secs(3))
        .expect("the box asked to be woken");
    assert!(end.redraw);
}

#[test]
fn holding_the_left_knob_mutes_until_the_verdict_changes() {
    let mut clocked = confirmed(bar(25.0));
    clocked.spin(450.0, 3.0);
    assert_eq!(verdict(&clocked), Verdict::Fast);
    let sounded = |c: &Clocked, since: usize| {
        c.polls[since..]
            .iter()
            .any(|(_, p)| p.outputs.buzzer_hz.is_some())
    };
    assert!(sounded(&clocked, 0));
    clocked.event(Event::Press(Knob::Left));
    clocked.spin(450.0, 1.0);
    clocked.event(Event::Release(Knob::Left));
    let muted = clocked.polls.len();
    clocked.spin(450.0, 10.0);
    assert_eq!(verdict(&clocked), Verdict::Fast);
    assert!(!sounded(&clocked, muted));
    assert!(
        clocked.polls[muted..].iter().any(|(_, p)| p.outputs.over),
        "the lamp goes on"
    );
    // Right for a moment, then fast again: heard again.
    clocked.spin(280.0, 2.0);
    assert_eq!(verdict(&clocked), Verdict::Right);
    let later = clocked.polls.len();
    clocked.spin(450.0, 3.0);
    assert_eq!(verdict(&clocked), Verdict::Fast);
    assert!(sounded(&clocked, later));
}

#[test]
fn danger_cannot_be_muted() {
    let mut clocked = confirmed(Setup {
        cap: Some(rpm(200.0)),
        ..bar(25.0)
    });
    clocked.spin(280.0, 3.0);
    assert_eq!(verdict(&clocked), Verdict::Danger);
    clocked.event(Event::Press(Knob::Left));
    clocked.spin(280.0, 1.0);
    clocked.event(Event::Release(Knob::Left));
    let muted = clocked.polls.len();
    clocked.spin(280.0, 4.0);
    let after = &clocked.polls[muted..];
    assert!(after.iter().all(|(_, p)| p.outputs.relay));
    assert!(
        after
            .iter()
            .all(|(_, p)| p.outputs.buzzer_hz.is_some() == p.outputs.over)
    );
    assert!(after.iter().any(|(_, p)| p.outputs.over));
}

#[test]
fn holding_the_right_knob_takes_the_cap_away() {
    let mut clocked = confirmed(Setup {
        holder: 3,
        cap: Some(rpm(100.0)),
        ..bar(25.0)
    });
    clocked.spin(71.0, 5.0);
    assert_eq!(verdict(&clocked), Verdict::Right);
    hold(&mut clocked, Knob::Right);
    assert_eq!(clocked.instrument.view().setup.cap, None);
    clocked.spin(71.0, 5.0);
    // The faceplate is unrated: without a cap nothing is right.
    assert_eq!(verdict(&clocked), Verdict::NeedsCap);
}

#[test]
fn the_speed_is_shown_and_judged_soon_after_the_start() {
    let mut clocked = confirmed(bar(25.0));
    clocked.rest(1.0);
    assert_eq!(verdict(&clocked), Verdict::NoPulses);
    let began = clocked.now;
    clocked.spin(280.0, 3.0);
    let right = clocked.polls.iter().find(|(_, p)| p.outputs.right).unwrap();
    // Two magnets at 280 rpm: a pulse every 0.107 s, four of them for a start, and a look.
    let after = seconds(right.0) - seconds(began);
    assert!((0.3..0.5).contains(&after), "{after}");
    let reading = clocked.instrument.view().reading;
    assert!((reading.speed.unwrap().get() - 280.0).abs() < 0.01);
}

#[test]
fn a_still_picture_is_not_drawn_again_and_a_running_one_ten_times_a_second_at_most() {
    let mut clocked = confirmed(bar(25.0));
    clocked.rest(1.0);
    let from = clocked.polls.len();
    clocked.rest(60.0);
    assert!(clocked.polls[from..].iter().all(|(_, p)| !p.redraw));
    // At rest it sleeps: a look every half second.
    assert!(clocked.polls.len() - from <= 121);
    clocked.spin(280.0, 3.0);
    let from = clocked.polls.len();
    clocked.spin(280.0, 10.0);
    assert!(
        clocked.polls[from..].iter().all(|(_, p)| !p.redraw),
        "steady digits stay"
    );
    // Slowly faster, right all along: a new speed with every pulse.
    clocked.rest(5.0);
    let mut edges = Vec::new();
    let mut t = seconds(clocked.now);
    for i in -30..400 {
        edges.extend([Edge::fall(at(t)), Edge::rise(at(t + 0.007))]);
        t += 30.0 / (255.0 + f64::from(i.max(0)) * 0.08);
    }
    let (steady, faster) = edges.split_at(60);
    let length = seconds(faster[0].at) - seconds(clocked.now);
    clocked.run(steady, length);
    let from = clocked.polls.len();
    let length = t - seconds(clocked.now);
    clocked.run(faster, length);
    let drawn: Vec<f64> = clocked.polls[from..]
        .iter()
        .filter(|(_, p)| p.redraw)
        .map(|(t, _)| seconds(*t))
        .collect();
    let dark = clocked.polls[from..].iter().find(|(_, p)| !p.outputs.right);
    assert_eq!(
        dark,
        None,
        "right all along; {:?}",
        clocked.instrument.view().reading
    );
    assert!(drawn.len() >= 32, "every rev/min is shown: {}", drawn.len());
    assert!(drawn.windows(2).all(|w| w[1] - w[0] > 0.0999), "{drawn:?}");
}

#[test]
fn a_bare_poll_long_after_the_last_edge_still_says_lost() {
    let mut clocked = confirmed(bar(25.0));
    let edges = Spindle::new(1120.0).edges(1.0, 5.0);
    clocked.run(&edges, 4.0);
    assert_eq!(clocked.instrument.view().reading.signal, Signal::Turning);
    let poll = clocked.instrument.poll(at(500.0));
    assert_eq!(clocked.instrument.view().verdict, Verdict::Lost);
    assert!(poll.next > at(500.0));
}

#[derive(Clone, Debug)]
enum Blow {
    Turn(bool, i8),
    Press(bool),
    Release(bool),
    /// Falls and rises in any order, each some nanoseconds after the one before.
    Edges(Vec<(u32, bool)>),
    /// Turns evenly: rpm, for some ms.
    Spin(u16, u16),
    /// ms.
    Wait(u16),
    /// Edges that go back in time.
    Backwards(u32),
    PowerCycle,
}

fn blow() -> impl Strategy<Value = Blow> {
    let knob = any::<bool>();
    prop_oneof![
        (knob, any::<i8>()).prop_map(|(k, n)| Blow::Turn(k, n)),
        (knob, -3_i8..4).prop_map(|(k, n)| Blow::Turn(k, n)),
        knob.prop_map(Blow::Press),
        knob.prop_map(Blow::Release),
        vec((0_u32..40_000_000, any::<bool>()), 0..20).prop_map(Blow::Edges),
        (1_u16..6000, 1_u16..3000).prop_map(|(n, ms)| Blow::Spin(n, ms)),
        (0_u16..6000).prop_map(Blow::Wait),
        any::<u32>().prop_map(Blow::Backwards),
        Just(Blow::PowerCycle),
    ]
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(300))]

    #[test]
    fn no_storm_of_events_breaks_it(
        which in 0_usize..3, stored in any::<bool>(), blows in vec(blow(), 1..40),
    ) {
        let machine = machines().nth(which).unwrap();
        let mut clocked = Clocked::new(machine.clone(), stored.then(|| bar(25.0)));
        let knob = |left| if left { Knob::Left } else { Knob::Right };
        let mut seen = 0;
        for blow in blows {
            // `Clocked` checks at every poll that the next one is not in the past.
            match blow {
                Blow::Turn(left, detents) => clocked.event(Event::Turn(knob(left), detents)),
                Blow::Press(left) => clocked.event(Event::Press(knob(left))),
                Blow::Release(left) => clocked.event(Event::Release(knob(left))),
                Blow::Edges(edges) => {
                    let mut t = clocked.now;
                    let edges: Vec<Edge> = edges
                        .into_iter()
                        .map(|(after, fall)| {
                            t += Duration::from_nanos(u64::from(after));
                            Edge { at: t, kind: if fall { EdgeKind::Fall } else { EdgeKind::Rise } }
                        })
                        .collect();
                    let length = seconds(t) - seconds(clocked.now);
                    clocked.run(&edges, length);
                }
                Blow::Spin(n, ms) => clocked.spin(f64::from(n), f64::from(ms) / 1000.0),
                Blow::Wait(ms) => clocked.rest(f64::from(ms) / 1000.0),
                Blow::Backwards(ns) => {
                    let t = clocked.now - Duration::from_nanos(u64::from(ns));
                    clocked.event(Event::Edges(&[Edge::rise(clocked.now), Edge::fall(t)]));
                }
                Blow::PowerCycle => {
                    clocked.power_cycle(machine.clone(), stored.then(|| bar(25.0)));
                }
            }
            let view = clocked.instrument.view();
            let reading = view.reading;
            prop_assert!(reading.speed.is_none_or(|n| n.get().is_finite()));
            prop_assert!(reading.quick.is_none_or(|n| n.get().is_finite()));
            let mut frame = Frame::new();
            let Ok(()) = clocked.instrument.draw(&mut frame);
            for (_, poll) in &clocked.polls[seen..] {
                prop_assert!(!(poll.outputs.right && poll.outputs.relay));
            }
            seen = clocked.polls.len();
            let outputs = clocked.last().outputs;
            prop_assert_eq!(outputs.relay, view.verdict == Verdict::Danger);
            prop_assert_eq!(outputs.right, view.verdict == Verdict::Right);
            if outputs.right {
                prop_assert_eq!(reading.signal, Signal::Turning);
                prop_assert!(view.advice.best().is_some());
            }
        }
    }
}
