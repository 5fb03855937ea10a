//! Two push-knobs: turns and presses to the setup and the page shown. A state machine; nothing is drawn here.
//!
//! ```text
//!            turn left: material, turn right: diameter
//!  Run page -- press left ---> Choose page -- press either --> Run page
//!     |      turn left: which field, turn right: its value
//!     |
//!     +------ press right --> Why page ----- press right ---> Run page
//!            turn either: further down the bounds
//!                               |
//!                               +----------- press left ----> Sensor page -- press either --> Run page
//!                                                                  |
//!                                                             turn either
//!                                                                  v
//!            Sensor page <-- turn left back -- Ten turns page -- turn left on --> Plate speed page -- turn left back --> Ten turns
//!            on both: press right does what the screen says (count, use the number), press left --> Run page
//!            Plate speed page, turn right: which plate
//!            Ten turns page, while it counts: turns do nothing, press left gives up
//!
//!            hold right: the cap is taken away; on the Why page: a new edge is in, its account starts anew;
//!                        on the two pages that count pulses: nothing
//!            hold left (any page): the buzzer is muted until the verdict changes
//! ```
//!
//! After power-up the remembered setup is unconfirmed: the first press only confirms it. What the knobs did before,
//! turns included, does not.

mod choice;

use heapless::String;

use crate::advice::Advice;
use crate::error::text;
use crate::machine::Machine;
use crate::screen::why;
use crate::sensor_setup::{Hand, Offer, SensorSetup};
use crate::setup::{Pulses, Setup};
use crate::time::{Duration, Instant};

pub use choice::Field;

/// A knob held down this long is held, not pressed.
pub const HOLD: Duration = Duration::from_millis(800);
/// A change made while the spindle runs is shown for this long.
pub const NOTICE: Duration = Duration::from_secs(3);

/// One of the two knobs.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Knob {
    /// Material; on the Choose page, which field.
    Left,
    /// Diameter; on the Choose page, the field's value.
    Right,
}

/// What the screen shows.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Page {
    /// Speed, target, step and verdict.
    Run,
    /// The rest of the setup, with the field that the right knob changes.
    Choose(Field),
    /// What holds the speed down, from this row on below the first.
    Why(u8),
    /// How well the sensor works.
    Sensor,
    /// Counting the pulses in a revolution by hand.
    TenTurns,
    /// The same by the plate's speed.
    PlateSpeed,
}

/// What a change of the setup shows for a while: `was 25, now 30 mm`.
#[derive(Clone, Debug, PartialEq)]
pub struct Notice {
    field: Field,
    before: Setup,
    until: Instant,
    /// The text.
    pub text: String<48>,
}

/// What the panel wants done besides changing the setup.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Wish {
    /// Be silent until the verdict changes.
    Mute,
    /// A new edge is in the tool.
    NewEdge,
}

#[derive(Clone, Copy, Debug, Default)]
enum Button {
    #[default]
    Up,
    /// Pressed since then, not yet long enough to be held.
    Down(Instant),
    /// Held; the release means nothing.
    Held,
}

/// The panel's state.
#[derive(Clone, Debug)]
pub struct Panel {
    page: Page,
    field: Field,
    confirmed: bool,
    notice: Option<Notice>,
    left: Button,
    right: Button,
}

/// What the panel acts on.
pub struct Bench<'a> {
    /// The setup that it changes.
    pub setup: &'a mut Setup,
    /// The machine, for its holders and units.
    pub machine: &'a Machine,
    /// The present advice: a new cap starts from it.
    pub advice: &'a Advice,
    /// Whether the spindle runs: then changes are announced.
    pub running: bool,
    /// What is known about the pulses in a revolution.
    pub sensor: &'a mut SensorSetup,
}

impl Bench<'_> {
    /// Takes a number of pulses over; the profile's own is no change of it.
    fn take_over(&mut self, pulses: Pulses) {
        let own = pulses.get() == self.machine.pulses();
        self.setup.pulses = (!own).then_some(pulses);
    }
}

impl Panel {
    /// `confirmed` is false where the setup is only remembered.
    pub fn new(confirmed: bool) -> Self {
        Panel {
            page: Page::Run,
            field: Field::Operation,
            confirmed,
            notice: None,
            left: Button::Up,
            right: Button::Up,
        }
    }

    /// The page shown.
    pub fn page(&self) -> Page {
        self.page
    }
    /// Whether the operator has confirmed the setup.
    pub fn confirmed(&self) -> bool {
        self.confirmed
    }
    /// The notice shown, if any.
    pub fn notice(&self) -> Option<&Notice> {
        self.notice.as_ref()
    }

    /// A knob was turned by some detents, clockwise positive.
    pub fn turn(&mut self, now: Instant, knob: Knob, detents: i8, bench: Bench<'_>) {
        let field = match (self.page, knob) {
            (Page::Run, Knob::Left) => Field::Material,
            (Page::Run, Knob::Right) => Field::Diameter,
            (Page::Choose(field), Knob::Left) => {
                self.field = field.stepped(detents);
                self.page = Page::Choose(self.field);
                return;
            }
            (Page::Choose(field), Knob::Right) => field,
            (Page::Why(first), _) => {
                let last = why::rows_below(bench.advice).saturating_sub(why::ROWS);
                // Both ends fit: there are fewer rows than a byte counts.
                let first = (i16::from(first) + i16::from(detents)).clamp(0, last as i16);
                self.page = Page::Why(first as u8);
                return;
            }
            (Page::Sensor | Page::TenTurns | Page::PlateSpeed, _) => {
                self.turn_sensor(knob, detents, bench);
                return;
            }
        };
        let before = *bench.setup;
        field.turn(detents, bench.setup, bench.machine, bench.advice);
        if bench.running && *bench.setup != before {
            self.announce(now, field, before, bench.setup, bench.machine);
        }
    }

