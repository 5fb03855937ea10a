//! Edges against analytic motion, and their order under everything at once.

use super::profile::{self, Piece, Profile};
use super::*;
use crate::lathe::{Lathe, LatheSpec, MotorSwitch, Ripple, Wave};
use crate::random::Random;
use rimrate_core::time::{Edge, EdgeKind, Instant};

const FAULTS: [Fault; 8] = [
    Fault::Chatter,
    Fault::Spikes,
    Fault::Dropouts,
    Fault::MagnetLost(0),
    Fault::StuckHigh,
    Fault::StuckLow,
    Fault::ShakeRegular,
    Fault::ShakeRandom,
];

fn times(edges: &[Edge], kind: EdgeKind) -> Vec<u64> {
    edges
        .iter()
        .filter(|edge| edge.kind == kind)
        .map(|edge| edge.at.nanos())
        .collect()
}

fn falls(edges: &[Edge]) -> Vec<u64> {
    times(edges, EdgeKind::Fall)
}

fn ideal(magnets: u32) -> Sensor {
    Sensor::new(SensorSpec::ideal(magnets), 1)
}

fn assert_order(edges: &[Edge]) {
    for pair in edges.windows(2) {
        assert!(pair[0].at < pair[1].at, "{pair:?}");
        assert_ne!(pair[0].kind, pair[1].kind, "{pair:?}");
    }
}

#[test]
fn constant_speed_is_exactly_periodic() {
    for (magnets, rpm) in [(1, 30.0), (2, 800.0), (3, 1234.5), (60, 3000.0)] {
        for way in [1.0, -1.0] {
            let mut sensor = ideal(magnets);
            let edges = profile::edges(&[Piece::steady(way * rpm, 20.0)], &mut sensor);
            assert_order(&edges);
            let falls = falls(&edges);
            let period = 60e9 / (rpm * f64::from(magnets));
            // The first comes half a gap, less half a passage, after the start.
            let passage = 12.0f64.min(120.0 / f64::from(magnets)) / 360.0 * 60e9 / rpm;
            for (k, at) in falls.iter().enumerate() {
                let expected = (k as f64 + 0.5) * period - passage / 2.0;
                assert!((*at as f64 - expected).abs() <= 1.0, "{k} {at} {expected}");
            }
            let rises = times(&edges, EdgeKind::Rise);
            for (fall, rise) in falls.iter().zip(&rises) {
                assert!(((rise - fall) as f64 - passage).abs() <= 1.0);
            }
        }
    }
}

#[test]
fn the_count_over_many_turns_is_exact() {
    // 1000 rpm for an hour and a half with three magnets: 90 000 turns.
    let edges = profile::edges(&[Piece::steady(1000.0, 5400.0)], &mut ideal(3));
    assert_eq!(falls(&edges).len(), 3 * 90_000);
    assert_eq!(edges.len(), 2 * 3 * 90_000);
}

#[test]
fn placement_errors_show_as_they_are() {
    let spec = SensorSpec {
        placement: vec![0.0, 2.0],
        ..SensorSpec::ideal(2)
    };
    let edges = profile::edges(&[Piece::steady(800.0, 10.0)], &mut Sensor::new(spec, 1));
    let falls = falls(&edges);
    let turn = 60e9 / 800.0;
    for (k, pair) in falls.windows(2).enumerate() {
        let gap = (pair[1] - pair[0]) as f64 / turn * 360.0;
        let expected = if k % 2 == 0 { 182.0 } else { 178.0 };
        assert!((gap - expected).abs() < 1e-4, "{k} {gap}");
    }
    // A span over the same magnet is free of them.
    for pair in falls.windows(3) {
        assert!(((pair[2] - pair[0]) as f64 - turn).abs() <= 1.0);
    }
    // An error backwards over the start of the turn only changes the order in which they are counted.
    let spec = SensorSpec {
        placement: vec![-3.0],
        ..SensorSpec::ideal(4)
    };
    let edges = profile::edges(&[Piece::steady(600.0, 2.0)], &mut Sensor::new(spec, 1));
    let first = falls_gap(&edges, 0) / 100e6 * 360.0;
    let last = falls_gap(&edges, 3) / 100e6 * 360.0;
    assert!((first - 93.0).abs() < 1e-4 && (last - 87.0).abs() < 1e-4);
}

fn falls_gap(edges: &[Edge], k: usize) -> f64 {
    let falls = falls(edges);
    (falls[k + 1] - falls[k]) as f64
}

