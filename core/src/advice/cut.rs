//! The cut itself: edge life, feed, force and power, finish, time, and what goes with threads, drills and bars.

use super::Setting;
use crate::machine::{Machine, MachineKind};
use crate::physics::cutting_speed::surface_speed_m_min;
use crate::physics::{
    chip, cutting_force, drilling, machining_time, power, removal_rate, roughness, threading,
    tool_life, whirl,
};
use crate::setup::{Setup, Support};
use crate::trade::edge::{self, TABLE_LIFE_MIN};
use crate::trade::{CuttingSpeed, Operation, Source, feed as feeds, stock};
use crate::units::{Rpm, SurfaceSpeed};

/// The nose radius, mm, taken where a finish is wanted and nobody enters a radius (common practice, no source).
pub const USUAL_NOSE_MM: f32 = 0.4;
/// A milling feed is raised at most this much against thin chips (our choice).
const MOST_THINNING: f32 = 2.0;
/// Time, s, taken for the spindle to stop where nobody has timed it (assumed, no source).
pub const USUAL_STOP_S: f32 = 3.0;

/// Everything about the cut besides the spindle's speed. What cannot be said is `None`.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Cut {
    /// The edge's life.
    pub edge: Option<EdgeLife>,
    /// The feed.
    pub feed: Option<Feed>,
    /// Force, torque and power of the cut; needs depth, or is a drill.
    pub load: Option<Load>,
    /// The largest depth, mm, that the motor pulls at this feed and at the fastest setting that all other bounds allow.
    pub depth_limit_mm: Option<f32>,
    /// The motor does not pull the cut at that setting: it has to run slower, or the cut be smaller.
    pub overloaded: bool,
    /// Roughness that feed and nose leave at best.
    pub finish: Option<Finish>,
    /// The nose radius, mm, that the feed is more than twice of: the marks do not meet and the roughness has no formula.
    pub beyond_nose_mm: Option<f32>,
    /// Time of one pass at the advised setting, min.
    pub time_min: Option<f32>,
    /// Metal removed at the advised setting, cm3/min.
    pub removal_cm3_min: Option<f32>,
    /// Speeds up to the end of a thread.
    pub thread: Option<ThreadEnd>,
    /// What a hand on the drill's lever should do.
    pub hand: Option<HandFeed>,
    /// Drills only: thrust, N.
    pub thrust_n: Option<f32>,
    /// The bar that sticks out.
    pub bar: Option<Slender>,
}

/// Edge life by Taylor's law.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct EdgeLife {
    /// The cutting speed that the life is stated for: the table's, or the insert box's.
    pub stated: SurfaceSpeed,
    /// The life, min, at that speed.
    pub stated_min: f32,
    /// Whether both are from the insert's box.
    pub from_box: bool,
    /// The share of the printed speed that the operation takes ([`edge::box_share`]); 1 where nothing is from a box.
    pub box_share: f32,
    /// Smallest and largest published exponent for the tool.
    pub n: (f32, f32),
    /// Where the exponents are from.
    pub source: Source,
    /// The life, min, that is wanted.
    pub wanted_min: Option<f32>,
    /// The cutting speed for it, m/min; never above the stated one, never below the slowest useful one.
    pub for_wanted: Option<f32>,
    /// The slowest useful speed, m/min, where carbide has one; where `for_wanted` was raised to it the wanted life is not
    /// reached.
    pub slowest_useful: Option<f32>,
}

impl EdgeLife {
    pub(super) fn of(setup: &Setup, cutting: &CuttingSpeed) -> Self {
        // A box does not speak of every operation: where it does not, the table stands.
        let boxed = setup
            .details
            .insert_box
            .zip(edge::box_share(setup.operation));
        let box_share = boxed.map_or(1.0, |(_, share)| share);
        let stated = boxed.map_or(cutting.ours, |(b, share)| b.speed.scaled(share));
        let stated_min = boxed.map_or(TABLE_LIFE_MIN, |(b, _)| b.life.min());
        let taylor = edge::taylor(setup.tool);
        let slowest_useful = edge::slowest_useful(setup.material, setup.tool, setup.operation)
            .map(|v| v.min(edge::SLOWEST_SHARE * stated.m_min()));
        let wanted_min = setup.details.life.map(|l| l.min());
        let for_wanted = wanted_min.map(|wanted| {
            // Longer costs speed by the largest exponent; shorter buys none: never above what is stated.
            let v = stated.m_min();
            let slower = if wanted > stated_min {
                tool_life::speed_for_life(v, stated_min, wanted, taylor.n.1)
            } else {
                v
            };
            slower.max(slowest_useful.unwrap_or(0.0)).min(v)
        });
        EdgeLife {
            stated,
            stated_min,
            from_box: boxed.is_some(),
            box_share,
            n: taylor.n,
            source: taylor.source,
            wanted_min,
            for_wanted,
            slowest_useful,
        }
    }

