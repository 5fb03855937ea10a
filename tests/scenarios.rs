//! Whole stories on the desk: a lathe, its sensor and the box. Every file under `sim/scenarios` is played, and what holds
//! for many speeds is written here as one story for each.

use std::path::{Path, PathBuf};

use rimrate_core::machine::Drive;
use rimrate_core::verdict::Verdict;
use rimrate_sim::play::{Keep, Summary, play};
use rimrate_sim::scenario::Scenario;
use rimrate_tests::machine;

fn folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("../sim/scenarios")
}

fn files() -> Vec<PathBuf> {
    let mut files: Vec<PathBuf> = std::fs::read_dir(folder())
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .filter(|path| path.extension().is_some_and(|e| e == "toml"))
        .collect();
    files.sort();
    files
}

fn played(scenario: &Scenario) -> Summary {
    play(scenario, &Keep::default()).unwrap_or_else(|e| panic!("{}: {e}", scenario.title))
}

fn meets(scenario: &Scenario) -> Summary {
    let summary = played(scenario);
    assert_eq!(summary.missed, [""; 0], "{}", scenario.title);
    assert_eq!(summary.met, scenario.expectations.len());
    assert!(summary.met > 0, "{} expects something", scenario.title);
    summary
}

#[test]
fn every_scenario_meets_its_expectations() {
    let files = files();
    assert!(files.len() >= 10, "{files:?}");
    for file in files {
        meets(&Scenario::load(&file).unwrap_or_else(|e| panic!("{e}")));
    }
}

#[test]
fn an_expectation_that_is_not_met_is_missed_with_its_time() {
    let text = std::fs::read_to_string(folder().join("sensor-dead.toml")).unwrap();
    let wrong = text.replace("signal = \"lost\"", "signal = \"doubtful\"");
    assert_ne!(text, wrong);
    let scenario = Scenario::parse(&wrong, "wrong", None).unwrap();
    let missed = played(&scenario).missed;
    assert!(!missed.is_empty());
    assert!(
        missed
            .iter()
            .all(|m| m.starts_with("at ") && m.contains("expected signal doubtful, saw lost")),
        "{missed:?}"
    );
}

/// Everything that a run leaves, byte by byte.
fn traces(scenario: &Scenario) -> Vec<(String, Vec<u8>)> {
    let dir = tempfile::tempdir().unwrap();
    let keep = Keep {
        csv: Some(dir.path().join("readings.csv")),
        vcd: Some(dir.path().join("line.vcd")),
        frames: Some(dir.path().join("frames")),
    };
    let summary = play(scenario, &keep).unwrap();
    let mut traces = vec![(
        "summary".to_owned(),
        format!(
            "{:?} {:?} {:?} {} {:?}",
            summary.verdicts, summary.changes, summary.highest, summary.pulses, summary.missed
        )
        .into_bytes(),
    )];
    let mut folders = vec![dir.path().to_path_buf()];
    while let Some(folder) = folders.pop() {
        for entry in std::fs::read_dir(folder).unwrap() {
            let path = entry.unwrap().path();
            if path.is_dir() {
                folders.push(path);
            } else {
                let name = path.strip_prefix(dir.path()).unwrap().display().to_string();
                traces.push((name, std::fs::read(&path).unwrap()));
            }
        }
    }
    traces.sort();
    traces
}

#[test]
fn the_same_scenario_leaves_the_same_traces_twice() {
    for name in [
        "shift.toml",
        "noisy-line.toml",
        "parked.toml",
        "drill-press.toml",
    ] {
        let scenario = Scenario::load(&folder().join(name)).unwrap();
        let (first, second) = (traces(&scenario), traces(&scenario));
        // Summary, readings, line and a picture every half second.
        assert_eq!(
            first.len() as f64,
            3.0 + (scenario.seconds * 2.0).floor() + 1.0,
            "{name}"
        );
        for (a, b) in first.iter().zip(&second) {
            assert!(a == b, "{name}: {} differs from {}", a.0, b.0);
        }
        assert_eq!(first.len(), second.len());
    }
}

#[test]
fn another_seed_makes_another_run() {
    let scenario = Scenario::load(&folder().join("noisy-line.toml")).unwrap();
    let other = Scenario {
        seed: scenario.seed + 1,
        ..scenario.clone()
    };
    assert_ne!(played(&scenario).pulses, played(&other).pulses);
}

/// A story on one of the demo lathes: set to a speed, started, then what `then` says.
struct Story {
    machine: &'static str,
    holder: &'static str,
    set: String,
    rpm: f64,
    seed: u64,
    seconds: f64,
    then: String,
}

impl Story {
    fn scenario(&self) -> Scenario {
        let Story {
            machine,
            holder,
            set,
            seed,
            seconds,
            then,
            ..
        } = self;
        let text = format!(
            r#"
            title = '{set}'
            machine = "{machine}"
            seconds = {seconds}
            seed = {seed}
            [setup]
            material = "mild-steel"
            tool = "hss"
            operation = "rough-turning"
            coolant = "flood"
            diameter = "25 mm"
            holder = "{holder}"
            [[at]]
            t = 0.2
            do = {{ press = "left" }}
            [[at]]
            t = 0.5
            do = {{ {set} }}
            [[at]]
            t = 1.0
            do = {{ motor = "forward" }}
            {then}
            "#
        );
        Scenario::parse(&text, "a story", None).unwrap_or_else(|e| panic!("{e}"))
    }
}

