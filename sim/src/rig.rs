//! A box on the bench: whatever takes edges and knobs and shows lamps and a picture.

use rimrate_core::beacon::Outputs;
use rimrate_core::instrument::{Event, Instrument};
use rimrate_core::machine::Machine;
use rimrate_core::panel::Knob;
use rimrate_core::setup::Setup;
use rimrate_core::tacho::Reading;
use rimrate_core::time::{Edge, Instant};
use rimrate_core::verdict::Verdict;

use crate::frame::Frame;

/// What a hand does to a knob.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Touch {
    /// Turns it by some detents, clockwise positive.
    Turn(Knob, i8),
    /// Pushes it down.
    Press(Knob),
    /// Lets it come up.
    Release(Knob),
}

/// A box that can be driven: in this process, or the firmware's image in an emulator.
pub trait Rig {
    /// Takes edges and lets time pass up to `now`; no edge is later.
    fn run(&mut self, edges: &[Edge], now: Instant);
    /// A hand at a knob, now.
    fn touch(&mut self, touch: Touch);
    /// Switches the box off and on again; what it remembers, it remembers.
    fn power_cycle(&mut self);
    /// The picture on the panel.
    fn frame(&self) -> &Frame;
    /// Lamps, buzzer and relay.
    fn outputs(&self) -> Outputs;
    /// The verdict.
    fn verdict(&self) -> Verdict;
    /// The reading.
    fn reading(&self) -> Reading;
}

/// The instrument in this process.
pub struct Desk {
    machine: Machine,
    instrument: Instrument,
    remembered: Option<Setup>,
    outputs: Outputs,
    frame: Frame,
    now: Instant,
    next: Instant,
}

impl Desk {
    /// A box on this machine, with the setup that it remembers.
    pub fn new(machine: Machine, remembered: Option<Setup>) -> Self {
        let now = Instant::ZERO;
        let mut desk = Desk {
            instrument: Instrument::new(now, machine.clone(), remembered),
            machine,
            remembered,
            outputs: Outputs::default(),
            frame: Frame::new(),
            now,
            next: now,
        };
        desk.poll();
        desk
    }

    /// The instrument.
    pub fn instrument(&self) -> &Instrument {
        &self.instrument
    }

    fn poll(&mut self) {
        let poll = self.instrument.poll(self.now);
        self.next = poll.next;
        self.outputs = poll.outputs;
        if poll.save.is_some() {
            self.remembered = poll.save;
        }
        if poll.redraw {
            self.frame.clear();
            let Ok(()) = self.instrument.draw(&mut self.frame);
        }
    }
}

impl Rig for Desk {
    fn run(&mut self, edges: &[Edge], now: Instant) {
        let mut edges = edges;
        loop {
            let (due, later) = edges.split_at(edges.partition_point(|e| e.at <= self.next));
            self.instrument
                .handle(self.next.min(now), Event::Edges(due));
            edges = later;
            if self.next > now {
                break;
            }
            self.now = self.next;
            self.poll();
        }
        let fresh = now > self.now;
        self.now = now;
        if fresh {
            self.poll();
        }
    }

    fn touch(&mut self, touch: Touch) {
        let event = match touch {
            Touch::Turn(knob, detents) => Event::Turn(knob, detents),
            Touch::Press(knob) => Event::Press(knob),
            Touch::Release(knob) => Event::Release(knob),
        };
        self.instrument.handle(self.now, event);
        self.poll();
    }

    fn power_cycle(&mut self) {
        self.instrument = Instrument::new(self.now, self.machine.clone(), self.remembered);
        self.poll();
    }

    fn frame(&self) -> &Frame {
        &self.frame
    }
    fn outputs(&self) -> Outputs {
        self.outputs
    }
    fn verdict(&self) -> Verdict {
        self.instrument.verdict()
    }
    fn reading(&self) -> Reading {
        *self.instrument.reading()
    }
}
