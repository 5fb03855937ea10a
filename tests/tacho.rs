//! The tacho against captures whose true speed is known at every instant: steady speeds, faults, stops and starts.
//!
//! The rules are those of `rimrate_core::tacho`; the captures come from the simulator's analytic speed profiles.

use proptest::prelude::*;
use rimrate_core::machine;
use rimrate_core::tacho::{Config, Reading, Signal, Tacho};
use rimrate_core::time::{Duration, Edge, Instant};
use rimrate_core::units::Rpm;
use rimrate_sim::sensor::profile::Piece;
use rimrate_sim::sensor::{Fault, SensorSpec};
use rimrate_tests::capture::{BRAKE, Capture, PLACED_2, PLACED_6};

fn rpm(reading: &Reading) -> f64 {
    reading.speed.map_or(f64::NAN, |n| f64::from(n.get()))
}

/// Largest relative error of the rows after `from`, all of which must be turning.
fn worst_after(capture: &Capture, from: f64) -> f64 {
    let mut worst = 0.0_f64;
    for (at, reading, _) in capture.rows().into_iter().filter(|(at, ..)| *at >= from) {
        assert_eq!(reading.signal, Signal::Turning, "at {at} s: {reading:?}");
        let truth = capture.truth(at);
        worst = worst.max((rpm(&reading) / truth - 1.0).abs());
    }
    worst
}

#[test]
fn a_steady_speed_reads_within_a_thousandth() {
    for (pulses, placement) in [
        (1, &[][..]),
        (2, PLACED_2),
        (4, &[0.5, -0.5]),
        (6, PLACED_6),
        (60, &[]),
    ] {
        for speed in [20.0, 45.0, 112.0, 333.0, 800.0, 1777.0, 3000.0, 6000.0] {
            let settling = f64::max(1.0, 5.0 * 60.0 / speed);
            let capture = Capture::new(pulses)
                .placed(placement)
                .then(Piece::steady(speed, settling + 3.0 * 60.0 / speed + 2.0));
            let worst = worst_after(&capture, settling);
            assert!(worst < 1e-3, "{pulses} pulses, {speed} rpm: {worst:.2e}");
        }
    }
}

#[test]
fn ten_rpm_reads_with_four_pulses() {
    let capture = Capture::new(4)
        .placed(&[1.0, -1.0, 0.0, 0.5])
        .then(Piece::steady(10.0, 60.0));
    let worst = worst_after(&capture, 20.0);
    assert!(worst < 1e-3, "{worst:.2e}");
}

#[test]
fn ripple_leaves_the_reading_near_its_size() {
    for pulses in [1, 2, 6, 60] {
        let capture = Capture::new(pulses)
            .rippled(0.003)
            .then(Piece::steady(640.0, 20.0));
        let worst = worst_after(&capture, 1.0);
        assert!(worst < 0.005, "{pulses} pulses: {worst:.2e}");
    }
}

#[test]
fn a_reading_never_exceeds_what_silence_allows() {
    for (pulses, placement) in [(1, &[][..]), (2, PLACED_2), (6, PLACED_6)] {
        for seed in 0..20_u64 {
            let speed = 60.0 + 97.0 * seed as f64;
            let capture = Capture::new(pulses)
                .placed(placement)
                .seeded(seed, seed as f64 * 0.07)
                .then(Piece::ramp(0.0, speed, 700.0))
                .then(Piece::steady(speed, 1.0))
                .then(Piece::ramp(speed, 0.0, 300.0))
                .then(Piece::steady(0.0, 8.0));
            for (at, reading, silence) in capture.rows() {
                let bound = 60.0 / f64::from(pulses) / silence;
                // The largest gap between magnets may be wider than the mean by their placement errors.
                let gap = if pulses == 1 { 1.0 } else { 1.12 };
                if let Some(speed) = reading.speed {
                    assert!(
                        f64::from(speed.get()) <= bound * gap * 1.006,
                        "{pulses} pulses at {at} s: {reading:?}, bound {bound}"
                    );
                }
            }
        }
    }
}

