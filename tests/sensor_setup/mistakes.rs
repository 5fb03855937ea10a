//! Operators who are mistaken: a motor that runs while turns are counted, a plate that is not the step's, a speed outside of its
//! band.

use rimrate_core::advice::advise;
use rimrate_core::machine::{Drive, Machine};
use rimrate_core::panel::{Bench, Panel};
use rimrate_core::sensor_setup::{Offer, SensorSetup};
use rimrate_core::units::Rpm;

use super::*;

/// A count begun while the motor runs in any step, with few magnets and with many, and ended at any moment: no number. A hand
/// that turns as fast as any is never taken for a motor.
#[test]
fn a_spindle_under_power_is_not_counted_as_by_hand() {
    for (n, magnets) in [
        (18.0, 1),
        (71.0, 2),
        (112.0, 3),
        (280.0, 1),
        (280.0, 2),
        (280.0, 60),
        (1120.0, 6),
        (2800.0, 1),
    ] {
        let mut clocked = at_ten_turns(bar(25.0));
        spin(&mut clocked, n, magnets, 2.0);
        click(&mut clocked, Knob::Right);
        // Ten turns of a slow step are ten turns; before and after them nothing is found.
        let seconds = (600.0 / n).max(7.0) + 1.0;
        spin(&mut clocked, n, magnets, seconds);
        let hand = clocked.instrument.view().sensor_setup.hand().clone();
        assert_eq!(hand, Hand::Driven, "{magnets} magnets at {n} rpm");
        shows(&clocked, "motor runs: switch it off");
        shows(&clocked, "CAUTION: lock out the supply, or");
        shows(&clocked, "press right: count again");
        click(&mut clocked, Knob::Right);
        assert_eq!(*clocked.instrument.view().setup, bar(25.0));
    }
    // Ten turns in less than five seconds, too few passages to see how even they are: 30 in one.
    let mut clocked = at_ten_turns(bar(25.0));
    click(&mut clocked, Knob::Right);
    spin(&mut clocked, 150.0, 12, 1.0);
    click(&mut clocked, Knob::Right);
    let view = clocked.instrument.view();
    assert!(matches!(view.sensor_setup.passages(), 29..=31));
    assert_eq!(*view.sensor_setup.hand(), Hand::Driven);
    for magnets in [1, 2, 3, 4, 6, 12, 60, 240] {
        for seed in 0..60 {
            let mut clocked = at_ten_turns(bar(25.0));
            count_as(&mut clocked, magnets, seed);
            let hand = clocked.instrument.view().sensor_setup.hand().clone();
            assert!(
                matches!(hand, Hand::Counted(..)),
                "{magnets}, hand {seed}: {hand:?}"
            );
        }
    }
}

/// Somebody at the page of the plate's speed, without a box around it.
struct Bystander {
    panel: Panel,
    setup: Setup,
    machine: Machine,
    sensor: SensorSetup,
}

