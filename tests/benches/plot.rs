//! The relative error of every method against the length of the data that it may use, with the bounds drawn in.
//!
//! A published method has a window, or a gate, of just that length. Ours chooses its own: it is given the data of that length
//! and no more, and flattens out where it wants none further back. The length varies by half a turn either way from look to
//! look: whether a window happens to hold whole turns would else make the curves jump.

use std::error::Error;

use plotters::coord::Shift;
use plotters::prelude::*;
use rimrate_core::tacho::Tacho;
use rimrate_core::time::{Duration, Edge, EdgeKind, Instant};
use rimrate_sim::sensor::profile::Piece;
use rimrate_tests::capture::{Capture, PLACED_2, bound, bound_unplaced, seconds};
use rimrate_tests::methods::{
    EndPoints, GateCount, LeastSquares, Method, OnePeriod, PulsesOverTime,
};

const PULSES: u32 = 2;
const SPEED: f64 = 607.37;
const TURN: f64 = 60.0 / SPEED;
/// 0.02 degrees.
const SIGMA: f64 = 0.02 / 360.0 * TURN;
const SEEDS: u64 = 60;
/// Looks at one capture, each a part of the window after the one before.
const LOOKS: u32 = 5;
const STEP: f64 = 0.377;
/// From the least that always holds a turn to some seconds, s.
const SHORTEST: f64 = 1.5 * TURN;
const LONGEST: f64 = 8.0;
const WINDOWS: i32 = 32;
/// The clock of the M/T method, as on the chip.
const CLOCK_HZ: f64 = 125e6;
const OURS: &str = "ours, calm view";
const METHODS: [&str; 6] = [
    "count in a gate",
    "one period",
    "M/T",
    "end points",
    "least squares",
    OURS,
];

fn windows() -> impl Iterator<Item = f64> {
    let ratio: f64 = LONGEST / SHORTEST;
    (0..=WINDOWS).map(move |i| SHORTEST * libm::pow(ratio, f64::from(i) / f64::from(WINDOWS)))
}

/// The windows of the looks around one.
fn varied(window: f64) -> impl Iterator<Item = (u64, f64)> {
    (0..SEEDS).map(move |seed| {
        let part = (seed as f64 + 0.5) / SEEDS as f64 - 0.5;
        (seed, window + part * TURN)
    })
}

fn published(name: &str, window: f64) -> Option<Box<dyn Method>> {
    Some(match name {
        "count in a gate" => Box::new(GateCount::new(PULSES, window)),
        "one period" => Box::new(OnePeriod::new(PULSES)),
        "M/T" => Box::new(PulsesOverTime::new(PULSES, window, CLOCK_HZ)),
        "end points" => Box::new(EndPoints::over(PULSES, window)),
        "least squares" => Box::new(LeastSquares::over(PULSES, window)),
        _ => return None,
    })
}

/// What a method says at the last fall before `now`.
fn speed(name: &str, window: f64, edges: &[Edge], now: Instant) -> Option<f64> {
    let falls = |e: &&Edge| e.kind == EdgeKind::Fall;
    let before = &edges[..edges.partition_point(|e| e.at <= now)];
    let last = before.iter().rev().find(falls)?.at;
    let Some(mut method) = published(name, window) else {
        let mut tacho = Tacho::new(Capture::new(PULSES).config());
        let from = before.partition_point(|e| seconds(last.since(e.at)) > window);
        // The last pulse is known when it has passed.
        let until = (before.len() + 1).min(edges.len());
        edges[from..until].iter().for_each(|&edge| tacho.push(edge));
        let speed = tacho.reading(edges[until - 1].at, |_| true).speed?;
        return Some(f64::from(speed.get())).filter(|n| *n > 0.0);
    };
    for edge in before.iter().filter(falls) {
        method.fall(seconds(edge.at.since(Instant::ZERO)));
    }
    method.speed(seconds(last.since(Instant::ZERO)))
}

