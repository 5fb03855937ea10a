//! The live shift without its face: the script or the hands move the bench, time goes at a pace.

use std::collections::VecDeque;
use std::time::Duration;

use rimrate_core::machine::Drive;
use rimrate_core::setup::Setup;
use rimrate_core::time::Instant;
use rimrate_core::trade::IsoGroup;
use rimrate_core::verdict::Verdict;

use super::keys::{Command, Hand};
use super::words;
use crate::bench::Bench;
use crate::rig::{Desk, Rig};
use crate::scenario::{Action, CutSpec, FaultName, MotorTo, Scenario};

/// Actions fall on this grid, ms, as in a run without a face: both are the same run.
const LOOK_MS: u64 = 10;
/// How many times faster than real time.
const PACES: [u32; 3] = [1, 5, 20];
/// Longer gaps between two looks were no time at the lathe: the computer slept.
const LONGEST_GAP: Duration = Duration::from_millis(250);
/// A verdict is told when it has stood this long; the lamps show each at once.
const TOLD_AFTER_MS: u64 = 200;
/// Events kept.
const KEPT: usize = 200;
/// Below this speed, rpm, gears can be shifted.
const AT_REST: f64 = 0.5;

/// Who moves the lathe.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Mode {
    /// The shift's script.
    Shift,
    /// Somebody's hands; the shift waits.
    Hands,
    /// Somebody's hands; the shift is over.
    Over,
}

/// Whose doing an event is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Who {
    /// A sentence of the shift.
    Story,
    /// The shift's script.
    Shift,
    /// Whoever is at the keys.
    You,
    /// The box: its verdict.
    Box,
    /// Nobody's: what was asked for cannot be done.
    Refusal,
}

/// Something that happened.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Told {
    /// When, ms.
    pub at: u64,
    /// Whose doing.
    pub who: Who,
    /// What.
    pub text: String,
    /// How many times in a row.
    pub times: u32,
}

/// Everything that the view shows.
pub(super) struct App<'a> {
    scenario: &'a Scenario,
    bench: Bench<Desk>,
    /// The bench's time, ms.
    ms: u64,
    /// Where the shift waits, ms.
    left_at: u64,
    next_action: usize,
    next_note: usize,
    story: &'a str,
    told: VecDeque<Told>,
    /// The last verdict that was told, and one that has not stood long enough yet.
    verdict: Verdict,
    fresh: Option<(Verdict, u64)>,
    mode: Mode,
    pace: usize,
    paused: bool,
    help: bool,
    quit: bool,
    /// Real time that is less than one look.
    carry: Duration,
    /// A foot that stays on the brake until the spindle stands.
    foot: bool,
    /// Where a variable drive's dial stands, rpm.
    dial: f64,
}

impl<'a> App<'a> {
    /// The shift, at its beginning.
    pub(super) fn new(scenario: &'a Scenario) -> Self {
        let mut app = App {
            scenario,
            bench: bench(scenario),
            ms: 0,
            left_at: 0,
            next_action: 0,
            next_note: 0,
            story: "",
            told: VecDeque::new(),
            verdict: Verdict::Unconfirmed,
            fresh: None,
            mode: Mode::Shift,
            pace: 0,
            paused: false,
            help: false,
            quit: false,
            carry: Duration::ZERO,
            foot: false,
            dial: dial(scenario),
        };
        app.begin();
        app
    }

