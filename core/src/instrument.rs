//! The whole box: owns all state, takes events with their time, gives effects as values.

use embedded_graphics::pixelcolor::BinaryColor;
use embedded_graphics::prelude::DrawTarget;

use crate::advice::{Advice, advise};
use crate::beacon::{self, Outputs};
use crate::edge_account::EdgeAccount;
use crate::load::{Load, Mark};
use crate::machine::Machine;
use crate::panel::{Bench, Knob, Page, Panel, Wish};
use crate::physics::cutting_speed::surface_speed_m_min;
use crate::screen::{self, View};
use crate::sensor_setup::{Doubt, Fit, Offer, SensorSetup};
use crate::setup::Setup;
use crate::tacho::{Config, Reading, Rejected, Signal, Tacho};
use crate::time::{Duration, Edge, Instant};
use crate::units::Rpm;
use crate::verdict::{Judge, Verdict};

/// The picture is drawn anew at most this often; the fastest that a number can be read anyway.
const REDRAW: Duration = Duration::from_millis(100);
/// A setup is handed out for saving when it has stood unchanged for this long: knobs turn in bursts, flash wears. Short enough
/// that whoever chooses and then starts the motor has been before it.
const SAVE_AFTER: Duration = Duration::from_secs(2);
/// So long after the last pulse a lost signal holds it up no more.
const SAVE_WHILE_LOST: Duration = Duration::from_secs(10);
/// While the spindle may turn, the reading is looked at this often,
const LOOK: Duration = Duration::from_millis(20);
/// else this often; edges and knobs come as events of their own.
const LOOK_AT_REST: Duration = Duration::from_millis(500);

/// The edge's life runs on in such steps: a life lasts minutes, and Taylor's law costs a power.
const COUNT_EDGE: Duration = Duration::from_millis(200);

/// Something that happened.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Event<'a> {
    /// Edges of the sensor's line, oldest first, none older than those before.
    Edges(&'a [Edge]),
    /// Edges were lost before those that follow: the capture ran over.
    CaptureLost,
    /// A knob was turned by some detents, clockwise positive.
    Turn(Knob, i8),
    /// A knob went down.
    Press(Knob),
    /// A knob came up.
    Release(Knob),
}

/// What is to be done.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Poll {
    /// Ask again at this time at the latest, or on the next event.
    pub next: Instant,
    /// Lamps, buzzer and relay.
    pub outputs: Outputs,
    /// The picture has changed: call [`Instrument::draw`].
    pub redraw: bool,
    /// Keep this setup, and hand it to [`Instrument::new`] at the next start. Only ever given while no pulses come: a memory
    /// may hold everything else up for as long as it erases.
    pub save: Option<Setup>,
}

/// The box.
#[derive(Clone, Debug)]
pub struct Instrument {
    machine: Machine,
    setup: Setup,
    advice: Advice,
    tacho: Tacho,
    panel: Panel,
    sensor_setup: SensorSetup,
    judge: Judge,
    reading: Reading,
    edge: EdgeAccount,
    load: Load,
    /// When the edge was counted last.
    looked: Instant,
    verdict: Verdict,
    verdict_since: Instant,
    /// Silent until the verdict changes.
    muted: bool,
    drawn: Option<(Instant, Shown)>,
    unsaved_since: Option<Instant>,
}

/// Everything that the picture depends on; the advice follows from the setup.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Shown {
    digits: Option<u32>,
    verdict: Verdict,
    page: Page,
    notice: bool,
    setup: Setup,
    /// Percent of the edge's life that the Why page shows.
    edge: Option<u32>,
    /// What runs on a page about the sensor: pulses counted, or their rate in hundredths of one a second.
    counted: Option<u32>,
    /// Where the count of pulses in a revolution stands.
    offer: Option<Offer>,
    doubt: Option<Doubt>,
    plate: Option<Rpm>,
    fit: Option<Fit>,
    /// How hard the motor works, where that is switched on and known.
    load: Option<Mark>,
}

/// The tacho for a setup on a machine.
fn config(setup: &Setup, machine: &Machine) -> Config {
    Config {
        pulses: setup.pulses_on(machine).get(),
        brake_rpm_per_s: machine.brake_rpm_per_s(),
        slowest: machine.slowest(),
    }
}

