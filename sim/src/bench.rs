//! A lathe, its sensor and a box, all on one clock.

use rimrate_core::machine::{Drive, Machine};
use rimrate_core::panel::{HOLD, Knob};
use rimrate_core::setup::Setup;
use rimrate_core::time::{Duration, Edge, EdgeKind, Instant};

use crate::lathe::{Cut, DriveSpec, Engagement, Feed, Lathe, LatheSpec, MotorSwitch};
use crate::rig::{Rig, Touch};
use crate::scenario::{Action, CutSpec, FaultName, MotorTo};
use crate::sensor::{Sensor, SensorSpec};

/// Edges reach the box in batches of this length, as the firmware takes them.
pub const SLICE: Duration = Duration::from_millis(5);
/// How long a hand takes for a short press.
const PRESS: Duration = Duration::from_millis(120);

/// Everything on the desk.
pub struct Bench<R> {
    machine: Machine,
    lathe: Lathe,
    sensor: Sensor,
    /// The box.
    pub rig: R,
    now: Instant,
    /// Knobs that a hand holds down, and when it lets go.
    held: Vec<(Instant, Knob)>,
    edges: Vec<Edge>,
    /// The label of the step or the range that the levers stand at.
    gear: String,
    pulses: u64,
    cut: Option<CutSpec>,
    pedal: f64,
    faults: Vec<FaultName>,
}

impl<R: Rig> Bench<R> {
    /// A lathe at rest with its levers at the slowest step.
    pub fn new(machine: Machine, sensor: SensorSpec, seed: u64, rig: R) -> Self {
        let spec = match machine.drive() {
            Drive::Stepped(_) => LatheSpec {
                brake_limit: f64::from(machine.brake_rpm_per_s()),
                ..LatheSpec::default()
            },
            Drive::Variable(_) => LatheSpec {
                feed: Feed::Regulated(DriveSpec::default()),
                brake_limit: f64::from(machine.brake_rpm_per_s()),
                ..LatheSpec::default()
            },
        };
        let mut bench = Bench {
            lathe: Lathe::new(spec, seed),
            sensor: Sensor::new(sensor, seed),
            rig,
            now: Instant::ZERO,
            held: Vec::new(),
            edges: Vec::new(),
            gear: String::new(),
            pulses: 0,
            cut: None,
            pedal: 0.0,
            faults: Vec::new(),
            machine,
        };
        match bench.machine.drive().clone() {
            Drive::Stepped(steps) => {
                if let Some(step) = steps.first() {
                    bench.lever(&step.label);
                }
            }
            Drive::Variable(ranges) => {
                if let Some(range) = ranges.first() {
                    bench.dial(f64::from(range.low.get()));
                }
            }
        }
        bench
    }

    /// The machine.
    pub fn machine(&self) -> &Machine {
        &self.machine
    }
    /// The lathe.
    pub fn lathe(&self) -> &Lathe {
        &self.lathe
    }
    /// The present time.
    pub fn now(&self) -> Instant {
        self.now
    }
    /// Where the levers stand.
    pub fn gear(&self) -> &str {
        &self.gear
    }
    /// Falls of the sensor's line so far.
    pub fn pulses(&self) -> u64 {
        self.pulses
    }
    /// The cut in progress.
    pub fn cut(&self) -> Option<CutSpec> {
        self.cut
    }
    /// The foot on the brake, 0 to 1.
    pub fn pedal(&self) -> f64 {
        self.pedal
    }
    /// What is wrong with the sensor at present.
    pub fn faults(&self) -> &[FaultName] {
        &self.faults
    }

    /// Lets everything run up to `until`, in slices; `on_edges` sees the edges of each slice.
    pub fn run(&mut self, until: Instant, mut on_edges: impl FnMut(&[Edge])) {
        while self.now < until {
            let release = self
                .held
                .iter()
                .map(|&(at, _)| at)
                .min()
                .unwrap_or(until)
                .max(self.now);
            let to = (self.now + SLICE).min(until).min(release);
            self.edges.clear();
            let (sensor, edges) = (&mut self.sensor, &mut self.edges);
            self.lathe.advance(to, &mut |segment| {
                sensor.sense(segment, &mut |edge| edges.push(edge))
            });
            let falls = edges.iter().filter(|e| e.kind == EdgeKind::Fall);
            self.pulses += falls.count() as u64;
            on_edges(edges);
            self.rig.run(edges, to);
            self.now = to;
            if release == to {
                let (due, later) = self.held.iter().partition(|(at, _)| *at <= to);
                self.held = later;
                let due: Vec<(Instant, Knob)> = due;
                due.into_iter()
                    .for_each(|(_, knob)| self.rig.touch(Touch::Release(knob)));
            }
        }
    }

