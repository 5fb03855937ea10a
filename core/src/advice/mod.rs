//! What the spindle should run at: every bound, the window that they leave, what the machine can do in it, and the cut.

mod bound;
mod caution;
mod cut;
mod excess;
mod pick;
mod shift;

use heapless::Vec;

use crate::machine::Drive;
use crate::machine::{HolderKind, Machine, MachineKind, MotorKind, SpindleNose};
use crate::physics::cutting_speed::{spindle_speed, spindle_speed_of};
use crate::physics::{drilling, workholding};
use crate::setup::{HalfNut, Setup};
use crate::trade::{self, CuttingSpeed, Operation, Refusal};
use crate::units::{Rpm, SurfaceSpeed};

pub use bound::{Bound, Kind, Reason, Side, Window};
pub use caution::Caution;
pub use cut::{
    Cut, EdgeLife, Feed, FeedFrom, Finish, HandFeed, Load, Slender, ThreadEnd, USUAL_NOSE_MM,
    USUAL_STOP_S,
};
pub use excess::Excess;
pub use pick::{Pick, Setting};
pub use shift::Shift;

use cut::Demand;
use pick::pick;

/// `fast` begins this far above the soft upper bound (see [`crate::verdict`]).
pub const FAST_ABOVE: f32 = 1.05;
/// `slow` begins below this share of the advised step (see [`crate::verdict`]).
pub const SLOW_BELOW: f32 = 0.90;
/// A loaded spindle may run this share of its plate speed and is right (ISO 229: 2 % below at rated load; from memory).
const LOADED: f32 = 0.98;
/// The machine counts as too slow for a cut whose speed lies this much above its fastest setting (our choice).
const TOO_SLOW: f32 = 1.25;
/// Drills thinner than this, mm, break when a hand presses them (common practice, no source).
const THIN_DRILL_MM: f32 = 6.0;

/// Room for one bound of every reason.
const MAX_BOUNDS: usize = 16;
/// Room for every caution that can stand beside others.
const MAX_CAUTIONS: usize = 17;

/// The answer for a setup on a machine.
#[derive(Clone, Debug, PartialEq)]
pub struct Advice {
    /// The cutting speed with its sources, or why there is none.
    pub cutting: Result<CuttingSpeed, Refusal>,
    /// Every bound that applies, in the order in which they were weighed.
    pub bounds: Vec<Bound, MAX_BOUNDS>,
    /// What they leave.
    pub window: Window,
    /// What to set on the machine.
    pub pick: Pick,
    /// Feed, force, finish, time and the rest of the cut.
    pub cut: Cut,
    /// What to mind, most pressing first.
    pub cautions: Vec<Caution, MAX_CAUTIONS>,
}

impl Advice {
    /// The speed to aim at, where there is a basis for one.
    pub fn best(&self) -> Option<Rpm> {
        self.cutting.is_ok().then(|| self.window.best())
    }

    /// The cutting speed behind the advice: the table's, or what the insert's box says.
    pub fn surface_speed(&self) -> Option<SurfaceSpeed> {
        self.cut.edge.map(|e| e.stated)
    }

    /// Below this the spindle is slow: the greater of the lower bound and 0.90 of the advised setting. A lower bound that the
    /// advised setting, loaded, does not clear, or an upper bound where none is advised, is a caution and no verdict: upper
    /// bounds win, and the advised setting reads right.
    pub fn slow_below(&self) -> Rpm {
        let set = self.pick.setting().map(|s| s.rpm);
        let step = set.map_or(Rpm::ZERO, |n| n.scaled(SLOW_BELOW));
        let low = self
            .window
            .low
            .map(|b| b.at)
            .filter(|&low| low <= set.map_or(self.window.high.at, |n| n.scaled(LOADED)));
        match low {
            Some(low) if low > step => low,
            _ => step,
        }
    }

    /// The upper bounds from the lowest on, each with how far it stands above the lowest, percent.
    pub fn ranked(&self) -> Vec<(Bound, f32), MAX_BOUNDS> {
        let mut uppers: Vec<(Bound, f32), MAX_BOUNDS> = Vec::new();
        let lowest = self.window.high.at.get().max(f32::MIN_POSITIVE);
        for bound in self.bounds.iter().filter(|b| b.side == Side::Upper) {
            let above = (bound.at.get() / lowest - 1.0) * 100.0;
            let at = uppers
                .iter()
                .position(|(b, _)| bound.at < b.at)
                .unwrap_or(uppers.len());
            // As many places as there are bounds.
            let _ = uppers.insert(at, (*bound, above));
        }
        uppers
    }

    /// All else would allow a setting, but the motor pulls this cut in none: less depth or feed is the help.
    pub fn nothing_pulls(&self) -> bool {
        matches!(self.pick, Pick::TooFast { .. }) && self.cut.overloaded
    }

