//! The pages about the sensor: from one to the next, the ten turns, the plate.

use rimrate_core::sensor_setup::Hand as Turns;
use rimrate_core::setup::Pulses;
use rimrate_core::time::Edge;

use super::*;

/// From the Run page to the one on which ten turns are counted.
fn at_ten_turns(machine: Machine) -> Hand {
    let mut hand = Hand::new(machine, bar(25.0));
    hand.click(Knob::Right);
    hand.click(Knob::Left);
    assert_eq!(hand.panel.page(), Page::Sensor);
    hand.turn(Knob::Left, 1);
    assert_eq!(hand.panel.page(), Page::TenTurns);
    hand
}

/// So many magnets pass, about one a second, as unevenly as a hand turns.
fn pass(hand: &mut Hand, passages: u32) {
    for i in 0..passages {
        hand.now += Duration::from_millis(600 + 97 * u64::from((i % 7).pow(2) % 7));
        let fall = hand.now;
        hand.now += Duration::from_millis(100);
        hand.sensor.edges(&[Edge::fall(fall), Edge::rise(hand.now)]);
    }
    hand.now += Duration::from_millis(900);
}

#[test]
fn either_knob_leads_from_the_sensor_page_to_the_ten_turns_and_the_left_one_on_and_back() {
    for knob in [Knob::Left, Knob::Right] {
        for detents in [-3, 1] {
            let mut hand = lathe();
            hand.click(Knob::Right);
            hand.click(Knob::Left);
            hand.turn(knob, detents);
            assert_eq!(hand.panel.page(), Page::TenTurns);
        }
    }
    let mut hand = at_ten_turns(machine("geared-lathe"));
    for (knob, detents, page) in [
        (Knob::Right, 2, Page::TenTurns),
        (Knob::Left, 1, Page::PlateSpeed),
        (Knob::Left, 5, Page::PlateSpeed),
        (Knob::Left, -1, Page::TenTurns),
        (Knob::Left, -1, Page::Sensor),
        (Knob::Left, 1, Page::TenTurns),
    ] {
        hand.turn(knob, detents);
        assert_eq!(hand.panel.page(), page);
        assert_eq!(hand.setup, bar(25.0));
    }
    hand.click(Knob::Left);
    assert_eq!(hand.panel.page(), Page::Run);
}

#[test]
fn ten_turns_are_begun_ended_and_taken_over_by_three_presses() {
    let mut hand = at_ten_turns(machine("geared-lathe"));
    pass(&mut hand, 3);
    hand.click(Knob::Right);
    assert!(matches!(hand.sensor.hand(), Turns::Counting(_)));
    // Turns mean nothing while it counts.
    for knob in [Knob::Left, Knob::Right] {
        hand.turn(knob, 1);
        assert_eq!(hand.panel.page(), Page::TenTurns);
    }
    pass(&mut hand, 30);
    hand.click(Knob::Right);
    let three = Pulses::new(3).unwrap();
    assert_eq!(*hand.sensor.hand(), Turns::Counted(30, Ok(three)));
    // Counted is not taken over, and holding the knob is no press: neither the number nor the cap changes.
    hand.setup.cap = Some(rpm(200.0));
    assert_eq!(hand.hold(Knob::Right), None);
    assert_eq!(
        (hand.setup.pulses, hand.setup.cap),
        (None, Some(rpm(200.0)))
    );
    hand.click(Knob::Right);
    assert_eq!(hand.setup.pulses, Some(three));
    assert_eq!(hand.panel.page(), Page::Sensor);
    // The number in use is not offered again: a press counts once more. The profile's own number is no choice.
    hand.turn(Knob::Left, 1);
    hand.click(Knob::Right);
    assert!(matches!(hand.sensor.hand(), Turns::Counting(_)));
    pass(&mut hand, 20);
    hand.click(Knob::Right);
    hand.click(Knob::Right);
    assert_eq!((hand.setup.pulses, hand.panel.page()), (None, Page::Sensor));
}

#[test]
fn a_count_is_given_up_by_the_left_knob_and_a_wrong_one_is_counted_again() {
    let mut hand = at_ten_turns(machine("geared-lathe"));
    hand.click(Knob::Right);
    pass(&mut hand, 30);
    hand.click(Knob::Left);
    assert_eq!(hand.panel.page(), Page::Run);
    assert_eq!(*hand.sensor.hand(), Turns::Waiting);
    // What was counted and not taken over is no more once the operator leaves, from this page or by way of the Sensor page.
    for by_sensor_page in [false, true] {
        let mut hand = at_ten_turns(machine("geared-lathe"));
        hand.click(Knob::Right);
        pass(&mut hand, 30);
        hand.click(Knob::Right);
        assert!(matches!(hand.sensor.hand(), Turns::Counted(30, Ok(_))));
        if by_sensor_page {
            hand.turn(Knob::Left, -1);
            assert!(matches!(hand.sensor.hand(), Turns::Counted(30, Ok(_))));
        }
        hand.click(Knob::Left);
        assert_eq!(hand.panel.page(), Page::Run);
        assert_eq!(*hand.sensor.hand(), Turns::Waiting);
    }
    let mut hand = at_ten_turns(machine("geared-lathe"));
    hand.click(Knob::Right);
    pass(&mut hand, 25);
    hand.click(Knob::Right);
    assert!(matches!(hand.sensor.hand(), Turns::Counted(25, Err(_))));
    hand.click(Knob::Right);
    assert!(matches!(hand.sensor.hand(), Turns::Counting(_)));
    assert_eq!(hand.setup.pulses, None);
}

#[test]
fn the_plate_is_one_of_the_machines_speeds_and_begins_with_none() {
    let mut hand = at_ten_turns(machine("geared-lathe"));
    hand.turn(Knob::Left, 1);
    assert_eq!(hand.sensor.plate(), None);
    for (detents, plate) in [
        (1, 18.0),
        (1, 28.0),
        (2, 71.0),
        (100, 2800.0),
        (-1, 1800.0),
        (-100, 18.0),
    ] {
        hand.turn(Knob::Right, detents);
        assert_eq!(hand.sensor.plate(), Some(rpm(plate)));
    }
    // Nothing was measured: a press does nothing.
    hand.click(Knob::Right);
    assert_eq!(
        (hand.panel.page(), hand.setup),
        (Page::PlateSpeed, bar(25.0))
    );
    let mut hand = at_ten_turns(machine("geared-lathe"));
    hand.turn(Knob::Left, 1);
    hand.turn(Knob::Right, -1);
    assert_eq!(hand.sensor.plate(), Some(rpm(2800.0)));
    // A variable drive has any speed between its ends.
    let variable = machine("variable-lathe");
    let (slowest, fastest) = (variable.drive().slowest(), variable.drive().fastest());
    let mut hand = at_ten_turns(variable);
    hand.turn(Knob::Left, 1);
    hand.turn(Knob::Right, 1);
    assert_eq!(hand.sensor.plate(), Some(slowest));
    let mut before = slowest;
    while before < fastest {
        hand.turn(Knob::Right, 1);
        let plate = hand.sensor.plate().unwrap();
        assert!(plate > before && plate <= fastest);
        before = plate;
    }
}