impl Instrument {
    /// Starts with a setup remembered from before, which then waits to be confirmed, or without one.
    ///
    /// A remembered holder that the machine does not list falls back to the first one, a load that it does not tell to none.
    pub fn new(now: Instant, machine: Machine, stored: Option<Setup>) -> Self {
        let mut setup = stored.unwrap_or(Setup::CAUTIOUS);
        if usize::from(setup.holder) >= machine.holders().len() {
            setup.holder = 0;
        }
        setup.load &= machine.tells_load().is_ok();
        // Built where it stays, as far as the compiler can: it is kilobytes.
        Instrument {
            tacho: Tacho::new(config(&setup, &machine)),
            advice: advise(&setup, &machine),
            reading: Reading::NOTHING,
            edge: EdgeAccount::default(),
            load: Load::default(),
            looked: now,
            verdict: Verdict::Unconfirmed,
            verdict_since: now,
            panel: Panel::new(false),
            sensor_setup: SensorSetup::default(),
            judge: Judge::default(),
            muted: false,
            drawn: None,
            unsaved_since: None,
            machine,
            setup,
        }
    }

    /// Takes an event. O(1) for knobs, O(1) for each edge.
    pub fn handle(&mut self, now: Instant, event: Event<'_>) {
        match event {
            Event::Edges(edges) => {
                self.sensor_setup.edges(edges);
                edges.iter().for_each(|&edge| self.tacho.push(edge));
            }
            Event::CaptureLost => {
                self.sensor_setup.edges_lost();
                self.tacho.capture_lost();
            }
            Event::Turn(knob, detents) => self.at_panel(now, |panel, bench| {
                panel.turn(now, knob, detents, bench);
                None
            }),
            Event::Press(knob) => self.at_panel(now, |panel, _| {
                panel.press(now, knob);
                None
            }),
            Event::Release(knob) => {
                self.at_panel(now, |panel, bench| panel.release(now, knob, bench))
            }
        }
    }

    /// Edges were held back, as a sensor that seems to be wired the other way round gives them: no count outlives that.
    pub fn edges_withheld(&mut self) {
        self.sensor_setup.edges_lost();
    }

    /// Pulses in a revolution that it goes by.
    pub fn pulses(&self) -> u16 {
        self.setup.pulses_on(&self.machine).get().get()
    }

    /// Whether the spindle's speed is changing: then a poll should not wait long after a pulse.
    pub fn is_urgent(&self) -> bool {
        self.tacho.is_changing()
    }

    /// Lets time pass up to `now` and says what is to be done. Bounded work: one look at each step of the machine when the
    /// setup has changed.
    pub fn poll(&mut self, now: Instant) -> Poll {
        self.at_panel(now, |panel, bench| panel.settle(now, bench));

        if matches!(self.panel.page(), Page::TenTurns | Page::PlateSpeed) {
            self.sensor_setup.look(now, self.tacho.last_pulse());
        }
        let machine = &self.machine;
        self.reading = self.tacho.reading(now, |n| machine.explains(n));
        if self.setup.load {
            self.load.look(now, &self.reading, &self.machine);
        }
        self.count_edge(now);
        let verdict = self
            .judge
            .verdict(now, &self.reading, &self.advice, self.panel.confirmed());
        if verdict != self.verdict {
            self.verdict = verdict;
            self.verdict_since = now;
            self.muted = false;
        }

        let (mut outputs, beacon_next) = beacon::outputs(self.verdict, self.verdict_since, now);
        if self.muted && self.verdict != Verdict::Danger {
            outputs.buzzer_hz = None;
        }
        let page = self.panel.page();
        let used = self.setup.pulses_on(&self.machine);
        let shown = Shown {
            digits: screen::digits(&self.reading),
            verdict: self.verdict,
            page,
            notice: self.panel.notice().is_some(),
            setup: self.setup,
            edge: matches!(page, Page::Why(_)).then(|| self.edge.percent()),
            counted: match page {
                Page::Sensor => Some(self.tacho.health().counted),
                Page::TenTurns => Some(self.sensor_setup.passages()),
                // A cast saturates.
                Page::PlateSpeed => match self.sensor_setup.rate() {
                    Some(rate) => Some((rate * 100.0) as u32),
                    None => Some(self.sensor_setup.seen()),
                },
                _ => None,
            },
            offer: match page {
                Page::TenTurns => Some(self.sensor_setup.hand_offer(used)),
                Page::PlateSpeed => Some(self.sensor_setup.plate_offer(used, &self.machine)),
                _ => None,
            },
            doubt: match page {
                Page::PlateSpeed => self.sensor_setup.doubt(used, &self.machine),
                _ => None,
            },
            plate: self.sensor_setup.plate(),
            fit: self.sensor_setup.fit(),
            load: self.mark(),
        };
        let redraw = match self.drawn {
            None => true,
            // A verdict, a page or a setting shows at once; digits that run wait for the eye.
            Some((at, was)) => {
                let only_digits = Shown {
                    digits: shown.digits,
                    counted: shown.counted,
                    fit: shown.fit,
                    ..was
                } == shown;
                was != shown && (!only_digits || now.since(at) >= REDRAW)
            }
        };
        if redraw {
            self.drawn = Some((now, shown));
        }
        let running = self.reading.is_running();
        let due = self.unsaved_since.and_then(|since| self.save_due(since));
        let save = due.filter(|&due| now >= due).map(|_| self.setup);
        if save.is_some() {
            self.unsaved_since = None;
        }
        let look = now
            + if running {
                LOOK
            } else if matches!(page, Page::TenTurns | Page::PlateSpeed) {
                REDRAW
            } else {
                LOOK_AT_REST
            };
        let due = due.filter(|_| save.is_none());
        let next = [beacon_next, self.panel.next_change(), due];
        Poll {
            next: next.into_iter().flatten().fold(look, Instant::min),
            outputs,
            redraw,
            save,
        }
    }

