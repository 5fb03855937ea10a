//! Bounds, window and pick, for any setup on any machine.

use proptest::collection::{btree_set, vec};
use proptest::option;
use proptest::prelude::*;
use proptest::sample::select;
use rimrate_core::advice::{Advice, Bound, Kind, Pick, Reason, Side, Window, advise};
use rimrate_core::machine::{
    ABOVE_PLATE, Drive, HolderKind, HolderSpec, Machine, MachineKind, MachineSpec, RangeSpec,
    SensorSpec, StepSpec,
};
use rimrate_core::setup::{Details, Diameter, Setup};
use rimrate_core::time::Instant;
use rimrate_core::trade::{Coolant, Material, Operation, Tool, cutting_speed};
use rimrate_core::units::{Rpm, UnitSystem};
use rimrate_core::verdict::{Judge, Verdict};
use rimrate_tests::{bar, machine, machines, rpm, turning};

/// Any sound machine: 1 to 32 steps or 1 to 8 ranges, holders with and without a stamped speed.
fn any_machine() -> impl Strategy<Value = Machine> {
    let steps = btree_set(1_u32..20_000, 1..=32).prop_map(|rpms| {
        let steps = rpms.iter().map(|&n| StepSpec {
            label: format!("step {n}").parse().unwrap(),
            rpm: n as f32,
            ..StepSpec::default()
        });
        (steps.collect::<Vec<_>>(), Vec::new())
    });
    // Of a sorted list, neighbours leave gaps between their ranges and every other pair overlaps.
    let ranges = (btree_set(1_u32..20_000, 4..=16), any::<bool>()).prop_map(|(marks, gaps)| {
        let marks: Vec<u32> = marks.into_iter().collect();
        let pairs: Vec<(u32, u32)> = if gaps {
            marks.chunks_exact(2).map(|p| (p[0], p[1])).collect()
        } else {
            marks.windows(3).map(|p| (p[0], p[2])).collect()
        };
        let ranges = pairs.into_iter().take(8).map(|(low, high)| RangeSpec {
            label: format!("range {low}").parse().unwrap(),
            low_rpm: low as f32,
            high_rpm: high as f32,
            ..RangeSpec::default()
        });
        (Vec::new(), ranges.collect::<Vec<_>>())
    });
    let holders = vec(option::of(1.0_f32..100_000.0), 1..=8);
    (
        prop_oneof![steps, ranges],
        holders,
        option::of(1.0_f32..3.0),
    )
        .prop_map(|((steps, ranges), holders, above)| {
            let fastest = steps
                .iter()
                .map(|s| s.rpm)
                .chain(ranges.iter().map(|r| r.high_rpm))
                .fold(0.0, f32::max);
            let holders = HolderKind::ALL.into_iter().zip(holders);
            let spec = MachineSpec {
                name: "any".parse().unwrap(),
                kind: MachineKind::Lathe,
                units: UnitSystem::Metric,
                top_speed_rpm: above.map(|a| fastest * a),
                brake_rpm_per_s: None,
                slowest_rpm: None,
                motor: None,
                feeds_mm: Default::default(),
                half_nut_stop_s: None,
                spindle_nose: None,
                sensor: SensorSpec { pulses: 2 },
                steps: steps.into_iter().collect(),
                ranges: ranges.into_iter().collect(),
                holders: holders
                    .map(|(kind, rated_rpm)| HolderSpec {
                        kind,
                        name: None,
                        rated_rpm,
                    })
                    .collect(),
            };
            Machine::new(spec).unwrap_or_else(|e| panic!("{e}"))
        })
}