    /// How far the advised setting stays below the best speed, percent; `None` without both.
    pub fn short_percent(&self) -> Option<f32> {
        let best = self.best()?.get();
        let set = self.pick.setting()?.rpm.get();
        Some((1.0 - set / best) * 100.0)
    }
}

/// Operations that a kind of machine cannot do, whatever the material.
///
/// # Errors
/// [`Refusal`] for a single point, a parting blade or a knurl on a drill press.
pub fn refuse_machine(operation: Operation, kind: MachineKind) -> Result<(), Refusal> {
    let on_turning_work = operation.is_outside_turning() && operation != Operation::DieThreading;
    match kind {
        MachineKind::DrillPress if on_turning_work || operation == Operation::Boring => {
            Err(Refusal {
                reason: "on a drill press the work is clamped and nothing feeds a single point: its load from the side shakes the chuck off its taper; use a lathe",
            })
        }
        _ => Ok(()),
    }
}

/// Weighs every bound for `setup` on `machine` and picks what to set. Work is bounded: a few looks at each step.
///
/// A holder index that the machine does not have counts as an unrated holder: never green without a cap.
pub fn advise(setup: &Setup, machine: &Machine) -> Advice {
    let cutting = refuse_machine(setup.operation, machine.kind()).and_then(|()| {
        trade::cutting_speed(setup.material, setup.tool, setup.operation, setup.coolant)
    });
    let holder = machine.holders().get(usize::from(setup.holder));
    let rated = holder.and_then(|h| h.rated);
    let mut cut = Cut {
        edge: cutting.as_ref().ok().map(|c| EdgeLife::of(setup, c)),
        feed: Feed::of(setup, machine),
        thread: ThreadEnd::of(setup, machine),
        bar: Slender::of(setup),
        ..Cut::default()
    };

    let top = Bound::upper(machine.top_speed(), Reason::MachineTopSpeed);
    let mut bounds: Vec<Bound, MAX_BOUNDS> = Vec::new();
    let mut weigh = |bound: Option<Bound>| {
        // MAX_BOUNDS has room for one bound of every reason, and each is weighed once.
        let _ = bound.map(|b| bounds.push(b));
    };
    let at = |v: f32| spindle_speed_of(v, setup.diameter);
    let edge = cut.edge.as_ref();
    weigh(edge.map(|e| {
        Bound::upper(
            spindle_speed(e.stated, setup.diameter),
            Reason::CuttingSpeed,
        )
    }));
    weigh(Some(top));
    weigh(rated.map(|n| Bound::upper(n, Reason::HolderRating)));
    weigh(setup.cap.map(|n| Bound::upper(n, Reason::OperatorCap)));
    weigh(edge.and_then(|e| Some(Bound::upper(at(e.for_wanted?), Reason::EdgeLife))));
    weigh(
        cut.bar
            .map(|bar| Bound::upper(bar.fastest, Reason::StickOut)),
    );
    weigh(jaw_grip(setup, holder.map(|h| h.kind)));
    weigh(thread_end(setup, machine, cut.thread.as_ref()));
    weigh(edge.and_then(|e| Some(Bound::lower(at(e.slowest_useful?), Reason::SlowestUseful))));
    weigh(motor_cooling(machine));

    let window = Window::of(&bounds).unwrap_or(Window::only(top));
    let demand = Demand::of(setup, cut.feed.as_ref());
    cut.load = demand.and_then(|d| d.load(setup));
    let mut answer = Answer::of(setup, machine, rated, &cutting, window, None);
    // The depth that would pull where everything but the motor has its way.
    let to_centre = matches!(
        setup.operation,
        Operation::RoughTurning | Operation::FinishTurning
    )
    .then(|| setup.diameter.mm() / 2.0);
    cut.depth_limit_mm = answer.pick.setting().and_then(|set| {
        let torque = machine.torque_at(&set.label, set.rpm)?;
        let depth = demand?.depth_of(torque)?;
        Some(to_centre.map_or(depth, |radius| depth.min(radius)))
    });
    cut.overloaded = cut
        .load
        .zip(answer.pick.setting())
        .is_some_and(|(load, set)| !machine.pulls(Some(load.torque_nm), &set.label, set.rpm));
    if let Some(torque) = cut.load.map(|l| l.torque_nm) {
        let power = machine
            .power_limit(torque)
            .map(|n| Bound::upper(n, Reason::Power));
        let torques = machine
            .torque_limit(torque)
            .map(|n| Bound::upper(n, Reason::Torque));
        for bound in [power, torques].into_iter().flatten() {
            let _ = bounds.push(bound);
        }
        if power.is_some() {
            let window = Window::of(&bounds).unwrap_or(window);
            answer = Answer::of(setup, machine, rated, &cutting, window, Some(torque));
        }
    }
    let Answer { window, pick } = answer;
    cut.finish_with(setup, pick.setting());
    let mut advice = Advice {
        cutting,
        bounds,
        window,
        pick,
        cut,
        cautions: Vec::new(),
    };
    advice.cautions = cautions(setup, machine, &advice);
    advice
}

