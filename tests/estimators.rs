//! The ways to get a speed from edges, ours among them, against published formulas and a general numerical library.
//!
//! `data/tachometer-formulas.csv` holds the published rows; each is named beside its check.

use nalgebra::{DMatrix, DVector};
use rimrate_core::tacho::{CLOCK, Tacho};
use rimrate_core::time::{Edge, Instant};
use rimrate_sim::random::Random;
use rimrate_tests::capture::{Capture, bound, bound_unplaced};
use rimrate_tests::methods::{EndPoints, GateCount, LeastSquares, Method, PulsesOverTime, slope};

#[path = "benches/plot.rs"]
mod plot;

/// The value column of a published row.
fn published(id: &str) -> String {
    csv::Reader::from_reader(include_str!("data/tachometer-formulas.csv").as_bytes())
        .records()
        .map(|r| r.unwrap())
        .find(|r| &r[0] == id)
        .unwrap_or_else(|| panic!("{id} is not in the data"))[3]
        .to_string()
}

/// Falls `spacing` apart with white noise.
fn stamps(count: usize, spacing: f64, sigma: f64, random: &mut Random) -> Vec<f64> {
    (0..count)
        .map(|k| 1.0 + spacing * k as f64 + sigma * random.normal())
        .collect()
}

/// Variance of what a method says, as a share of the true speed, over many runs.
fn variance(make: impl Fn() -> Box<dyn Method>, count: usize, sigma: f64) -> f64 {
    const SPACING: f64 = 0.01;
    const RUNS: u32 = 20_000;
    let mut random = Random::new(3, 5);
    let squares: f64 = (0..RUNS)
        .map(|_| {
            let mut method = make();
            for at in stamps(count, SPACING, sigma * SPACING, &mut random) {
                method.fall(at);
            }
            let speed = method.speed(2.0).unwrap();
            (speed * SPACING / 60.0 - 1.0).powi(2)
        })
        .sum();
    squares / f64::from(RUNS)
}

#[test]
fn least_squares_and_end_points_have_their_published_variance() {
    // PV0493, Kay: var(T) >= 12 sigma^2 / (N (N^2 - 1)); PV0495: 2 sigma^2 / (N - 1)^2. One pulse a revolution, period 1.
    assert_eq!(published("PV0493"), "12*sigma^2/(N*(N^2-1))");
    assert_eq!(published("PV0495"), "2*sigma^2/(N-1)^2");
    let sigma = 1e-4;
    for count in [4, 10, 33] {
        let n = count as f64;
        let fit = variance(|| Box::new(LeastSquares::new(1, 1e9)), count, sigma);
        let want = 12.0 * sigma * sigma / (n * (n * n - 1.0));
        assert!((fit / want - 1.0).abs() < 0.05, "{count}: {}", fit / want);
        assert!((bound(count, sigma, 1.0).powi(2) / want - 1.0).abs() < 1e-12);
        let ends = variance(|| Box::new(EndPoints::new(1, 1e9)), count, sigma);
        let want = 2.0 * sigma * sigma / (n - 1.0).powi(2);
        assert!((ends / want - 1.0).abs() < 0.05, "{count}: {}", ends / want);
    }
}

#[test]
fn counting_in_a_gate_has_its_published_quantum() {
    // PV0488: 60 / (P Tg) rev/min.
    assert_eq!(published("PV0488"), "60/(P*Tg)");
    let read = |spacing: f64| {
        let mut gate = GateCount::new(6, 0.5);
        let mut at = 0.0;
        while at < 0.5 {
            gate.fall(at);
            at += spacing;
        }
        gate.speed(0.5).unwrap()
    };
    let quantum = 60.0 / (6.0 * 0.5);
    // 50 pulses and 51.
    assert!((read(0.5 / 50.5) - read(0.5 / 49.5) - quantum).abs() < 1e-9);
}

