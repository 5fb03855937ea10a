//! The whole lathe against what mechanics and published examples say of it.

use super::*;
use core::f64::consts::TAU;
use rimrate_core::time::{Duration, Instant};

fn secs(s: f64) -> Instant {
    Instant::from_nanos((s * 1e9) as u64)
}

/// Runs to a time and checks on the way that the motion has no gap and no jump.
fn run(lathe: &mut Lathe, until: f64) -> Vec<Segment> {
    let mut segments: Vec<Segment> = Vec::new();
    lathe.advance(secs(until), &mut |segment| {
        if let Some(last) = segments.last() {
            assert_eq!(
                last.start + Duration::from_nanos(last.len_ns),
                segment.start
            );
            assert!((last.angle_at(last.secs()) - segment.angle).abs() < 1e-12);
            // A stop is set to 0 exactly; it lies within a nanosecond of the polynomial's.
            assert!((last.speed_at(last.secs()) - segment.speed).abs() < 1e-6);
        }
        segments.push(*segment);
    });
    if let Some(last) = segments.last() {
        assert_eq!(last.start + Duration::from_nanos(last.len_ns), secs(until));
    }
    segments
}

/// A cut that takes a torque in N m.
fn cut(torque: f64, engagement: Engagement) -> Option<Cut> {
    Some(Cut {
        specific_force: 2000.0,
        depth: 1.0,
        feed: torque / 20.0,
        diameter: 20.0,
        engagement,
    })
}

fn steady(torque: f64) -> Option<Cut> {
    let cut = cut(torque, Engagement::Continuous);
    assert!((cut.unwrap().torque() - torque).abs() < 1e-9);
    cut
}

/// A lathe that has run up to its speed on a step, with nothing switched on later.
fn running(spec: LatheSpec, plate_rpm: f64) -> Lathe {
    let mut lathe = Lathe::new(spec, 1);
    lathe.select(plate_rpm);
    lathe.motor(MotorSwitch::Forward);
    run(&mut lathe, 4.0);
    lathe
}

#[test]
fn half_torque_gives_the_published_speed() {
    // (rated rpm, rated W, speed at half torque, power at half torque); four poles, 50 Hz, torque proportional to slip.
    let examples = [
        // Hubert, "Electric Machines" (book p. 201): rated slip 0.0159, half torque: 1488.075 rpm.
        (1500.0 * (1.0 - 0.0159), 1100.0, 1488.075, None),
        // FOSSEE Scilab textbook companion no. 3760, example 6.30: 10 kW at 1440 rpm, half torque: 1470 rpm, 5104.2 W.
        (1440.0, 10_000.0, 1470.0, Some(5104.2)),
    ];
    for (rated_rpm, rated_power, rpm, power) in examples {
        let motor = MotorSpec {
            rated_rpm,
            rated_power,
            ..MotorSpec::default()
        };
        let spec = LatheSpec {
            motor,
            ..LatheSpec::default()
        };
        // Plate speed and motor speed the same: the spindle shows the motor itself.
        let mut lathe = running(spec.without_losses(), rated_rpm);
        let free = lathe.smooth_rpm();
        assert!((free - 1500.0).abs() < 0.01, "{free}");
        lathe.cut(steady(motor.rated_torque() / 2.0));
        run(&mut lathe, 8.0);
        // The examples take the curve as straight. Kloss's bends: at half torque, with a breakdown torque of 2.5 times the
        // rated, x = 2k - sqrt(4k^2 - 1) gives 3.2 % less slip than half the rated slip. That much may be between them.
        let slip = motor.slip(lathe.smooth_rpm());
        let straight = motor.slip(rpm);
        assert!(slip < straight && slip > 0.96 * straight, "{slip}");
        assert!((lathe.smooth_rpm() / rpm - 1.0).abs() < 0.001);
        if let Some(power) = power {
            let shaft = lathe.motor_torque() * lathe.motor_rpm() * TAU / 60.0;
            assert!((shaft / power - 1.0).abs() < 0.001, "{shaft}");
        }
        // At the rated point both agree.
        lathe.cut(steady(motor.rated_torque()));
        run(&mut lathe, 12.0);
        assert!((lathe.smooth_rpm() - rated_rpm).abs() < 0.01);
    }
}