/// From the formula: above this speed a stop takes longer than the gap between magnets, rpm.
fn can_be_known_above(pulses: u32) -> f64 {
    60.0 * (2.0 * BRAKE / 60.0 / f64::from(pulses)).sqrt()
}

#[test]
fn a_dead_sensor_is_lost_in_time_and_stays_lost() {
    for (pulses, placement) in [(1, &[][..]), (2, PLACED_2), (6, PLACED_6), (60, &[])] {
        for factor in [1.2, 1.5, 2.0, 4.0, 8.0] {
            let speed = can_be_known_above(pulses) * factor;
            if speed > 6000.0 {
                continue;
            }
            let dies = f64::max(3.0, 6.0 * 60.0 / speed);
            let capture = Capture::new(pulses)
                .placed(placement)
                .then(Piece::steady(speed, dies))
                .with(Piece::steady(speed, 40.0), &[(Fault::StuckHigh, true)]);
            let four = 4.0 * 60.0 / speed / f64::from(pulses);
            for (at, reading, silence) in capture.rows() {
                let context = format!(
                    "{pulses} pulses, {speed:.0} rpm, at {at} s, silent for {silence:.3} s: {reading:?}"
                );
                if silence > f64::max(0.5, four * 1.02) + 0.011 && at > dies {
                    assert_eq!(reading.signal, Signal::Lost, "{context}");
                    assert_eq!(reading.speed, None);
                } else if at > 1.0 && at < dies {
                    assert_eq!(reading.signal, Signal::Turning, "{context}");
                } else if at > 1.0 {
                    assert_ne!(reading.signal, Signal::Still, "{context}");
                }
            }
        }
    }
}

#[test]
fn a_stop_at_the_braking_limit_is_never_lost() {
    for (pulses, placement) in [
        (1, &[][..]),
        (2, PLACED_2),
        (3, &[0.0, 2.0, -1.0]),
        (6, PLACED_6),
        (60, &[]),
    ] {
        for seed in 0..60_u64 {
            let speed = 30.0 * 1.093_f64.powi(seed as i32);
            for start in [0.0, 0.31, 0.77] {
                let capture = Capture::new(pulses)
                    .placed(placement)
                    .rippled(0.002)
                    .seeded(seed, start)
                    .then(Piece::ramp(0.0, speed, 900.0))
                    .then(Piece::steady(speed, 1.0 + 0.013 * seed as f64))
                    .then(Piece::ramp(speed, 0.0, BRAKE))
                    .then(Piece::steady(0.0, 8.0));
                for (at, reading, _) in capture.rows() {
                    assert_ne!(
                        reading.signal,
                        Signal::Lost,
                        "{pulses} pulses from {speed:.1} rpm, start {start}, at {at} s"
                    );
                }
                let last = capture.rows().last().unwrap().1;
                assert_eq!(
                    last.signal,
                    Signal::Still,
                    "{pulses} pulses from {speed:.1} rpm"
                );
            }
        }
    }
}

#[test]
fn a_jog_that_is_braked_at_once_is_never_lost() {
    for pulses in [1, 2, 6, 60] {
        for seed in 0..60_u64 {
            let speed = 20.0 * 1.09_f64.powi(seed as i32);
            let capture = Capture::new(pulses)
                .seeded(seed, 0.137 * seed as f64)
                .then(Piece::ramp(0.0, speed, 1500.0 + 40.0 * seed as f64))
                .then(Piece::ramp(speed, 0.0, BRAKE))
                .then(Piece::steady(0.0, 7.0));
            for (at, reading, _) in capture.rows() {
                assert_ne!(
                    reading.signal,
                    Signal::Lost,
                    "{pulses} pulses to {speed:.1} rpm, at {at} s"
                );
            }
        }
    }
}