#[test]
fn ramps_cross_at_their_analytic_times() {
    // From rest at a rev/s2 the angle phi is reached at sqrt(2 phi / a); braked to rest at a, phi before the end is passed
    // sqrt(2 phi / a) before the end.
    let a: f64 = 3000.0 / 60.0;
    let take = 6.0 / 360.0;
    let up = profile::edges(&[Piece::ramp(0.0, 3000.0, 3000.0)], &mut ideal(2));
    assert_order(&up);
    let up_falls = falls(&up);
    assert_eq!(up_falls.len(), 50);
    for (k, at) in up_falls.iter().enumerate() {
        let phi = 0.25 + 0.5 * k as f64 - take;
        let expected = (2.0 * phi / a).sqrt() * 1e9;
        assert!((*at as f64 - expected).abs() <= 1.0, "{k} {at} {expected}");
    }
    let down = profile::edges(
        &[Piece::ramp(3000.0, 0.0, 3000.0), Piece::steady(0.0, 5.0)],
        &mut ideal(2),
    );
    let down_falls = falls(&down);
    assert_eq!(down_falls.len(), 50);
    for (k, at) in down_falls.iter().enumerate() {
        // 25 turns in all.
        let phi = 25.0 - (0.25 + 0.5 * k as f64 - take);
        let expected = (1.0 - (2.0 * phi / a).sqrt()) * 1e9;
        assert!((*at as f64 - expected).abs() <= 1.0, "{k} {at} {expected}");
    }
}

#[test]
fn a_piece_may_turn_round() {
    // Up to rest and back again in one piece: the edges mirror in time about the turning point at 1 s.
    let edges = profile::edges(
        &[Piece {
            secs: 2.0,
            from_rpm: 600.0,
            to_rpm: -600.0,
        }],
        &mut ideal(2),
    );
    assert_order(&edges);
    assert!(edges.len() >= 38 && edges.len().is_multiple_of(2));
    for (there, back) in edges.iter().zip(edges.iter().rev()) {
        let sum = there.at.nanos() + back.at.nanos();
        assert!(sum.abs_diff(2_000_000_000) <= 2, "{there:?} {back:?}");
    }
}

#[test]
fn hysteresis_keeps_the_width_and_swallows_small_shakes() {
    let spec = SensorSpec {
        hysteresis: 2.0,
        ..SensorSpec::ideal(1)
    };
    for rpm in [100.0, -100.0] {
        let mut sensor = Sensor::new(spec.clone(), 1);
        let edges = profile::edges(&[Piece::steady(rpm, 3.0)], &mut sensor);
        let (falls, rises) = (falls(&edges), times(&edges, EdgeKind::Rise));
        // 12 degrees at 100 rpm are 20 ms.
        assert!((rises[0] - falls[0]).abs_diff(20_000_000) <= 1);
    }
    // To and fro about the taking point, by less than the hysteresis and by more.
    for (degrees, expected) in [(1.5, 1), (3.0, 20)] {
        let mut sensor = Sensor::new(spec.clone(), 1);
        let mut profile = Profile::new(-(5.0 + degrees * 0.9) / 360.0);
        let mut edges = Vec::new();
        for k in 0..20 {
            let rpm = if k % 2 == 0 { 1.0 } else { -1.0 };
            let piece = Piece::steady(rpm, degrees / 6.0);
            profile.run(&piece, &mut sensor, &mut |edge| edges.push(edge));
        }
        assert_order(&edges);
        assert_eq!(edges.len(), expected, "{degrees}");
    }
}

#[test]
fn ripple_moves_the_edges_where_it_should() {
    let ripple = Ripple {
        turn: Wave {
            share: 0.005,
            per_turn: 1.0,
            phase: 0.3,
        },
        belt: Wave {
            share: 0.003,
            per_turn: 0.37,
            phase: 1.0,
        },
    };
    // The inverse is exact ...
    for k in -2000..2000 {
        let angle = f64::from(k) * 0.0137;
        assert!((ripple.angle(ripple.smooth(angle)) - angle).abs() < 1e-13);
    }
    // ... so at an edge the spindle is where the edge is.
    let mut profile = Profile::new(-0.25);
    profile.ripple = ripple;
    let mut edges = Vec::new();
    let mut sensor = ideal(2);
    profile.run(&Piece::steady(900.0, 30.0), &mut sensor, &mut |edge| {
        edges.push(edge);
    });
    assert_order(&edges);
    for (k, at) in falls(&edges).iter().enumerate() {
        let smooth = -0.25 + *at as f64 * 1e-9 * 15.0;
        let expected = 0.5 * k as f64 - 6.0 / 360.0;
        // 1 ns at 15 rev/s.
        assert!((ripple.angle(smooth) - expected).abs() < 1.6e-8);
    }
}