#[test]
fn pulses_over_time_give_their_published_speed() {
    // PV0490: n = 60 fc m1 / (P m2); PV0489: one clock count more is 1 / (m2 - 1) of a single period.
    assert_eq!(published("PV0490"), "60*fc*m1/(P*m2)");
    assert_eq!(published("PV0489"), "1/(m2-1) approx n*P/(60*fc)");
    let (pulses, clock, gate) = (4, 1e5, 0.1);
    let mut method = PulsesOverTime::new(pulses, gate, clock);
    for k in 0..=7 {
        method.fall(0.0153 * f64::from(k));
    }
    // The gate ends with the first pulse after 0.1 s: the seventh, 10,710 counts on.
    let want = 60.0 * clock * 7.0 / (4.0 * 10_710.0);
    assert!((method.speed(1.0).unwrap() - want).abs() < 1e-9);
    let one = |counts: f64| {
        let mut method = PulsesOverTime::new(pulses, 0.0, clock);
        method.fall(0.0);
        method.fall(counts / clock);
        method.speed(1.0).unwrap()
    };
    let (m2, n) = (1000.0, one(1000.0));
    assert!(((one(m2 - 1.0) - n) / n - 1.0 / (m2 - 1.0)).abs() < 1e-9);
    assert!((1.0 / (m2 - 1.0) / (n * f64::from(pulses) / (60.0 * clock)) - 1.0).abs() < 0.002);
}

#[test]
fn a_crystal_is_as_exact_as_its_catalogue_says() {
    // PV0496: 20, 50 and 100 parts in a million are common; ours is the middle one. PV0497 and PV0498: 32768 Hz +/- 20 ppm.
    let tolerances = published("PV0496");
    let middle: f64 = tolerances
        .split(';')
        .nth(1)
        .unwrap()
        .trim()
        .parse()
        .unwrap();
    assert!((f64::from(CLOCK) / (middle * 1e-6) - 1.0).abs() < 1e-6);
    for (id, sign) in [("PV0497", -1.0), ("PV0498", 1.0)] {
        let limit: f64 = published(id).parse().unwrap();
        assert!(
            (32_768.0 * (1.0 + sign * 20e-6) - limit).abs() < 1e-5,
            "{id}"
        );
    }
}

/// Least squares by singular values.
fn solve(rows: &[Vec<f64>], right: &[f64]) -> DVector<f64> {
    let matrix = DMatrix::from_fn(rows.len(), rows[0].len(), |r, c| rows[r][c]);
    matrix
        .svd(true, true)
        .solve(&DVector::from_column_slice(right), 1e-14)
        .unwrap()
}

#[test]
fn a_slope_is_that_of_a_numerical_library() {
    let mut random = Random::new(11, 1);
    for count in [3, 17, 200] {
        let times = stamps(count, 0.02, 0.003, &mut random);
        let rows: Vec<Vec<f64>> = (0..count).map(|k| vec![1.0, k as f64]).collect();
        let want = solve(&rows, &times)[1];
        let ours = slope(times.iter().enumerate().map(|(k, &t)| (k as f64, t)));
        assert!((ours / want - 1.0).abs() < 1e-10, "{count}: {ours}, {want}");
    }
}

#[test]
fn the_calm_speed_is_the_least_squares_of_a_numerical_library() {
    // One slope, and an offset for each magnet: the model with placement unknown, over the first four turns of a spindle.
    const TURNS: usize = 4;
    let mut random = Random::new(21, 2);
    for pulses in [1_usize, 2, 3, 6, 24] {
        for _ in 0..20 {
            let turn = 0.2 + 0.3 * random.uniform();
            let offsets: Vec<f64> = (0..pulses)
                .map(|m| turn * (m as f64 / pulses as f64 + random.between(-2e-4, 2e-4)))
                .collect();
            let falls: Vec<u64> = (0..TURNS * pulses)
                .map(|k| {
                    let at = (k / pulses) as f64 * turn + offsets[k % pulses];
                    ((1.0 + at + 2e-5 * random.normal()) * 1e9) as u64
                })
                .collect();
            let rows: Vec<Vec<f64>> = (0..TURNS * pulses)
                .map(|k| {
                    let mut row = vec![0.0; pulses + 1];
                    row[k % pulses] = 1.0;
                    row[pulses] = (k / pulses) as f64;
                    row
                })
                .collect();
            let seconds: Vec<f64> = falls.iter().map(|&t| t as f64 / 1e9 - 1.0).collect();
            let want = 60.0 / solve(&rows, &seconds)[pulses];

            let mut tacho = Tacho::new(Capture::new(pulses as u32).config());
            let low = (turn / pulses as f64 * 0.2 * 1e9) as u64;
            for &fall in &falls {
                tacho.push(Edge::fall(Instant::from_nanos(fall)));
                tacho.push(Edge::rise(Instant::from_nanos(fall + low)));
            }
            let now = Instant::from_nanos(falls.last().unwrap() + low);
            let ours = f64::from(tacho.reading(now, |_| true).speed.unwrap().get());
            // Whole nanoseconds, and one rounding to single precision.
            assert!(
                (ours / want - 1.0).abs() < 8e-8,
                "{pulses} pulses: {ours}, {want}"
            );
        }
    }
}

