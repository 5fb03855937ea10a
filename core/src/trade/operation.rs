//! What is done to the work.

use core::fmt;

/// An operation on a lathe or a drill press.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[cfg_attr(
    feature = "serde",
    derive(serde::Serialize, serde::Deserialize),
    serde(rename_all = "kebab-case")
)]
pub enum Operation {
    /// Turning at about 0.15 in (3.8 mm) depth and 0.015 in/rev (0.38 mm).
    RoughTurning,
    /// Turning at about 0.04 in (1 mm) depth and 0.007 in/rev (0.18 mm).
    FinishTurning,
    /// Across the end of the work.
    Facing,
    /// Opening a hole with a single point.
    Boring,
    /// With a twist drill.
    Drilling,
    /// With a straight machine reamer.
    Reaming,
    /// With a machine tap under power.
    Tapping,
    /// A thread with a single point.
    Threading,
    /// Cutting off.
    Parting,
    /// Rolling a pattern into the surface.
    Knurling,
    /// With a cutter in the spindle.
    Milling,
    /// A cone at the mouth of a hole.
    Countersinking,
    /// With a hole saw.
    HoleSawing,
    /// With one point swung on a wide circle.
    FlyCutting,
    /// An outside thread with a die.
    DieThreading,
}

impl Operation {
    /// All of them, in the order a knob turns through.
    pub const ALL: [Operation; 15] = [
        Operation::RoughTurning,
        Operation::FinishTurning,
        Operation::Facing,
        Operation::Boring,
        Operation::Drilling,
        Operation::Reaming,
        Operation::Tapping,
        Operation::Threading,
        Operation::Parting,
        Operation::Knurling,
        Operation::Milling,
        Operation::Countersinking,
        Operation::HoleSawing,
        Operation::FlyCutting,
        Operation::DieThreading,
    ];

    /// The word that names it in files and commands.
    pub const fn id(self) -> &'static str {
        match self {
            Operation::RoughTurning => "rough-turning",
            Operation::FinishTurning => "finish-turning",
            Operation::Facing => "facing",
            Operation::Boring => "boring",
            Operation::Drilling => "drilling",
            Operation::Reaming => "reaming",
            Operation::Tapping => "tapping",
            Operation::Threading => "threading",
            Operation::Parting => "parting",
            Operation::Knurling => "knurling",
            Operation::Milling => "milling",
            Operation::Countersinking => "countersinking",
            Operation::HoleSawing => "hole-sawing",
            Operation::FlyCutting => "fly-cutting",
            Operation::DieThreading => "die-threading",
        }
    }
    /// In full.
    pub const fn name(self) -> &'static str {
        match self {
            Operation::RoughTurning => "rough turning",
            Operation::FinishTurning => "finish turning",
            Operation::Facing => "facing",
            Operation::Boring => "boring",
            Operation::Drilling => "drilling",
            Operation::Reaming => "reaming",
            Operation::Tapping => "tapping",
            Operation::Threading => "single-point threading",
            Operation::Parting => "parting off",
            Operation::Knurling => "knurling",
            Operation::Milling => "milling",
            Operation::Countersinking => "countersinking",
            Operation::HoleSawing => "cutting with a hole saw",
            Operation::FlyCutting => "fly cutting",
            Operation::DieThreading => "threading with a die",
        }
    }
    /// For the small screen: at most 10 characters, ASCII.
    pub const fn label(self) -> &'static str {
        match self {
            Operation::RoughTurning => "Rough turn",
            Operation::FinishTurning => "Fine turn",
            Operation::Facing => "Facing",
            Operation::Boring => "Boring",
            Operation::Drilling => "Drilling",
            Operation::Reaming => "Reaming",
            Operation::Tapping => "Tapping",
            Operation::Threading => "Threading",
            Operation::Parting => "Parting",
            Operation::Knurling => "Knurling",
            Operation::Milling => "Milling",
            Operation::Countersinking => "C-sinking",
            Operation::HoleSawing => "Hole saw",
            Operation::FlyCutting => "Fly cutter",
            Operation::DieThreading => "Die",
        }
    }
    /// The operation of that name.
    pub fn from_id(id: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|o| o.id() == id)
    }
    /// Turned on the outside of work that a holder swings: the diameter is the work's.
    pub const fn is_outside_turning(self) -> bool {
        matches!(
            self,
            Operation::RoughTurning
                | Operation::FinishTurning
                | Operation::Facing
                | Operation::Threading
                | Operation::Parting
                | Operation::Knurling
                | Operation::DieThreading
        )
    }
    /// A single point takes a chip off turning work, outside, inside or across its end.
    pub const fn is_turning(self) -> bool {
        matches!(
            self,
            Operation::RoughTurning
                | Operation::FinishTurning
                | Operation::Facing
                | Operation::Boring
        )
    }
    /// Several teeth, or one, turn with the cutter and the work is fed past them.
    pub const fn is_milling(self) -> bool {
        matches!(self, Operation::Milling | Operation::FlyCutting)
    }
    /// A thread is cut, so the lead is the feed.
    pub const fn is_threading(self) -> bool {
        matches!(
            self,
            Operation::Threading | Operation::Tapping | Operation::DieThreading
        )
    }
    /// What the diameter belongs to, so that the screen can name it: at most 6 characters.
    ///
    /// The cutting speed is that of the largest diameter that the edge meets: the stock outside, the finished bore
    /// inside, the tool's own when the tool is what gives the diameter, whatever the stock measures.
    pub const fn diameter_word(self) -> &'static str {
        match self {
            Operation::RoughTurning
            | Operation::FinishTurning
            | Operation::Facing
            | Operation::Threading
            | Operation::Parting
            | Operation::Knurling => "work",
            Operation::Boring => "bore",
            Operation::Drilling => "drill",
            Operation::Reaming => "reamer",
            Operation::Tapping => "tap",
            Operation::Milling => "cutter",
            Operation::Countersinking => "c-sink",
            Operation::HoleSawing => "saw",
            Operation::FlyCutting => "circle",
            Operation::DieThreading => "thread",
        }
    }
}

impl fmt::Display for Operation {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.name())
    }
}