    /// Does something now. `setup` gives the diameter at which a cut is made.
    pub fn act(&mut self, action: &Action, setup: &Setup) {
        match action {
            Action::Turn { knob, by } => self.rig.touch(Touch::Turn((*knob).into(), *by)),
            Action::Press(knob) => self.push((*knob).into(), PRESS),
            Action::Hold(knob) => self.push((*knob).into(), HOLD + PRESS),
            Action::Motor(to) => self.lathe.motor(switch(*to)),
            Action::Jog(seconds) => {
                self.lathe.jog(
                    MotorSwitch::Forward,
                    Duration::from_secs_f32(*seconds as f32),
                );
            }
            Action::HandTurn(turns) => self.lathe.turn_by_hand(*turns),
            Action::Lever(label) => self.lever(label),
            Action::Dial(rpm) => self.dial(*rpm),
            Action::Cut(cut) => {
                self.cut = Some(*cut);
                let diameter = f64::from(setup.diameter.mm());
                self.lathe.cut(Some(engaged(cut, diameter)));
            }
            Action::Uncut => {
                self.cut = None;
                self.lathe.cut(None);
            }
            Action::Brake(pedal) => {
                self.pedal = *pedal;
                self.lathe.brake(*pedal);
            }
            Action::Plug => self.lathe.plug(),
            Action::Fault(fault) => {
                self.mended(*fault);
                self.faults.push(*fault);
                self.sensor.set((*fault).into(), true);
            }
            Action::Mend(fault) => {
                self.mended(*fault);
                self.sensor.set((*fault).into(), false);
            }
            Action::PowerCycle => self.rig.power_cycle(),
        }
    }

    fn mended(&mut self, fault: FaultName) {
        self.faults.retain(|&f| f != fault);
    }

    fn push(&mut self, knob: Knob, time: Duration) {
        self.rig.touch(Touch::Press(knob));
        self.held.push((self.now + time, knob));
    }

    fn lever(&mut self, label: &str) {
        if let Drive::Stepped(steps) = self.machine.drive()
            && let Some(step) = steps.iter().find(|s| s.label == label)
        {
            self.lathe.select(f64::from(step.rpm.get()));
            self.gear = label.to_owned();
        }
    }

    /// Sets a variable drive; the belt goes to the fastest range that has the speed.
    fn dial(&mut self, rpm: f64) {
        if let Drive::Variable(ranges) = self.machine.drive()
            && let Some(range) = ranges
                .iter()
                .rev()
                .find(|r| (f64::from(r.low.get())..=f64::from(r.high.get())).contains(&rpm))
        {
            // The range ends where the drive does: at twice its base speed.
            self.lathe.select(f64::from(range.high.get()) / 2.0);
            self.lathe.set_speed(rpm);
            self.gear = format!("{}, {rpm:.0} rpm", range.label);
        }
    }
}

fn switch(to: MotorTo) -> MotorSwitch {
    match to {
        MotorTo::Off => MotorSwitch::Off,
        MotorTo::Forward => MotorSwitch::Forward,
        MotorTo::Reverse => MotorSwitch::Reverse,
    }
}

fn engaged(cut: &CutSpec, diameter: f64) -> Cut {
    Cut {
        specific_force: cut.specific_force,
        depth: cut.depth_mm,
        feed: cut.feed_mm,
        diameter,
        engagement: match (cut.times, cut.share) {
            (None, None) => Engagement::Continuous,
            (times, share) => Engagement::Interrupted {
                times: times.unwrap_or(1),
                share: share.unwrap_or(0.5),
            },
        },
    }
}