/// Twenty speeds: the twelve steps of the geared lathe, eight settings of the variable one.
fn twenty(seed: u64, seconds: f64, then: &dyn Fn(f64) -> String) -> Vec<Story> {
    let lathe = machine("geared-lathe");
    let Drive::Stepped(steps) = lathe.drive() else {
        panic!("stepped")
    };
    let mut stories: Vec<Story> = steps
        .iter()
        .map(|step| Story {
            machine: "geared-lathe",
            holder: "three-jaw",
            set: format!("lever = \"{}\"", step.label),
            rpm: f64::from(step.rpm.get()),
            seed,
            seconds,
            then: then(f64::from(step.rpm.get())),
        })
        .collect();
    for rpm in [65.0, 130.0, 260.0, 420.0, 640.0, 1000.0, 1500.0, 2150.0] {
        stories.push(Story {
            machine: "variable-lathe",
            holder: "collet",
            set: format!("dial = {rpm:.1}"),
            rpm,
            seed,
            seconds,
            then: then(rpm),
        });
    }
    assert_eq!(stories.len(), 20);
    stories
}

#[test]
fn a_stop_at_the_braking_limit_is_never_a_lost_signal_from_any_speed() {
    for seed in 0..5 {
        let then = |_: f64| {
            r#"
            [[expect]]
            t = 14.0
            signal = "turning"
            within_percent = 1.0
            [[at]]
            t = 15.0
            do = { brake = 1.0 }
            [[expect]]
            t = 1.0
            until = 27.0
            never = "lost"
            [[expect]]
            t = 26.0
            until = 27.0
            signal = "still"
            verdict = "no-pulses"
            "#
            .to_owned()
        };
        for story in twenty(seed, 27.0, &then) {
            meets(&story.scenario());
        }
    }
}

#[test]
fn a_plug_reversal_is_never_a_lost_signal_from_any_step() {
    for seed in 0..3 {
        let then = |_: f64| {
            r#"
            [[at]]
            t = 15.0
            do = "plug"
            [[expect]]
            t = 1.0
            until = 40.0
            never = "lost"
            [[expect]]
            t = 39.0
            until = 40.0
            signal = "still"
            "#
            .to_owned()
        };
        for story in twenty(seed, 40.0, &then) {
            meets(&story.scenario());
        }
    }
}

#[test]
fn a_dead_sensor_is_lost_within_half_a_second_wherever_that_can_be_known() {
    let mut known = 0;
    for seed in 0..5 {
        // omega^2 > 2 a g: one magnet's gap, the machine's braking limit.
        let then = |_: f64| String::new();
        for mut story in twenty(seed, 30.0, &then) {
            let lathe = machine(story.machine);
            let (gap, brake) = (
                1.0 / f64::from(lathe.pulses().get()),
                f64::from(lathe.brake_rpm_per_s()) / 60.0,
            );
            // Loaded and regulated speeds differ from the setting by a few percent.
            let (slow, quick) = (0.95 * story.rpm / 60.0, 1.06 * story.rpm / 60.0);
            let dead = "[[at]]\nt = 14.0\ndo = { fault = \"stuck-high\" }\n";
            if slow * slow > 2.2 * brake * gap {
                story.then = format!(
                    "{dead}[[expect]]\nt = 14.5\nuntil = 30.0\nsignal = \"lost\"\nverdict = \"lost\"\n"
                );
                known += 1;
            } else if quick * quick < 2.0 * brake * gap {
                // Nobody can know: never lost, and not green for longer than a missing pulse takes.
                let late = 14.0 + 4.0 * gap / slow;
                story.then = format!(
                    "{dead}[[expect]]\nt = 14.0\nuntil = 30.0\nnever = \"lost\"\n\
                     [[expect]]\nt = {late}\nuntil = 30.0\nnever = \"right\"\n"
                );
            } else {
                continue;
            }
            // Above a rated holder or the machine's top, danger comes first.
            meets(&story.scenario());
        }
    }
    assert!(known >= 25, "{known}");
}

#[test]
fn a_parked_magnet_that_shakes_never_turns() {
    for machine in ["geared-lathe", "variable-lathe"] {
        for (hz, low) in [
            (24.0, 0.5),
            (50.0, 0.5),
            (100.0, 0.4),
            (12.0, 0.6),
            (3.0, 0.5),
        ] {
            for how in ["regular", "random"] {
                for seed in 0..4 {
                    let text = format!(
                        r#"
                        title = "shaken"
                        machine = "{machine}"
                        seconds = 120
                        seed = {seed}
                        [sensor]
                        shake_hz = {hz:.1}
                        shake_low = {low}
                        [setup]
                        material = "mild-steel"
                        tool = "hss"
                        operation = "rough-turning"
                        coolant = "flood"
                        diameter = "25 mm"
                        holder = "collet"
                        [[at]]
                        t = 0.2
                        do = {{ press = "left" }}
                        [[at]]
                        t = 1.0
                        do = {{ fault = "shake-{how}" }}
                        [[expect]]
                        t = 1.0
                        until = 120.0
                        signal = "still"
                        "#
                    );
                    meets(&Scenario::parse(&text, "shaken", None).unwrap());
                }
            }
        }
    }
}

#[test]
fn danger_closes_the_relay_at_any_speed_above_the_cap() {
    for story in twenty(3, 12.0, &|_| String::new()) {
        if story.rpm < 30.0 {
            continue;
        }
        let mut scenario = story.scenario();
        scenario.setup.cap = Some(rimrate_core::units::Rpm::saturating(story.rpm as f32 * 0.9));
        let summary = played(&scenario);
        let danger = summary
            .verdicts
            .get(Verdict::Danger.id())
            .copied()
            .unwrap_or(0.0);
        assert!(danger > 4.0, "{}: {:?}", story.set, summary.verdicts);
        // On its way up it may pass what would be right below the cap.
        let right = summary.verdicts.get(Verdict::Right.id()).copied();
        assert!(
            right.unwrap_or(0.0) < 1.0,
            "{}: {:?}",
            story.set,
            summary.verdicts
        );
    }
}
