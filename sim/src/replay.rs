//! A logic analyser's capture of a hall sensor, through the very tacho of the instrument.

use std::fs::File;
use std::io::{BufRead, BufReader};
use std::path::Path;

use rimrate_core::tacho::{Config, Reading, Rejected, Signal, Tacho};
use rimrate_core::time::{Edge, EdgeKind, Instant};
use vcd::{Command, Parser, ScopeItem, Value};

use crate::fail::Fail;
use crate::play::progress;
use crate::record::{ROW_MS, Readings};

/// What a replay came to.
#[derive(Clone, Copy, Debug)]
pub struct Outcome {
    /// Length of the capture, s.
    pub seconds: f64,
    /// Edges of the sensor's line.
    pub edges: u64,
    /// Rows with each signal: still, turning, lost, doubtful.
    pub rows: [u64; 4],
    /// The last reading.
    pub last: Reading,
    /// What was no pulse, by kind.
    pub rejected: Rejected,
}

/// Replays a capture; rows go to `csv` where there is one.
pub fn replay(
    path: &Path,
    config: Config,
    signal: Option<&str>,
    csv: Option<&Path>,
) -> Result<Outcome, Fail> {
    let file =
        File::open(path).map_err(|e| Fail::file(path, format_args!("cannot be read: {e}")))?;
    let length = file.metadata().map_or(0, |m| m.len());
    let progress = progress(length);
    let mut csv = csv.map(Readings::begin).transpose()?;
    let mut rows = Rows {
        tacho: Tacho::new(config),
        next_ms: 0,
        counts: [0; 4],
    };
    let mut edges = 0;
    let mut row =
        |at: Instant, reading: &Reading| csv.as_mut().map_or(Ok(()), |csv| csv.row(at, reading));
    let end = read(
        path,
        BufReader::new(progress.wrap_read(file)),
        signal,
        |edge| {
            edges += 1;
            rows.before(edge.at, &mut row)?;
            rows.tacho.push(edge);
            Ok(())
        },
    )?;
    // A row at the very end knows every edge up to it.
    rows.before(end, &mut row)?;
    rows.at(end, &mut row)?;
    progress.finish_and_clear();
    csv.map(Readings::finish).transpose()?;
    Ok(Outcome {
        seconds: end.nanos() as f64 / 1e9,
        edges,
        rows: rows.counts,
        last: rows.tacho.reading(end, |_| true),
        rejected: rows.tacho.rejected(),
    })
}

/// The rows of a replay: one every 50 ms, from what was known by then.
struct Rows {
    tacho: Tacho,
    next_ms: u64,
    counts: [u64; 4],
}

impl Rows {
    /// Writes the rows that are due before `until`.
    fn before(
        &mut self,
        until: Instant,
        row: &mut impl FnMut(Instant, &Reading) -> Result<(), Fail>,
    ) -> Result<(), Fail> {
        while self.due() < until {
            self.write(row)?;
        }
        Ok(())
    }

    /// Writes the row that is due at `end`, if one is.
    fn at(
        &mut self,
        end: Instant,
        row: &mut impl FnMut(Instant, &Reading) -> Result<(), Fail>,
    ) -> Result<(), Fail> {
        if self.due() == end {
            self.write(row)
        } else {
            Ok(())
        }
    }

    fn due(&self) -> Instant {
        Instant::from_nanos(self.next_ms.saturating_mul(1_000_000))
    }

    fn write(
        &mut self,
        row: &mut impl FnMut(Instant, &Reading) -> Result<(), Fail>,
    ) -> Result<(), Fail> {
        let at = self.due();
        let reading = self.tacho.reading(at, |_| true);
        let place = match reading.signal {
            Signal::Still => 0,
            Signal::Turning => 1,
            Signal::Lost => 2,
            Signal::Doubtful => 3,
        };
        self.counts[place] += 1;
        self.next_ms += ROW_MS;
        row(at, &reading)
    }
}

