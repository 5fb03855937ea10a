//! Machine profiles: whatever is written, the machine is sound or the error says what is not.

use std::collections::BTreeSet;

use proptest::collection::vec;
use proptest::option;
use proptest::prelude::*;
use rimrate_core::machine::{
    ABOVE_PLATE, BELOW_PLATE, DEFAULT_BRAKE_RPM_PER_S, DEFAULT_SLOWEST_RPM, Drive, HolderKind,
    Machine, MachineKind,
};
use rimrate_core::units::UnitSystem;
use rimrate_sim::profile;
use rimrate_tests::{machine, machines, rpm};

/// The least that a profile must have.
fn least(more: &str) -> String {
    format!(
        "name = \"A lathe\"\nkind = \"lathe\"\n{more}\n[sensor]\npulses = 2\n\
         [[step]]\nlabel = \"slow\"\nrpm = 100\n[[step]]\nlabel = \"fast\"\nrpm = 200\n\
         [[holder]]\nkind = \"collet\"\n"
    )
}

fn assert_sound(machine: &Machine) {
    let mut labels = BTreeSet::new();
    let fastest = match machine.drive() {
        Drive::Stepped(steps) => {
            assert!((1..=32).contains(&steps.len()));
            assert!(steps.windows(2).all(|w| w[0].rpm < w[1].rpm));
            assert!(steps.iter().all(|s| labels.insert(s.label.to_string())));
            steps.last().unwrap().rpm
        }
        Drive::Variable(ranges) => {
            assert!((1..=8).contains(&ranges.len()));
            assert!(ranges.iter().all(|r| r.low < r.high));
            assert!(
                ranges
                    .windows(2)
                    .all(|w| w[0].low < w[1].low && w[0].high < w[1].high)
            );
            assert!(ranges.iter().all(|r| labels.insert(r.label.to_string())));
            ranges.last().unwrap().high
        }
    };
    assert!(machine.top_speed() >= fastest);
    assert!((1..=240).contains(&machine.pulses().get()));
    assert!((10.0..=100_000.0).contains(&machine.brake_rpm_per_s()));
    assert!((1.0..=1000.0).contains(&machine.slowest().get()));
    assert!((1..=10).contains(&machine.holders().len()));
    let mut names = BTreeSet::new();
    for holder in machine.holders() {
        assert!(names.insert(holder.name.to_ascii_lowercase()));
        assert!(holder.rated.is_none_or(|n| n.get() >= 1.0));
    }
}

#[test]
fn the_shipped_machines_are_sound_and_of_three_kinds() {
    assert!(machines().count() >= 3);
    machines().for_each(|machine| assert_sound(&machine));
    let lathe = machine("geared-lathe");
    assert_eq!(
        (lathe.kind(), lathe.units()),
        (MachineKind::Lathe, UnitSystem::Metric)
    );
    assert!(matches!(lathe.drive(), Drive::Stepped(steps) if steps.len() == 12));
    // Labels hold several levers.
    assert!(matches!(lathe.drive(), Drive::Stepped(s) if s.iter().all(|s| s.label.contains(", "))));
    for kind in [
        HolderKind::ThreeJaw,
        HolderKind::FourJaw,
        HolderKind::Collet,
        HolderKind::Faceplate,
        HolderKind::BetweenCentres,
        HolderKind::Arbor,
    ] {
        assert!(lathe.holders().iter().any(|h| h.kind == kind), "{kind:?}");
    }
    assert!(matches!(
        machine("variable-lathe").drive(),
        Drive::Variable(_)
    ));
    let press = machine("drill-press");
    assert_eq!(
        (press.kind(), press.units()),
        (MachineKind::DrillPress, UnitSystem::Inch)
    );
}

#[test]
fn what_is_missing_has_its_stated_default() {
    let machine = profile::parse(&least(""), "least").unwrap();
    assert_sound(&machine);
    assert_eq!(machine.top_speed(), rpm(200.0).scaled(ABOVE_PLATE));
    assert_eq!(machine.brake_rpm_per_s(), DEFAULT_BRAKE_RPM_PER_S);
    assert_eq!(machine.slowest().get(), DEFAULT_SLOWEST_RPM);
    assert_eq!(machine.units(), UnitSystem::Metric);
    assert_eq!(machine.holders()[0].name, "collet");
    assert_eq!(
        machine.holders()[0].rated,
        None,
        "a rating is never guessed"
    );
}