    /// The life, min, to expect at a cutting speed, m/min, by the exponent that promises less; at most a working week.
    pub fn expected_min(&self, v: f32) -> f32 {
        const LONGEST: f32 = 2400.0;
        let v1 = self.stated.m_min();
        let life = tool_life::cautious_life_at_speed(v1, self.stated_min, v, self.n);
        if life.is_nan() {
            0.0
        } else {
            life.min(LONGEST)
        }
    }

    /// Whether the wanted life was given up for the slowest useful speed.
    pub fn life_given_up(&self) -> bool {
        match (self.for_wanted, self.slowest_useful, self.wanted_min) {
            (Some(v), Some(slowest), Some(wanted)) => {
                v <= slowest && self.expected_min(v) < wanted * 0.999
            }
            _ => false,
        }
    }
}

/// Where a feed is from.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum FeedFrom {
    /// The operator typed it.
    Typed,
    /// It leaves the wanted roughness.
    ForFinish,
    /// The table of feeds, its row's source beside it.
    Table,
    /// The lead of the thread.
    Lead,
}

impl FeedFrom {
    /// A stable code.
    pub const fn code(self) -> &'static str {
        match self {
            FeedFrom::Typed => "typed",
            FeedFrom::ForFinish => "for-finish",
            FeedFrom::Table => "table",
            FeedFrom::Lead => "lead",
        }
    }
}

/// A feed.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Feed {
    /// mm per revolution; `None` for a mill whose teeth nobody counted.
    pub per_rev: Option<f32>,
    /// mm per tooth, when milling.
    pub per_tooth: Option<f32>,
    /// Where it is from.
    pub from: FeedFrom,
    /// It was lowered to the next feed of the machine's gearbox, or raised to its finest.
    pub of_gearbox: bool,
    /// Wider than the gearbox's finest would allow: the wanted one is finer than the machine has.
    pub coarser_than_wanted: bool,
    /// There is no power feed for it: by hand.
    pub by_hand: bool,
    /// The table row's source.
    pub source: Source,
}

impl Feed {
    pub(super) fn of(setup: &Setup, machine: &Machine) -> Option<Self> {
        let (op, details) = (setup.operation, &setup.details);
        let d = setup.diameter.mm();
        let lead = details.thread.map(|t| t.lead.mm());
        let row = feeds::feed(setup.material, op, d, lead);
        let turned = op.is_turning();
        let (mut mm, from, source) = match (details.feed, details.ra) {
            _ if op.is_threading() => (lead?, FeedFrom::Lead, Source::common_practice()),
            (Some(feed), _) => (feed.mm(), FeedFrom::Typed, Source::common_practice()),
            (None, Some(ra)) if turned => {
                let nose = details.nose_radius.map_or(USUAL_NOSE_MM, |r| r.mm());
                let fine = roughness::feed_for_ra(ra.um() / 1000.0, nose);
                // A coarse finish is no reason to feed harder than roughing does.
                let rough = feeds::feed(setup.material, Operation::RoughTurning, d, None)?;
                (fine.min(rough.mm), FeedFrom::ForFinish, rough.source)
            }
            (None, _) => {
                let row = row?;
                (row.mm, FeedFrom::Table, row.source)
            }
        };
        let gears = machine.feeds();
        let power = turned && machine.kind() == MachineKind::Lathe && !gears.is_empty();
        let (mut of_gearbox, mut coarser_than_wanted) = (false, false);
        if power && from != FeedFrom::Typed {
            // Rounding must not lose a feed of the list that is exactly the wanted one.
            let lower = gears.iter().rev().find(|&&g| g <= mm * 1.0001);
            coarser_than_wanted = lower.is_none();
            mm = *lower.or(gears.first())?;
            of_gearbox = true;
        }
        let (per_rev, per_tooth) = if op.is_milling() {
            let thick = match (from, details.width) {
                (FeedFrom::Table, Some(width)) => {
                    (1.0 / chip::thinning(width.mm().min(d), d).max(1e-3)).min(MOST_THINNING)
                }
                _ => 1.0,
            };
            let teeth = match op {
                Operation::FlyCutting => Some(1.0),
                _ => details.teeth.map(|z| f32::from(z.get())),
            };
            (teeth.map(|z| z * mm * thick), Some(mm * thick))
        } else {
            (Some(mm), None)
        };
        let by_hand = !power && op != Operation::Threading;
        Some(Feed {
            per_rev,
            per_tooth,
            from,
            of_gearbox,
            coarser_than_wanted,
            by_hand,
            source,
        })
    }
}

