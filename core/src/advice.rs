//! What the spindle should run at: every bound, the window that they leave, and what the machine can do in it.

use core::fmt;

use heapless::Vec;

use crate::machine::{ABOVE_PLATE, Drive, Label, Machine};
use crate::physics::cutting_speed::spindle_speed;
use crate::setup::Setup;
use crate::trade::{self, CuttingSpeed, Refusal};
use crate::units::Rpm;

/// `fast` begins this far above the soft upper bound (see [`crate::verdict`]).
pub const FAST_ABOVE: f32 = 1.05;
/// `slow` begins below this share of the advised step (see [`crate::verdict`]).
pub const SLOW_BELOW: f32 = 0.90;

/// Room for one bound of every reason.
const MAX_BOUNDS: usize = 16;

/// What happens beyond a bound.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Kind {
    /// Something may break loose.
    Hard,
    /// Edge, finish or motor suffer.
    Soft,
}

impl Kind {
    /// A stable code.
    pub const fn code(self) -> &'static str {
        match self {
            Kind::Hard => "hard",
            Kind::Soft => "soft",
        }
    }
}

/// Which side of the window a bound closes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Side {
    /// At most this fast.
    Upper,
    /// At least this fast.
    Lower,
}

/// Why a bound stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Reason {
    /// Cutting speed of material, tool and operation.
    CuttingSpeed,
    /// Top speed of the machine.
    MachineTopSpeed,
    /// Speed stamped on the workholder.
    HolderRating,
    /// Cap typed by the operator or instructor.
    OperatorCap,
}

impl Reason {
    /// A stable code.
    pub const fn code(self) -> &'static str {
        match self {
            Reason::CuttingSpeed => "cutting-speed",
            Reason::MachineTopSpeed => "machine-top-speed",
            Reason::HolderRating => "holder-rating",
            Reason::OperatorCap => "operator-cap",
        }
    }

    /// In words.
    pub const fn words(self) -> &'static str {
        match self {
            Reason::CuttingSpeed => "cutting speed of material, tool and operation",
            Reason::MachineTopSpeed => "top speed of the machine",
            Reason::HolderRating => "speed stamped on the workholder",
            Reason::OperatorCap => "cap typed by the operator",
        }
    }

    /// In words short enough for a line of the screen.
    pub const fn short(self) -> &'static str {
        match self {
            Reason::CuttingSpeed => "cutting speed",
            Reason::MachineTopSpeed => "machine",
            Reason::HolderRating => "holder rating",
            Reason::OperatorCap => "my cap",
        }
    }

    const fn kind(self) -> Kind {
        match self {
            Reason::CuttingSpeed => Kind::Soft,
            Reason::MachineTopSpeed | Reason::HolderRating | Reason::OperatorCap => Kind::Hard,
        }
    }
}

/// One bound on the spindle speed.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Bound {
    /// Where it stands.
    pub at: Rpm,
    /// Which side it closes.
    pub side: Side,
    /// What happens beyond it.
    pub kind: Kind,
    /// Why it stands.
    pub reason: Reason,
}

impl Bound {
    /// An upper bound.
    pub fn upper(at: Rpm, reason: Reason) -> Self {
        Bound {
            at,
            side: Side::Upper,
            kind: reason.kind(),
            reason,
        }
    }
}

impl fmt::Display for Bound {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let side = match self.side {
            Side::Upper => "at most",
            Side::Lower => "at least",
        };
        write!(f, "{side} {}: {}", self.at, self.reason.words())
    }
}

/// What the bounds leave: lowest upper bound, highest lower bound.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Window {
    /// The lowest upper bound of any kind: the one that binds. The machine's top speed always stands.
    pub high: Bound,
    /// The lowest hard upper bound.
    pub hard: Option<Bound>,
    /// The lowest soft upper bound.
    pub soft: Option<Bound>,
    /// The highest lower bound.
    pub low: Option<Bound>,
}

impl Window {
    /// The window of these bounds, or `None` without any upper bound.
    pub fn of(bounds: &[Bound]) -> Option<Self> {
        let lowest = |kind: &[Kind]| {
            bounds
                .iter()
                .filter(|b| b.side == Side::Upper && kind.contains(&b.kind))
                .copied()
                .reduce(|a, b| if b.at < a.at { b } else { a })
        };
        let low = bounds
            .iter()
            .filter(|b| b.side == Side::Lower)
            .copied()
            .reduce(|a, b| if b.at > a.at { b } else { a });
        Some(Window {
            high: lowest(&[Kind::Hard, Kind::Soft])?,
            hard: lowest(&[Kind::Hard]),
            soft: lowest(&[Kind::Soft]),
            low,
        })
    }

    /// Whether a lower bound stands above an upper one. The upper one wins.
    pub fn conflict(&self) -> bool {
        self.low.is_some_and(|low| low.at > self.high.at)
    }

    /// The best speed: the fastest inside every upper bound.
    pub fn best(&self) -> Rpm {
        self.high.at
    }

    /// The fastest plate speed whose loaded spindle stays inside every hard bound and does not read fast.
    fn fastest_plate(&self) -> Rpm {
        let hard = self
            .hard
            .map_or(Rpm::MAX, |b| b.at.scaled(1.0 / ABOVE_PLATE));
        let soft = self
            .soft
            .map_or(Rpm::MAX, |b| b.at.scaled(FAST_ABOVE / ABOVE_PLATE));
        if hard < soft { hard } else { soft }
    }
}

