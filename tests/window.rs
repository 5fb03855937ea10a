//! The whole window, with every detail that an operator may add: properties over any cut on any motor.

use proptest::collection::btree_set;
use proptest::option;
use proptest::prelude::*;
use proptest::sample::select;
use rimrate_core::advice::{Advice, Caution, Pick, Reason, Side, advise};
use rimrate_core::machine::{
    HolderKind, HolderSpec, Machine, MachineKind, MachineSpec, MotorKind, MotorSpec, RangeSpec,
    SensorSpec, SpindleNose, StepSpec,
};
use rimrate_core::setup::{
    Bar, Details, Diameter, HalfNut, InsertBox, Jaws, Life, Ra, Setup, Support, Thread,
};
use rimrate_core::time::Instant;
use rimrate_core::trade::{Coolant, Material, Operation, Tool};
use rimrate_core::units::{Length, SurfaceSpeed, UnitSystem};
use rimrate_core::verdict::{Judge, Verdict};
use rimrate_tests::{machine, rpm, turning};

fn mm(x: f32) -> Length {
    Length::from_mm(x).unwrap_or_else(|e| panic!("{x}: {e}"))
}

/// A length, spread evenly over the logarithm of its range.
fn length(low: f32, high: f32) -> impl Strategy<Value = Length> {
    (low.ln()..high.ln()).prop_map(move |x| mm(x.exp().clamp(low, high)))
}

fn life() -> impl Strategy<Value = Life> {
    (15.0_f32..=240.0).prop_map(|t| Life::new("life", t).unwrap())
}

fn any_details() -> impl Strategy<Value = Details> {
    let cut = (
        option::of(length(0.001, 100.0)),
        option::of(length(0.001, 10.0)),
        option::of(length(0.01, 20.0)),
        option::of(select(
            &["0.05 um", "0.8 um", "3.2 um", "63 uin", "50 um"][..],
        )),
        option::of(life()),
        option::of((1.0_f32..2000.0, life())),
    );
    let support = select(&Support::ALL[..]);
    let bar = (
        length(0.1, 10_000.0),
        support,
        option::of(length(0.1, 2000.0)),
        option::of(length(0.01, 2000.0)),
    );
    let thread = (
        length(0.05, 100.0),
        option::of(length(0.1, 1000.0)),
        option::of(select(&HalfNut::ALL[..])),
    );
    let more = (
        option::of(length(0.1, 100_000.0)),
        option::of(1_u8..=100),
        option::of(length(0.01, 1000.0)),
        option::of((2_u8..=8, 0.001_f32..100.0, 1.0_f32..1000.0, 10.0_f32..1e6)),
        prop::bool::weighted(0.1),
        prop::bool::weighted(0.1),
    );
    (cut, option::of(bar), option::of(thread), more).prop_map(|(cut, bar, thread, more)| {
        let (depth, feed, nose_radius, ra, life, insert_box) = cut;
        let (length, teeth, width, jaws, off_balance, interrupted) = more;
        Details {
            depth,
            feed,
            nose_radius,
            ra: ra.map(|text| Ra::parse(text).unwrap()),
            life,
            insert_box: insert_box.map(|(v, life)| InsertBox {
                speed: SurfaceSpeed::from_m_min(v).unwrap(),
                life,
            }),
            bar: bar.map(|(length, support, stock, bore)| Bar {
                length,
                support,
                stock,
                bore,
            }),
            thread: thread.map(|(lead, runout, half_nut)| Thread {
                lead,
                runout,
                half_nut,
            }),
            length,
            teeth: teeth.and_then(std::num::NonZeroU8::new),
            width,
            jaws: jaws.map(|(n, mass, radius, grip)| Jaws::new(n, mass, radius, grip).unwrap()),
            off_balance,
            interrupted,
        }
    })
}

fn any_setup() -> impl Strategy<Value = Setup> {
    (
        select(&Material::ALL[..]),
        select(&Tool::ALL[..]),
        select(&Operation::ALL[..]),
        select(&Coolant::ALL[..]),
        length(0.1, 2000.0),
        0_u8..4,
        option::of(1.0_f32..100_000.0),
        any_details(),
    )
        .prop_map(
            |(material, tool, operation, coolant, d, holder, cap, details)| Setup {
                material,
                tool,
                operation,
                coolant,
                diameter: Diameter::nearest(d.mm()),
                holder,
                cap: cap.map(rpm),
                cap_is_old: false,
                pulses: None,
                load: false,
                details,
            },
        )
}