/// A window with what to set in it.
struct Answer {
    window: Window,
    pick: Pick,
}

impl Answer {
    fn of(
        setup: &Setup,
        machine: &Machine,
        rated: Option<Rpm>,
        cutting: &Result<CuttingSpeed, Refusal>,
        window: Window,
        torque: Option<f32>,
    ) -> Self {
        let unknown = rated.is_none() || setup.details.off_balance || setup.details.interrupted;
        let pick = match cutting {
            Err(refusal) => Pick::NoBasis(*refusal),
            Ok(_) if unknown && (setup.cap.is_none() || setup.cap_is_old) => Pick::NeedsCap,
            Ok(_) => pick(&window, machine, torque),
        };
        Answer { window, pick }
    }
}

/// The speed at which the jaws have lost what they may.
fn jaw_grip(setup: &Setup, holder: Option<HolderKind>) -> Option<Bound> {
    let jaws = setup.details.jaws?;
    if !matches!(holder, Some(HolderKind::ThreeJaw | HolderKind::FourJaw)) {
        return None;
    }
    let loss = jaws.grip_n() * (1.0 - workholding::GRIP_LEFT);
    let n = workholding::speed_at_loss(jaws.count(), jaws.mass_kg(), jaws.radius_mm(), loss);
    Some(Bound::upper(Rpm::saturating(n), Reason::JawGrip))
}

/// The speed up to the end of a thread. Where it is not said what is done there, the slower case. Away from the shoulder
/// there is no bound, unless the chuck is screwed on: then that way is not to be taken.
fn thread_end(setup: &Setup, machine: &Machine, end: Option<&ThreadEnd>) -> Option<Bound> {
    let end = end?;
    let slower = if end.opened < end.closed {
        end.opened
    } else {
        end.closed
    };
    let n = match setup.details.thread?.half_nut {
        Some(HalfNut::Opened) => end.opened,
        Some(HalfNut::Closed) => end.closed,
        None => slower,
        Some(HalfNut::Away) if machine.nose() == SpindleNose::Threaded => slower,
        Some(HalfNut::Away) => return None,
    };
    Some(Bound::upper(n, Reason::ThreadRunout))
}

/// The slowest speed at which a motor on an inverter cools itself in one of its ranges.
fn motor_cooling(machine: &Machine) -> Option<Bound> {
    let Drive::Variable(ranges) = machine.drive() else {
        return None;
    };
    let slowest = ranges
        .iter()
        .filter_map(|r| r.cool)
        .reduce(|a, b| if b < a { b } else { a });
    machine
        .motor()
        .filter(|m| m.kind == MotorKind::Inverter)
        .and(slowest)
        .map(|n| Bound::lower(n, Reason::MotorCooling))
}