/// Any setup, its holder perhaps not on the machine.
fn any_setup() -> impl Strategy<Value = Setup> {
    (
        select(&Material::ALL[..]),
        select(&Tool::ALL[..]),
        select(&Operation::ALL[..]),
        select(&Coolant::ALL[..]),
        prop_oneof![0.1_f32..2000.0, 1.0_f32..60.0],
        0_u8..10,
        option::of(1.0_f32..100_000.0),
    )
        .prop_map(
            |(material, tool, operation, coolant, mm, holder, cap)| Setup {
                material,
                tool,
                operation,
                coolant,
                diameter: Diameter::nearest(mm),
                holder,
                cap: cap.map(rpm),
                cap_is_old: false,
                pulses: None,
                load: false,
                details: Details::NONE,
            },
        )
}

fn with(setup: Setup, mm: f32) -> Setup {
    Setup {
        diameter: Diameter::nearest(mm),
        ..setup
    }
}

/// What a spindle at this steady speed is judged to be by a confirmed box that has seen nothing before.
fn verdict(advice: &Advice, n: f32) -> Verdict {
    Judge::default().verdict(Instant::ZERO, &turning(n), advice, true)
}

/// Every combination that has no basis for a cutting speed under fluid.
fn refused() -> Vec<(Material, Tool, Operation)> {
    let mut all = Vec::new();
    for material in Material::ALL {
        for tool in Tool::ALL {
            for operation in Operation::ALL {
                if cutting_speed(material, tool, operation, Coolant::Flood).is_err() {
                    all.push((material, tool, operation));
                }
            }
        }
    }
    all
}

fn rated(machine: &Machine, setup: &Setup) -> Option<Rpm> {
    machine
        .holders()
        .get(usize::from(setup.holder))
        .and_then(|h| h.rated)
}