/// A speed that the machine can be set to.
#[derive(Clone, Debug, PartialEq)]
pub struct Setting {
    /// The label of the step or range.
    pub label: Label,
    /// The step's plate speed, or the speed to set within the range.
    pub rpm: Rpm,
}

/// What to set on the machine, or why nothing is advised.
#[derive(Clone, Debug, PartialEq)]
pub enum Pick {
    /// Set this.
    Set(Setting),
    /// Even the machine's slowest is too fast.
    TooFast {
        /// The slowest setting, the nearest to what is allowed.
        nearest: Setting,
        /// How far it lies above the fastest setting allowed, percent.
        over_percent: f32,
    },
    /// The holder has no stamped speed and no cap was typed.
    NeedsCap,
    /// There is no basis for a cutting speed.
    NoBasis(Refusal),
}

impl Pick {
    /// The setting, where one is advised.
    pub fn setting(&self) -> Option<&Setting> {
        match self {
            Pick::Set(setting) => Some(setting),
            _ => None,
        }
    }
}

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
}

impl Advice {
    /// The speed to aim at, where there is a basis for one.
    pub fn best(&self) -> Option<Rpm> {
        self.cutting.is_ok().then(|| self.window.best())
    }

    /// Below this the spindle is slow: the greater of the lower bound and 0.90 of the advised setting.
    pub fn slow_below(&self) -> Rpm {
        let step = self
            .pick
            .setting()
            .map_or(Rpm::ZERO, |s| s.rpm.scaled(SLOW_BELOW));
        let low = self.window.low.map_or(Rpm::ZERO, |b| b.at);
        if low > step { low } else { step }
    }

    /// How far the advised setting stays below the best speed, percent; `None` without both.
    pub fn short_percent(&self) -> Option<f32> {
        let best = self.best()?.get();
        let set = self.pick.setting()?.rpm.get();
        Some((1.0 - set / best) * 100.0)
    }
}

/// Weighs every bound for `setup` on `machine` and picks what to set. Work is bounded: one look at each step.
///
/// A holder index that the machine does not have counts as an unrated holder: never green without a cap.
pub fn advise(setup: &Setup, machine: &Machine) -> Advice {
    let cutting = trade::cutting_speed(setup.material, setup.tool, setup.operation, setup.coolant);
    let rated = machine
        .holders()
        .get(usize::from(setup.holder))
        .and_then(|h| h.rated);

    let top = Bound::upper(machine.top_speed(), Reason::MachineTopSpeed);
    let mut bounds = Vec::new();
    let mut weigh = |bound: Option<Bound>| {
        // MAX_BOUNDS has room for one bound of every reason, and each is weighed once.
        let _ = bound.map(|b| bounds.push(b));
    };
    weigh(
        cutting
            .as_ref()
            .ok()
            .map(|c| Bound::upper(spindle_speed(c.ours, setup.diameter), Reason::CuttingSpeed)),
    );
    weigh(Some(top));
    weigh(rated.map(|n| Bound::upper(n, Reason::HolderRating)));
    weigh(setup.cap.map(|n| Bound::upper(n, Reason::OperatorCap)));

    let window = Window::of(&bounds).unwrap_or(Window {
        high: top,
        hard: Some(top),
        soft: None,
        low: None,
    });
    let pick = match &cutting {
        Err(refusal) => Pick::NoBasis(*refusal),
        Ok(_) if rated.is_none() && setup.cap.is_none() => Pick::NeedsCap,
        Ok(_) => pick(&window, machine.drive()),
    };
    Advice {
        cutting,
        bounds,
        window,
        pick,
    }
}

/// Stepped drive: the fastest step that fits. Variable drive: the target itself, in the fastest range that has it;
/// in a gap between two ranges the top of the lower one.
fn pick(window: &Window, drive: &Drive) -> Pick {
    let limit = window.fastest_plate();
    let reach = if window.best() < limit {
        window.best()
    } else {
        limit
    };
    let (fitting, slowest) = match drive {
        Drive::Stepped(steps) => (
            steps
                .iter()
                .rev()
                .find(|s| s.rpm <= reach)
                .map(|s| (&s.label, s.rpm)),
            steps.first().map(|s| (&s.label, s.rpm)),
        ),
        Drive::Variable(ranges) => {
            let hard = window
                .hard
                .map_or(Rpm::MAX, |b| b.at.scaled(1.0 / ABOVE_PLATE));
            let target = if window.best() < hard {
                window.best()
            } else {
                hard
            };
            (
                ranges
                    .iter()
                    .rev()
                    .find(|r| r.low <= target)
                    .map(|r| (&r.label, if target < r.high { target } else { r.high })),
                ranges.first().map(|r| (&r.label, r.low)),
            )
        }
    };
    let setting = |(label, rpm): (&Label, Rpm)| Setting {
        label: label.clone(),
        rpm,
    };
    match (fitting, slowest) {
        (Some(found), _) => Pick::Set(setting(found)),
        (None, Some(slowest)) => Pick::TooFast {
            over_percent: (slowest.1.get() / reach.get().max(f32::MIN_POSITIVE) - 1.0) * 100.0,
            nearest: setting(slowest),
        },
        // A machine has at least one step or range; without any there is nothing to allow.
        (None, None) => Pick::NeedsCap,
    }
}