/// What to mind, most pressing first.
fn cautions(setup: &Setup, machine: &Machine, advice: &Advice) -> Vec<Caution, MAX_CAUTIONS> {
    let (details, op, cut) = (&setup.details, setup.operation, &advice.cut);
    let holder = machine.holders().get(usize::from(setup.holder));
    let set = advice.pick.setting().map(|s| s.rpm);
    let mut all = Vec::new();
    let mut mind = |caution: Caution| {
        // No more cautions than places can stand together (there is a test).
        let _ = all.push(caution);
    };

    if advice.pick == Pick::NeedsCap {
        if holder.is_none_or(|h| h.rated.is_none()) {
            let kind = holder.map(|h| h.kind);
            let offered = offered_cap(setup, machine, kind);
            mind(Caution::NeedsCap {
                holder: kind,
                offered,
            });
        } else {
            mind(Caution::NeedsCapForWork);
        }
    }
    if details.off_balance || holder.is_some_and(|h| h.kind == HolderKind::Faceplate) {
        mind(Caution::OffBalance);
    }
    if details.interrupted {
        mind(Caution::Interrupted);
    }
    if op.is_milling() && holder.is_some_and(|h| h.kind == HolderKind::DrillChuck) {
        mind(Caution::SideLoad);
    }
    if let Pick::TooFast { .. } = advice.pick {
        mind(if advice.nothing_pulls() {
            Caution::NothingPulls {
                depth_mm: cut.depth_limit_mm,
            }
        } else {
            Caution::SlowestTooFast
        });
    }
    if let Some(bar) = cut.bar.filter(Slender::too_slender) {
        mind(Caution::Slender {
            ratio: bar.ratio,
            support: bar.support,
        });
    }
    if let Some(thread) = details.thread.filter(|_| op == Operation::Threading) {
        let away = thread.half_nut == Some(HalfNut::Away);
        if away && machine.nose() == SpindleNose::Threaded {
            mind(Caution::ChuckUnscrews);
        }
        if let Some(end) = cut.thread.filter(|t| t.stop_assumed && !away) {
            mind(Caution::StopNotTimed {
                taken_s: end.stop_s,
            });
        }
    }
    if setup.material.caution().is_some() {
        mind(Caution::Material(setup.material));
    }
    if cut.overloaded && !advice.nothing_pulls() {
        mind(Caution::Overload {
            depth_mm: cut.depth_limit_mm,
            inverter: machine
                .motor()
                .is_some_and(|m| m.kind == MotorKind::Inverter),
        });
    }
    let wanted = advice
        .bounds
        .iter()
        .filter(|b| b.side == Side::Upper && b.reason != Reason::MachineTopSpeed);
    let wanted = wanted
        .map(|b| b.at)
        .reduce(|a, b| if b < a { b } else { a });
    let fastest = machine.drive().fastest();
    let too_slow = set
        .zip(wanted)
        .filter(|&(set, wanted)| set >= fastest && wanted > fastest.scaled(TOO_SLOW));
    if let Some((fastest, wanted)) = too_slow {
        mind(Caution::MachineTooSlow { wanted, fastest });
    } else if let Some(percent) = advice.short_percent().filter(|&p| p > 30.0) {
        mind(Caution::StaysBelow {
            percent,
            drill: op == Operation::Drilling,
        });
    }
    if let Some(hand) = cut.hand.filter(|_| {
        op == Operation::Drilling && setup.diameter.mm() <= THIN_DRILL_MM && too_slow.is_some()
    }) {
        mind(Caution::DrillBreaks {
            mm_per_min: hand.mm_per_min,
            s_per_10_mm: hand.s_per_10_mm,
        });
    }
    if let (Some(set), Some(low)) = (set, advice.window.low)
        && low.at > set.scaled(LOADED)
    {
        mind(Caution::BelowUseful {
            at: low.at,
            motor: low.reason == Reason::MotorCooling,
        });
    }
    if cut.edge.as_ref().is_some_and(EdgeLife::life_given_up) {
        mind(Caution::LifeNotReached);
    }
    if cut.load.is_some_and(|l| !l.in_range) && machine.motor().is_some() {
        mind(Caution::ForceGuessed);
    }
    if cut.feed.is_some_and(|f| f.coarser_than_wanted) {
        mind(Caution::NoFinerFeed);
    }
    if let Some(nose_mm) = cut.beyond_nose_mm {
        mind(Caution::FeedBeyondNose { nose_mm });
    }
    let of_operation = match op {
        Operation::Facing => Some(Caution::TowardsCentre),
        Operation::Parting => Some(Caution::Parting),
        Operation::Reaming => Some(Caution::Reamer),
        Operation::Countersinking => Some(Caution::Countersink),
        Operation::Tapping | Operation::DieThreading => Some(Caution::TapOrDie),
        Operation::HoleSawing => Some(Caution::HoleSaw),
        Operation::FlyCutting => Some(Caution::FlyCutter),
        Operation::Milling if details.teeth.is_none() => Some(Caution::CountTeeth),
        Operation::Drilling => details
            .length
            .filter(|l| l.mm() > drilling::PECK_BEYOND * setup.diameter.mm())
            .map(|_| Caution::Peck {
                first_mm: drilling::PECK_BEYOND * setup.diameter.mm(),
                then_mm: drilling::peck(setup.diameter.mm()),
            }),
        _ => None,
    };
    if let Some(caution) = of_operation {
        mind(caution);
    }
    mind(Caution::Shifting(machine.kind()));
    mind(Caution::Advisory);
    all
}

/// A cap that may be offered for a holder that carries no speed because none is ever stamped on its kind. Never for chucks
/// and faceplates: unmarked ones are not to be trusted at any speed that a formula gives.
fn offered_cap(setup: &Setup, machine: &Machine, holder: Option<HolderKind>) -> Option<Rpm> {
    let sound = matches!(
        holder,
        Some(
            HolderKind::Collet | HolderKind::BetweenCentres | HolderKind::Arbor | HolderKind::Taper
        )
    );
    if !sound || setup.details.off_balance || setup.details.interrupted {
        return None;
    }
    let n = workholding::rim_speed_cap(setup.diameter.mm(), workholding::RIM_SPEED);
    // Where the machine does not reach it, it would hold nothing back.
    Some(Rpm::saturating(n)).filter(|&n| n < machine.top_speed())
}