#[test]
fn steps_run_near_their_plate_speeds() {
    // Loaded or free, machine-tool practice allows about -2 % to +6 % (common practice, no source).
    for plate in [31.5, 100.0, 400.0, 1000.0, 2000.0] {
        let mut lathe = running(LatheSpec::default(), plate);
        let free = lathe.smooth_rpm() / plate;
        assert!((0.98..1.06).contains(&free), "{plate}: {free}");
        let torque = MotorSpec::default().rated_torque() * 1440.0 / plate;
        lathe.cut(steady(0.7 * torque));
        run(&mut lathe, 8.0);
        let loaded = lathe.smooth_rpm() / plate;
        assert!((0.98..1.06).contains(&loaded), "{plate}: {loaded}");
        assert!(loaded < free - 0.01);
        // What the spindle lacks to the field is the motor's slip and the belt's loss, nothing else.
        let motor = MotorSpec::default();
        let ideal = lathe.motor_rpm() / 1440.0 * plate * (1.0 - lathe.belt_loss());
        assert!((ideal - lathe.smooth_rpm()).abs() < 1e-9 * plate);
        let slip = motor.slip(lathe.motor_rpm());
        // Mains wander moves the field by up to 0.2 %.
        assert!(
            (motor.torque(slip - 0.002)..motor.torque(slip + 0.002))
                .contains(&lathe.motor_torque())
        );
    }
}

#[test]
fn energy_is_neither_made_nor_lost() {
    let spec = LatheSpec {
        turn_ripple: 0.0,
        ..LatheSpec::default().without_losses()
    };
    let inertia = spec.spindle_inertia + spec.motor_inertia * 1.44 * 1.44;
    // Run-up: all the work of the motor is in the masses at the end.
    let mut lathe = Lathe::new(spec, 1);
    lathe.select(1000.0);
    lathe.motor(MotorSwitch::Forward);
    let (mut work, mut ms) = (0.0, 0);
    while ms < 3000 {
        ms += 1;
        let before = lathe.motor_rpm();
        run(&mut lathe, f64::from(ms) * 1e-3);
        // The torque belongs to the start of the step and the mean speed to all of it: right to a fraction of a percent.
        work += lathe.motor_torque() * 0.5 * (before + lathe.motor_rpm()) * TAU / 60.0 * 1e-3;
    }
    let omega = lathe.smooth_rpm() * TAU / 60.0;
    let stored = 0.5 * inertia * omega * omega;
    assert!((work / stored - 1.0).abs() < 0.01, "{work} {stored}");

    // Coasting against dry friction alone: J omega^2 / 2 = M phi, and it takes J omega / M.
    let dry = LatheSpec {
        spindle_friction: 0.4,
        motor_friction: 0.3,
        ..spec
    };
    let mut lathe = running(dry, 1000.0);
    lathe.motor(MotorSwitch::Off);
    let (angle, omega) = (lathe.angle(), lathe.smooth_rpm() * TAU / 60.0);
    let torque = 0.4 + 0.3 * 1.44;
    let takes = inertia * omega / torque;
    let segments = run(&mut lathe, 4.0 + takes + 1.0);
    let turns = inertia * omega * omega / 2.0 / torque / TAU;
    assert!((lathe.angle() - angle - turns).abs() < 1e-6 * turns);
    let stopped = segments.iter().find(|segment| segment.is_still()).unwrap();
    assert!((stopped.start.nanos() as f64 * 1e-9 - 4.0 - takes).abs() < 1e-6);

    // Under load: motor power = friction + cut + what the belt loses.
    let steady_mains = LatheSpec {
        mains_wander: 0.0,
        ..LatheSpec::default()
    };
    let mut lathe = running(steady_mains, 500.0);
    lathe.cut(steady(10.0));
    run(&mut lathe, 10.0);
    let spec = LatheSpec::default();
    let (omega, ratio) = (lathe.smooth_rpm() * TAU / 60.0, 1440.0 / 500.0);
    let power = lathe.motor_torque() * lathe.motor_rpm() * TAU / 60.0;
    let useful = 10.0 * omega;
    let friction =
        (spec.spindle_friction + spec.motor_friction * ratio + spec.spindle_drag * omega) * omega;
    let belt = power * lathe.belt_loss();
    assert!((power / (useful + friction + belt) - 1.0).abs() < 1e-4);
}