#[test]
fn the_lathe_and_the_sensor_agree() {
    let mut lathe = Lathe::new(LatheSpec::default(), 3);
    let mut sensor = ideal(2);
    lathe.select(800.0);
    lathe.motor(MotorSwitch::Forward);
    let start = lathe.angle();
    let mut edges = Vec::new();
    for ms in 1..=30_000 {
        if ms == 9_000 {
            lathe.select(400.0);
        }
        if ms == 20_000 {
            lathe.motor(MotorSwitch::Reverse);
        }
        if ms == 20_000 {
            // Forwards all the way so far: two pulses a turn.
            let turned = lathe.angle() - start;
            let count = falls(&edges).len() as f64;
            assert!((count - 2.0 * turned).abs() <= 1.0, "{count} {turned}");
            assert!(turned > 150.0);
        }
        let before = lathe.angle();
        let from = edges.len();
        lathe.advance(Instant::from_nanos(ms * 1_000_000), &mut |segment| {
            sensor.sense(segment, &mut |edge: Edge| edges.push(edge));
        });
        // Every edge of the millisecond lies at an angle that the spindle swept in it.
        let (low, high) = (before.min(lathe.angle()), before.max(lathe.angle()));
        for edge in &edges[from..] {
            assert!(edge.at.nanos().div_ceil(1_000_000) >= ms - 1);
            let off = [-6.0, 6.0].map(|degrees| {
                let nearest = (before * 2.0 - degrees / 180.0).round() / 2.0 + degrees / 360.0;
                (low - 1e-6..=high + 1e-6).contains(&nearest)
            });
            assert!(off[0] || off[1], "{edge:?} {low} {high}");
        }
    }
    assert_order(&edges);
    assert!(lathe.smooth_rpm() < -390.0);
}

#[test]
fn jitter_has_its_size_and_never_comes_early() {
    let exact = profile::edges(&[Piece::steady(600.0, 500.0)], &mut ideal(2));
    for (ns, degrees) in [(5_000.0, 0.0), (0.0, 0.02)] {
        let spec = SensorSpec {
            jitter_ns: ns,
            jitter_deg: degrees,
            ..SensorSpec::ideal(2)
        };
        // 600 rpm are 3.6 degrees in a millisecond.
        let sigma = ns + degrees / 3.6e-6;
        let edges = profile::edges(&[Piece::steady(600.0, 500.0)], &mut Sensor::new(spec, 1));
        assert_order(&edges);
        assert_eq!(edges.len(), exact.len());
        let late: Vec<f64> = edges
            .iter()
            .zip(&exact)
            .map(|(edge, exact)| edge.at.nanos() as f64 - exact.at.nanos() as f64)
            .collect();
        assert!(late.iter().all(|late| *late >= 0.0));
        let n = late.len() as f64;
        let mean = late.iter().sum::<f64>() / n;
        let variance = late.iter().map(|late| (late - mean).powi(2)).sum::<f64>() / n;
        assert!((mean / (4.0 * sigma) - 1.0).abs() < 0.01, "{mean} {sigma}");
        assert!((variance.sqrt() / sigma - 1.0).abs() < 0.03);
    }
}

#[test]
fn a_lost_magnet_leaves_the_other() {
    let mut sensor = ideal(2);
    sensor.set(Fault::MagnetLost(1), true);
    let edges = profile::edges(&[Piece::steady(600.0, 10.0)], &mut sensor);
    let falls_ = falls(&edges);
    assert_eq!(falls_.len(), 100);
    assert!(
        falls_
            .windows(2)
            .all(|w| (w[1] - w[0]).abs_diff(100_000_000) <= 1)
    );
}

#[test]
fn dropouts_come_at_their_rate() {
    let mut sensor = ideal(2);
    sensor.set(Fault::Dropouts, true);
    let edges = profile::edges(&[Piece::steady(600.0, 1000.0)], &mut sensor);
    assert_order(&edges);
    let missing = 20_000 - falls(&edges).len();
    // 5 % of 20 000, five standard deviations.
    assert!(missing.abs_diff(1000) < 155, "{missing}");
}

