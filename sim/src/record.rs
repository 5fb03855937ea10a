//! What a run leaves behind: readings as CSV, the sensor's line as VCD, the panel as PNG.

use std::io::Write;
use std::path::{Path, PathBuf};

use rimrate_core::tacho::{Reading, Signal};
use rimrate_core::time::{Edge, EdgeKind, Instant};

use crate::fail::Fail;
use crate::files::Whole;
use crate::frame::Frame;

/// Rows of a CSV of readings are this far apart, ms.
pub const ROW_MS: u64 = 50;

/// A CSV with the columns `time_s,rpm,signal`: rpm is 0 when still and empty when lost.
pub struct Readings {
    csv: csv::Writer<Whole>,
    path: PathBuf,
}

impl Readings {
    /// Begins the file.
    pub fn begin(path: &Path) -> Result<Self, Fail> {
        let mut csv = csv::Writer::from_writer(Whole::begin(path)?);
        csv.write_record(["time_s", "rpm", "signal"])
            .map_err(|e| Fail::file(path, e))?;
        Ok(Readings {
            csv,
            path: path.to_path_buf(),
        })
    }

    /// Adds a row.
    pub fn row(&mut self, at: Instant, reading: &Reading) -> Result<(), Fail> {
        let rpm = match (reading.signal, reading.speed) {
            (Signal::Still, _) => "0".to_owned(),
            (Signal::Turning | Signal::Doubtful, Some(speed)) => format!("{:.4}", speed.get()),
            (Signal::Lost, _) | (_, None) => String::new(),
        };
        let time = format!("{:.3}", at.nanos() as f64 / 1e9);
        self.csv
            .write_record([&time, &rpm, reading.signal.id()])
            .map_err(|e| Fail::file(&self.path, e))
    }

    /// Puts the file in its place.
    pub fn finish(self) -> Result<(), Fail> {
        self.csv
            .into_inner()
            .map_err(|e| Fail::file(&self.path, e.error()))?
            .finish()
    }
}

/// A capture of the sensor's line in the value-change-dump format of IEEE 1364, in nanoseconds.
pub struct Capture {
    vcd: vcd::Writer<Whole>,
    hall: vcd::IdCode,
    path: PathBuf,
}

/// The name of the sensor's line in our captures.
pub const SIGNAL: &str = "hall";

impl Capture {
    /// Begins the file with the line high.
    pub fn begin(path: &Path) -> Result<Self, Fail> {
        let failed = |e: std::io::Error| Fail::file(path, format_args!("cannot be written: {e}"));
        let mut vcd = vcd::Writer::new(Whole::begin(path)?);
        let hall = (|| {
            vcd.timescale(1, vcd::TimescaleUnit::NS)?;
            vcd.add_module("spindle")?;
            let hall = vcd.add_wire(1, SIGNAL)?;
            vcd.upscope()?;
            vcd.enddefinitions()?;
            vcd.timestamp(0)?;
            vcd.begin(vcd::SimulationCommand::Dumpvars)?;
            vcd.change_scalar(hall, vcd::Value::V1)?;
            vcd.end()?;
            Ok(hall)
        })()
        .map_err(failed)?;
        Ok(Capture {
            vcd,
            hall,
            path: path.to_path_buf(),
        })
    }

    /// Adds edges.
    pub fn edges(&mut self, edges: &[Edge]) -> Result<(), Fail> {
        let write = |vcd: &mut vcd::Writer<Whole>, edge: &Edge| {
            vcd.timestamp(edge.at.nanos())?;
            vcd.change_scalar(self.hall, edge.kind == EdgeKind::Rise)
        };
        edges
            .iter()
            .try_for_each(|edge| write(&mut self.vcd, edge))
            .map_err(|e| Fail::file(&self.path, format_args!("cannot be written: {e}")))
    }

    /// Ends the capture at this time and puts the file in its place.
    pub fn finish(mut self, end: Instant) -> Result<(), Fail> {
        let failed =
            |e: std::io::Error| Fail::file(&self.path, format_args!("cannot be written: {e}"));
        self.vcd.timestamp(end.nanos()).map_err(failed)?;
        self.vcd.flush().map_err(failed)?;
        // The writer lends its file only; an empty one takes its place.
        let Capture { mut vcd, path, .. } = self;
        let file = std::mem::replace(vcd.writer(), Whole::nothing(&path));
        file.finish()
    }
}

/// Writes the panel as PNG, four pixels to one.
pub fn picture(path: &Path, frame: &Frame) -> Result<(), Fail> {
    let mut file = Whole::begin(path)?;
    frame
        .write_png(&mut file, 4)
        .map_err(|e| Fail::file(path, e))?;
    file.flush().map_err(|e| Fail::file(path, e))?;
    file.finish()
}
