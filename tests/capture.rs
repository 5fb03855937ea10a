//! Captures of a hall sensor whose true speed is known at every instant, run through the tacho.

use std::collections::VecDeque;

use rimrate_core::machine::pulses;
use rimrate_core::tacho::{Config, Reading, Tacho};
use rimrate_core::time::{Duration, Edge, EdgeKind, Instant};
use rimrate_core::units::Rpm;
use rimrate_sim::lathe::{Ripple, Wave};
use rimrate_sim::sensor::profile::{Piece, Profile};
use rimrate_sim::sensor::{Fault, Sensor, SensorSpec};

/// The hardest stop that the tacho is told of, rev/min in a second.
pub const BRAKE: f64 = 3000.0;
/// Two magnets, each a degree off.
pub const PLACED_2: &[f64] = &[1.0, -1.0];
/// Six magnets, each up to three degrees off.
pub const PLACED_6: &[f64] = &[0.0, 3.0, -2.0, 1.5, -3.0, 2.0];

/// A spindle, its sensor, and what happens to both.
#[derive(Clone, Debug)]
pub struct Capture {
    /// The sensor.
    pub sensor: SensorSpec,
    seed: u64,
    start: f64,
    ripple: f64,
    belt_per_turn: f64,
    pieces: Vec<(Piece, Vec<(Fault, bool)>)>,
}

/// What is known at one time.
#[derive(Clone, Copy, Debug)]
pub struct Row {
    /// Since the start, s.
    pub at: f64,
    /// The same for the tacho.
    pub now: Instant,
    /// What the tacho says.
    pub reading: Reading,
    /// Since the last fall of the line, s.
    pub silence: f64,
    /// Falls of the line within the window that [`Capture::watch`] was given.
    pub falls: usize,
}

impl Row {
    /// The calm speed, rev/min.
    pub fn rpm(&self) -> f64 {
        self.reading.speed.map_or(f64::NAN, |n| f64::from(n.get()))
    }
    /// The fast speed, rev/min.
    pub fn quick(&self) -> f64 {
        self.reading.quick.map_or(f64::NAN, |n| f64::from(n.get()))
    }
}

impl Capture {
    /// A sensor with a microsecond of jitter.
    pub fn new(pulses: u32) -> Self {
        let sensor = SensorSpec {
            jitter_ns: 1000.0,
            ..SensorSpec::ideal(pulses)
        };
        Capture {
            sensor,
            seed: 1,
            start: 0.3,
            ripple: 0.0,
            belt_per_turn: 0.37,
            pieces: Vec::new(),
        }
    }
    /// How far each magnet sits from its even place, degrees.
    pub fn placed(mut self, degrees: &[f64]) -> Self {
        self.sensor.placement = degrees.to_vec();
        self
    }
    /// White jitter of the edges, s.
    pub fn jitter(mut self, seconds: f64) -> Self {
        self.sensor.jitter_ns = seconds * 1e9;
        self
    }
    /// Another run of chance, and another angle to start from, rev.
    pub fn seeded(mut self, seed: u64, start: f64) -> Self {
        self.seed = seed;
        self.start = start;
        self
    }
    /// Ripple of turn and belt, each of this size as a share of the speed.
    pub fn rippled(mut self, share: f64) -> Self {
        self.ripple = share;
        self
    }
    /// The belt's ripple comes so often in a turn; seldom, it is a wobble.
    pub fn belt(mut self, per_turn: f64) -> Self {
        self.belt_per_turn = per_turn;
        self
    }
    /// A piece of motion more.
    pub fn then(self, piece: Piece) -> Self {
        self.with(piece, &[])
    }
    /// A piece at whose start faults begin or end.
    pub fn with(mut self, piece: Piece, faults: &[(Fault, bool)]) -> Self {
        self.pieces.push((piece, faults.to_vec()));
        self
    }

    /// Hands out the edges one by one; gives the end.
    pub fn play(&self, on_edge: &mut impl FnMut(Edge)) -> Instant {
        let mut sensor = Sensor::new(self.sensor.clone(), self.seed);
        let mut profile = Profile::new(self.start);
        profile.ripple = Ripple {
            turn: Wave {
                share: self.ripple,
                per_turn: 1.0,
                phase: 0.4,
            },
            belt: Wave {
                share: self.ripple,
                per_turn: self.belt_per_turn,
                phase: 1.1,
            },
        };
        for (piece, faults) in &self.pieces {
            for &(fault, on) in faults {
                sensor.set(fault, on);
            }
            profile.run(piece, &mut sensor, on_edge);
        }
        profile.now
    }

