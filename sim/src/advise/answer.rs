//! The answer, as text that explains itself or as JSON.

use std::fmt::Write as _;

use rimrate_core::advice::{
    Advice, Bound, Caution, Excess, FAST_ABOVE, FeedFrom, Pick, Reason, Setting, Side,
};
use rimrate_core::machine::{Drive, Holder, Machine};
use rimrate_core::physics::cutting_speed::surface_speed_m_min;
use rimrate_core::setup::{HalfNut, Setup, Support};
use rimrate_core::trade::{Coolant, CuttingSpeed};
use rimrate_core::units::{Decimal, Rpm, SurfaceSpeed};
use serde_json::{Value, json};

pub(super) struct Answer<'a> {
    pub(super) setup: &'a Setup,
    pub(super) machine: &'a Machine,
    pub(super) advice: &'a Advice,
    pub(super) cutting: &'a CuttingSpeed,
}

/// A number for people, with so many places at the most.
fn n(value: f32, decimals: u32) -> Decimal {
    Decimal { value, decimals }
}

/// A line broken at spaces for a terminal of 110 columns, the first 15 of which say what it is about.
fn wrapped(line: &str) -> Vec<String> {
    const ROOM: usize = 95;
    let mut rows = vec![String::new()];
    for word in line.split(' ') {
        match rows.last_mut() {
            Some(row) if row.is_empty() => row.push_str(word),
            Some(row) if row.chars().count() + 1 + word.chars().count() <= ROOM => {
                row.push(' ');
                row.push_str(word);
            }
            _ => rows.push(word.to_owned()),
        }
    }
    rows
}

/// Fewer than 20 rows.
const MOST_ROWS: usize = 19;
/// A bound this far above the best speed, percent, is not near enough to matter: three times it.
const FAR_ABOVE: f32 = 200.0;

/// What is left out of the text, each level with those before it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
enum Terse {
    /// Nothing.
    Full,
    /// The sources of the cutting speed: `--list` and JSON have them.
    NoSource,
    /// Bounds far above the best speed, counted.
    NearBounds,
    /// The edge's life, unless some of it is lost.
    NoEdgeLife,
    /// Force, pass and bar, where the bounds and cautions say the same or nothing depends on them.
    OnlyWhatHolds,
}

impl Terse {
    const ALL: [Terse; 5] = [
        Terse::Full,
        Terse::NoSource,
        Terse::NearBounds,
        Terse::NoEdgeLife,
        Terse::OnlyWhatHolds,
    ];
}

/// Cautions about what may hurt somebody and that no other line speaks of; they are told first where not all can be.
const fn may_hurt(caution: &Caution) -> bool {
    matches!(
        caution,
        Caution::NeedsCap { .. }
            | Caution::NeedsCapForWork
            | Caution::OffBalance
            | Caution::SideLoad
            | Caution::Slender { .. }
            | Caution::ChuckUnscrews
            | Caution::Material(_)
    )
}

/// A line in rows, the first of which begins with what it is about.
fn labelled(word: &str, line: &str) -> Vec<String> {
    let mut word = word;
    wrapped(line)
        .into_iter()
        .map(|row| format!("{:<15}{row}", std::mem::take(&mut word)))
        .collect()
}

/// A number for JSON, with three significant places behind the point.
fn round(x: f32) -> f64 {
    (f64::from(x) * 1000.0).round() / 1000.0
}

fn rpm(x: Rpm) -> f64 {
    (f64::from(x.get()) * 100.0).round() / 100.0
}