/// Reads a capture: every edge in order of time, then the time at which it ends.
fn read(
    path: &Path,
    source: impl BufRead,
    signal: Option<&str>,
    mut on_edge: impl FnMut(Edge) -> Result<(), Fail>,
) -> Result<Instant, Fail> {
    let mut parser = Parser::new(source);
    let header = parser
        .parse_header()
        .map_err(|e| Fail::file(path, format_args!("is no value change dump: {e}")))?;
    let Some((number, unit)) = header.timescale else {
        return Err(Fail::file(
            path,
            "timescale: none is given; allowed: 1, 10 or 100 with s, ms, us, ns, ps or fs",
        ));
    };
    let mut wires = Vec::new();
    collect(&header.items, &mut wires);
    let code = pick(path, &wires, signal)?;
    // Femtoseconds in one count: exact for every unit that the standard has.
    let femto = u128::from(number) * (1_000_000_000_000_000 / u128::from(unit.divisor()));

    let mut now = Instant::ZERO;
    let mut counts: Option<u64> = None;
    let mut level: Option<bool> = None;
    while let Some(command) = parser.next().transpose().map_err(|e| Fail::file(path, e))? {
        // The parser has not yet gone beyond the end of the command's line.
        let line = parser.line();
        match command {
            Command::Timestamp(count) => {
                if let Some(before) = counts.filter(|&before| count < before) {
                    return Err(Fail::input(format!(
                        "{}:{line}: timestamp: `{count}` goes back in time; allowed: {before} or later",
                        path.display()
                    )));
                }
                counts = Some(count);
                let ns = u128::from(count) * femto / 1_000_000;
                let ns = u64::try_from(ns).map_err(|_| {
                    Fail::input(format!(
                        "{}:{line}: timestamp: `{count}` is too late; allowed: up to 2^64 ns",
                        path.display()
                    ))
                })?;
                now = Instant::from_nanos(ns);
            }
            Command::ChangeScalar(changed, value) if changed == code => {
                // An undriven open collector is pulled up; an unknown level says nothing.
                let high = match value {
                    Value::V0 => false,
                    Value::V1 | Value::Z => true,
                    Value::X => continue,
                };
                if level.is_some_and(|was| was != high) {
                    on_edge(Edge {
                        at: now,
                        kind: if high { EdgeKind::Rise } else { EdgeKind::Fall },
                    })?;
                }
                level = Some(high);
            }
            _ => {}
        }
    }
    if level.is_none() {
        return Err(Fail::file(
            path,
            "signal: never has a value; the capture is empty or cut short",
        ));
    }
    Ok(now)
}

/// Every one-bit signal with its name.
fn collect<'a>(items: &'a [ScopeItem], wires: &mut Vec<(&'a str, vcd::IdCode)>) {
    for item in items {
        match item {
            ScopeItem::Var(var) if var.size == 1 => wires.push((&var.reference, var.code)),
            ScopeItem::Scope(scope) => collect(&scope.items, wires),
            _ => {}
        }
    }
}

fn pick(
    path: &Path,
    wires: &[(&str, vcd::IdCode)],
    signal: Option<&str>,
) -> Result<vcd::IdCode, Fail> {
    let names: Vec<&str> = wires.iter().map(|(name, _)| *name).collect();
    let known = if names.is_empty() {
        "none: the capture has no one-bit signal".to_owned()
    } else {
        names.join(", ")
    };
    match (signal, wires) {
        (Some(wanted), _) => wires
            .iter()
            .find(|(name, _)| *name == wanted)
            .map(|(_, code)| *code)
            .ok_or_else(|| {
                Fail::file(
                    path,
                    format_args!("signal: `{wanted}` is not in the capture; allowed: {known}"),
                )
            }),
        (None, [(_, code)]) => Ok(*code),
        (None, []) => Err(Fail::file(
            path,
            "signal: the capture has no one-bit signal",
        )),
        (None, _) => Err(Fail::file(
            path,
            format_args!("signal: name one with --signal; allowed: {known}"),
        )),
    }
}

impl Outcome {
    /// Prints what the replay came to.
    pub fn report(&self, out: &mut impl std::io::Write) -> std::io::Result<()> {
        let [still, turning, lost, doubtful] = self.rows;
        writeln!(out, "{:.3} s, {} edges", self.seconds, self.edges)?;
        writeln!(
            out,
            "rows of {ROW_MS} ms: {turning} turning, {still} still, {lost} lost, {doubtful} doubtful"
        )?;
        let r = &self.rejected;
        writeln!(
            out,
            "not counted as pulses: {} joined, {} slivers, {} noise, {} doubled, {} extra, {} too close, {} shaken, {} disordered; {} missing, {} merged",
            r.joined,
            r.slivers,
            r.noise,
            r.doubled,
            r.extra,
            r.too_close,
            r.shaken,
            r.disordered,
            r.missing,
            r.merged
        )?;
        match (self.last.signal, self.last.speed) {
            (Signal::Turning, Some(n)) => {
                writeln!(out, "at the end: turning at {:.2} rpm", n.get())
            }
            (signal, _) => writeln!(out, "at the end: {}", signal.id()),
        }
    }
}
