//! What several checks share: machines, setups, a spindle's edges, and a box with a clock.

pub mod capture;
pub mod methods;

use std::path::Path;

use rimrate_core::instrument::{Event, Instrument, Poll};
use rimrate_core::machine::Machine;
use rimrate_core::setup::{Details, Diameter, Setup};
use rimrate_core::tacho::{Reading, Signal};
use rimrate_core::time::{Duration, Edge, Instant};
use rimrate_core::trade::{Coolant, Material, Operation, Tool};
use rimrate_core::units::Rpm;
use rimrate_sim::profile;

/// A machine that comes with Rimrate.
pub fn machine(name: &str) -> Machine {
    profile::load(Path::new(name)).unwrap_or_else(|e| panic!("{name}: {e}"))
}

/// All machines that come with Rimrate.
pub fn machines() -> impl Iterator<Item = Machine> {
    profile::BUILT_IN.iter().map(|(name, _)| machine(name))
}

/// A bar of mild steel in the first holder, rough-turned with high-speed steel under fluid.
pub fn bar(mm: f32) -> Setup {
    Setup {
        material: Material::MildSteel,
        tool: Tool::Hss,
        operation: Operation::RoughTurning,
        coolant: Coolant::Flood,
        diameter: Diameter::nearest(mm),
        holder: 0,
        cap: None,
        cap_is_old: false,
        pulses: None,
        load: false,
        details: Details::NONE,
    }
}

/// A speed.
pub fn rpm(n: f32) -> Rpm {
    Rpm::new(n).unwrap_or_else(|e| panic!("{n}: {e}"))
}

/// A point in time, seconds after the start of the clock.
pub fn at(seconds: f64) -> Instant {
    Instant::from_nanos((seconds * 1e9).round() as u64)
}

/// A reading of a spindle that turns steadily.
pub fn turning(n: f32) -> Reading {
    Reading {
        signal: Signal::Turning,
        speed: Some(rpm(n)),
        quick: Some(rpm(n)),
        ..Reading::NOTHING
    }
}

/// A spindle with evenly spaced magnets that turns evenly.
#[derive(Clone, Copy, Debug)]
pub struct Spindle {
    /// Speed, rev/min.
    pub rpm: f64,
    /// Magnets.
    pub pulses: u32,
    /// Share of the spacing for which the line is low.
    pub low: f64,
}

impl Spindle {
    /// Two magnets, low for a fifteenth of the spacing.
    pub fn new(rpm: f64) -> Self {
        Spindle {
            rpm,
            pulses: 2,
            low: 1.0 / 15.0,
        }
    }

    /// Its edges in `from..until`, seconds; a magnet arrives at `from`.
    pub fn edges(&self, from: f64, until: f64) -> Vec<Edge> {
        let spacing = 60.0 / self.rpm / f64::from(self.pulses);
        (0..)
            .map(|i| from + spacing * f64::from(i))
            .take_while(|t| *t < until)
            .flat_map(|t| [Edge::fall(at(t)), Edge::rise(at(t + self.low * spacing))])
            .filter(|e| e.at < at(until))
            .collect()
    }
}

/// A box that is polled exactly when it asked to be, with all that it answered.
pub struct Clocked {
    /// The box.
    pub instrument: Instrument,
    /// The present time.
    pub now: Instant,
    /// Every poll and its answer.
    pub polls: Vec<(Instant, Poll)>,
    next: Instant,
}

impl Clocked {
    /// Switches a box on at time 0.
    pub fn new(machine: Machine, stored: Option<Setup>) -> Self {
        let mut clocked = Clocked {
            instrument: Instrument::new(Instant::ZERO, machine, stored),
            now: Instant::ZERO,
            polls: Vec::new(),
            next: Instant::ZERO,
        };
        clocked.poll();
        clocked
    }

    /// The last answer.
    pub fn last(&self) -> &Poll {
        &self.polls.last().expect("was polled when switched on").1
    }

    /// Every setup that was handed out to be kept, and when.
    pub fn saved(&self) -> Vec<(Instant, Setup)> {
        self.polls
            .iter()
            .filter_map(|(t, p)| p.save.map(|s| (*t, s)))
            .collect()
    }

    fn poll(&mut self) {
        let poll = self.instrument.poll(self.now);
        assert!(
            poll.next > self.now,
            "asked at {:?} to be asked at {:?}",
            self.now,
            poll.next
        );
        self.next = poll.next;
        self.polls.push((self.now, poll));
    }

    /// Switches the box off and on again, with the setup that it handed out last.
    pub fn power_cycle(&mut self, machine: Machine, stored: Option<Setup>) {
        let kept = self
            .saved()
            .last()
            .map_or(stored, |(_, setup)| Some(*setup));
        self.instrument = Instrument::new(self.now, machine, kept);
        self.poll();
    }

    /// Something happens now.
    pub fn event(&mut self, event: Event<'_>) {
        self.instrument.handle(self.now, event);
        self.poll();
    }

    /// Lets time pass without edges.
    pub fn rest(&mut self, seconds: f64) {
        self.run(&[], seconds);
    }

    /// Lets time pass with these edges, each of which arrives when it happens.
    pub fn run(&mut self, edges: &[Edge], seconds: f64) {
        let until = self.now + Duration::from_nanos((seconds * 1e9).round() as u64);
        for edge in edges {
            self.pass(edge.at);
            self.event(Event::Edges(std::slice::from_ref(edge)));
        }
        self.pass(until);
    }

    /// Lets the spindle turn evenly for some seconds.
    pub fn spin(&mut self, rpm: f64, seconds: f64) {
        let from = self.now.nanos() as f64 / 1e9;
        let edges = Spindle::new(rpm).edges(from, from + seconds);
        self.run(&edges, seconds);
    }

    fn pass(&mut self, until: Instant) {
        while self.next <= until {
            self.now = self.next;
            self.poll();
        }
        self.now = until;
    }
}
