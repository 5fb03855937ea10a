//! What to mind with a cut, in words.

use core::fmt;

use crate::machine::{HolderKind, MachineKind};
use crate::setup::Support;
use crate::trade::Material;
use crate::units::{Decimal, Rpm};

/// A caution that goes with the advice; it prints as one or a few sentences.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Caution {
    /// The holder has no stamped speed and no cap was typed.
    NeedsCap {
        /// What holds; `None` where the machine does not list it.
        holder: Option<HolderKind>,
        /// A cap that may be typed, from an assumed rim speed.
        offered: Option<Rpm>,
    },
    /// The work is off balance or strikes the edge, and no cap was typed.
    NeedsCapForWork,
    /// Weight off the axis pulls.
    OffBalance,
    /// The edge is struck in every turn.
    Interrupted,
    /// Even the slowest setting is too fast.
    SlowestTooFast,
    /// No setting has the torque for the cut.
    NothingPulls {
        /// The depth, mm, that the setting pulls that all else allows.
        depth_mm: Option<f32>,
    },
    /// A bar too slender for its support.
    Slender {
        /// Free length over diameter.
        ratio: f32,
        /// What holds its end.
        support: Support,
    },
    /// Threading away from the shoulder runs the spindle in reverse, and the chuck is screwed on.
    ChuckUnscrews,
    /// Nobody has timed how long the spindle takes to stop.
    StopNotTimed {
        /// The time taken, s.
        taken_s: f32,
    },
    /// Something about the material.
    Material(Material),
    /// The machine's fastest setting stays far below what is right.
    MachineTooSlow {
        /// What would be right.
        wanted: Rpm,
        /// The fastest setting.
        fastest: Rpm,
    },
    /// A small drill that turns too slowly breaks when it is pressed.
    DrillBreaks {
        /// The most that the hand may feed, mm/min.
        mm_per_min: f32,
        /// That is so long for 10 mm, s.
        s_per_10_mm: f32,
    },
    /// The steps leave a wide gap below the best speed.
    StaysBelow {
        /// How far, percent.
        percent: f32,
        /// A drill, which breaks when it is pressed.
        drill: bool,
    },
    /// The setting lies below a lower bound.
    BelowUseful {
        /// The lower bound.
        at: Rpm,
        /// It is the motor that suffers, else the edge.
        motor: bool,
    },
    /// The wanted edge life would ask for less than the slowest useful speed.
    LifeNotReached,
    /// The motor is the limit.
    Overload {
        /// The depth, mm, that it pulls at the setting that everything else allows.
        depth_mm: Option<f32>,
        /// On an inverter slower gives no more torque.
        inverter: bool,
    },
    /// The chip is thinner or thicker than the force law is fitted for.
    ForceGuessed,
    /// The gearbox has no feed as fine as the wanted one.
    NoFinerFeed,
    /// The feed is more than twice the nose radius.
    FeedBeyondNose {
        /// The nose radius, mm.
        nose_mm: f32,
    },
    /// A drill chuck takes no load from the side.
    SideLoad,
    /// Facing: the right speed rises towards the centre.
    TowardsCentre,
    /// Parting off.
    Parting,
    /// A deep hole.
    Peck {
        /// Depth of the first part, mm.
        first_mm: f32,
        /// Then so much at a time, mm.
        then_mm: f32,
    },
    /// A reamer.
    Reamer,
    /// A countersink.
    Countersink,
    /// A tap or a die under power.
    TapOrDie,
    /// A hole saw.
    HoleSaw,
    /// A fly cutter.
    FlyCutter,
    /// A cutter whose teeth nobody has counted.
    CountTeeth,
    /// What always goes with shifting and starting.
    Shifting(MachineKind),
    /// The box is advisory.
    Advisory,
}