fn lowest_upper(bounds: &[Bound], kinds: &[Kind]) -> Option<Rpm> {
    let uppers = bounds
        .iter()
        .filter(|b| b.side == Side::Upper && kinds.contains(&b.kind));
    uppers
        .map(|b| b.at)
        .reduce(|a, b| if b < a { b } else { a })
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(2_000))]

    #[test]
    fn every_answer_is_finite_and_of_the_machine(setup in any_setup(), machine in any_machine()) {
        let advice = advise(&setup, &machine);
        prop_assert!(advice.bounds.iter().all(|b| b.at.get().is_finite()));
        prop_assert!(advice.slow_below().get().is_finite());
        prop_assert_eq!(advice.best().is_some(), advice.cutting.is_ok());
        let known = |label: &str, n: Rpm| match machine.drive() {
            Drive::Stepped(steps) => steps.iter().any(|s| s.label == label && s.rpm == n),
            Drive::Variable(ranges) => ranges
                .iter()
                .any(|r| r.label == label && (r.low..=r.high).contains(&n)),
        };
        match &advice.pick {
            Pick::Set(s) => {
                prop_assert!(known(&s.label, s.rpm), "{:?}", s);
                prop_assert!(s.rpm <= advice.best().unwrap());
                let short = advice.short_percent().unwrap();
                prop_assert!((0.0..=100.0).contains(&short), "{}", short);
            }
            Pick::TooFast { nearest, over_percent } => {
                prop_assert!(known(&nearest.label, nearest.rpm), "{:?}", nearest);
                prop_assert!(over_percent.is_finite() && *over_percent > 0.0, "{}", over_percent);
                // Nothing slower is on the machine.
                let slowest = match machine.drive() {
                    Drive::Stepped(steps) => steps[0].rpm,
                    Drive::Variable(ranges) => ranges[0].low,
                };
                prop_assert_eq!(nearest.rpm, slowest);
            }
            Pick::NeedsCap => prop_assert!(setup.cap.is_none() && rated(&machine, &setup).is_none()),
            Pick::NoBasis(refusal) => {
                prop_assert_eq!(advice.cutting, Err(*refusal));
                prop_assert!(!refusal.reason.is_empty());
            }
        }
    }

    #[test]
    fn a_larger_diameter_never_gives_a_faster_target(
        setup in any_setup(), machine in any_machine(), a in 0.1_f32..2000.0, b in 0.1_f32..2000.0,
    ) {
        let (small, large) = (advise(&with(setup, a.min(b)), &machine), advise(&with(setup, a.max(b)), &machine));
        prop_assert!(large.best() <= small.best());
        let set = |advice: &Advice| advice.pick.setting().map(|s| s.rpm);
        prop_assert!(set(&large) <= set(&small), "{:?} {:?}", large.pick, small.pick);
    }

    #[test]
    fn a_bound_never_disappears_and_never_makes_faster(
        setup in any_setup(), machine in any_machine(), cap in 1.0_f32..100_000.0,
    ) {
        let without = advise(&Setup { cap: None, ..setup }, &machine);
        let with = advise(&Setup { cap: Some(rpm(cap)), ..setup }, &machine);
        prop_assert!(with.best() <= without.best());
        prop_assert!(with.window.best() <= without.window.best());
        prop_assert!(without.bounds.iter().all(|b| with.bounds.contains(b)));
        prop_assert!(with.bounds.contains(&Bound::upper(rpm(cap), Reason::OperatorCap)));
        // With a holder that is stamped, a cap never makes the setting faster either.
        if let (Some(a), Some(b)) = (with.pick.setting(), without.pick.setting()) {
            prop_assert!(a.rpm <= b.rpm);
        }
    }

    #[test]
    fn every_bound_that_applies_is_there_once(setup in any_setup(), machine in any_machine()) {
        let advice = advise(&setup, &machine);
        let of = |reason| {
            let mut all = advice.bounds.iter().filter(move |b| b.reason == reason);
            (all.next().map(|b| b.at), all.next())
        };
        prop_assert_eq!(of(Reason::MachineTopSpeed), (Some(machine.top_speed()), None));
        prop_assert_eq!(of(Reason::HolderRating), (rated(&machine, &setup), None));
        prop_assert_eq!(of(Reason::OperatorCap), (setup.cap, None));
        // n = 1000 v / (pi D), in double precision.
        let n = advice.cutting.ok().map(|c| {
            1000.0 * f64::from(c.ours.m_min()) / (std::f64::consts::PI * f64::from(setup.diameter.mm()))
        });
        match (of(Reason::CuttingSpeed), n) {
            ((None, None), None) => {}
            ((Some(at), None), Some(n)) => prop_assert!((f64::from(at.get()) / n - 1.0).abs() < 1e-6),
            other => prop_assert!(false, "{:?}", other),
        }
        let hard = [Reason::MachineTopSpeed, Reason::HolderRating, Reason::OperatorCap];
        prop_assert!(advice.bounds.iter().all(|b| (b.kind == Kind::Hard) == hard.contains(&b.reason)));
    }

    #[test]
    fn the_lowest_upper_bound_holds(setup in any_setup(), machine in any_machine()) {
        let advice = advise(&setup, &machine);
        let both = lowest_upper(&advice.bounds, &[Kind::Hard, Kind::Soft]);
        prop_assert_eq!(Some(advice.window.high.at), both);
        prop_assert!(advice.bounds.contains(&advice.window.high));
        prop_assert_eq!(advice.window.best(), advice.window.high.at);
        prop_assert_eq!(advice.window.hard.map(|b| b.at), lowest_upper(&advice.bounds, &[Kind::Hard]));
        prop_assert_eq!(advice.window.soft.map(|b| b.at), lowest_upper(&advice.bounds, &[Kind::Soft]));
    }

    #[test]
    fn the_advised_setting_reads_right_loaded_and_free(
        setup in any_setup(), machine in any_machine(), off in 0.98_f32..1.06,
    ) {
        let advice = advise(&setup, &machine);
        let Some(set) = advice.pick.setting() else { return Ok(()) };
        let hard = advice.window.hard.unwrap().at;
        let offs = match machine.drive() {
            // Mechanical and electrical tolerance of ISO 229 (from memory).
            Drive::Stepped(_) => vec![0.98, off, 1.06],
            // A regulated drive holds what it is set to; the 5 % belong to whoever sets it.
            Drive::Variable(_) => vec![0.98, off.min(1.049)],
        };
        for off in offs {
            // Multiplied as the spindle would, not as single precision rounds.
            let n = (f64::from(set.rpm.get()) * f64::from(off)) as f32;
            prop_assert!(n <= hard.get() * (1.0 + f32::EPSILON), "{} of {:?} above {}", off, set, hard);
            prop_assert_eq!(verdict(&advice, n), Verdict::Right, "{} of {:?}, {:?}", off, set, advice.window);
        }
    }

    #[test]
    fn an_unrated_holder_without_a_cap_is_never_right(
        setup in any_setup(), machine in any_machine(), n in 0.1_f32..30_000.0,
    ) {
        // No machine here has more than eight holders: a ninth counts as unrated too.
        let unrated = machine.holders().iter().position(|h| h.rated.is_none()).unwrap_or(9);
        let setup = Setup { cap: None, holder: unrated as u8, ..setup };
        let advice = advise(&setup, &machine);
        prop_assert!(advice.pick.setting().is_none());
        prop_assert_ne!(verdict(&advice, n), Verdict::Right);
        // A cap is the way out, where there is a basis for a speed.
        let capped = advise(&Setup { cap: Some(rpm(100.0)), ..setup }, &machine);
        prop_assert_ne!(&capped.pick, &Pick::NeedsCap);
    }

    #[test]
    fn without_a_basis_the_hard_bounds_still_stand(
        setup in any_setup(), refused in select(refused()), machine in any_machine(), n in 0.1_f32..200_000.0,
    ) {
        let (material, tool, operation) = refused;
        let advice = advise(&Setup { material, tool, operation, coolant: Coolant::Flood, ..setup }, &machine);
        prop_assert!(advice.cutting.is_err());
        prop_assert!(advice.pick.setting().is_none());
        prop_assert_eq!(advice.best(), None);
        let hard = lowest_upper(&advice.bounds, &[Kind::Hard]).unwrap();
        let want = if rpm(n) > hard { Verdict::Danger } else { Verdict::NoAdvice };
        prop_assert_eq!(verdict(&advice, n), want);
    }

    #[test]
    fn above_a_hard_bound_is_danger_whatever_else(
        setup in any_setup(), machine in any_machine(), by in 1.0001_f32..10.0,
    ) {
        let advice = advise(&setup, &machine);
        for bound in advice.bounds.iter().filter(|b| b.kind == Kind::Hard) {
            let n = bound.at.get() * by;
            for confirmed in [true, false] {
                let seen = Judge::default().verdict(Instant::ZERO, &turning(n), &advice, confirmed);
                prop_assert_eq!(seen, Verdict::Danger);
            }
        }
    }

    #[test]
    fn any_bounds_leave_a_window_or_say_that_they_conflict(
        uppers in vec((0.0_f32..1e7, any::<bool>()), 1..6), lowers in vec(0.0_f32..1e7, 0..4),
    ) {
        let bound = |at: f32, side, kind| Bound { at: rpm(at), side, kind, reason: Reason::CuttingSpeed };
        let bounds: Vec<Bound> = uppers
            .iter()
            .map(|&(at, hard)| bound(at, Side::Upper, if hard { Kind::Hard } else { Kind::Soft }))
            .chain(lowers.iter().map(|&at| bound(at, Side::Lower, Kind::Soft)))
            .collect();
        let window = Window::of(&bounds).unwrap();
        let high = uppers.iter().map(|u| u.0).fold(f32::MAX, f32::min);
        let low = lowers.iter().copied().reduce(f32::max);
        // The upper bound wins, conflict or not.
        prop_assert_eq!(window.best().get(), high);
        prop_assert_eq!(window.low.map(|b| b.at.get()), low);
        prop_assert_eq!(window.conflict(), low.is_some_and(|low| low > high));
    }
}