impl Answer<'_> {
    fn holder(&self) -> Option<&Holder> {
        self.machine.holders().get(usize::from(self.setup.holder))
    }

    fn stated(&self) -> SurfaceSpeed {
        self.advice.surface_speed().unwrap_or(self.cutting.ours)
    }

    pub(super) fn json(&self) -> Value {
        let (setup, advice, cut) = (self.setup, self.advice, &self.advice.cut);
        let window = &advice.window;
        let bounds: Vec<Value> = advice
            .bounds
            .iter()
            .map(|b| {
                json!({
                    "rpm": rpm(b.at),
                    "reason": b.reason.code(),
                    "kind": b.kind.code(),
                    "side": match b.side { Side::Upper => "upper", Side::Lower => "lower" },
                    "text": b.to_string(),
                })
            })
            .collect();
        let setting = |s: &Setting| json!({ "label": s.label.as_str(), "rpm": rpm(s.rpm) });
        let (pick, nearest) = match &advice.pick {
            Pick::Set(s) => (setting(s), Value::Null),
            Pick::TooFast {
                nearest,
                over_percent,
            } => {
                let mut nearest = setting(nearest);
                nearest["over_percent"] = json!(round(*over_percent));
                (Value::Null, nearest)
            }
            Pick::NeedsCap | Pick::NoBasis(_) => (Value::Null, Value::Null),
        };
        let set = advice.pick.setting().map(|s| s.rpm);
        let edge = cut.edge.as_ref().map(|e| {
            json!({
                "from": if e.from_box { "box" } else { "table" },
                "box_share": e.from_box.then(|| round(e.box_share)),
                "stated_m_min": round(e.stated.m_min()),
                "stated_min": round(e.stated_min),
                "exponent_range": [round(e.n.0), round(e.n.1)],
                "wanted_min": e.wanted_min.map(round),
                "exponent": e.wanted_min.map(|_| round(e.n.1)),
                "speed_m_min": e.for_wanted.map(round),
                "slowest_useful_m_min": e.slowest_useful.map(round),
                "expected_min": set.map(|s| round(e.expected_min(surface_speed_m_min(s, setup.diameter)))),
                "reached": e.wanted_min.map(|_| !e.life_given_up()),
            })
        });
        let per_rev = cut.feed.and_then(|f| f.per_rev);
        json!({
            "material": setup.material.id(),
            "tool": setup.tool.id(),
            "operation": setup.operation.id(),
            "coolant": setup.coolant.id(),
            "diameter_mm": setup.diameter.mm(),
            "machine": self.machine.name(),
            "holder": self.holder().map(|h| h.name.as_str()),
            "surface_speed_m_min": round(self.stated().m_min()),
            "surface_speed_range_m_min": [round(self.cutting.range.0.m_min()), round(self.cutting.range.1.m_min())],
            "basis": self.cutting.how.to_string(),
            "window_rpm": {
                "low": window.low.map_or(0.0, |b| rpm(b.at)),
                "best": rpm(window.best()),
                "high": rpm(window.high.at),
            },
            "held_by": window.high.reason.code(),
            "bounds": bounds,
            "pick": pick,
            "nearest": nearest,
            "needs_cap": advice.pick == Pick::NeedsCap,
            "conflict": window.conflict(),
            "edge_life": edge,
            "feed": cut.feed.map(|f| json!({
                "mm_per_rev": f.per_rev.map(round),
                "mm_per_tooth": f.per_tooth.map(round),
                "mm_per_min": per_rev.zip(set).map(|(f, n)| round(f * n.get())),
                "from": f.from.code(),
                "of_gearbox": f.of_gearbox,
                "by_hand": f.by_hand,
                "source": (f.from == FeedFrom::Table).then(|| f.source.to_string()),
            })),
            "load": cut.load.map(|l| json!({
                "force_n": l.force_n.map(round),
                "torque_nm": round(l.torque_nm),
                "power_kw": set.map(|n| round(l.power_kw(n))),
                "in_range": l.in_range,
            })),
            "overloaded": cut.overloaded,
            "depth_limit_mm": cut.depth_limit_mm.map(round),
            "finish": cut.finish.map(|f| json!({
                "ra_um": round(f.ra_um),
                "rt_um": round(f.rt_um),
                "nose_radius_mm": round(f.nose_mm),
                "nose_assumed": f.nose_assumed,
            })),
            "time_min": cut.time_min.map(round),
            "removal_cm3_min": cut.removal_cm3_min.map(round),
            "thread": cut.thread.map(|t| json!({
                "opened_rpm": rpm(t.opened),
                "closed_rpm": rpm(t.closed),
                "stop_s": round(t.stop_s),
                "stop_assumed": t.stop_assumed,
            })),
            "hand_feed": cut.hand.map(|h| json!({
                "mm_per_min": round(h.mm_per_min),
                "s_per_10_mm": round(h.s_per_10_mm),
            })),
            "thrust_n": cut.thrust_n.map(round),
            "stick_out": cut.bar.map(|b| json!({
                "length_per_diameter": round(b.ratio),
                "support": b.support.id(),
                "fastest_rpm": rpm(b.fastest),
                "too_slender": b.too_slender(),
            })),
            "cautions": advice.cautions.iter().map(Caution::to_string).collect::<Vec<_>>(),
            "caution_codes": advice.cautions.iter().map(Caution::code).collect::<Vec<_>>(),
        })
    }

    /// The answer in fewer than 20 rows: at each level of terseness what is needed least is left out, until it fits.
    pub(super) fn text(&self) -> String {
        let mut text = Vec::new();
        for terse in Terse::ALL {
            text = self.body(terse);
            let room = MOST_ROWS.saturating_sub(text.len());
            if let Some(cautions) = self.cautions(room, terse) {
                text.extend(cautions);
                break;
            }
        }
        text.iter().fold(String::new(), |all, row| all + row + "\n")
    }

    /// All but the cautions.
    fn body(&self, terse: Terse) -> Vec<String> {
        let mut rows = Vec::new();
        let mut say = |word: &str, line: String| rows.extend(labelled(word, &line));
        self.head(terse, &mut say);
        self.setting(terse, &mut say);
        self.cut(terse, &mut say);
        say("bounds", self.bounds(terse));
        rows
    }

    /// The cautions, most pressing first, in this many rows; `None` where they do not fit and something else may still be
    /// left out. What is always said comes last, and is never cut.
    fn cautions(&self, room: usize, terse: Terse) -> Option<Vec<String>> {
        let all: Vec<String> = self
            .advice
            .cautions
            .iter()
            .map(Caution::to_string)
            .collect();
        let always = all.len().saturating_sub(2);
        let (mind, always) = all.split_at(always);
        let always = always.join(" ");
        let each: Vec<String> = mind
            .iter()
            .chain([&always])
            .flat_map(|line| labelled("caution", line))
            .collect();
        if each.len() <= room {
            return Some(each);
        }
        if terse < Terse::NoEdgeLife {
            return None;
        }
        // In one paragraph, what may hurt somebody first, and the rest only in JSON.
        let (hazards, others): (Vec<_>, Vec<_>) = mind
            .iter()
            .zip(&self.advice.cautions)
            .partition(|(_, caution)| may_hurt(caution));
        let pressing = hazards.len();
        let mind: Vec<&String> = hazards
            .iter()
            .chain(&others)
            .map(|(words, _)| *words)
            .collect();
        let fitting = |shown: usize| {
            let mut parts: Vec<String> = mind.iter().take(shown).map(ToString::to_string).collect();
            if shown < mind.len() {
                parts.push(format!("And {} more in --json.", mind.len() - shown));
            }
            parts.push(always.clone());
            let rows = labelled("caution", &parts.join(" "));
            (rows.len() <= room).then_some(rows)
        };
        // Rather less of the cut than a hazard untold.
        let least = match terse {
            Terse::OnlyWhatHolds => 0,
            _ => pressing,
        };
        (least..=mind.len()).rev().find_map(fitting)
    }

    fn head(&self, terse: Terse, say: &mut dyn FnMut(&str, String)) {
        let setup = self.setup;
        let coolant = match setup.coolant {
            Coolant::Flood => "with cutting fluid",
            Coolant::Dry => "dry",
        };
        let held = match self.holder() {
            Some(Holder { name, rated, .. }) => match rated {
                Some(n) => format!("{name}, stamped {n}"),
                None => format!("{name}, which has no stamped speed"),
            },
            None => "nothing".to_owned(),
        };
        say(
            "cut",
            format!(
                "{}, {}, {}, {} {}, {coolant}",
                // The grades in brackets are for `--list`.
                setup.material.name().split(" (").next().unwrap_or_default(),
                setup.tool.name(),
                setup.operation.name(),
                setup.operation.diameter_word(),
                setup.diameter.length().display(self.machine.units()),
            ),
        );
        say(
            "machine",
            format!("{}, held by {held}", self.machine.name()),
        );
        let v = self.stated();
        let from = match &self.advice.cut.edge {
            Some(e) if e.from_box => {
                let share = if e.box_share < 1.0 {
                    format!(", x {} {}", n(e.box_share, 2), setup.operation)
                } else {
                    String::new()
                };
                format!(
                    "from the insert's box{share}, for {} min",
                    n(e.stated_min, 0)
                )
            }
            _ => {
                let row = self.cutting.how.row;
                let factors: Vec<String> = self
                    .cutting
                    .how
                    .factors
                    .iter()
                    .map(|f| {
                        // Behind the colon stands why: that is for `--list` and JSON.
                        let what = f.what.split(':').next().unwrap_or(f.what);
                        format!("x {:.2} {what}", f.by)
                    })
                    .collect();
                let by = if factors.is_empty() {
                    String::new()
                } else {
                    let factors = if terse >= Terse::OnlyWhatHolds {
                        format!("x {:.2}", self.cutting.how.factors.product())
                    } else {
                        factors.join(", ")
                    };
                    format!(" of {} {factors}", row.operation)
                };
                let (low, high) = (row.range.0.m_min(), row.range.1.m_min());
                let (low, high) = (n(low, 1).to_string(), n(high, 1).to_string());
                // A single figure, or two that print alike, stands once.
                let range = if low == high {
                    low
                } else {
                    format!("{low} to {high}")
                };
                let source = if terse >= Terse::NoSource {
                    String::new()
                } else {
                    format!("; {}", row.source.text)
                };
                format!("published {range} m/min{by}{source}")
            }
        };
        say(
            "cutting speed",
            format!(
                "{} m/min ({} ft/min), {from}",
                n(v.m_min(), 1),
                n(v.ft_min(), 0)
            ),
        );
    }

    fn setting(&self, terse: Terse, say: &mut dyn FnMut(&str, String)) {
        let (setup, advice) = (self.setup, self.advice);
        say(
            "best speed",
            format!(
                "{}, held by the {}",
                advice.window.best(),
                advice.window.high.reason.words()
            ),
        );
        match &advice.pick {
            Pick::Set(s) => {
                let v = surface_speed_m_min(s.rpm, setup.diameter);
                let how = match self.machine.drive() {
                    Drive::Stepped(_) => "set the step",
                    Drive::Variable(_) => "set the drive",
                };
                let (low, high) = (advice.slow_below(), self.right_until());
                say(
                    how,
                    format!(
                        "{} at {}: the edge runs at {v:.1} m/min; right from {} to {high}",
                        s.label,
                        s.rpm,
                        n(low.get(), 0)
                    ),
                );
            }
            Pick::TooFast { .. } if advice.nothing_pulls() => {
                say("set no step", "no setting pulls this cut".to_owned())
            }
            Pick::TooFast {
                nearest,
                over_percent,
            } => say(
                "set no step",
                format!(
                    "even the slowest, {} at {}, is {} too fast",
                    nearest.label,
                    nearest.rpm,
                    Excess(*over_percent)
                ),
            ),
            Pick::NeedsCap => say(
                "set no step",
                "nothing reads right until you give a cap (--cap)".to_owned(),
            ),
            Pick::NoBasis(refusal) => say("set no step", refusal.to_string()),
        }
        let Some(e) = advice.cut.edge.as_ref() else {
            return;
        };
        let set = advice.pick.setting();
        let at_set = set.map(|s| e.expected_min(surface_speed_m_min(s.rpm, setup.diameter)));
        if let (Some(wanted), Some(v)) = (e.wanted_min, e.for_wanted)
            && (terse < Terse::NoEdgeLife || e.life_given_up())
        {
            let mut line = format!(
                "{} min wanted: {} m/min by the largest exponent of {} to {}, from {} m/min for {} min",
                n(wanted, 0),
                n(v, 1),
                n(e.n.0, 2),
                n(e.n.1, 2),
                n(e.stated.m_min(), 1),
                n(e.stated_min, 0)
            );
            if let Some(low) = e.slowest_useful {
                let _ = write!(line, "; slowest useful {} m/min", n(low, 1));
            }
            if let Some(t) = at_set {
                let _ = write!(line, "; at that setting {} min or more", n(t, 0));
            }
            say("edge life", line);
        }
    }

    fn cut(&self, terse: Terse, say: &mut dyn FnMut(&str, String)) {
        let (cut, set) = (&self.advice.cut, self.advice.pick.setting().map(|s| s.rpm));
        if let Some(f) = &cut.feed {
            let per = match (f.per_rev, f.per_tooth) {
                (Some(rev), Some(tooth)) => {
                    format!("{} mm a tooth, {} mm a turn", n(tooth, 3), n(rev, 3))
                }
                (None, Some(tooth)) => format!("{} mm a tooth", n(tooth, 3)),
                (Some(rev), None) => format!("{} mm a turn", n(rev, 3)),
                (None, None) => String::new(),
            };
            let minute = f.per_rev.zip(set).map_or_else(String::new, |(f, n_)| {
                format!(", {} mm/min", n(f * n_.get(), 1))
            });
            let from = match f.from {
                FeedFrom::Typed => "as typed".to_owned(),
                FeedFrom::ForFinish => "for the finish".to_owned(),
                FeedFrom::Lead => "the lead".to_owned(),
                FeedFrom::Table => "table".to_owned(),
            };
            let gearbox = if f.of_gearbox {
                ", next lower of the gearbox"
            } else {
                ""
            };
            let hand = if f.by_hand { ", by hand" } else { "" };
            let seconds = cut.hand.map_or_else(String::new, |h| {
                format!(": 10 mm in {} s or more", n(h.s_per_10_mm, 1))
            });
            say(
                "feed",
                format!("{per}{minute}{hand}{seconds} ({from}{gearbox})"),
            );
        }
        let motor = self.machine.motor();
        let mut power = Vec::new();
        if let Some(load) = &cut.load {
            power.extend(load.force_n.map(|f| format!("{} N", n(f, 0))));
            power.push(format!("{} N m", n(load.torque_nm, 1)));
            power.extend(set.map(|s| {
                let of = motor.map_or_else(String::new, |m| {
                    format!(" of the motor's {}", n(m.at_cut(), 2))
                });
                format!("{}{of} kW", n(load.power_kw(s), 2))
            }));
        }
        power.extend(cut.thrust_n.map(|t| format!("thrust {} N", n(t, 0))));
        power.extend(cut.depth_limit_mm.map(|d| {
            format!(
                "pulls {} mm of depth at the setting that all else allows",
                n(d, 2)
            )
        }));
        // The motor's part stays where the motor is what holds.
        let motor_holds = self.advice.cut.overloaded
            || matches!(
                self.advice.window.high.reason,
                Reason::Power | Reason::Torque
            );
        let short = terse >= Terse::OnlyWhatHolds;
        if !power.is_empty() && (!short || motor_holds) {
            say("power", format!("{} (worn edge)", power.join(", ")));
        }
        let mut pass = Vec::new();
        if let Some(t) = cut.time_min {
            let s = t * 60.0;
            pass.push(if s < 120.0 {
                format!("{} s", n(s, 0))
            } else {
                format!("{} min", n(t, 1))
            });
        }
        pass.extend(
            cut.removal_cm3_min
                .map(|q| format!("{} cm3/min of chips", n(q, 1))),
        );
        if let Some(f) = &cut.finish {
            let nose = if f.nose_assumed { ", assumed" } else { "" };
            pass.push(format!(
                "Ra {} um, Rt {} um at best (nose {} mm{nose})",
                n(f.ra_um, 2),
                n(f.rt_um, 1),
                n(f.nose_mm, 2)
            ));
        }
        if !pass.is_empty() && !short {
            say("pass", pass.join(", "));
        }
        if let Some(t) = &cut.thread {
            let assumed = if t.stop_assumed { ", assumed" } else { "" };
            let away = match self.setup.details.thread.and_then(|t| t.half_nut) {
                Some(HalfNut::Away) => "; cut away from the shoulder neither holds",
                _ => "",
            };
            say(
                "thread's end",
                format!(
                    "half-nut opened by hand in 1 s: {}; kept closed, spindle stopped in {} s{assumed}: {}{away}",
                    t.opened,
                    n(t.stop_s, 1),
                    t.closed
                ),
            );
        }
        if let Some(b) = cut.bar.as_ref().filter(|_| !short) {
            let held = match b.support {
                Support::Free => "in the chuck alone",
                Support::Tailstock => "with the tailstock",
                Support::Behind => "behind the headstock",
            };
            say(
                "stick-out",
                format!(
                    "{} diameters {held}: half its whipping speed is {}",
                    n(b.ratio, 1),
                    b.fastest
                ),
            );
        }
    }

    /// Upper bounds, lowest first, then lower ones.
    fn bounds(&self, terse: Terse) -> String {
        let one = |b: &Bound| format!("{} {} ({})", b.at, b.reason.short(), b.kind.code());
        let ranked = self.advice.ranked();
        let near = |above: f32| terse < Terse::NearBounds || above <= FAR_ABOVE;
        let mut all: Vec<String> = ranked
            .iter()
            .filter(|(_, above)| near(*above))
            .map(|(b, above)| match above {
                a if *a < 0.05 => one(b),
                a => format!("{} {}", one(b), Excess(*a).above()),
            })
            .collect();
        let far = ranked.iter().filter(|(_, above)| !near(*above)).count();
        if far > 0 {
            all.push(format!("and {far} more"));
        }
        all.extend(
            self.advice
                .bounds
                .iter()
                .filter(|b| b.side == Side::Lower)
                .map(|b| format!("at least {}", one(b))),
        );
        all.join("; ")
    }

    /// Where the verdict leaves right upwards.
    fn right_until(&self) -> Rpm {
        let window = &self.advice.window;
        let fast = window.soft.map(|b| b.at.scaled(FAST_ABOVE));
        let hard = window.hard.map(|b| b.at);
        [fast, hard]
            .into_iter()
            .flatten()
            .reduce(|a, b| if b < a { b } else { a })
            .unwrap_or(window.best())
    }
}