#[test]
fn the_slowest_speed_worth_reading_lies_below_every_setting() {
    for machine in machines() {
        assert!(machine.slowest() < machine.drive().slowest());
    }
    // A back gear that crawls is read all the same: 0.85 of its 8 rev/min, not the 10 that stand where nothing is written.
    let crawls = least("[[step]]\nlabel = \"crawl\"\nrpm = 8\n");
    let machine = profile::parse(&crawls, "crawls").unwrap();
    assert!((machine.slowest().get() - 6.8).abs() < 1e-3);
}

#[test]
fn thirty_two_steps_fit_and_no_more() {
    let steps = |n: u32| -> String {
        (1..=n)
            .map(|i| format!("[[step]]\nlabel = \"s{i}\"\nrpm = {}\n", 10 * i))
            .collect()
    };
    let with = |n: u32| {
        let text = format!(
            "name = \"A lathe\"\nkind = \"lathe\"\n[sensor]\npulses = 1\n{}[[holder]]\nkind = \"collet\"\n",
            steps(n)
        );
        profile::parse(&text, "many")
    };
    assert_sound(&with(32).unwrap());
    let error = with(33).unwrap_err().to_string();
    assert!(
        error.starts_with("many:") && error.contains("step"),
        "{error}"
    );
    assert!(!error.contains('\n'));
}

#[test]
fn a_holder_is_found_by_its_name_or_by_a_kind_that_is_there_once() {
    let lathe = machine("variable-lathe");
    assert_eq!(lathe.holder_named("80 mm three-jaw"), Some(1));
    assert_eq!(lathe.holder_named("80 MM Three-Jaw"), Some(1));
    assert_eq!(lathe.holder_named("collet"), Some(2));
    assert_eq!(lathe.holder_named("three-jaw"), None, "there are two");
    assert_eq!(lathe.holder_named("four-jaw"), None, "there is none");
    assert_eq!(lathe.holder_named(""), None);
}

#[test]
fn a_step_explains_what_load_and_tolerance_make_of_it_and_nothing_else() {
    let lathe = machine("geared-lathe");
    let Drive::Stepped(steps) = lathe.drive() else {
        panic!("stepped")
    };
    for step in steps {
        for (share, explained) in [
            (BELOW_PLATE + 0.001, true),
            (0.98, true),
            (1.0, true),
            (ABOVE_PLATE - 0.001, true),
            (ABOVE_PLATE + 0.001, false),
            (BELOW_PLATE - 0.001, false),
            // One of two magnets gone.
            (0.5, false),
        ] {
            assert_eq!(
                lathe.explains(step.rpm.scaled(share)),
                explained,
                "{step:?} x {share}"
            );
        }
    }
    let lathe = machine("variable-lathe");
    for n in [60.0, 100.0, 500.0, 1234.5, 2200.0] {
        assert!(lathe.explains(rpm(n)));
    }
    assert!(!lathe.explains(rpm(2400.0)) && !lathe.explains(rpm(45.0)));
}

#[test]
fn every_line_of_a_shipped_profile_can_go_wrong_without_a_panic() {
    for (name, text) in profile::BUILT_IN {
        for at in 0..text.lines().count() {
            for other in [
                "",
                "rpm = nan",
                "rpm = -1",
                "label = \"\"",
                "]",
                "kind = 7",
                "\u{0}",
            ] {
                let lines: Vec<&str> = text.lines().collect();
                let changed: Vec<&str> = lines
                    .iter()
                    .enumerate()
                    .map(|(i, line)| if i == at { other } else { line })
                    .collect();
                match profile::parse(&changed.join("\n"), name) {
                    Ok(machine) => assert_sound(&machine),
                    Err(e) => {
                        let error = e.to_string();
                        assert!(error.starts_with(name), "{error}");
                        assert!(!error.contains('\n'), "{error}");
                    }
                }
            }
        }
    }
}