/// Any machine with any motor, or none.
fn any_machine() -> impl Strategy<Value = Machine> {
    let drive = (
        prop::bool::ANY,
        btree_set(1_u32..6000, 4..=16),
        0.0_f32..=1.0,
        prop::bool::ANY,
    );
    let motor = option::of((0.05_f32..20.0, option::of(0.3_f32..=1.0), 0.2_f32..=1.0));
    let nose = option::of(select(
        &[SpindleNose::Threaded, SpindleNose::Cam, SpindleNose::Bolted][..],
    ));
    let feeds = btree_set(1_u32..500, 0..=20);
    (
        drive,
        motor,
        nose,
        feeds,
        option::of(0.1_f32..60.0),
        select(
            &[
                MachineKind::Lathe,
                MachineKind::Mill,
                MachineKind::DrillPress,
            ][..],
        ),
    )
        .prop_map(|(drive, motor, nose, feeds, half_nut_stop_s, kind)| {
            let (variable, marks, at, cools) = drive;
            let marks: Vec<f32> = marks.into_iter().map(|n| n as f32).collect();
            let special = motor.is_some_and(|(_, _, low)| low < 0.8);
            let ranges = marks
                .windows(3)
                .take(8)
                .filter(|_| variable)
                .map(|w| RangeSpec {
                    label: format!("range {}", w[0]).parse().unwrap(),
                    low_rpm: w[0],
                    high_rpm: w[2],
                    base_rpm: special.then_some(w[0] + at * (w[2] - w[0])),
                    cool_rpm: (special && cools).then_some(w[1]),
                });
            let steps = marks
                .iter()
                .filter(|_| !variable)
                .enumerate()
                .map(|(i, &n)| StepSpec {
                    label: format!("step {n}").parse().unwrap(),
                    rpm: n,
                    kw: motor
                        .filter(|_| special && i % 2 == 0)
                        .map(|(kw, _, low)| kw.max(0.03 / low) * low),
                    rated_rpm: None,
                });
            let holders = [Some(2000.0), None, Some(500.0)]
                .into_iter()
                .zip(HolderKind::ALL);
            let kinds = match (special, variable) {
                (false, _) => MotorKind::Mains,
                (true, true) => MotorKind::Inverter,
                (true, false) => MotorKind::TwoSpeed,
            };
            let spec = MachineSpec {
                name: "any".parse().unwrap(),
                kind,
                units: UnitSystem::Metric,
                top_speed_rpm: None,
                brake_rpm_per_s: None,
                slowest_rpm: None,
                motor: motor.map(|(kw, efficiency, low)| MotorSpec {
                    kw: kw.max(0.03 / low),
                    kind: kinds,
                    efficiency,
                    rated_rpm: None,
                }),
                feeds_mm: feeds.into_iter().map(|f| f as f32 / 100.0).collect(),
                half_nut_stop_s,
                spindle_nose: nose,
                sensor: SensorSpec { pulses: 2 },
                steps: steps.collect(),
                ranges: ranges.collect(),
                holders: holders
                    .map(|(rated_rpm, kind)| HolderSpec {
                        kind,
                        name: None,
                        rated_rpm,
                    })
                    .collect(),
            };
            Machine::new(spec).unwrap_or_else(|e| panic!("{e}"))
        })
}

fn verdict(advice: &Advice, n: f32) -> Verdict {
    Judge::default().verdict(Instant::ZERO, &turning(n), advice, true)
}