    /// When a setup changed at `since` is handed out. While the spindle may turn, it waits: the look that finds it at rest
    /// hands it out, and one that has lost the signal when there has been nothing to measure for long.
    fn save_due(&self, since: Instant) -> Option<Instant> {
        let settled = since + SAVE_AFTER;
        match self.reading.signal {
            Signal::Still => Some(settled),
            Signal::Turning | Signal::Doubtful => None,
            Signal::Lost => Some(settled.max(self.tacho.silent_since() + SAVE_WHILE_LOST)),
        }
    }

    /// Draws the picture as of the last [`Instrument::poll`] on a cleared 128 x 64 target.
    pub fn draw<D: DrawTarget<Color = BinaryColor>>(&self, target: &mut D) -> Result<(), D::Error> {
        screen::draw(&self.view(), target)
    }

    /// Everything that a page shows, as of the last poll.
    pub fn view(&self) -> View<'_> {
        View {
            setup: &self.setup,
            machine: &self.machine,
            advice: &self.advice,
            reading: &self.reading,
            verdict: self.verdict,
            page: self.panel.page(),
            notice: self.panel.notice(),
            sensor: self.tacho.health(),
            edge: self.edge,
            sensor_setup: &self.sensor_setup,
            load: self.mark(),
        }
    }

    fn mark(&self) -> Option<Mark> {
        let shown = self.setup.load && self.reading.signal == Signal::Turning;
        self.load.mark().filter(|_| shown)
    }

    /// The reading as of the last poll.
    pub fn reading(&self) -> &Reading {
        &self.reading
    }
    /// The verdict as of the last poll.
    pub fn verdict(&self) -> Verdict {
        self.verdict
    }
    /// What the sensor gave that was no pulse, by kind.
    pub fn rejected(&self) -> Rejected {
        self.tacho.rejected()
    }

    /// Counts the time since the last look against the edge: only while cutting, where the load tells that.
    fn count_edge(&mut self, now: Instant) {
        let dt = now.since(self.looked);
        if dt < COUNT_EDGE {
            return;
        }
        self.looked = now;
        let turning = self.reading.signal == Signal::Turning;
        if let (true, Some(n), Some(edge)) = (turning, self.reading.speed, &self.advice.cut.edge) {
            let v = surface_speed_m_min(n, self.setup.diameter);
            let cutting = self.load.cutting().filter(|_| self.setup.load);
            self.edge.add(dt, v, edge, cutting);
        }
    }

    /// Lets the panel act on the setup, and does what follows from that.
    fn at_panel(&mut self, now: Instant, act: impl FnOnce(&mut Panel, Bench<'_>) -> Option<Wish>) {
        let before = self.setup;
        let bench = Bench {
            setup: &mut self.setup,
            machine: &self.machine,
            advice: &self.advice,
            running: self.reading.is_running(),
            sensor: &mut self.sensor_setup,
        };
        let wish = act(&mut self.panel, bench);
        self.after_panel(now, &before, wish);
    }

    /// A function of its own, so that the advice's frame is not on the stack for every event.
    #[inline(never)]
    fn after_panel(&mut self, now: Instant, before: &Setup, wish: Option<Wish>) {
        if self.setup.load != before.load {
            self.load.forget_run();
        }
        if self.setup != *before {
            self.advice = advise(&self.setup, &self.machine);
            self.unsaved_since = Some(now);
        }
        if self.setup.pulses != before.pulses {
            self.tacho.configure(config(&self.setup, &self.machine));
            // The free speeds that it has learned were counted with other pulses.
            self.load = Load::default();
        }
        match wish {
            Some(Wish::Mute) => self.muted = true,
            Some(Wish::NewEdge) => self.edge.renew(),
            None => {}
        }
    }
}