#[test]
fn the_brake_keeps_to_its_limit() {
    for plate in [50.0, 400.0, 1000.0, 2000.0] {
        for pedal in [0.3, 1.0] {
            for cutting in [None, steady(1.0)] {
                let mut lathe = running(LatheSpec::default(), plate);
                let from = lathe.smooth_rpm();
                lathe.cut(cutting);
                lathe.brake(pedal);
                let segments = run(&mut lathe, 7.0);
                let limit = pedal * 3000.0 / 60.0;
                for segment in &segments {
                    assert!(segment.accel >= -limit - 1e-9, "{segment:?}");
                }
                let stop = segments.iter().find(|segment| segment.is_still()).unwrap();
                let took = stop.start.nanos() as f64 * 1e-9 - 4.0;
                assert!((took - from / (pedal * 3000.0)).abs() < 1e-6, "{took}");
                assert_eq!(lathe.switch(), MotorSwitch::Off);
                assert_eq!(lathe.smooth_rpm(), 0.0);
            }
        }
    }
}

#[test]
fn plug_reversal_stops_and_does_not_reverse() {
    for plate in [31.5, 63.0, 125.0, 250.0, 500.0, 1000.0, 2000.0] {
        for way in [MotorSwitch::Forward, MotorSwitch::Reverse] {
            let mut lathe = Lathe::new(LatheSpec::default(), 1);
            lathe.select(plate);
            lathe.motor(way);
            run(&mut lathe, 4.0);
            let before = lathe.smooth_rpm();
            let mut coasting = lathe.clone();
            lathe.plug();
            let segments = run(&mut lathe, 8.0);
            assert_eq!(lathe.smooth_rpm(), 0.0);
            assert_eq!(lathe.switch(), MotorSwitch::Off);
            for segment in &segments {
                assert!(segment.speed * before >= 0.0);
                // The braking limit that the instrument assumes by default.
                assert!(segment.accel.abs() * 60.0 <= 3000.0, "{segment:?}");
            }
            // Faster than coasting by far.
            coasting.motor(MotorSwitch::Off);
            let stop = |segments: &[Segment]| {
                let still = segments.iter().find(|segment| segment.is_still());
                still.unwrap().start.nanos() as f64 * 1e-9 - 4.0
            };
            let (plugged, coasted) = (stop(&segments), stop(&run(&mut coasting, 20.0)));
            assert!(plugged < 0.5 * coasted, "{plate}: {plugged} {coasted}");
        }
    }
    // On a spindle at rest it does nothing.
    let mut lathe = Lathe::new(LatheSpec::default(), 1);
    lathe.select(500.0);
    lathe.plug();
    assert!(run(&mut lathe, 1.0).iter().all(Segment::is_still));
}

#[test]
fn a_switched_off_spindle_coasts_to_rest() {
    let mut lathe = running(LatheSpec::default(), 1000.0);
    lathe.motor(MotorSwitch::Off);
    let segments = run(&mut lathe, 20.0);
    let mut last = f64::INFINITY;
    for segment in &segments {
        assert!(segment.speed <= last && segment.speed >= 0.0);
        last = segment.speed;
    }
    assert!(segments.last().unwrap().is_still());
    let moving = segments.iter().filter(|s| !s.is_still()).count();
    assert!((1000..8000).contains(&moving), "{moving}");
}

#[test]
fn too_heavy_a_cut_stalls() {
    let motor = MotorSpec::default();
    let spec = LatheSpec::default().without_losses();
    let starting = motor.torque(1.0);
    // More than the breakdown torque: it stops, and the motor hums.
    let mut lathe = running(spec, motor.rated_rpm);
    lathe.cut(steady(1.05 * motor.breakdown_torque()));
    run(&mut lathe, 8.0);
    assert_eq!(lathe.smooth_rpm(), 0.0);
    assert!((lathe.motor_torque() - starting).abs() < 0.01 * starting);
    // The tool taken off, it runs up again.
    lathe.cut(None);
    run(&mut lathe, 12.0);
    assert!(lathe.smooth_rpm() > 1490.0);
    // Between starting and breakdown torque: a running motor holds it, a standing one does not start.
    let between = steady(0.8 * motor.breakdown_torque());
    assert!(0.8 * motor.breakdown_torque() > starting);
    lathe.cut(between);
    run(&mut lathe, 16.0);
    assert!(lathe.smooth_rpm() > 1000.0);
    let mut lathe = Lathe::new(spec, 1);
    lathe.select(motor.rated_rpm);
    lathe.cut(between);
    lathe.motor(MotorSwitch::Forward);
    run(&mut lathe, 4.0);
    assert_eq!(lathe.smooth_rpm(), 0.0);
}