    /// The scenario.
    pub(super) fn scenario(&self) -> &'a Scenario {
        self.scenario
    }
    /// The lathe, its sensor and the box.
    pub(super) fn bench(&self) -> &Bench<Desk> {
        &self.bench
    }
    /// The time at the lathe, ms.
    pub(super) fn clock_ms(&self) -> u64 {
        self.ms
    }
    /// The shift's length, ms.
    pub(super) fn length_ms(&self) -> u64 {
        (self.scenario.seconds * 1e3) as u64
    }
    /// Where the shift waits while hands are on the lathe, ms.
    pub(super) fn left_at_ms(&self) -> u64 {
        self.left_at
    }
    /// Who moves the lathe.
    pub(super) fn mode(&self) -> Mode {
        self.mode
    }
    /// How many times faster than real time it goes.
    pub(super) fn pace(&self) -> u32 {
        PACES[self.pace]
    }
    /// Whether time stands.
    pub(super) fn paused(&self) -> bool {
        self.paused
    }
    /// Whether the help is shown; time stands meanwhile.
    pub(super) fn help(&self) -> bool {
        self.help
    }
    /// Whether somebody wants to leave.
    pub(super) fn quit(&self) -> bool {
        self.quit
    }
    /// What it is all about at present.
    pub(super) fn story(&self) -> &str {
        match self.mode {
            Mode::Shift => self.story,
            Mode::Hands => "The lathe is yours; Enter goes back to the shift.",
            Mode::Over => "The shift is over, the lathe is yours; Enter plays it again, q quits.",
        }
    }
    /// What happened, oldest first.
    pub(super) fn told(&self) -> impl DoubleEndedIterator<Item = &Told> {
        self.told.iter()
    }

    /// Lets real time pass.
    pub(super) fn advance(&mut self, real: Duration) {
        if self.paused || self.help {
            return;
        }
        self.carry += real.min(LONGEST_GAP) * self.pace();
        let look = Duration::from_millis(LOOK_MS);
        while self.carry >= look {
            self.carry -= look;
            self.step();
        }
    }

    /// Does what a key asks for.
    pub(super) fn command(&mut self, command: Command) {
        match command {
            Command::Quit => self.quit = true,
            Command::Help => self.help = !self.help,
            // Whoever reads the help touches nothing by accident.
            _ if self.help => self.help = false,
            Command::Pause => self.paused = !self.paused,
            Command::Pace => self.pace = (self.pace + 1) % PACES.len(),
            Command::Resume => match self.mode {
                Mode::Shift => {}
                Mode::Hands => self.back_to(self.left_at),
                Mode::Over => self.back_to(0),
            },
            Command::NextStage => self.next_stage(),
            Command::Hand(hand) => {
                self.take_over();
                self.hand(hand);
            }
        }
    }

    fn begin(&mut self) {
        self.bench = bench(self.scenario);
        self.dial = dial(self.scenario);
        (self.ms, self.next_action, self.next_note) = (0, 0, 0);
        (self.story, self.foot, self.carry) = ("", false, Duration::ZERO);
        (self.verdict, self.fresh) = (self.bench.rig.verdict(), None);
        self.told.clear();
        self.mode = Mode::Shift;
        self.script();
    }

    /// Plays the shift anew up to a time, in no time: every run is the same, so that it then stands where it stood.
    fn back_to(&mut self, ms: u64) {
        self.begin();
        while self.ms < ms && self.mode == Mode::Shift {
            self.step();
        }
    }

    fn next_stage(&mut self) {
        match self.mode {
            Mode::Shift => {}
            Mode::Hands => self.back_to(self.left_at),
            Mode::Over => return self.back_to(0),
        }
        let stage = self.next_note;
        while self.mode == Mode::Shift && self.next_note == stage {
            self.step();
        }
    }

    fn take_over(&mut self) {
        if self.mode == Mode::Shift {
            self.mode = Mode::Hands;
            self.left_at = self.ms;
            let at = words::clock(self.ms);
            self.tell(Who::You, format!("you take over, the shift waits at {at}"));
            // The script's foot is not yours.
            if self.bench.pedal() > 0.0 {
                self.act(&Action::Brake(0.0));
            }
        }
    }

    fn step(&mut self) {
        self.ms += LOOK_MS;
        self.bench
            .run(Instant::from_nanos(self.ms * 1_000_000), |_| {});
        if self.mode == Mode::Shift {
            self.script();
        }
        if self.foot && self.bench.lathe().smooth_rpm() == 0.0 {
            self.foot = false;
            self.act(&Action::Brake(0.0));
        }
        self.listen();
    }

    /// Does what the script has for this time.
    fn script(&mut self) {
        let now = self.ms as f64 / 1e3 + 1e-9;
        while let Some((_, text)) = self
            .scenario
            .notes
            .get(self.next_note)
            .filter(|n| n.0 <= now)
        {
            self.next_note += 1;
            self.story = text;
            self.tell(Who::Story, text.clone());
        }
        while let Some((_, action)) = self
            .scenario
            .actions
            .get(self.next_action)
            .filter(|a| a.0 <= now)
        {
            self.next_action += 1;
            self.tell(Who::Shift, words::action(action));
            self.bench.act(action, &self.scenario.setup);
        }
        if self.ms >= self.length_ms() {
            self.mode = Mode::Over;
        }
    }

    fn hand(&mut self, hand: Hand) {
        match hand {
            Hand::Turn(knob, by) => self.do_it(Action::Turn { knob, by }),
            Hand::Press(knob) => self.do_it(Action::Press(knob)),
            Hand::Hold(knob) => self.do_it(Action::Hold(knob)),
            Hand::Motor(to) => {
                if self.bench.pedal() > 0.0 && to != MotorTo::Off {
                    self.foot = false;
                    self.act(&Action::Brake(0.0));
                }
                self.do_it(Action::Motor(to));
            }
            Hand::Step(by) => self.shift_gear(by),
            Hand::Brake => {
                self.foot = true;
                self.do_it(Action::Brake(1.0));
            }
            Hand::Cut { interrupted } => {
                let action = match self.bench.cut() {
                    Some(cut) if cut.times.is_some() == interrupted => Action::Uncut,
                    _ => Action::Cut(self.usual_cut(interrupted)),
                };
                self.do_it(action);
            }
            Hand::Cable => self.toggle(FaultName::StuckHigh),
            Hand::Magnet => self.toggle(FaultName::MagnetLost),
        }
    }

    fn toggle(&mut self, fault: FaultName) {
        let action = if self.bench.faults().contains(&fault) {
            Action::Mend(fault)
        } else {
            Action::Fault(fault)
        };
        self.do_it(action);
    }

    fn shift_gear(&mut self, by: i8) {
        let action = match self.scenario.machine.drive() {
            Drive::Stepped(steps) => {
                if self.bench.lathe().smooth_rpm().abs() > AT_REST {
                    let text = "stop the spindle before shifting: b brakes";
                    return self.tell(Who::Refusal, text.into());
                }
                let at = steps.iter().position(|s| s.label == self.bench.gear());
                let to = at.and_then(|at| at.checked_add_signed(isize::from(by)));
                match to.and_then(|to| steps.get(to)) {
                    Some(step) => Action::Lever(step.label.as_str().to_owned()),
                    None => return self.tell(Who::Refusal, "no further step".into()),
                }
            }
            Drive::Variable(ranges) => {
                let low = ranges.iter().map(|r| f64::from(r.low.get()));
                let high = ranges.iter().map(|r| f64::from(r.high.get()));
                let to = if by > 0 {
                    self.dial * 1.05
                } else {
                    self.dial / 1.05
                };
                self.dial = to
                    .max(low.fold(f64::INFINITY, f64::min))
                    .min(high.fold(0.0, f64::max));
                Action::Dial(self.dial)
            }
        };
        self.do_it(action);
    }

    /// A cut of medium depth in the material that the box is set to. Specific cutting forces rounded, per group of
    /// materials (common practice, no source).
    fn usual_cut(&self, interrupted: bool) -> CutSpec {
        let specific_force = match self.setup().material.group() {
            IsoGroup::P => 2100.0,
            IsoGroup::M => 2400.0,
            IsoGroup::K => 1300.0,
            IsoGroup::N => 800.0,
            IsoGroup::S => 2800.0,
            IsoGroup::H => 4000.0,
        };
        CutSpec {
            specific_force,
            depth_mm: 2.0,
            feed_mm: 0.2,
            times: interrupted.then_some(6),
            share: interrupted.then_some(0.6),
        }
    }

    /// What the box is set to.
    pub(super) fn setup(&self) -> Setup {
        *self.bench.rig.instrument().view().setup
    }

    fn do_it(&mut self, action: Action) {
        self.tell(Who::You, words::action(&action));
        self.act(&action);
        self.listen();
    }

    fn act(&mut self, action: &Action) {
        let setup = self.setup();
        self.bench.act(action, &setup);
    }

    /// Tells of a new verdict: of danger at once, of others when they have stood for a moment.
    fn listen(&mut self) {
        let verdict = self.bench.rig.verdict();
        if verdict == self.verdict {
            self.fresh = None;
            return;
        }
        let since = match self.fresh {
            Some((fresh, since)) if fresh == verdict => since,
            _ => self.ms,
        };
        if verdict == Verdict::Danger || self.ms - since >= TOLD_AFTER_MS {
            self.fresh = None;
            self.verdict = verdict;
            let text = format!("the box says: {}", verdict.id());
            self.tell_at(since, Who::Box, text);
        } else {
            self.fresh = Some((verdict, since));
        }
    }

    fn tell(&mut self, who: Who, text: String) {
        self.tell_at(self.ms, who, text);
    }

    fn tell_at(&mut self, at: u64, who: Who, text: String) {
        // Clicks of a knob that follow one another are one line.
        if let Some(last) = self.told.back_mut()
            && (last.who, &last.text) == (who, &text)
        {
            last.times += 1;
            return;
        }
        if self.told.len() == KEPT {
            self.told.pop_front();
        }
        self.told.push_back(Told {
            at,
            who,
            text,
            times: 1,
        });
    }
}

fn bench(scenario: &Scenario) -> Bench<Desk> {
    let desk = Desk::new(scenario.machine.clone(), Some(scenario.setup));
    Bench::new(
        scenario.machine.clone(),
        scenario.sensor.clone(),
        scenario.seed,
        desk,
    )
}

/// Where a variable drive's dial stands at first, rpm.
fn dial(scenario: &Scenario) -> f64 {
    match scenario.machine.drive() {
        Drive::Stepped(_) => 0.0,
        Drive::Variable(ranges) => ranges.first().map_or(0.0, |r| f64::from(r.low.get())),
    }
}