#[test]
fn without_any_upper_bound_there_is_no_window() {
    let low = Bound {
        at: rpm(100.0),
        side: Side::Lower,
        kind: Kind::Soft,
        reason: Reason::CuttingSpeed,
    };
    assert_eq!(Window::of(&[low]), None);
    assert_eq!(Window::of(&[]), None);
}

#[test]
fn a_bar_of_mild_steel_on_the_geared_lathe() {
    let lathe = machine("geared-lathe");
    let advice = advise(&bar(25.0), &lathe);
    // 27.4 m/min at 25 mm: 1000 x 27.4 / (pi x 25) = 348.9 rpm.
    assert!((advice.best().unwrap().get() - 348.9).abs() < 0.05);
    assert_eq!(advice.window.high.reason, Reason::CuttingSpeed);
    let set = advice.pick.setting().unwrap();
    assert_eq!(
        (set.label.as_str(), set.rpm),
        ("A-1, back gear out", rpm(280.0))
    );
    let reasons: Vec<Reason> = advice.bounds.iter().map(|b| b.reason).collect();
    assert_eq!(
        reasons,
        [
            Reason::CuttingSpeed,
            Reason::MachineTopSpeed,
            Reason::HolderRating
        ]
    );
    assert!(!advice.window.conflict());
}