#[test]
fn an_interrupted_cut_loads_by_its_share_and_shakes_the_speed() {
    let mut lathe = running(LatheSpec::default().without_losses(), 500.0);
    lathe.cut(cut(
        20.0,
        Engagement::Interrupted {
            times: 2,
            share: 0.25,
        },
    ));
    run(&mut lathe, 6.0);
    let segments = run(&mut lathe, 8.0);
    let (mut low, mut high, mut sum) = (f64::MAX, f64::MIN, 0.0);
    for segment in &segments {
        low = low.min(segment.speed);
        high = high.max(segment.speed);
        sum += segment.speed;
    }
    let mean = sum / segments.len() as f64 * 60.0;
    let mut even = running(LatheSpec::default().without_losses(), 500.0);
    even.cut(steady(5.0));
    run(&mut even, 8.0);
    assert!((mean / even.smooth_rpm() - 1.0).abs() < 0.002, "{mean}");
    assert!((high - low) / high > 0.005, "{low} {high}");
}

#[test]
fn a_jog_is_short() {
    let mut lathe = Lathe::new(LatheSpec::default(), 1);
    lathe.select(250.0);
    lathe.jog(MotorSwitch::Forward, Duration::from_micros(150_300));
    run(&mut lathe, 0.15);
    assert_eq!(lathe.switch(), MotorSwitch::Forward);
    let rising = lathe.smooth_rpm();
    assert!(rising > 20.0);
    let segments = run(&mut lathe, 6.0);
    assert_eq!(lathe.switch(), MotorSwitch::Off);
    // It slows from the very end of the jog on.
    let off = segments.iter().find(|s| s.accel < 0.0).unwrap();
    assert_eq!(off.start, Instant::from_nanos(150_300_000));
    assert_eq!(lathe.smooth_rpm(), 0.0);
}

#[test]
fn shifting_in_motion_lets_the_motor_pull() {
    let mut lathe = running(LatheSpec::default(), 500.0);
    let (speed, angle) = (lathe.smooth_rpm(), lathe.angle());
    lathe.select(1000.0);
    assert_eq!(lathe.smooth_rpm(), speed);
    assert!((lathe.angle() - angle).abs() < 1e-12);
    run(&mut lathe, 4.05);
    assert!(lathe.smooth_rpm() > speed + 10.0 && lathe.smooth_rpm() < 900.0);
    run(&mut lathe, 8.0);
    assert!((lathe.smooth_rpm() / 1000.0 - 1.02).abs() < 0.04);
    // Out of gear it coasts, whatever the switch says.
    lathe.select(0.0);
    run(&mut lathe, 30.0);
    assert_eq!(lathe.smooth_rpm(), 0.0);
}

#[test]
fn reverse_is_the_mirror_image() {
    let spec = LatheSpec {
        turn_ripple: 0.0,
        belt_ripple: 0.0,
        ..LatheSpec::default()
    };
    let mut there = Lathe::new(spec, 1);
    let mut back = Lathe::new(spec, 1);
    let start = there.angle();
    there.select(500.0);
    back.select(500.0);
    there.motor(MotorSwitch::Forward);
    back.motor(MotorSwitch::Reverse);
    for s in 1..5 {
        run(&mut there, f64::from(s));
        run(&mut back, f64::from(s));
        assert_eq!(there.smooth_rpm(), -back.smooth_rpm());
        assert!((there.angle() - start + back.angle() - start).abs() < 1e-9);
    }
    // Straight into reverse: through standstill and up again.
    there.motor(MotorSwitch::Reverse);
    run(&mut there, 8.0);
    assert!((there.smooth_rpm() - back.smooth_rpm()).abs() < 2.0);
}