#[test]
fn spikes_come_at_their_rate_and_width() {
    let mut sensor = ideal(1);
    sensor.set(Fault::Spikes, true);
    let edges = profile::edges(&[Piece::steady(0.0, 500.0)], &mut sensor);
    assert_order(&edges);
    let falls_ = falls(&edges);
    // 20 a second for 500 s, five standard deviations.
    assert!(falls_.len().abs_diff(10_000) < 500, "{}", falls_.len());
    let rises = times(&edges, EdgeKind::Rise);
    for (fall, rise) in falls_.iter().zip(&rises) {
        // Two that overlap make one that is longer.
        assert!(rise - fall <= 40_000);
    }
}

#[test]
fn chatter_splits_edges_within_its_zone() {
    let mut sensor = ideal(2);
    sensor.set(Fault::Chatter, true);
    let clean = profile::edges(&[Piece::steady(600.0, 10.0)], &mut ideal(2));
    let edges = profile::edges(&[Piece::steady(600.0, 10.0)], &mut sensor);
    assert_order(&edges);
    // One to three extra pieces an edge.
    let pieces = edges.len() as f64 / clean.len() as f64;
    assert!((4.5..5.5).contains(&pieces), "{pieces}");
    // Half a degree at 3600 degrees/s.
    let zone = 138_890;
    let mut k = 0;
    for edge in &edges {
        while k + 1 < clean.len() && clean[k + 1].at <= edge.at {
            k += 1;
        }
        assert!(edge.at.nanos() - clean[k].at.nanos() <= zone);
    }
    // The first piece is the edge itself.
    assert!(clean.iter().all(|edge| edges.contains(edge)));
}

#[test]
fn a_dead_sensor_is_silent_and_comes_back_true() {
    for (fault, low) in [(Fault::StuckHigh, false), (Fault::StuckLow, true)] {
        let mut sensor = ideal(2);
        let mut profile = Profile::new(-0.25);
        let mut edges = Vec::new();
        let second = Piece::steady(590.0, 1.0);
        profile.run(&second, &mut sensor, &mut |edge| edges.push(edge));
        sensor.set(fault, true);
        let before = edges.len();
        profile.run(&second, &mut sensor, &mut |edge| edges.push(edge));
        assert!(edges.len() <= before + 1);
        assert_eq!(sensor.is_low(), low);
        sensor.set(fault, false);
        profile.run(&second, &mut sensor, &mut |edge| edges.push(edge));
        assert_order(&edges);
        let after: Vec<Edge> = edges
            .iter()
            .filter(|edge| edge.at > Instant::from_nanos(2_000_000_000))
            .copied()
            .collect();
        let mut whole = profile::edges(&[Piece::steady(590.0, 3.0)], &mut ideal(2));
        whole.retain(|edge| edge.at > Instant::from_nanos(2_000_000_000));
        assert_eq!(after, whole);
    }
}

#[test]
fn a_parked_magnet_shakes_only_while_the_spindle_is_still() {
    let mut sensor = ideal(2);
    sensor.set(Fault::ShakeRegular, true);
    let pieces = [
        Piece::steady(600.0, 1.0),
        // 481 half periods and a bit: it leaves the line at the other level.
        Piece::steady(0.0, 10.03),
        Piece::steady(600.0, 1.0),
    ];
    let edges = profile::edges(&pieces, &mut sensor);
    assert_order(&edges);
    let count = |from: u64, to: u64| {
        falls(&edges)
            .iter()
            .filter(|at| (from..to).contains(*at))
            .count()
    };
    assert_eq!(count(0, 1_000_000_000), 20);
    assert!(count(1_000_000_000, 11_030_000_000).abs_diff(240) <= 1);
    // In motion again, it is as if nothing had been.
    let moving = |edges: &[Edge]| -> Vec<Edge> {
        let again = Instant::from_nanos(11_030_000_000);
        edges.iter().filter(|e| e.at > again).copied().collect()
    };
    let clean = profile::edges(&pieces, &mut ideal(2));
    assert_eq!(moving(&edges), moving(&clean));
    assert_eq!(moving(&clean).len(), 40);

    sensor = ideal(2);
    sensor.set(Fault::ShakeRandom, true);
    let edges = profile::edges(&[Piece::steady(0.0, 400.0)], &mut sensor);
    assert_order(&edges);
    let falls_ = falls(&edges);
    // 24 a second on average; each interval is two waits of 1/48 s, so the count spreads by sqrt(n / 2).
    assert!(falls_.len().abs_diff(9600) < 350, "{}", falls_.len());
    let low: u64 = times(&edges, EdgeKind::Rise)
        .iter()
        .zip(&falls_)
        .map(|(rise, fall)| rise - fall)
        .sum();
    assert!((low as f64 / 400e9 - 0.5).abs() < 0.03);
}