/// Everything that is a number in the advice about the cut.
fn numbers(advice: &Advice) -> Vec<f32> {
    let cut = &advice.cut;
    let mut all: Vec<f32> = advice.bounds.iter().map(|b| b.at.get()).collect();
    all.extend(advice.ranked().iter().map(|(_, above)| *above));
    all.extend(
        [
            cut.depth_limit_mm,
            cut.time_min,
            cut.removal_cm3_min,
            cut.thrust_n,
        ]
        .iter()
        .flatten(),
    );
    all.extend(
        cut.feed
            .iter()
            .flat_map(|f| [f.per_rev, f.per_tooth])
            .flatten(),
    );
    all.extend(cut.load.iter().flat_map(|l| [l.torque_nm, l.chip_mm]));
    all.extend(cut.load.and_then(|l| l.force_n));
    all.extend(cut.finish.iter().flat_map(|f| [f.ra_um, f.rt_um]));
    all.extend(cut.hand.iter().flat_map(|h| [h.mm_per_min, h.s_per_10_mm]));
    all.extend(cut.bar.iter().map(|b| b.ratio));
    all.extend(cut.edge.iter().flat_map(|e| {
        let at = |n: f32| e.expected_min(n);
        [at(0.0), at(1.0), at(1e4), e.for_wanted.unwrap_or(0.0)]
    }));
    all
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(4_000))]

    #[test]
    fn no_cut_gives_a_nan_a_negative_number_or_a_false_setting(setup in any_setup(), machine in any_machine()) {
        let advice = advise(&setup, &machine);
        for n in numbers(&advice) {
            prop_assert!(n.is_finite() && n >= 0.0, "{} in {:?}", n, advice);
        }
        for caution in &advice.cautions {
            let words = caution.to_string();
            prop_assert!(words.len() > 20 && !words.contains("NaN") && !words.contains("inf "), "{}", words);
        }
        match &advice.pick {
            Pick::Set(s) => prop_assert!(s.rpm <= advice.best().unwrap()),
            Pick::TooFast { over_percent, .. } => {
                prop_assert!(over_percent.is_finite() && *over_percent > 0.0, "{:?}", advice);
                let told = |c: &Caution| matches!(c, Caution::SlowestTooFast | Caution::NothingPulls { .. });
                prop_assert!(advice.cautions.iter().any(told));
            }
            Pick::NeedsCap | Pick::NoBasis(_) => {}
        }
        // What always goes with it is always there: no caution was pushed out by others.
        prop_assert_eq!(advice.cautions.last(), Some(&Caution::Advisory));
    }

    #[test]
    fn the_binding_reason_is_the_lowest_upper_bound_and_each_stands_once(
        setup in any_setup(), machine in any_machine(),
    ) {
        let advice = advise(&setup, &machine);
        let uppers = || advice.bounds.iter().filter(|b| b.side == Side::Upper);
        prop_assert!(uppers().all(|b| b.at >= advice.window.high.at));
        prop_assert!(advice.bounds.contains(&advice.window.high));
        for reason in Reason::ALL {
            prop_assert!(advice.bounds.iter().filter(|b| b.reason == reason).count() <= 1);
        }
        // The ranking is all of the upper bounds in order, the binding one first.
        let ranked = advice.ranked();
        prop_assert_eq!(ranked.len(), uppers().count());
        prop_assert!(ranked.windows(2).all(|w| w[0].0.at <= w[1].0.at && w[0].1 <= w[1].1));
        prop_assert_eq!(ranked[0].0.at, advice.window.high.at);
    }

    #[test]
    fn adding_a_bound_never_raises_the_best_speed(
        setup in any_setup(), machine in any_machine(), more in any_details(), cap in 1.0_f32..10_000.0,
    ) {
        let d = setup.details;
        let bare = Setup { details: Details { life: None, bar: None, thread: None, jaws: None, depth: None, ..d }, cap: None, ..setup };
        // The feed of a thread is its lead: without it there is no other feed either.
        let before = advise(&bare, &machine);
        let added = [
            Setup { cap: Some(rpm(cap)), ..bare },
            Setup { details: Details { life: more.life, ..bare.details }, ..bare },
            Setup { details: Details { bar: more.bar, ..bare.details }, ..bare },
            Setup { details: Details { thread: more.thread, ..bare.details }, ..bare },
            Setup { details: Details { jaws: more.jaws, ..bare.details }, ..bare },
            Setup { details: Details { depth: more.depth, ..bare.details }, ..bare },
        ];
        for setup in added {
            let after = advise(&setup, &machine);
            prop_assert!(after.window.best() <= before.window.best(), "{:?}\n{:?}", before.bounds, after.bounds);
            prop_assert!(before.bounds.iter().all(|b| after.bounds.contains(b)), "a bound disappeared");
        }
    }

    #[test]
    fn longer_life_larger_overhang_deeper_cut_and_less_runout_never_raise_it(
        setup in any_setup(), machine in any_machine(), a in 0.0_f32..=1.0, b in 0.0_f32..=1.0,
        support in select(&Support::ALL[..]),
    ) {
        let (small, large) = (a.min(b), a.max(b));
        let on = |low: f32, high: f32, at: f32| mm((low.ln() + at * (high / low).ln()).exp().clamp(low, high));
        let best = |details: Details| advise(&Setup { details, ..setup }, &machine).window.best();
        let d = setup.details;
        let with_life = |at: f32| Details { life: Life::new("life", 15.0 + 225.0 * at).ok(), ..d };
        prop_assert!(best(with_life(large)) <= best(with_life(small)));
        let bar = |at| Details {
            bar: Some(Bar { length: on(0.1, 10_000.0, at), support, stock: None, bore: None }),
            ..d
        };
        prop_assert!(best(bar(large)) <= best(bar(small)));
        let depth = |at| Details { depth: Some(on(0.001, 100.0, at)), ..d };
        prop_assert!(best(depth(large)) <= best(depth(small)));
        let thread = |at| Details {
            thread: Some(Thread { lead: mm(1.5), runout: Some(on(0.1, 1000.0, at)), half_nut: None }),
            ..d
        };
        prop_assert!(best(thread(small)) <= best(thread(large)));
    }

    #[test]
    fn what_is_advised_reads_right_loaded_and_free_and_is_pulled(
        setup in any_setup(), machine in any_machine(),
    ) {
        let advice = advise(&setup, &machine);
        let Some(set) = advice.pick.setting() else { return Ok(()) };
        for off in [0.98, 1.0, 1.049] {
            let n = (f64::from(set.rpm.get()) * off) as f32;
            prop_assert_eq!(verdict(&advice, n), Verdict::Right, "{} of {:?}, {:?}", off, set, advice.window);
        }
        if let (Some(load), Some(gives)) = (advice.cut.load, machine.torque_at(&set.label, set.rpm)) {
            let pulls = gives >= load.torque_nm * 0.999;
            let warned = advice.cautions.iter().any(|c| matches!(c, Caution::Overload { .. }));
            prop_assert!(pulls || warned, "{} N m of {}: {:?}", gives, load.torque_nm, advice);
        }
    }

    #[test]
    fn off_balance_and_interrupted_work_wants_a_cap_whatever_the_holder(
        setup in any_setup(), machine in any_machine(), off in prop::bool::ANY,
    ) {
        let details = Details { off_balance: off, interrupted: !off, ..setup.details };
        let advice = advise(&Setup { details, cap: None, ..setup }, &machine);
        prop_assert!(matches!(advice.pick, Pick::NeedsCap | Pick::NoBasis(_)));
        let caution = if off { Caution::OffBalance } else { Caution::Interrupted };
        prop_assert!(advice.cautions.contains(&caution));
    }

    #[test]
    fn a_cap_is_offered_for_sound_holders_only_and_never_taken(
        setup in any_setup(), holder in 0_u8..9,
    ) {
        let lathe = machine("geared-lathe");
        let advice = advise(&Setup { holder, cap: None, ..setup }, &lathe);
        for caution in &advice.cautions {
            if let Caution::NeedsCap { holder, offered: Some(cap) } = caution {
                let kind = holder.unwrap();
                prop_assert!(matches!(kind, HolderKind::BetweenCentres | HolderKind::Arbor), "{:?}", kind);
                prop_assert!(*cap < lathe.top_speed());
                prop_assert_eq!(advice.pick.setting(), None);
                prop_assert!(caution.to_string().contains("assumed, no source"));
            }
        }
    }

    #[test]
    fn millimetres_and_inches_give_the_same_answer(setup in any_setup(), machine in any_machine()) {
        // A length typed in inches comes back as the same millimetres, but for rounding.
        let inch = |l: Length| format!("{} in", f64::from(l.mm()) / 25.4).parse::<Length>().unwrap();
        let d = setup.details;
        let details = Details {
            depth: d.depth.map(inch),
            feed: d.feed.map(inch),
            length: d.length.map(inch),
            bar: d.bar.map(|b| Bar { length: inch(b.length), stock: b.stock.map(inch), bore: b.bore.map(inch), ..b }),
            thread: d.thread.map(|t| Thread { lead: inch(t.lead), runout: t.runout.map(inch), ..t }),
            ..d
        };
        let (a, b) = (advise(&setup, &machine), advise(&Setup { details, ..setup }, &machine));
        prop_assert_eq!(a.bounds.len(), b.bounds.len());
        for (a, b) in a.bounds.iter().zip(&b.bounds) {
            prop_assert_eq!(a.reason, b.reason);
            let apart = (a.at.get() / b.at.get().max(1e-6) - 1.0).abs();
            // Torque limits jump from one range to the next where rounding decides.
            prop_assert!(a.at == b.at || apart < 1e-5 || a.reason == Reason::Torque, "{:?} {:?}", a, b);
        }
    }
}