#[test]
fn ripple_has_its_size_and_its_frequencies() {
    let spec = LatheSpec {
        mains_wander: 0.0,
        turn_ripple: 0.003,
        belt_ripple: 0.002,
        ..LatheSpec::default()
    };
    let mut lathe = running(spec, 500.0);
    let (mut low, mut high) = (f64::MAX, f64::MIN);
    for ms in 4000..20_000 {
        run(&mut lathe, f64::from(ms) * 1e-3);
        let ripple = lathe.speed_rpm() / lathe.smooth_rpm() - 1.0;
        low = low.min(ripple);
        high = high.max(ripple);
    }
    assert!((high - 0.005).abs() < 0.0002 && (low + 0.005).abs() < 0.0002);
    let segment = run(&mut lathe, 20.1)[0];
    let belt = 0.23 * 1440.0 / 500.0;
    assert!((segment.ripple.belt.per_turn - belt).abs() < 1e-12);
}

#[test]
fn the_mains_wander_shows_in_the_speed() {
    let mut lathe = running(LatheSpec::default(), 1000.0);
    // Let the belt's creep settle first, or it would pass for wander.
    run(&mut lathe, 1500.0);
    let (mut low, mut high) = (f64::MAX, f64::MIN);
    for s in 1500..1700 {
        run(&mut lathe, f64::from(s));
        low = low.min(lathe.smooth_rpm());
        high = high.max(lathe.smooth_rpm());
    }
    let spread = (high - low) / high;
    assert!((0.002..0.0042).contains(&spread), "{spread}");
}

#[test]
fn a_regulated_drive_holds_its_setting() {
    let drive = DriveSpec::default();
    let spec = LatheSpec {
        feed: Feed::Regulated(drive),
        belt_slip: 0.0,
        belt_creep: 0.0,
        ..LatheSpec::default()
    };
    let mut lathe = Lathe::new(spec, 1);
    // A range with 1000 rpm at the base speed: 1000 rpm/s of the motor are 694 rpm/s of the spindle.
    lathe.select(1000.0);
    lathe.set_speed(700.0);
    lathe.motor(MotorSwitch::Forward);
    run(&mut lathe, 0.5);
    assert!((lathe.smooth_rpm() / 347.2 - 1.0).abs() < 0.03);
    run(&mut lathe, 3.0);
    assert!((lathe.smooth_rpm() / 700.0 - 1.0).abs() < 0.005);
    // Rated torque costs the droop: 0.5 % of 1000 rpm, less what friction took before.
    lathe.cut(steady(7.0));
    run(&mut lathe, 5.0);
    let loaded = lathe.smooth_rpm();
    assert!((692.0..699.0).contains(&loaded), "{loaded}");
    // Above the base speed the power is the limit: overload x rated power, whatever the cut asks for.
    lathe.cut(steady(3.0));
    lathe.set_speed(2000.0);
    run(&mut lathe, 10.0);
    assert!((lathe.smooth_rpm() / 2000.0 - 1.0).abs() < 0.01);
    lathe.cut(steady(12.0));
    run(&mut lathe, 14.0);
    let power = lathe.motor_torque() * lathe.motor_rpm() * TAU / 60.0;
    assert!((power / (1.5 * 1100.0) - 1.0).abs() < 0.01, "{power}");
    assert!(lathe.smooth_rpm() < 1900.0);
    // Stopping: down the ramp, then let go.
    lathe.cut(None);
    lathe.motor(MotorSwitch::Off);
    run(&mut lathe, 20.0);
    assert_eq!(lathe.smooth_rpm(), 0.0);
    assert_eq!(lathe.motor_torque(), 0.0);
}

#[test]
fn short_steps_give_the_same_motion() {
    let story = |chop_ns: u64| {
        let spec = LatheSpec {
            mains_wander: 0.0,
            ..LatheSpec::default()
        };
        let mut lathe = Lathe::new(spec, 1);
        lathe.select(500.0);
        lathe.motor(MotorSwitch::Forward);
        let mut speeds = Vec::new();
        for ms in 0..3000 {
            match ms {
                1000 => lathe.cut(cut(
                    4.0,
                    Engagement::Interrupted {
                        times: 6,
                        share: 0.7,
                    },
                )),
                2000 => lathe.plug(),
                _ => {}
            }
            let mut at = ms * 1_000_000;
            while at < (ms + 1) * 1_000_000 {
                at += chop_ns;
                lathe.advance(Instant::from_nanos(at), &mut |_| {});
            }
            speeds.push(lathe.smooth_rpm());
        }
        speeds
    };
    let (coarse, fine) = (story(1_000_000), story(15_625));
    for (coarse, fine) in coarse.iter().zip(&fine) {
        assert!((coarse - fine).abs() < 0.0004 * 500.0, "{coarse} {fine}");
    }
}