#[test]
fn a_rated_speed_is_checked_and_a_two_speed_motor_has_two() {
    let text = |kind: &str, motor: &str, step: &str| {
        format!(
            "name = \"A lathe\"\nkind = \"lathe\"\n[motor]\nkind = \"{kind}\"\nkw = 1.1\n{motor}\n\
             [sensor]\npulses = 2\n[[step]]\nlabel = \"low\"\nrpm = 100\n{step}\n\
             [[step]]\nlabel = \"high\"\nrpm = 200\n[[holder]]\nkind = \"collet\"\n"
        )
    };
    for wrong in ["1500", "1499", "1300", "0", "-1440", "5000", "inf"] {
        let motor = format!("rated_rpm = {wrong}");
        let error = profile::parse(&text("mains", &motor, ""), "a profile").unwrap_err();
        let error = error.to_string();
        let named = ["motor.rated_rpm", wrong, "0.5 to 12 % below 750, 900"];
        assert!(named.iter().all(|w| error.contains(w)), "{error}");
        assert!(!error.contains('\n'), "{error}");
    }
    let stray = profile::parse(&text("mains", "", "rated_rpm = 1440"), "a profile").unwrap_err();
    assert!(stray.to_string().contains("step[0].rated_rpm"), "{stray}");
    let step = "kw = 0.7\nrated_rpm = 690";
    let machine = profile::parse(&text("two-speed", "rated_rpm = 1440", step), "a profile");
    let Drive::Stepped(steps) = machine.unwrap().drive().clone() else {
        panic!("no steps");
    };
    let slips = steps.iter().map(|s| s.rated_slip.unwrap());
    assert!(
        slips
            .zip([0.08, 0.04])
            .all(|(s, want)| (s - want).abs() < 1e-6)
    );
    // Without its own, the slower speed has no bar, the faster one does.
    let machine = profile::parse(
        &text("two-speed", "rated_rpm = 1440", "kw = 0.7"),
        "a profile",
    );
    let machine = machine.unwrap();
    assert_eq!(machine.tells_load(), Ok(()));
    assert!(matches!(machine.drive(), Drive::Stepped(s) if s[0].rated_slip.is_none()));
}

/// Numbers that people and accidents write.
fn number() -> impl Strategy<Value = String> {
    prop_oneof![
        (1_u32..5000).prop_map(|n| n.to_string()),
        (1.0_f32..5000.0).prop_map(|n| format!("{n:.3}")),
        any::<i32>().prop_map(|n| n.to_string()),
        any::<f32>().prop_map(|n| format!("{n:?}")),
        Just("nan".to_owned()),
        Just("inf".to_owned()),
        Just("-0.0".to_owned()),
        Just("\"12\"".to_owned()),
    ]
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(1_000))]

    #[test]
    fn any_profile_is_sound_or_refused_in_one_line(
        steps in vec((".{0,36}", number()), 0..40),
        ranges in vec(("[ -~]{1,20}", number(), number()), 0..3),
        holders in vec((0_usize..9, option::of(number())), 0..12),
        pulses in number(), top in option::of(number()), brake in option::of(number()),
    ) {
        let quoted = |s: &str| format!("{s:?}").replace("\\'", "'").replace("\\u{", "u{");
        let mut text = "name = \"any\"\nkind = \"lathe\"\n".to_owned();
        top.iter().for_each(|n| text += &format!("top_speed_rpm = {n}\n"));
        brake.iter().for_each(|n| text += &format!("brake_rpm_per_s = {n}\n"));
        text += &format!("[sensor]\npulses = {pulses}\n");
        for (label, n) in &steps {
            text += &format!("[[step]]\nlabel = {}\nrpm = {n}\n", quoted(label));
        }
        for (label, low, high) in &ranges {
            text += &format!("[[range]]\nlabel = {}\nlow_rpm = {low}\nhigh_rpm = {high}\n", quoted(label));
        }
        for (kind, rated) in &holders {
            let kind = HolderKind::ALL.get(*kind).map_or("vice", |k| k.id());
            text += &format!("[[holder]]\nkind = \"{kind}\"\n");
            rated.iter().for_each(|n| text += &format!("rated_rpm = {n}\n"));
        }
        match profile::parse(&text, "any") {
            Ok(machine) => assert_sound(&machine),
            Err(e) => {
                let error = e.to_string();
                prop_assert!(error.starts_with("any:"), "{}", error);
                prop_assert!(!error.contains('\n'), "{}", error);
            }
        }
    }

    #[test]
    fn a_profile_of_good_numbers_is_taken(
        rpms in proptest::collection::btree_set(1_u32..100_000, 1..=32),
        rated in vec(option::of(1_u32..100_000), 1..=8), pulses in 1_u16..=240,
    ) {
        let mut text = format!("name = \"any\"\nkind = \"mill\"\n[sensor]\npulses = {pulses}\n");
        for n in &rpms {
            text += &format!("[[step]]\nlabel = \"{n}\"\nrpm = {n}\n");
        }
        for (kind, rated) in HolderKind::ALL.iter().zip(&rated) {
            text += &format!("[[holder]]\nkind = \"{}\"\n", kind.id());
            rated.iter().for_each(|n| text += &format!("rated_rpm = {n}\n"));
        }
        let machine = profile::parse(&text, "any").map_err(|e| TestCaseError::fail(e.to_string()))?;
        assert_sound(&machine);
        prop_assert_eq!(machine.pulses().get(), pulses);
        prop_assert!(rpms.iter().all(|&n| machine.explains(rpm(n as f32))));
    }
}