/// Force, torque and power of a cut.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Load {
    /// Cutting force, N; `None` for drills and mills, which turn rather than push.
    pub force_n: Option<f32>,
    /// Torque at the spindle, N m.
    pub torque_nm: f32,
    /// Thickness of the chip, mm.
    pub chip_mm: f32,
    /// Whether the chip lies where the force law is fitted.
    pub in_range: bool,
}

impl Load {
    /// Power at a spindle speed, kW.
    pub fn power_kw(&self, n: Rpm) -> f32 {
        power::of_torque(self.torque_nm, n.get())
    }
}

/// The load of each mm of depth, or of the whole drill or blade.
#[derive(Clone, Copy, Debug)]
pub(super) struct Demand {
    load: Load,
    by_depth: bool,
}

impl Demand {
    pub(super) fn of(setup: &Setup, feed: Option<&Feed>) -> Option<Self> {
        let k = stock::force(setup.material)?.kienzle;
        let feed = feed?;
        let hss = if setup.tool.is_carbide() {
            1.0
        } else {
            cutting_force::HIGH_SPEED_STEEL
        };
        let worn = cutting_force::WORN_EDGE * hss;
        let d = setup.diameter.mm();
        let (force, torque, h, by_depth) = match setup.operation {
            op if op.is_turning() => {
                let f = feed.per_rev?;
                let sin = cutting_force::SIN_KAPPA;
                let force = worn * k.force(1.0, f, sin);
                (Some(force), power::torque(force, d), f * sin, true)
            }
            Operation::Parting => {
                let f = feed.per_rev?;
                let force = worn * k.force(setup.details.width?.mm(), f, 1.0);
                (Some(force), power::torque(force, d), f, false)
            }
            Operation::Drilling => {
                let f = feed.per_rev?;
                (None, worn * k.drill_torque(d, f), f / 2.0, false)
            }
            Operation::Milling | Operation::FlyCutting => {
                let a_e = setup.details.width?.mm().min(d);
                let h = chip::mean_thickness(feed.per_tooth?, a_e, d);
                // Work of a turn, N mm, over 2 pi.
                let volume = a_e * feed.per_rev?;
                let torque = worn * k.specific(h) * volume / (2.0 * core::f32::consts::PI * 1000.0);
                (None, torque, h, true)
            }
            _ => return None,
        };
        Some(Demand {
            load: Load {
                force_n: force,
                torque_nm: torque,
                chip_mm: h,
                in_range: cutting_force::in_range(h),
            },
            by_depth,
        })
    }

    /// The load of the cut as entered; `None` where its depth is missing.
    pub(super) fn load(&self, setup: &Setup) -> Option<Load> {
        if !self.by_depth {
            return Some(self.load);
        }
        let depth = setup.details.depth?.mm();
        Some(Load {
            force_n: self.load.force_n.map(|f| f * depth),
            torque_nm: self.load.torque_nm * depth,
            ..self.load
        })
    }

    /// The depth, mm, that a torque pulls.
    pub(super) fn depth_of(&self, torque: f32) -> Option<f32> {
        (self.by_depth && self.load.torque_nm > 0.0).then(|| torque / self.load.torque_nm)
    }
}

/// Roughness that feed and nose leave at best.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Finish {
    /// Arithmetic mean, um.
    pub ra_um: f32,
    /// Peak to valley, um.
    pub rt_um: f32,
    /// Radius of the nose, mm.
    pub nose_mm: f32,
    /// The radius was not entered, the usual one was taken.
    pub nose_assumed: bool,
}

/// Speeds up to the end of a thread.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ThreadEnd {
    /// Half-nut opened by hand in the runout.
    pub opened: Rpm,
    /// Half-nut kept closed, the spindle stopped.
    pub closed: Rpm,
    /// Time of the stop, s.
    pub stop_s: f32,
    /// Nobody has timed the stop.
    pub stop_assumed: bool,
}

impl ThreadEnd {
    pub(super) fn of(setup: &Setup, machine: &Machine) -> Option<Self> {
        let thread = setup.details.thread?;
        if setup.operation != Operation::Threading {
            return None;
        }
        let (runout, lead) = (thread.runout?.mm(), thread.lead.mm());
        let stop = machine.half_nut_stop_s();
        let stop_s = stop.unwrap_or(USUAL_STOP_S);
        let opened = threading::half_nut_opened(runout, lead, threading::REACTION_S);
        Some(ThreadEnd {
            opened: Rpm::saturating(opened),
            closed: Rpm::saturating(threading::half_nut_closed(runout, lead, stop_s)),
            stop_s,
            stop_assumed: stop.is_none(),
        })
    }
}