impl Caution {
    /// A stable code.
    pub const fn code(&self) -> &'static str {
        match self {
            Caution::NeedsCap { .. } => "needs-cap",
            Caution::NeedsCapForWork => "needs-cap-for-work",
            Caution::OffBalance => "off-balance",
            Caution::Interrupted => "interrupted",
            Caution::SlowestTooFast => "slowest-too-fast",
            Caution::NothingPulls { .. } => "nothing-pulls",
            Caution::Slender { .. } => "slender",
            Caution::ChuckUnscrews => "chuck-unscrews",
            Caution::StopNotTimed { .. } => "stop-not-timed",
            Caution::Material(_) => "material",
            Caution::MachineTooSlow { .. } => "machine-too-slow",
            Caution::DrillBreaks { .. } => "drill-breaks",
            Caution::StaysBelow { .. } => "stays-below",
            Caution::BelowUseful { .. } => "below-useful",
            Caution::LifeNotReached => "life-not-reached",
            Caution::Overload { .. } => "overload",
            Caution::ForceGuessed => "force-guessed",
            Caution::NoFinerFeed => "no-finer-feed",
            Caution::FeedBeyondNose { .. } => "feed-beyond-nose",
            Caution::SideLoad => "side-load",
            Caution::TowardsCentre => "towards-centre",
            Caution::Parting => "parting",
            Caution::Peck { .. } => "peck",
            Caution::Reamer => "reamer",
            Caution::Countersink => "countersink",
            Caution::TapOrDie => "tap-or-die",
            Caution::HoleSaw => "hole-saw",
            Caution::FlyCutter => "fly-cutter",
            Caution::CountTeeth => "count-teeth",
            Caution::Shifting(_) => "shifting",
            Caution::Advisory => "advisory",
        }
    }
}

/// A number with one place behind the point at the most.
const fn one(value: f32) -> Decimal {
    Decimal { value, decimals: 1 }
}