#[test]
fn the_speed_under_acceleration_is_the_parabola_of_a_numerical_library() {
    // Through the mean times of seven turns, its slope at the newest pulse; the variance of a linear function g of the estimates
    // is s^2 g (X' X)^-1 g (Draper and Smith, Applied Regression Analysis; from memory).
    const TURNS: usize = 7;
    let mut random = Random::new(22, 3);
    for pulses in [1_usize, 2, 6, 24] {
        for way in [-1.0, 1.0] {
            for _ in 0..10 {
                let turn = 0.25 + 0.1 * random.uniform();
                let offsets: Vec<f64> = (0..pulses)
                    .map(|_| turn * random.between(-2e-4, 2e-4))
                    .collect();
                let falls: Vec<u64> = (0..TURNS * pulses)
                    .map(|k| {
                        let turns = k as f64 / pulses as f64;
                        let at = turn * turns * (1.0 + way * 0.0015 * turns) + offsets[k % pulses];
                        ((1.0 + at + 2e-5 * random.normal()) * 1e9) as u64
                    })
                    .collect();
                let means: Vec<f64> = falls
                    .chunks(pulses)
                    .map(|turn| {
                        turn.iter().map(|&t| t as f64 / 1e9 - 1.0).sum::<f64>() / pulses as f64
                    })
                    .collect();
                let rows: Vec<Vec<f64>> = (0..TURNS)
                    .map(|r| vec![1.0, r as f64, (r * r) as f64])
                    .collect();
                let fit = solve(&rows, &means);
                let n = pulses as f64;
                let newest = (TURNS - 1) as f64 + (n - 1.0) / (2.0 * n);
                let g = DVector::from_vec(vec![0.0, 1.0, 2.0 * newest]);
                let period = g.dot(&fit);
                let x = DMatrix::from_fn(TURNS, 3, |r, c| rows[r][c]);
                let rest = &x * &fit - DVector::from_column_slice(&means);
                let s2 = rest.dot(&rest) / (TURNS - 3) as f64;
                let variance = s2 * g.dot(&((x.transpose() * &x).try_inverse().unwrap() * &g));

                let mut tacho = Tacho::new(Capture::new(pulses as u32).config());
                let low = (turn / n * 0.2 * 1e9) as u64;
                for &fall in &falls {
                    tacho.push(Edge::fall(Instant::from_nanos(fall)));
                    tacho.push(Edge::rise(Instant::from_nanos(fall + low)));
                }
                let now = Instant::from_nanos(falls.last().unwrap() + low);
                let reading = tacho.reading(now, |_| true);
                let ours = f64::from(reading.speed.unwrap().get());
                // Its sums are in single precision.
                assert!(
                    (ours * period / 60.0 - 1.0).abs() < 1e-6,
                    "{pulses} pulses: {ours}, {}",
                    60.0 / period
                );
                let clock = f64::from(CLOCK).powi(2) / 3.0;
                let claimed = (f64::from(reading.uncertainty).powi(2) - clock).sqrt();
                let want = variance.sqrt() / period;
                assert!(
                    (claimed - want).abs() < 0.01 * want + 1e-6,
                    "{pulses} pulses: claimed {claimed:.3e}, {want:.3e}"
                );
            }
        }
    }
}

#[test]
fn the_bound_for_unknown_placement_is_what_the_model_allows() {
    // The inverse of the normal equations gives the variance of a least-squares fit (Gauss and Markov).
    for (pulses, turns) in [(1_usize, 3_usize), (2, 4), (6, 3), (6, 10)] {
        let rows: Vec<Vec<f64>> = (0..turns * pulses)
            .map(|k| {
                let mut row = vec![0.0; pulses + 1];
                row[k % pulses] = 1.0;
                row[pulses] = (k / pulses) as f64;
                row
            })
            .collect();
        let a = DMatrix::from_fn(rows.len(), pulses + 1, |r, c| rows[r][c]);
        let variance = (a.transpose() * &a).try_inverse().unwrap()[(pulses, pulses)];
        let want = bound_unplaced(pulses as u32, turns as f64, 1.0, 1.0).powi(2);
        assert!((variance / want - 1.0).abs() < 1e-9, "{pulses}, {turns}");
    }
}

#[test]
fn the_plot_is_what_the_bench_draws() {
    assert!(
        plot::draw().unwrap() == include_str!("benches/error-by-window.svg"),
        "look at what `cargo bench -p rimrate-tests --bench tacho -- --plot FILE.svg` draws now"
    );
}
