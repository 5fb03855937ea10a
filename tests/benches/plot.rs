//! The relative error of every method against the time that it has had, with the bound drawn in.

use std::error::Error;
use std::path::Path;

use plotters::prelude::*;
use rimrate_core::time::Duration;
use rimrate_sim::sensor::profile::Piece;
use rimrate_tests::capture::{Capture, bound, bound_unplaced};

use super::{METHODS, watch};

const PULSES: u32 = 2;
const SPEED: f64 = 607.37;
/// 0.02 degrees.
const SIGMA: f64 = 0.02 / 360.0 * 60.0 / SPEED;
const SEEDS: u64 = 200;
/// How long each capture is, s, and how often it is looked at, ms.
const LONG: f64 = 3.0;
const LOOK: u64 = 25;

/// Root of the mean square over the seeds, at each look.
fn errors(name: &str) -> Vec<(f64, f64)> {
    let looks = (LONG * 1000.0) as usize / LOOK as usize;
    let mut sums = vec![(0.0, 0.0); looks + 1];
    for seed in 0..SEEDS {
        let capture = Capture::new(PULSES)
            .jitter(SIGMA)
            .seeded(seed, 0.618 * seed as f64)
            .then(Piece::steady(SPEED, LONG));
        let mut look = 0;
        watch(
            name,
            &capture,
            Duration::from_millis(LOOK),
            1.0,
            |_, speed, _| {
                if let (Some(n), Some(sum)) = (speed.filter(|n| *n > 0.0), sums.get_mut(look)) {
                    sum.0 += 1.0;
                    sum.1 += (n / SPEED - 1.0).powi(2);
                }
                look += 1;
            },
        );
    }
    (0..)
        .zip(sums)
        // Only where every run has a reading.
        .filter(|(_, (count, _))| *count >= SEEDS as f64)
        .map(|(look, (count, squares))| {
            (
                f64::from(look) * LOOK as f64 / 1e3,
                f64::sqrt(squares / count),
            )
        })
        .collect()
}

/// Draws the plot.
pub(crate) fn draw(file: &Path) -> Result<(), Box<dyn Error>> {
    let area = SVGBackend::new(file, (900, 620)).into_drawing_area();
    area.fill(&WHITE)?;
    let mut chart = ChartBuilder::on(&area)
        .caption(
            format!("Error of a steady {SPEED} rpm, {PULSES} magnets, 0.02 degrees of jitter"),
            ("sans-serif", 18),
        )
        .margin(12)
        .x_label_area_size(44)
        .y_label_area_size(70)
        .build_cartesian_2d((0.1..LONG).log_scale(), (1e-6..1e-1_f64).log_scale())?;
    chart
        .configure_mesh()
        .x_desc("time since the first pulses, s")
        .y_desc("rms error, share of the speed")
        .y_label_formatter(&|y| format!("{y:.0e}"))
        .x_label_formatter(&|x| format!("{x:.1}"))
        .draw()?;
    for (i, name) in METHODS.into_iter().enumerate() {
        let color = Palette99::pick(i).to_rgba();
        let width = if name.starts_with("ours") { 3 } else { 1 };
        chart
            .draw_series(LineSeries::new(errors(name), color.stroke_width(width)))?
            .label(name)
            .legend(move |(x, y)| {
                PathElement::new([(x, y), (x + 18, y)], color.stroke_width(width))
            });
    }
    let turn = 60.0 / SPEED;
    let spacing = turn / f64::from(PULSES);
    let times = (1..=60)
        .map(|i| 0.05 * f64::from(i))
        .filter(|t| *t >= 3.0 * turn);
    let all = times
        .clone()
        .map(|t| (t, bound((t / spacing) as usize, SIGMA, spacing)));
    let unplaced = times.map(|t| (t, bound_unplaced(PULSES, (t / turn).floor(), SIGMA, turn)));
    for (points, name, color) in [
        (all.collect::<Vec<_>>(), "bound, all edges so far", BLACK),
        (
            unplaced.collect(),
            "bound, placement unknown",
            RGBColor(120, 120, 120),
        ),
    ] {
        chart
            .draw_series(DashedLineSeries::new(points, 6, 4, color.stroke_width(2)))?
            .label(name)
            .legend(move |(x, y)| PathElement::new([(x, y), (x + 18, y)], color.stroke_width(2)));
    }
    chart
        .configure_series_labels()
        .background_style(WHITE.mix(0.85))
        .border_style(BLACK)
        .position(SeriesLabelPosition::UpperRight)
        .draw()?;
    area.present()?;
    Ok(())
}