impl Bystander {
    fn act(&mut self, what: impl FnOnce(&mut Panel, Bench<'_>)) {
        let advice = advise(&self.setup, &self.machine);
        let bench = Bench {
            setup: &mut self.setup,
            machine: &self.machine,
            advice: &advice,
            running: true,
            sensor: &mut self.sensor,
        };
        what(&mut self.panel, bench);
    }

    fn at_plate(machine: Machine) -> Self {
        let mut bystander = Bystander {
            panel: Panel::new(true),
            setup: bar(25.0),
            machine,
            sensor: SensorSetup::default(),
        };
        for knob in [Knob::Right, Knob::Left] {
            bystander.panel.press(at(0.0), knob);
            bystander.act(|panel, bench| assert_eq!(panel.release(at(0.0), knob, bench), None));
        }
        for _ in 0..2 {
            bystander.act(|panel, bench| panel.turn(at(0.0), Knob::Left, 1, bench));
        }
        assert_eq!(bystander.panel.page(), Page::PlateSpeed);
        bystander
    }
}

/// Whatever step a spindle with up to nine pulses runs in, whatever number is in use, and whichever plate somebody chooses by
/// mistake: without a count by hand no number but the right one is ever offered, and never where the one in use is right.
#[test]
fn a_plate_chosen_by_mistake_offers_no_wrong_number() {
    let mut offered = 0;
    for name in ["geared-lathe", "variable-lathe", "drill-press"] {
        let machine = machine(name);
        let running: Vec<f32> = match machine.drive() {
            Drive::Stepped(steps) => steps.iter().map(|s| s.rpm.get()).collect(),
            Drive::Variable(ranges) => ranges
                .iter()
                .flat_map(|r| [r.low, r.high])
                .map(Rpm::get)
                .collect(),
        };
        for (step, n) in running
            .iter()
            .flat_map(|&step| (1..=CLEAR).map(move |n| (step, n)))
        {
            for off in [0.982, 1.0, 1.03, 1.058] {
                let mut by = Bystander::at_plate(machine.clone());
                let rate = f64::from(step) * off * f64::from(n) / 60.0;
                let (mut now, mut pulse) = (0.0, (0, at(0.0)));
                while by.sensor.rate().is_none() {
                    now += 0.1;
                    let count = (now * rate) as u32;
                    pulse = (count, at(f64::from(count) / rate));
                    by.sensor.look(at(now), Some(pulse));
                    assert!(now < 300.0);
                }
                for _ in 0..running.len() {
                    by.act(|panel, bench| panel.turn(at(now), Knob::Right, 1, bench));
                    by.sensor.look(at(now), Some(pulse));
                    for used in (1..=12).chain([20, 60, 240]) {
                        if let Offer::Use(found) = by.sensor.plate_offer(pulses(used), &machine) {
                            assert_eq!(
                                found,
                                pulses(n),
                                "{step} rpm, {used} in use, plate {:?}",
                                by.sensor.plate()
                            );
                            assert_ne!(found, pulses(used));
                            offered += 1;
                        }
                    }
                }
            }
        }
    }
    assert!(offered > 100, "the plate's speed alone is a way: {offered}");
}

/// Two magnets, as the profile says, 1120 rpm, and the plate knob left at 280: eight a turn is not offered.
#[test]
fn a_right_number_in_use_is_not_replaced_by_a_wrong_plate() {
    let mut clocked = at_ten_turns(bar(25.0));
    turn(&mut clocked, Knob::Left, 1);
    shows(&clocked, "CAUTION: chuck key out first.");
    shows(&clocked, "Run in one step, without a cut.");
    turn(&mut clocked, Knob::Right, 7);
    spin(&mut clocked, 1120.0, 2, 8.0);
    shows(&clocked, "8 a turn, in use 2");
    shows(&clocked, "or is it step 1120 rpm?");
    assert!((read(&clocked) / 1120.0 - 1.0).abs() < 1e-3);
    click(&mut clocked, Knob::Right);
    let view = clocked.instrument.view();
    assert_eq!((view.page, *view.setup), (Page::PlateSpeed, bar(25.0)));
}

/// Six magnets in the slowest step: two in use are surely wrong, and nothing else explains the rate. What is offered lasts as long
/// as the spindle runs, and is gone when the page is entered anew.
#[test]
fn a_plate_alone_replaces_a_number_that_nothing_explains_while_it_is_measured() {
    let mut clocked = at_ten_turns(bar(25.0));
    turn(&mut clocked, Knob::Left, 1);
    turn(&mut clocked, Knob::Right, 1);
    spin(&mut clocked, 18.0, 6, 30.0);
    shows(&clocked, "6 a turn, in use 2");
    shows(&clocked, "press right: use 6");
    clocked.rest(10.0);
    shows(&clocked, "not steady yet: 0 of 40");
    click(&mut clocked, Knob::Right);
    let view = clocked.instrument.view();
    assert_eq!((view.page, *view.setup), (Page::PlateSpeed, bar(25.0)));
    turn(&mut clocked, Knob::Left, -1);
    assert!(clocked.instrument.view().sensor_setup.fit().is_some());
    turn(&mut clocked, Knob::Left, 1);
    assert_eq!(clocked.instrument.view().sensor_setup.fit(), None);
    spin(&mut clocked, 18.0, 6, 40.0);
    click(&mut clocked, Knob::Right);
    assert_eq!(clocked.instrument.view().setup.pulses, Some(pulses(6)));
}

/// The gaps between the bands up to nine pulses: a rate known within 1 to 1.5 % that lies up to 1.3 % outside of a number's band
/// is never taken for another one; 1.4 % below it ten are.
#[test]
fn just_outside_the_band_no_other_number_is_told() {
    let told = |n: u32, off: f32, share| fit(n as f32 * off, share, rpm(60.0));
    for share in [0.01, 0.0115, 0.0125, 0.0135, 0.015] {
        for n in 1..=u32::from(MAX_PULSES) {
            for i in 0..=13 {
                let out = 1.0 + i as f32 * 1e-3;
                for off in [0.98 / out, 1.06 * out] {
                    if let Fit::One(found) = told(n, off, share) {
                        assert_eq!(found, pulses(n), "at {off} within {share}");
                    }
                }
            }
            if let Fit::Several(from, to) = told(n, 1.06, share) {
                let most = u32::from(MAX_PULSES);
                assert!(from <= to && to <= most, "{from} to {to}");
            }
        }
    }
    assert_eq!(told(10, 0.98 / 1.014, 0.0135), Fit::One(pulses(9)));
}