#[test]
fn a_motor_far_stiffer_than_the_step_settles_without_ringing() {
    // Nothing but a tiny rotor on a steep curve: the exact answer is an exponential far faster than a step.
    let spec = LatheSpec {
        motor_inertia: 1e-6,
        spindle_inertia: 1e-6,
        ..LatheSpec::default().without_losses()
    };
    let mut lathe = Lathe::new(spec, 1);
    lathe.select(1440.0);
    lathe.motor(MotorSwitch::Forward);
    run(&mut lathe, 1.0);
    assert!((lathe.smooth_rpm() - 1500.0).abs() < 0.01);
    // A load comes and goes: the new speed is there within a few steps, and stays.
    let motor = spec.motor;
    lathe.cut(steady(motor.rated_torque()));
    run(&mut lathe, 1.005);
    for segment in run(&mut lathe, 1.02) {
        assert!((segment.speed * 60.0 - motor.rated_rpm).abs() < 0.1);
    }
    lathe.cut(None);
    run(&mut lathe, 1.025);
    for segment in run(&mut lathe, 1.04) {
        assert!((segment.speed * 60.0 - 1500.0).abs() < 0.1);
    }
}

#[test]
fn the_same_seed_gives_the_same_run() {
    let end = |seed| {
        let mut lathe = Lathe::new(LatheSpec::default(), seed);
        lathe.select(800.0);
        lathe.motor(MotorSwitch::Forward);
        run(&mut lathe, 9.0);
        (lathe.speed_rpm().to_bits(), lathe.angle().to_bits())
    };
    assert_eq!(end(5), end(5));
    assert_ne!(end(5), end(6));
}

#[test]
fn nonsense_on_the_controls_is_harmless() {
    let mut lathe = running(LatheSpec::default(), 500.0);
    for x in [f64::NAN, f64::INFINITY, -f64::INFINITY, -1.0] {
        lathe.brake(x);
        lathe.set_speed(x);
        lathe.select(x);
    }
    run(&mut lathe, 4.5);
    assert!(lathe.smooth_rpm().is_finite());
}

/// Ten turns by hand are ten turns, uneven, forwards, and end at rest; a hand waits until the spindle stands, and lets go when
/// the motor is switched.
#[test]
fn a_hand_turns_the_spindle_pull_by_pull() {
    for seed in 0..20 {
        let mut lathe = Lathe::new(LatheSpec::default(), seed);
        lathe.select(280.0);
        let from = lathe.angle();
        lathe.turn_by_hand(10.0);
        let segments = run(&mut lathe, 120.0);
        let turned = lathe.angle() - from;
        assert!((turned - 10.0).abs() < 1e-3, "{turned}");
        assert!(segments.iter().all(|s| s.speed >= 0.0));
        let fastest = segments.iter().map(|s| 60.0 * s.speed).fold(0.0, f64::max);
        assert!((20.0..=60.1).contains(&fastest), "{fastest}");
        let rests = segments
            .windows(2)
            .filter(|s| s[0].speed > 0.0 && s[1].is_still());
        assert!((20..=70).contains(&rests.count()));
        assert!(lathe.smooth_rpm() == 0.0);
    }
    let mut lathe = Lathe::new(LatheSpec::default(), 1);
    lathe.select(280.0);
    lathe.motor(MotorSwitch::Forward);
    run(&mut lathe, 5.0);
    lathe.turn_by_hand(1.0);
    assert_eq!(lathe.switch(), MotorSwitch::Off);
    run(&mut lathe, 5.02);
    assert!(lathe.smooth_rpm() > 200.0, "it coasts");
    run(&mut lathe, 60.0);
    assert!(lathe.smooth_rpm() == 0.0);
    lathe.turn_by_hand(10.0);
    run(&mut lathe, 62.0);
    lathe.motor(MotorSwitch::Forward);
    run(&mut lathe, 70.0);
    assert!(lathe.smooth_rpm() > 250.0, "the motor runs");
}