    /// A knob went down.
    pub fn press(&mut self, now: Instant, knob: Knob) {
        *self.button(knob) = Button::Down(now);
    }

    /// A knob came up.
    pub fn release(&mut self, now: Instant, knob: Knob, mut bench: Bench<'_>) -> Option<Wish> {
        let wish = self.pass(now, &mut bench);
        if let Button::Down(_) = core::mem::take(self.button(knob)) {
            self.pressed(now, knob, bench);
        }
        wish
    }

    /// Lets time pass: holds begin, notices end.
    pub fn settle(&mut self, now: Instant, mut bench: Bench<'_>) -> Option<Wish> {
        self.pass(now, &mut bench)
    }

    fn pass(&mut self, now: Instant, bench: &mut Bench<'_>) -> Option<Wish> {
        if self.notice.as_ref().is_some_and(|n| now >= n.until) {
            self.notice = None;
        }
        let mut wish = None;
        for knob in [Knob::Left, Knob::Right] {
            if let Button::Down(since) = *self.button(knob)
                && now.since(since) >= HOLD
            {
                *self.button(knob) = Button::Held;
                match knob {
                    _ if !self.confirmed => self.confirmed = true,
                    Knob::Left => wish = Some(Wish::Mute),
                    Knob::Right if matches!(self.page, Page::Why(_)) => wish = Some(Wish::NewEdge),
                    Knob::Right if matches!(self.page, Page::TenTurns | Page::PlateSpeed) => {}
                    Knob::Right => {
                        let before = *bench.setup;
                        bench.setup.cap = None;
                        bench.setup.cap_is_old = false;
                        if bench.running && *bench.setup != before {
                            self.announce(now, Field::Cap, before, bench.setup, bench.machine);
                        }
                    }
                }
            }
        }
        wish
    }

    /// When time alone changes something next.
    pub fn next_change(&self) -> Option<Instant> {
        let hold = |button: Button| match button {
            Button::Down(since) => Some(since + HOLD),
            Button::Up | Button::Held => None,
        };
        let notice = self.notice.as_ref().map(|n| n.until);
        [hold(self.left), hold(self.right), notice]
            .into_iter()
            .flatten()
            .min()
    }

    fn button(&mut self, knob: Knob) -> &mut Button {
        match knob {
            Knob::Left => &mut self.left,
            Knob::Right => &mut self.right,
        }
    }

    /// The pages about the sensor lie side by side, the left knob goes along them.
    fn turn_sensor(&mut self, knob: Knob, detents: i8, bench: Bench<'_>) {
        self.page = match (self.page, knob) {
            (Page::Sensor, _) => Page::TenTurns,
            (Page::TenTurns, Knob::Left) if !matches!(bench.sensor.hand(), Hand::Counting(_)) => {
                if detents > 0 {
                    bench.sensor.enter_plate();
                    Page::PlateSpeed
                } else {
                    Page::Sensor
                }
            }
            (Page::PlateSpeed, Knob::Left) if detents < 0 => Page::TenTurns,
            (Page::PlateSpeed, Knob::Right) => {
                bench
                    .sensor
                    .turn_plate(detents, bench.machine, choice::turned_rpm);
                Page::PlateSpeed
            }
            (page, _) => page,
        };
    }

    fn pressed(&mut self, now: Instant, knob: Knob, mut bench: Bench<'_>) {
        if !self.confirmed {
            self.confirmed = true;
            return;
        }
        let used = bench.setup.pulses_on(bench.machine);
        let offer = match self.page {
            Page::TenTurns => bench.sensor.hand_offer(used),
            Page::PlateSpeed => bench.sensor.plate_offer(used, bench.machine),
            _ => Offer::Nothing,
        };
        self.page = match (self.page, knob) {
            (Page::Run, Knob::Left) => Page::Choose(self.field),
            (Page::Run, Knob::Right) => Page::Why(0),
            (Page::Why(_), Knob::Left) => Page::Sensor,
            (Page::TenTurns | Page::PlateSpeed, Knob::Right) => match offer {
                Offer::Use(pulses) => {
                    bench.take_over(pulses);
                    bench.sensor.time_anew();
                    Page::Sensor
                }
                Offer::Start | Offer::End | Offer::Again => {
                    bench.sensor.count(now);
                    self.page
                }
                Offer::Nothing => self.page,
            },
            (Page::TenTurns | Page::PlateSpeed, Knob::Left) | (Page::Sensor, _) => {
                bench.sensor.leave();
                Page::Run
            }
            (Page::Choose(_) | Page::Why(_), _) => Page::Run,
        };
    }

    /// Turns that follow one another are one change: it was what it was before the first of them.
    fn announce(
        &mut self,
        now: Instant,
        field: Field,
        before: Setup,
        after: &Setup,
        machine: &Machine,
    ) {
        let before = match &self.notice {
            Some(notice) if notice.field == field && now < notice.until => notice.before,
            _ => before,
        };
        if before == *after {
            // Turned back to what it was: there is no change to tell.
            self.notice = None;
            return;
        }
        let text = text(field.change(&before, after, machine));
        self.notice = Some(Notice {
            field,
            before,
            until: now + NOTICE,
            text,
        });
    }
}
