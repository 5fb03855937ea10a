//! Bounds and the window that they leave.

use core::fmt;

use super::FAST_ABOVE;
use crate::machine::ABOVE_PLATE;
use crate::units::Rpm;

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
    /// First bending speed of the bar that sticks out.
    StickOut,
    /// Grip that the jaws lose by turning.
    JawGrip,
    /// Cutting speed for the wanted edge life.
    EdgeLife,
    /// Power of the motor.
    Power,
    /// Torque of the motor in its ranges or steps.
    Torque,
    /// Room and time to stop the tool at the end of a thread.
    ThreadRunout,
    /// Slowest speed at which carbide cuts cleanly.
    SlowestUseful,
    /// Slowest speed at which the motor cools itself.
    MotorCooling,
}

impl Reason {
    /// Every reason.
    pub const ALL: [Reason; 12] = [
        Reason::CuttingSpeed,
        Reason::MachineTopSpeed,
        Reason::HolderRating,
        Reason::OperatorCap,
        Reason::StickOut,
        Reason::JawGrip,
        Reason::EdgeLife,
        Reason::Power,
        Reason::Torque,
        Reason::ThreadRunout,
        Reason::SlowestUseful,
        Reason::MotorCooling,
    ];

    /// A stable code.
    pub const fn code(self) -> &'static str {
        match self {
            Reason::CuttingSpeed => "cutting-speed",
            Reason::MachineTopSpeed => "machine-top-speed",
            Reason::HolderRating => "holder-rating",
            Reason::OperatorCap => "operator-cap",
            Reason::StickOut => "stick-out",
            Reason::JawGrip => "jaw-grip",
            Reason::EdgeLife => "edge-life",
            Reason::Power => "power",
            Reason::Torque => "torque",
            Reason::ThreadRunout => "thread-runout",
            Reason::SlowestUseful => "slowest-useful",
            Reason::MotorCooling => "motor-cooling",
        }
    }

    /// In words.
    pub const fn words(self) -> &'static str {
        match self {
            Reason::CuttingSpeed => "cutting speed of material, tool and operation",
            Reason::MachineTopSpeed => "top speed of the machine",
            Reason::HolderRating => "speed stamped on the workholder",
            Reason::OperatorCap => "cap typed by the operator",
            Reason::StickOut => "half the speed at which the bar whips",
            Reason::JawGrip => "grip that the jaws lose by turning",
            Reason::EdgeLife => "edge life that you want",
            Reason::Power => "power of the motor at this depth and feed",
            Reason::Torque => "torque of the motor at this depth and feed",
            Reason::ThreadRunout => "runout of the thread",
            Reason::SlowestUseful => "slowest speed at which carbide cuts cleanly",
            Reason::MotorCooling => "slowest speed at which the motor cools itself",
        }
    }

    /// In words short enough for a line of the screen.
    pub const fn short(self) -> &'static str {
        match self {
            Reason::CuttingSpeed => "cutting speed",
            Reason::MachineTopSpeed => "machine",
            Reason::HolderRating => "holder rating",
            Reason::OperatorCap => "my cap",
            Reason::StickOut => "bar whips",
            Reason::JawGrip => "jaw grip",
            Reason::EdgeLife => "edge life",
            Reason::Power => "motor power",
            Reason::Torque => "motor torque",
            Reason::ThreadRunout => "thread runout",
            Reason::SlowestUseful => "carbide rubs",
            Reason::MotorCooling => "motor cooling",
        }
    }

    const fn kind(self) -> Kind {
        match self {
            Reason::MachineTopSpeed
            | Reason::HolderRating
            | Reason::OperatorCap
            | Reason::StickOut
            | Reason::JawGrip => Kind::Hard,
            _ => Kind::Soft,
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
    /// A lower bound.
    pub fn lower(at: Rpm, reason: Reason) -> Self {
        Bound {
            side: Side::Lower,
            ..Bound::upper(at, reason)
        }
    }

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

    /// The window of one upper bound.
    pub(super) const fn only(high: Bound) -> Self {
        let (hard, soft) = match high.kind {
            Kind::Hard => (Some(high), None),
            Kind::Soft => (None, Some(high)),
        };
        Window {
            high,
            hard,
            soft,
            low: None,
        }
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
    pub(super) fn fastest_plate(&self) -> Rpm {
        let hard = self
            .hard
            .map_or(Rpm::MAX, |b| b.at.scaled(1.0 / ABOVE_PLATE));
        let soft = self
            .soft
            .map_or(Rpm::MAX, |b| b.at.scaled(FAST_ABOVE / ABOVE_PLATE));
        if hard < soft { hard } else { soft }
    }
}