/// A long, wild run with all faults coming and going; the spindle turns both ways, crawls, jumps and stands.
fn wild(seed: u64) -> Vec<Edge> {
    let mut random = Random::new(seed, 99);
    let magnets = 1 + (random.uniform() * 6.0) as u32;
    let spec = SensorSpec {
        magnets,
        placement: (0..magnets).map(|_| random.between(-3.0, 3.0)).collect(),
        width: random.between(1.0, 40.0),
        hysteresis: random.between(0.0, 1.0),
        jitter_ns: random.between(0.0, 50_000.0),
        jitter_deg: random.between(0.0, 1.0),
        chatter_zone: random.between(0.1, 10.0),
        spike_rate: random.between(1.0, 20_000.0),
        shake_hz: random.between(1.0, 3000.0),
        ..SensorSpec::default()
    };
    let mut sensor = Sensor::new(spec, seed);
    let mut profile = Profile::new(random.uniform());
    profile.ripple.turn = Wave {
        share: 0.005,
        per_turn: 1.0,
        phase: 1.0,
    };
    let mut edges = Vec::new();
    for round in 0..60 {
        for fault in FAULTS {
            // Stuck for a while only, or there would be little to see; everything else at once in the first rounds.
            let stuck = matches!(fault, Fault::StuckHigh | Fault::StuckLow);
            let on = random.chance(if stuck { 0.1 } else { 0.7 });
            sensor.set(fault, if round < 10 { !stuck } else { on });
        }
        let speed = |random: &mut Random| match (random.uniform() * 4.0) as u32 {
            0 => 0.0,
            1 => random.between(-5.0, 5.0),
            2 => random.between(-3000.0, 3000.0),
            _ => random.between(0.0, 40_000.0),
        };
        let from = speed(&mut random);
        let to = if random.chance(0.5) {
            from
        } else {
            speed(&mut random)
        };
        let piece = Piece {
            secs: random.between(0.0, 0.2),
            from_rpm: from,
            to_rpm: to,
        };
        let until = edges.len();
        let begin = profile.now;
        profile.run(&piece, &mut sensor, &mut |edge| edges.push(edge));
        // Edges come with the piece in which they lie.
        for edge in &edges[until..] {
            assert!(edge.at >= begin && edge.at < profile.now);
        }
    }
    edges
}

#[test]
fn edges_alternate_and_increase_under_everything_at_once() {
    let mut total = 0;
    for seed in 0..40 {
        let edges = wild(seed);
        assert_order(&edges);
        total += edges.len();
    }
    assert!(total > 100_000, "{total}");
}

#[test]
fn the_same_seed_gives_the_same_edges() {
    assert_eq!(wild(7), wild(7));
    assert_ne!(wild(7), wild(8));
}

#[test]
fn every_machine_plays_the_same_run() {
    let mut lathe = Lathe::new(LatheSpec::default(), 11);
    let mut sensor = Sensor::new(SensorSpec::default(), 11);
    for fault in [Fault::Chatter, Fault::Spikes, Fault::Dropouts] {
        sensor.set(fault, true);
    }
    lathe.select(1000.0);
    lathe.motor(MotorSwitch::Forward);
    let (mut count, mut digest) = (0, 0xcbf2_9ce4_8422_2325u64);
    lathe.advance(Instant::from_nanos(30_000_000_000), &mut |segment| {
        sensor.sense(segment, &mut |edge| {
            count += 1;
            // FNV-1a over whole words (Fowler, Noll, Vo).
            digest = (digest ^ edge.at.nanos()).wrapping_mul(0x0000_0100_0000_01b3);
        });
    });
    // Our own record, no outside source. A change of the physics moves it; another machine or compiler must not.
    assert_eq!(
        (count, digest),
        (11_164, 0xa3a1_597e_3706_b95b),
        "{digest:#x}"
    );
}

#[test]
fn no_magnets_no_edges() {
    let edges = profile::edges(&[Piece::steady(1000.0, 10.0)], &mut ideal(0));
    assert!(edges.is_empty());
}