#[test]
fn a_stopped_spindle_is_still_after_one_period_of_the_slowest_speed() {
    for pulses in [1, 2, 4, 6] {
        for speed in [30.0, 150.0, 400.0] {
            let capture = Capture::new(pulses)
                .then(Piece::steady(speed, 12.0))
                .then(Piece::ramp(speed, 0.0, 2000.0))
                .then(Piece::steady(0.0, 8.0));
            for (at, reading, silence) in capture.rows() {
                if silence > 6.0 / f64::from(pulses) * 1.005 + 0.011 && at > 12.0 {
                    assert_eq!(
                        reading.signal,
                        Signal::Still,
                        "{pulses} pulses from {speed} rpm at {at} s"
                    );
                    assert_eq!(rpm(&reading), 0.0);
                }
            }
        }
    }
}

#[test]
fn signal_comes_back_after_a_loss() {
    let capture = Capture::new(2)
        .placed(PLACED_2)
        .then(Piece::steady(800.0, 3.0))
        .with(Piece::steady(800.0, 5.0), &[(Fault::StuckHigh, true)])
        .with(Piece::steady(800.0, 3.0), &[(Fault::StuckHigh, false)]);
    let rows = capture.rows();
    let at = |t: f64| rows.iter().find(|(at, ..)| *at >= t).unwrap().1;
    assert_eq!(at(7.9).signal, Signal::Lost);
    // Three pulses make two intervals that agree with the last speed: 0.12 s at the latest.
    assert_eq!(at(8.2).signal, Signal::Turning);
    assert!((rpm(&at(9.0)) / 800.0 - 1.0).abs() < 1e-3);
}

#[test]
fn a_parked_magnet_that_shakes_is_still() {
    for fault in [Fault::ShakeRegular, Fault::ShakeRandom] {
        for (turned_before, low) in [
            (true, 0.5),
            (true, 0.25),
            (true, 0.75),
            (false, 0.5),
            (false, 0.45),
        ] {
            for pulses in [1, 2, 6] {
                let mut capture = Capture::new(pulses).seeded(u64::from(pulses), 0.11);
                // Six magnets are low for a fifth of the time while they turn: shaking must differ from that.
                capture.sensor.shake_low = if pulses == 6 {
                    f64::max(low, 0.45)
                } else {
                    low
                };
                let before = if turned_before { 20.0 } else { 0.0 };
                if turned_before {
                    capture = capture
                        .then(Piece::steady(300.0, 5.0))
                        .then(Piece::ramp(300.0, 0.0, 500.0))
                        .then(Piece::steady(0.0, before - 5.6));
                }
                let capture = capture.with(Piece::steady(0.0, 600.0), &[(fault, true)]);
                let wrong: Vec<f64> = capture
                    .rows()
                    .into_iter()
                    .filter(|(at, reading, _)| *at > before && reading.signal != Signal::Still)
                    .map(|(at, ..)| at)
                    .collect();
                assert!(
                    wrong.is_empty(),
                    "{fault:?}, low {low}, {pulses} pulses, turned before {turned_before}: {} rows, first {:?}",
                    wrong.len(),
                    wrong.first()
                );
            }
        }
    }
}

#[test]
fn shaking_that_begins_as_the_spindle_stops_ends_in_still() {
    for fault in [Fault::ShakeRegular, Fault::ShakeRandom] {
        for pulses in [1, 2, 6] {
            for speed in [100.0, 300.0, 900.0] {
                let capture = Capture::new(pulses)
                    .then(Piece::steady(speed, 5.0))
                    .then(Piece::ramp(speed, 0.0, 1000.0))
                    .with(Piece::steady(0.0, 30.0), &[(fault, true)]);
                for (at, reading, _) in capture
                    .rows()
                    .into_iter()
                    .filter(|(at, ..)| *at > 5.0 + speed / 1000.0 + 7.0)
                {
                    assert_eq!(
                        reading.signal,
                        Signal::Still,
                        "{fault:?}, {pulses} pulses from {speed} rpm at {at} s"
                    );
                }
            }
        }
    }
}