#[test]
fn a_step_is_not_offered_where_its_loaded_speed_would_leave_a_hard_bound() {
    let lathe = machine("geared-lathe");
    let step = |cap: f32| {
        let setup = Setup {
            cap: Some(rpm(cap)),
            ..bar(25.0)
        };
        let advice = advise(&setup, &lathe);
        advice.pick.setting().map(|s| s.rpm.get())
    };
    // 1.06 x 280 = 296.8.
    assert_eq!(step(297.0), Some(280.0));
    assert_eq!(step(296.0), Some(180.0));
    assert_eq!(step(280.0), Some(180.0));
    // 1.06 x 18 = 19.08: below it nothing is left.
    assert_eq!(step(19.1), Some(18.0));
    assert_eq!(step(19.0), None);
}

#[test]
fn where_even_the_slowest_step_is_too_fast_it_is_named_with_its_excess() {
    let press = machine("drill-press");
    let setup = Setup {
        material: Material::TitaniumAlloy,
        operation: Operation::Drilling,
        ..bar(50.0)
    };
    let advice = advise(&setup, &press);
    let best = advice.best().unwrap().get();
    match &advice.pick {
        Pick::TooFast {
            nearest,
            over_percent,
        } => {
            assert_eq!(
                (nearest.label.as_str(), nearest.rpm),
                ("belt 1", rpm(355.0))
            );
            // Against the fastest plate speed that would do: 1.05 / 1.06 of the best speed.
            let want = (355.0 / (best * 1.05 / ABOVE_PLATE) - 1.0) * 100.0;
            assert!((over_percent - want).abs() < 0.01, "{over_percent} {want}");
        }
        other => panic!("{other:?}"),
    }
}

#[test]
fn a_variable_drive_is_set_within_its_ranges() {
    let lathe = machine("variable-lathe");
    let Drive::Variable(ranges) = lathe.drive() else {
        panic!("not variable")
    };
    let mut labels = std::collections::BTreeSet::new();
    for mm in 1..=500 {
        let advice = advise(&bar(mm as f32), &lathe);
        match &advice.pick {
            Pick::Set(set) => {
                let range = ranges.iter().find(|r| r.label == set.label).unwrap();
                assert!((range.low..=range.high).contains(&set.rpm), "{set:?}");
                // The target itself, unless the machine's top or a hard bound is lower.
                let hard = advice.window.hard.unwrap().at.get() / ABOVE_PLATE;
                let want = advice.window.best().get().min(hard).min(2200.0);
                assert!(
                    (set.rpm.get() - want).abs() < 0.01,
                    "{mm} mm: {set:?}, {want}"
                );
                labels.insert(set.label.clone());
            }
            Pick::TooFast { nearest, .. } => {
                assert_eq!(nearest.rpm, ranges[0].low);
                assert!(advice.window.best() < ranges[0].low);
            }
            other => panic!("{other:?}"),
        }
    }
    assert_eq!(labels.len(), 2, "both belts are used: {labels:?}");
}