/// What a hand on the drill's lever should do.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct HandFeed {
    /// At most this fast, mm/min.
    pub mm_per_min: f32,
    /// Seconds for each 10 mm at the least.
    pub s_per_10_mm: f32,
}

/// A bar that sticks out.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Slender {
    /// Free length over diameter.
    pub ratio: f32,
    /// What holds its end.
    pub support: Support,
    /// Half of its first bending speed.
    pub fastest: Rpm,
}

impl Slender {
    pub(super) fn of(setup: &Setup) -> Option<Self> {
        let bar = setup.details.bar?;
        let work = setup
            .operation
            .is_outside_turning()
            .then(|| setup.diameter.mm());
        let diameter = bar.stock.map(|s| s.mm()).or(work)?;
        let elastic = stock::elastic(setup.material);
        let beam = whirl::Bar {
            length: bar.length.mm(),
            diameter,
            bore: bar.bore.map_or(0.0, |b| b.mm().min(diameter)),
            e_gpa: elastic.e_gpa,
            rho: elastic.rho,
        };
        Some(Slender {
            ratio: beam.length / diameter,
            support: bar.support,
            fastest: Rpm::saturating(whirl::fastest(&beam, bar.support.beta())),
        })
    }

    /// Too slender for its support.
    pub fn too_slender(&self) -> bool {
        self.ratio > self.support.slender_from()
    }
}

impl Cut {
    /// What follows from feed and advised setting: finish, time, removal, the hand's feed, the thrust.
    pub(super) fn finish_with(&mut self, setup: &Setup, set: Option<&Setting>) {
        let (op, details, d) = (setup.operation, &setup.details, setup.diameter.mm());
        let per_rev = self.feed.and_then(|f| f.per_rev);
        let turned = op.is_turning();
        if let Some(f) = per_rev
            && turned
            && (details.nose_radius.is_some() || details.ra.is_some())
        {
            let nose_mm = details.nose_radius.map_or(USUAL_NOSE_MM, |r| r.mm());
            // The rounded marks of one turn meet those of the next up to twice the radius only.
            self.beyond_nose_mm = (f > 2.0 * nose_mm).then_some(nose_mm);
            self.finish = self.beyond_nose_mm.is_none().then(|| Finish {
                ra_um: 1000.0 * roughness::ra(f, nose_mm),
                rt_um: 1000.0 * roughness::rt(f, nose_mm),
                nose_mm,
                nose_assumed: details.nose_radius.is_none(),
            });
        }
        if let (Operation::Drilling, Some(k), Some(f)) =
            (op, stock::thrust_factor(setup.material), per_rev)
        {
            self.thrust_n = Some(drilling::thrust(k, d, f));
        }
        let (Some(f), Some(n)) = (per_rev, set.map(|s| s.rpm)) else {
            return;
        };
        let to_centre = matches!(op, Operation::Facing | Operation::Parting).then_some(d / 2.0);
        let length = details.length.map(|l| l.mm()).or(to_centre);
        self.time_min = length.map(|length| {
            let beyond = match op {
                Operation::Drilling => machining_time::drill_point(d),
                Operation::Milling | Operation::FlyCutting => match details.width {
                    Some(width) => machining_time::slab_approach(d, width.mm()),
                    None => 2.0 * machining_time::face_approach(d),
                },
                _ => 0.0,
            };
            machining_time::of_pass(length + beyond, f, n.get())
        });
        let v = surface_speed_m_min(n, setup.diameter);
        let depth = details.depth.map(|a| a.mm());
        self.removal_cm3_min = match op {
            _ if turned => depth.map(|a| removal_rate::turning(v, a, f)),
            Operation::Drilling => Some(removal_rate::drilling(d, f, n.get())),
            Operation::Milling | Operation::FlyCutting => depth
                .zip(details.width)
                .map(|(a, w)| removal_rate::milling(w.mm(), a, f * n.get())),
            _ => None,
        };
        if matches!(
            op,
            Operation::Drilling
                | Operation::Reaming
                | Operation::Countersinking
                | Operation::HoleSawing
        ) {
            let mm_per_min = f * n.get();
            self.hand = Some(HandFeed {
                mm_per_min,
                s_per_10_mm: 600.0 / mm_per_min.max(1e-3),
            });
        }
    }
}