/// The box still waits for the next pulse of a slow spindle when the parked magnet begins to shake at random.
#[test]
fn shaking_that_begins_soon_after_a_stop_shows_no_speed() {
    let mut wrong = Vec::new();
    for pulses in [1, 2, 3] {
        for wait in [1.0, 2.0, 3.0, 5.0] {
            // What silence allows by then, with one pulse missing.
            let most = f64::max(60.0, 2.2 * 60.0 / wait / f64::from(pulses));
            for seed in 0..40 {
                let mut capture = Capture::new(pulses).seeded(seed, 0.11 * seed as f64);
                capture.sensor.width = 0.12 * 360.0 / f64::from(pulses);
                let capture = capture
                    .then(Piece::steady(300.0, 5.0))
                    .then(Piece::ramp(300.0, 0.0, 1000.0))
                    .then(Piece::steady(0.0, wait))
                    .with(Piece::steady(0.0, 20.0), &[(Fault::ShakeRandom, true)]);
                let begins = 5.3 + wait;
                let fastest = capture
                    .rows()
                    .into_iter()
                    .filter(|(at, ..)| *at > begins)
                    .map(|(_, reading, _)| reading.quick.map_or(0.0, |n| f64::from(n.get())))
                    .fold(0.0, f64::max);
                if fastest > most {
                    wrong.push((pulses, wait, seed, fastest));
                }
            }
        }
    }
    // Chance may shake as a spindle turns: seldom.
    assert!(wrong.len() <= 480 / 50, "{} of 480: {wrong:?}", wrong.len());
}

#[test]
fn chatter_noise_and_missed_pulses_do_not_move_the_reading() {
    type Prepare = fn(&mut SensorSpec);
    let cases: [(&str, Fault, Prepare); 3] = [
        ("chatter", Fault::Chatter, |_| {}),
        ("60 spikes a second", Fault::Spikes, |s| s.spike_rate = 60.0),
        ("3 % missing", Fault::Dropouts, |s| s.dropout = 0.03),
    ];
    for (name, fault, prepare) in cases {
        for pulses in [1, 2, 6] {
            for speed in [180.0, 800.0, 2400.0] {
                let mut capture = Capture::new(pulses);
                prepare(&mut capture.sensor);
                let mut wrong = 0;
                let capture = capture
                    .then(Piece::steady(speed, 2.0))
                    .with(Piece::steady(speed, 60.0), &[(fault, true)]);
                let rows = capture.rows();
                let spacing = 60.0 / speed / f64::from(pulses);
                for (_, reading, silence) in rows.iter().filter(|(at, ..)| *at > 2.0) {
                    // While a pulse is missing, what silence allows goes down: that rule wins over a calm reading.
                    let bounded = fault == Fault::Dropouts && *silence > spacing;
                    let quick = f64::from(reading.quick.map_or(f32::NAN, |n| n.get()));
                    let calm = if bounded { quick } else { rpm(reading) };
                    wrong += u32::from(
                        reading.signal != Signal::Turning
                            || (calm / speed - 1.0).abs() > 2e-3
                            || (quick / speed - 1.0).abs() > 0.05,
                    );
                }
                let share = f64::from(wrong) / rows.len() as f64;
                // Several missing pulses close together look like a slower spindle until the rhythm returns.
                let allowed = if fault == Fault::Dropouts {
                    0.01
                } else {
                    0.001
                };
                assert!(
                    share < allowed,
                    "{name}, {pulses} pulses, {speed} rpm: {:.2} % of rows wrong",
                    100.0 * share
                );
            }
        }
    }
}

#[test]
fn a_start_under_noise_is_read() {
    for pulses in [1, 2, 6] {
        let mut capture = Capture::new(pulses);
        capture.sensor.spike_rate = 60.0;
        let capture = capture
            .with(Piece::steady(0.0, 2.0), &[(Fault::Spikes, true)])
            .then(Piece::ramp(0.0, 800.0, 800.0))
            .then(Piece::steady(800.0, 5.0));
        let worst = worst_after(&capture, 6.0);
        assert!(worst < 2e-3, "{pulses} pulses: {worst:.2e}");
    }
}