/// Root of the mean square in %, by window; only where every look sees a speed.
fn errors(name: &str, placed: &[f64]) -> Vec<(f64, f64)> {
    windows()
        .filter_map(|middle| {
            let (mut count, mut squares) = (0.0, 0.0);
            for (seed, window) in varied(middle) {
                let long = (2.2 + STEP * f64::from(LOOKS)) * window + 1.0;
                let capture = Capture::new(PULSES)
                    .placed(placed)
                    .jitter(SIGMA)
                    .seeded(seed, 0.618 * seed as f64)
                    .then(Piece::steady(SPEED, long));
                let (edges, _) = capture.edges();
                for look in 0..LOOKS {
                    let at = (2.1 + STEP * f64::from(look)) * window + 0.5;
                    let now = Instant::ZERO + Duration::from_nanos((at * 1e9) as u64);
                    let n = speed(name, window, &edges, now)?;
                    count += 1.0;
                    squares += (n / SPEED - 1.0).powi(2);
                }
            }
            Some((middle, 100.0 * f64::sqrt(squares / count)))
        })
        .collect()
}

/// A bound in %, by window.
fn bounds(of: impl Fn(f64) -> f64) -> Vec<(f64, f64)> {
    windows()
        .map(|middle| {
            let squares: f64 = varied(middle).map(|(_, w)| of(w).powi(2)).sum();
            (middle, 100.0 * f64::sqrt(squares / SEEDS as f64))
        })
        .filter(|(_, bound)| bound.is_finite())
        .collect()
}

fn panel(
    area: &DrawingArea<SVGBackend, Shift>,
    caption: &str,
    placed: &[f64],
    legend: bool,
) -> Result<(), Box<dyn Error>> {
    let mut chart = ChartBuilder::on(area)
        .caption(caption, ("sans-serif", 17))
        .margin(10)
        .x_label_area_size(40)
        .y_label_area_size(64)
        .build_cartesian_2d(
            (0.125..LONGEST).log_scale().base(2.0),
            (1e-5..100.0_f64).log_scale(),
        )?;
    chart
        .configure_mesh()
        .x_desc("data that the method may use, s")
        .y_desc("rms error, % of the speed")
        .x_label_formatter(&|x| format!("{x}"))
        .y_label_formatter(&|y| format!("{y}"))
        .light_line_style(WHITE)
        .draw()?;
    for (i, name) in METHODS.into_iter().enumerate() {
        let style = Palette99::pick(i).stroke_width(if name == OURS { 4 } else { 2 });
        chart
            .draw_series(LineSeries::new(errors(name, placed), style))?
            .label(name)
            .legend(move |(x, y)| PathElement::new([(x, y), (x + 18, y)], style));
    }
    // With the edges at both ends.
    let edges = |w: f64| (w * f64::from(PULSES) / TURN) as usize + 1;
    let known = bounds(|w| bound(edges(w), SIGMA, TURN / f64::from(PULSES)));
    let unknown = bounds(|w| {
        let turns = edges(w) / PULSES as usize;
        bound_unplaced(PULSES, turns as f64, SIGMA, TURN)
    });
    for (points, name, color) in [
        (known, "bound, placement known", BLACK),
        (unknown, "bound, placement unknown", RGBColor(130, 130, 130)),
    ] {
        let style = color.stroke_width(2);
        chart
            .draw_series(DashedLineSeries::new(points, 6, 4, style))?
            .label(name)
            .legend(move |(x, y)| PathElement::new([(x, y), (x + 18, y)], style));
    }
    if legend {
        chart
            .configure_series_labels()
            .background_style(WHITE.mix(0.85))
            .border_style(BLACK)
            .position(SeriesLabelPosition::LowerLeft)
            .draw()?;
    }
    Ok(())
}

/// The plot, as SVG.
pub(crate) fn draw() -> Result<String, Box<dyn Error>> {
    let mut svg = String::new();
    {
        let area = SVGBackend::with_string(&mut svg, (1240, 640)).into_drawing_area();
        area.fill(&WHITE)?;
        let note = format!(
            "A steady {SPEED} rpm, {PULSES} magnets, 0.02 degrees of white jitter. Ours wants no more than the last 0.7 s: there its curve flattens."
        );
        area.draw(&Text::new(note, (20, 614), ("sans-serif", 15)))?;
        let (panels, _) = area.split_vertically(600);
        let [left, right] = &panels.split_evenly((1, 2))[..] else {
            return Err("two panels were asked for".into());
        };
        panel(left, "Magnets evenly spaced", &[], false)?;
        panel(right, "Magnets 1 degree off each", PLACED_2, true)?;
        area.present()?;
    }
    Ok(svg)
}