#[test]
fn in_a_gap_between_ranges_the_top_of_the_lower_one_is_set() {
    let range = |label: &str, low_rpm, high_rpm| RangeSpec {
        label: label.parse().unwrap(),
        low_rpm,
        high_rpm,
        ..RangeSpec::default()
    };
    let spec = MachineSpec {
        name: "gap".parse().unwrap(),
        kind: MachineKind::Lathe,
        units: UnitSystem::Metric,
        top_speed_rpm: None,
        brake_rpm_per_s: None,
        slowest_rpm: None,
        motor: None,
        feeds_mm: Default::default(),
        half_nut_stop_s: None,
        spindle_nose: None,
        sensor: SensorSpec { pulses: 1 },
        steps: Default::default(),
        ranges: [range("low", 50.0, 200.0), range("high", 600.0, 2000.0)]
            .into_iter()
            .collect(),
        holders: [HolderSpec {
            kind: HolderKind::Collet,
            name: None,
            rated_rpm: Some(3000.0),
        }]
        .into_iter()
        .collect(),
    };
    let lathe = Machine::new(spec).unwrap();
    // 349 rpm is best for 25 mm.
    let set = |mm| {
        let advice = advise(&bar(mm), &lathe);
        advice
            .pick
            .setting()
            .map(|s| (s.label.to_string(), s.rpm.get().round()))
    };
    assert_eq!(set(25.0), Some(("low".to_owned(), 200.0)));
    assert_eq!(set(100.0), Some(("low".to_owned(), 87.0)));
    assert_eq!(set(10.0), Some(("high".to_owned(), 872.0)));
    assert_eq!(set(1000.0), None);
}

#[test]
fn every_demo_machine_has_an_answer_for_every_setup() {
    let (mut set, mut refused) = (0, 0);
    for lathe in machines() {
        for material in Material::ALL {
            for tool in Tool::ALL {
                for operation in Operation::ALL {
                    for holder in 0..lathe.holders().len() as u8 {
                        let setup = Setup {
                            material,
                            tool,
                            operation,
                            holder,
                            ..bar(25.0)
                        };
                        match advise(&setup, &lathe).pick {
                            Pick::Set(_) => set += 1,
                            Pick::NoBasis(_) => refused += 1,
                            Pick::TooFast { .. } | Pick::NeedsCap => {}
                        }
                    }
                }
            }
        }
    }
    assert!(set > 5_000 && refused > 500, "{set} set, {refused} refused");
}

#[test]
fn an_excess_prints_in_words_where_the_figure_is_absurd() {
    use rimrate_core::advice::Excess;
    for (percent, words, above, short) in [
        (0.001, "just", "just above", "+0%"),
        (0.99, "just", "just above", "+1%"),
        (1.0, "1 %", "+1 %", "+1%"),
        (349.4, "349 %", "+349 %", "+349%"),
        (900.0, "900 %", "+900 %", "+900%"),
        (901.0, "over 10 times", "over 10 times", "+901%"),
        (135_036.0, "over 10 times", "over 10 times", "far"),
        (f32::MAX, "over 10 times", "over 10 times", "far"),
    ] {
        let excess = Excess(percent);
        assert_eq!(excess.to_string(), words);
        assert_eq!(excess.above().to_string(), above);
        assert_eq!(excess.short().to_string(), short);
        // What the screen's row holds.
        assert!(format!("slowest {excess} too fast").len() <= 32);
        assert!(short.len() <= 6);
    }
}