impl fmt::Display for Caution {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let words = match *self {
            Caution::NeedsCap { holder, offered } => {
                let holder = holder.map_or("something unknown", HolderKind::name);
                write!(
                    f,
                    "Held by {holder}, which has no stamped speed: set none until you know what it and the work allow, then give it as a cap."
                )?;
                if let Some(cap) = offered {
                    write!(
                        f,
                        " A rim of the work at {} m/s, n = 60 000 v / (pi D), would be {cap} (assumed, no source; for sound, balanced work only).",
                        one(crate::physics::workholding::RIM_SPEED)
                    )?;
                }
                return Ok(());
            }
            Caution::NothingPulls { depth_mm } => {
                f.write_str("No setting of the machine pulls this cut: less depth or feed.")?;
                if let Some(value) = depth_mm {
                    write!(
                        f,
                        " It pulls {} mm of depth.",
                        Decimal { value, decimals: 2 }
                    )?;
                }
                return Ok(());
            }
            Caution::Slender { ratio, support } => {
                return match support {
                    Support::Free => write!(
                        f,
                        "The bar sticks out {} times its diameter, 4 is the limit in the chuck alone: do not cut unsupported. Tailstock or steady, or less out.",
                        one(ratio)
                    ),
                    Support::Tailstock => write!(
                        f,
                        "The bar is {} times as long as it is thick, 10 is the limit with a tailstock: set a steady.",
                        one(ratio)
                    ),
                    Support::Behind => write!(
                        f,
                        "Behind the headstock the bar sticks out {} times its diameter: support it, whatever the speed. A bar that whips there bends at once and strikes whoever stands near.",
                        one(ratio)
                    ),
                };
            }
            Caution::StopNotTimed { taken_s } => {
                return write!(
                    f,
                    "Nobody has timed the stop of the spindle: {} s taken (assumed, no source). Time it and enter it in the profile.",
                    one(taken_s)
                );
            }
            Caution::MachineTooSlow { wanted, fastest } => {
                return write!(
                    f,
                    "The machine is too slow for this: {wanted} would be allowed, its fastest setting is {fastest}. It cuts all the same, only longer: the feed of a turn stays, that of a minute falls."
                );
            }
            Caution::DrillBreaks {
                mm_per_min,
                s_per_10_mm,
            } => {
                return write!(
                    f,
                    "Here the hand is the limit: at most {} mm/min, {} s or more for 10 mm. Pressed harder, the drill bends, jams and breaks; back it out often.",
                    one(mm_per_min),
                    one(s_per_10_mm)
                );
            }
            Caution::StaysBelow { percent, drill } => {
                write!(
                    f,
                    "The machine stays {percent:.0} % below the best speed: feed by hand more slowly in proportion"
                )?;
                if drill { ", small drills break." } else { "." }
            }
            Caution::BelowUseful { at, motor: true } => {
                return write!(
                    f,
                    "Below {at} the motor's fan does not cool it: short cuts only, or a lower range."
                );
            }
            Caution::BelowUseful { at, motor: false } => {
                return write!(
                    f,
                    "Below {at} carbide does not cut cleanly: chips weld to the edge and tear it. High-speed steel is the better tool at this speed."
                );
            }
            Caution::Overload { depth_mm, inverter } => {
                f.write_str("The motor is the limit: it would slow down or stall at the setting that all else allows.")?;
                if let Some(value) = depth_mm {
                    write!(
                        f,
                        " There it pulls {} mm of depth: take that, or run slower.",
                        Decimal { value, decimals: 2 }
                    )?;
                }
                if inverter {
                    " Slower on the dial gives no more torque, only a slower belt or gear does."
                } else {
                    ""
                }
            }
            Caution::FeedBeyondNose { nose_mm } => {
                return write!(
                    f,
                    "The feed is more than twice the nose radius of {} mm: it cuts a thread, no surface, and no roughness can be given.",
                    Decimal {
                        value: nose_mm,
                        decimals: 2
                    }
                );
            }
            Caution::Peck { first_mm, then_mm } => {
                return write!(
                    f,
                    "Deeper than three diameters: peck. Out for the first time at {} mm, then every {} mm, so that chips and heat come out.",
                    one(first_mm),
                    one(then_mm)
                );
            }
            Caution::Material(material) => material.caution().unwrap_or_default(),
            Caution::NeedsCapForWork => {
                "Work off balance or with gaps has no formula: decide on a speed, slow, and give it as a cap."
            }
            Caution::OffBalance => {
                "Off-centre weight shakes the machine and works clamps loose: balance it with a counterweight, turn it once by hand past tool and bed, start at the slowest step and stand clear of its plane."
            }
            Caution::Interrupted => {
                "An interrupted cut strikes the edge in every turn: firm grip, tough tool, light feed, a slower step than a smooth cut."
            }
            Caution::SlowestTooFast => {
                "Even the slowest setting is too fast: put in the back gear or the slow belt if there is one, take a tool that stands more speed, or work by hand. Do not run it and hope."
            }
            Caution::ChuckUnscrews => {
                "The chuck is screwed on: cutting in reverse, away from the shoulder, unscrews it. Cut towards the shoulder at the slower speed."
            }
            Caution::LifeNotReached => {
                "The wanted edge life asks for less than the slowest speed at which carbide cuts cleanly: the edge will not last as long."
            }
            Caution::ForceGuessed => {
                "The chip is thinner or thicker than the force law is known for: the power is a rough figure."
            }
            Caution::NoFinerFeed => {
                "The gearbox has no feed as fine as the wanted one: its finest is taken."
            }
            Caution::SideLoad => {
                "Never mill in a drill chuck: load from the side shakes its taper loose, and chuck and cutter are thrown. Hold the cutter in a collet or on an arbor with a drawbar."
            }
            Caution::TowardsCentre => {
                "The speed is for the outside; towards the centre a faster one would be right: do not shift in mid-cut."
            }
            Caution::Parting => {
                "Slower than turning, because the blade is thin and the chips jam in the slot. The right speed rises towards the centre: do not shift in mid-cut. Lock the saddle, blade square and on centre, oil in the slot, and do not catch the piece by hand."
            }
            Caution::Reamer => {
                "Reamers run at half the drill's speed and twice its feed, with oil. Never backwards: it chips the edges."
            }
            Caution::Countersink => {
                "Countersinks chatter when fast or fed softly: slow, firm, short."
            }
            Caution::TapOrDie => {
                "Under power only with a clutch or an eye on the depth: stop before the bottom, reverse to break the chip. By hand is safer on small threads."
            }
            Caution::HoleSaw => {
                "A hole saw grabs when it breaks through: clamp the work, light feed, lift often to clear the kerf. The pilot drill turns at the same speed, far too slowly for itself."
            }
            Caution::FlyCutter => {
                "A fly cutter strikes once in a turn and throws what is loose: tool clamped short, bar balanced if it can be, light cut, stand out of its plane."
            }
            Caution::CountTeeth => {
                "Count the cutter's teeth and enter them: feed, power and time depend on it."
            }
            Caution::Shifting(MachineKind::Lathe) => {
                "Stop the spindle before shifting; chuck key out; work gripped to depth and turned once by hand."
            }
            Caution::Shifting(_) => {
                "Stop the spindle before shifting; work clamped; chuck key out; sleeves and gloves away."
            }
            Caution::Advisory => {
                "Advisory only: what is marked on holder, tool or machine, and their makers' limits, always win."
            }
        };
        f.write_str(words)
    }
}