#[test]
fn one_of_two_magnets_gone_is_doubtful_and_the_higher_speed_is_assumed() {
    let capture = Capture::new(2)
        .then(Piece::steady(800.0, 3.0))
        .with(Piece::steady(800.0, 20.0), &[(Fault::MagnetLost(0), true)]);
    for (at, reading, _) in capture.rows() {
        if at > 6.0 {
            assert_eq!(reading.signal, Signal::Doubtful, "at {at} s");
            assert!(
                reading.quick.is_some_and(|n| n.get() > 600.0),
                "at {at} s: {reading:?}"
            );
        }
        assert_ne!(reading.signal, Signal::Lost);
    }
}

#[test]
fn a_steady_speed_that_no_step_explains_is_doubtful() {
    let capture = Capture::new(2).then(Piece::steady(400.0, 10.0));
    let (edges, end) = capture.edges();
    let mut tacho = Tacho::new(capture.config());
    edges.into_iter().for_each(|edge| tacho.push(edge));
    let only_800 = |n: Rpm| (700.0..850.0).contains(&n.get());
    let reading = tacho.reading(end, only_800);
    assert_eq!(reading.signal, Signal::Doubtful);
    assert!(
        (reading.quick.unwrap().get() - 800.0).abs() < 1.0,
        "the speed with a magnet gone: {reading:?}"
    );
}

/// A slow wobble within the ripple floor puts off no doubt: it is neither a line nor another speed.
#[test]
fn a_speed_that_wobbles_and_that_no_step_explains_is_doubtful() {
    let rpm = 345.0;
    for (pulses, period) in [(1, 2.0), (2, 2.0), (2, 3.0), (6, 4.0), (2, 6.0), (6, 10.0)] {
        let capture = Capture::new(pulses)
            .rippled(0.003)
            .belt(60.0 / (rpm * period))
            .then(Piece::steady(rpm, 40.0));
        let mut tacho = Tacho::new(capture.config());
        let (mut looks, mut doubts, mut next) = (0, 0, 3.0);
        capture.play(&mut |edge| {
            let at = edge.at.nanos() as f64 / 1e9;
            if at >= next {
                next = at + 0.02;
                looks += 1;
                let reading = tacho.reading(edge.at, |_| false);
                doubts += usize::from(reading.signal == Signal::Doubtful);
            }
            tacho.push(edge);
        });
        let share = f64::from(doubts as u32) / f64::from(looks);
        println!("{pulses} pulses, {period} s: {share}");
        assert!(share > 0.95, "{pulses} pulses, {period} s: {share}");
    }
}

/// Fine teeth that pass wide, and a long pause before the next one: the product of interval and share is past 32 bits.
#[test]
fn a_wide_tooth_after_a_pause_of_seconds_is_a_pulse() {
    for pause in [3.0, 4.0, 4.2, 4.29, 4.3, 5.0] {
        let mut capture = Capture::new(24);
        capture.sensor.width = 0.75 * 360.0 / 24.0;
        let capture = capture.then(Piece::steady(120.0, 5.0));
        let (edges, end) = capture.edges();
        let mut tacho = Tacho::new(capture.config());
        edges.into_iter().for_each(|edge| tacho.push(edge));
        let before = tacho.rejected();
        let later = |s: f64| end + Duration::from_secs_f32((pause + s) as f32);
        tacho.push(Edge::rise(later(-0.5 * pause)));
        tacho.push(Edge::fall(later(0.0)));
        tacho.push(Edge::rise(later(0.001)));
        assert_eq!(tacho.rejected().shaken, before.shaken, "{pause} s");
    }
}

/// A magnet that passes in a five-hundredth of the spacing, or in less.
#[test]
fn narrow_magnets_are_read() {
    for (pulses, share) in [(1, 0.0015), (1, 0.002), (2, 0.004), (6, 0.0043), (6, 0.002)] {
        for speed in [60.0, 600.0, 3000.0] {
            let mut capture = Capture::new(pulses).jitter(0.0);
            capture.sensor.width = share * 360.0 / f64::from(pulses);
            capture.sensor.hysteresis = capture.sensor.width / 4.0;
            let capture = capture.then(Piece::steady(speed, 20.0));
            let worst = worst_after(&capture, 15.0);
            assert!(worst < 1e-3, "{pulses} pulses, {share}: {worst:.2e}");
        }
    }
}