    /// All edges, and the end.
    pub fn edges(&self) -> (Vec<Edge>, Instant) {
        let mut edges = Vec::new();
        let end = self.play(&mut |edge| edges.push(edge));
        (edges, end)
    }

    /// True speed without ripple, rev/min.
    pub fn truth(&self, at: f64) -> f64 {
        let mut start = 0.0;
        for (piece, _) in &self.pieces {
            if at <= start + piece.secs {
                let share = if piece.secs > 0.0 {
                    (at - start) / piece.secs
                } else {
                    1.0
                };
                return piece.from_rpm + (piece.to_rpm - piece.from_rpm) * share;
            }
            start += piece.secs;
        }
        0.0
    }

    /// What the tacho is told.
    pub fn config(&self) -> Config {
        Config {
            pulses: pulses(self.sensor.magnets as u16).unwrap(),
            brake_rpm_per_s: BRAKE as f32,
            slowest: Rpm::new(10.0).unwrap(),
        }
    }

    /// Looks at the tacho every so often, and counts the falls in a window of so many seconds before. The machine explains
    /// every speed.
    pub fn watch(&self, every: Duration, window: f64, see: &mut impl FnMut(Row)) {
        let mut watch = Watch {
            tacho: Tacho::new(self.config()),
            every,
            window,
            next: Instant::ZERO,
            falls: VecDeque::new(),
            last_fall: None,
        };
        let end = self.play(&mut |edge| {
            watch.look(edge.at, see);
            watch.push(edge);
        });
        watch.look(end + Duration::from_nanos(1), see);
    }

    /// Every 10 ms: time in s, reading, silence since the last fall of the line in s.
    pub fn rows(&self) -> Vec<(f64, Reading, f64)> {
        let mut rows = Vec::new();
        self.watch(Duration::from_millis(10), 0.0, &mut |row| {
            rows.push((row.at, row.reading, row.silence));
        });
        rows
    }
}

struct Watch {
    tacho: Tacho,
    every: Duration,
    window: f64,
    next: Instant,
    falls: VecDeque<Instant>,
    last_fall: Option<Instant>,
}

impl Watch {
    fn push(&mut self, edge: Edge) {
        if edge.kind == EdgeKind::Fall {
            self.last_fall = Some(edge.at);
            if self.window > 0.0 {
                self.falls.push_back(edge.at);
            }
        }
        self.tacho.push(edge);
    }

    /// Rows before `until`.
    fn look(&mut self, until: Instant, see: &mut impl FnMut(Row)) {
        while self.next < until {
            let now = self.next;
            self.next += self.every;
            while self
                .falls
                .front()
                .is_some_and(|&fall| seconds(now.since(fall)) >= self.window)
            {
                self.falls.pop_front();
            }
            see(Row {
                at: seconds(now.since(Instant::ZERO)),
                now,
                reading: self.tacho.reading(now, |_| true),
                silence: self
                    .last_fall
                    .map_or(f64::INFINITY, |fall| seconds(now.since(fall))),
                falls: self.falls.len(),
            });
        }
    }
}

/// To seconds.
pub fn seconds(time: Duration) -> f64 {
    time.nanos() as f64 / 1e9
}

/// The bound for the relative error of a period from `edges` time stamps `spacing` apart with white noise `sigma` (Kay, line
/// fit; published row PV0493): nothing without bias is better.
pub fn bound(edges: usize, sigma: f64, spacing: f64) -> f64 {
    let m = edges as f64;
    (12.0 / (m * (m * m - 1.0))).sqrt() * sigma / spacing
}

/// The same with placement unknown: `pulses` lines of `turns` points each, with one slope and offsets of their own.
pub fn bound_unplaced(pulses: u32, turns: f64, sigma: f64, turn: f64) -> f64 {
    (12.0 / (f64::from(pulses) * turns * (turns * turns - 1.0))).sqrt() * sigma / turn
}