/// Somebody moves the sensor while the machine stands: the magnets pass twice, or half, as wide as before.
#[test]
fn a_sensor_that_was_moved_is_read_again() {
    for pulses in [1, 2, 6, 12, 60] {
        for factor in [0.4, 2.0, 3.0] {
            let mut capture = Capture::new(pulses);
            capture.sensor.width = 0.05 * 360.0 / f64::from(pulses);
            let before = capture.clone().then(Piece::steady(600.0, 20.0));
            capture.sensor.width *= factor;
            let after = capture.then(Piece::steady(600.0, 5.0));
            let mut tacho = Tacho::new(before.config());
            let end = before.play(&mut |edge| tacho.push(edge));
            let later = (end + Duration::from_secs(10)).since(Instant::ZERO);
            let _ = tacho.reading(end + Duration::from_secs(9), |_| true);
            let end = after.play(&mut |edge| {
                tacho.push(Edge {
                    at: edge.at + later,
                    ..edge
                });
            });
            let reading = tacho.reading(end + later, |_| true);
            assert_eq!(reading.signal, Signal::Turning, "{pulses} pulses, {factor}");
            let off = (rpm(&reading) / 600.0 - 1.0).abs();
            assert!(off < 1e-3, "{pulses} pulses, {factor}: {off:.2e}");
        }
    }
}

/// Spikes that run into one another are not as wide as they lie apart.
#[test]
fn a_slow_spindle_is_read_under_spikes() {
    for (pulses, share) in [(1, 0.10), (2, 0.20), (1, 0.05), (2, 0.10)] {
        for seed in 0..10 {
            let mut capture = Capture::new(pulses).seeded(seed, 0.2);
            capture.sensor.width = share * 360.0 / f64::from(pulses);
            capture.sensor.spike_rate = 60.0;
            let capture = capture
                .then(Piece::steady(60.0, 10.0))
                .with(Piece::steady(60.0, 60.0), &[(Fault::Spikes, true)]);
            let worst = worst_after(&capture, 6.0);
            assert!(
                worst < 0.02,
                "{pulses} pulses, {share}, seed {seed}: {worst:.2e}"
            );
        }
    }
}

/// Turned slowly by hand, then the motor: no tooth of a wheel is taken for an extra one for long.
#[test]
fn a_wheel_that_was_turned_slowly_and_then_starts_is_read_soon() {
    let capture = Capture::new(8)
        .then(Piece::steady(10.5, 20.0))
        .then(Piece::ramp(10.5, 600.0, 1000.0))
        .then(Piece::steady(600.0, 3.0));
    let worst = worst_after(&capture, 20.0 + 0.59 + 1.0);
    assert!(worst < 0.01, "{worst:.2e}");
}

#[test]
fn a_runaway_is_shown_at_its_real_speed() {
    let capture = Capture::new(1)
        .then(Piece::steady(500.0, 2.0))
        .then(Piece::ramp(500.0, 50_000.0, 5_000.0))
        .then(Piece::steady(50_000.0, 1.0));
    let last = capture.rows().last().unwrap().1;
    assert!((rpm(&last) / 50_000.0 - 1.0).abs() < 1e-3, "{last:?}");
}

#[test]
fn the_input_limit_of_20000_pulses_a_second_is_read() {
    let capture = Capture::new(60)
        .then(Piece::ramp(0.0, 19_900.0, 10_000.0))
        .then(Piece::steady(19_900.0, 0.5));
    let last = capture.rows().last().unwrap().1;
    assert!((rpm(&last) / 19_900.0 - 1.0).abs() < 1e-3, "{last:?}");
}

#[test]
fn run_up_and_coast_down_stay_within_the_true_extremes() {
    for pulses in [1, 2, 6, 60] {
        let capture = Capture::new(pulses)
            .then(Piece::ramp(0.0, 1200.0, 600.0))
            .then(Piece::steady(1200.0, 2.0))
            .then(Piece::ramp(1200.0, 300.0, 300.0))
            .then(Piece::steady(300.0, 2.0));
        for (at, reading, _) in capture
            .rows()
            .into_iter()
            .filter(|(_, r, _)| r.signal == Signal::Turning)
        {
            let n = rpm(&reading);
            assert!(
                n <= 1212.0 && (at < 3.0 || n >= 297.0),
                "{pulses} pulses at {at} s: {n}"
            );
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 400, failure_persistence: None, ..ProptestConfig::default() })]

    /// Any edges at all, in any order and state: no panic, no NaN, nothing above what silence allows.
    #[test]
    fn no_edges_break_it(
        steps in prop::collection::vec((0_u64..3_000_000_000, any::<bool>(), 0_u8..20), 0..400),
        pulses in 1_u16..=240,
        brake in 10.0_f32..100_000.0,
        slowest in 1.0_f32..1000.0,
    ) {
        let config = Config {
            pulses: machine::pulses(pulses).unwrap(),
            brake_rpm_per_s: brake,
            slowest: Rpm::new(slowest).unwrap(),
        };
        let mut tacho = Tacho::new(config);
        let mut now = 0_u64;
        for (gap, fall, shrink) in steps {
            now += gap >> shrink;
            let at = Instant::from_nanos(now);
            tacho.push(if fall { Edge::fall(at) } else { Edge::rise(at) });
            let reading = tacho.reading(at + Duration::from_nanos(gap / 2), |n| n.get() < 1e4);
            for n in [reading.speed, reading.quick].into_iter().flatten() {
                prop_assert!(n.get().is_finite() && n.get() >= 0.0);
            }
        }
    }
}

#[test]
fn a_spindle_that_becomes_much_faster_at_once_is_read() {
    for (pulses, slow, fast) in [
        (1, 60.0, 2500.0),
        (2, 52.0, 2500.0),
        (6, 52.0, 2500.0),
        (60, 20.0, 2500.0),
    ] {
        let capture = Capture::new(pulses)
            .then(Piece::steady(slow, 8.0))
            .then(Piece::steady(0.0, 1.0))
            .then(Piece::steady(fast, 3.0));
        let worst = worst_after(&capture, 10.5);
        assert!(worst < 1e-3, "{pulses} pulses: {worst:.2e}");
    }
}

#[test]
fn a_capture_that_ran_over_shows_no_wrong_speed() {
    for pulses in [1, 2, 6, 60] {
        let capture = Capture::new(pulses).then(Piece::steady(640.0, 6.0));
        let (edges, end) = capture.edges();
        let mut tacho = Tacho::new(capture.config());
        // A part of the edges never arrives: 0.2 s and an odd number of them.
        let gap = 3_000_000_000..3_201_234_567;
        let mut told = false;
        let mut read_again = None;
        for edge in edges.into_iter().filter(|e| !gap.contains(&e.at.nanos())) {
            if edge.at.nanos() >= gap.end && !told {
                tacho.capture_lost();
                told = true;
                assert_eq!(tacho.reading(edge.at, |_| true).signal, Signal::Lost);
            }
            tacho.push(edge);
            let reading = tacho.reading(edge.at, |_| true);
            if told && reading.signal == Signal::Turning {
                read_again.get_or_insert(edge.at);
                assert!(
                    (rpm(&reading) / 640.0 - 1.0).abs() < 5e-3,
                    "{pulses} pulses: {reading:?}"
                );
            }
        }
        let turns = (read_again.unwrap().nanos() - gap.end) as f64 / 1e9 * 640.0 / 60.0;
        assert!(
            turns < 4.0,
            "{pulses} pulses: read again after {turns} turns"
        );
        assert!((rpm(&tacho.reading(end, |_| true)) / 640.0 - 1.0).abs() < 1e-3);
    }
}
