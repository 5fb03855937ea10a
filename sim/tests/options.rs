//! `rimrate advise` with many options at once: the text stays short, and what does not apply is refused by name.

use std::process::{Command, Output};

use rimrate_core::trade::{Material, Operation, Tool};
use serde_json::Value;

fn advise(options: &[(&str, &str)]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_rimrate"))
        .arg("advise")
        .args(
            options
                .iter()
                .flat_map(|(o, v)| [*o, *v])
                .filter(|w| !w.is_empty()),
        )
        .output()
        .unwrap()
}

fn cut<'a>(
    tool: &'a str,
    operation: &'a str,
    more: &[(&'a str, &'a str)],
) -> Vec<(&'a str, &'a str)> {
    let mut all = vec![
        ("--material", "mild-steel"),
        ("--tool", tool),
        ("--operation", operation),
        ("--diameter", "25 mm"),
    ];
    all.extend(more);
    all
}

fn well(options: &[(&str, &str)]) -> String {
    let output = advise(options);
    let error = String::from_utf8(output.stderr).unwrap();
    assert_eq!(output.status.code(), Some(0), "{options:?}: {error}");
    String::from_utf8(output.stdout).unwrap()
}

fn json(options: &[(&str, &str)]) -> Value {
    let mut all = options.to_vec();
    all.push(("--json", ""));
    serde_json::from_str(&well(&all)).unwrap()
}

fn refused(options: &[(&str, &str)], words: &[&str]) {
    let output = advise(options);
    let error = String::from_utf8(output.stderr).unwrap();
    assert_eq!(output.status.code(), Some(2), "{options:?}: {error}");
    assert!(output.stdout.is_empty(), "{options:?}");
    assert_eq!(error.lines().count(), 1, "{error}");
    for word in words {
        assert!(error.contains(word), "`{word}` is not in: {error}");
    }
}

/// Always the same numbers: a linear congruential generator (Knuth's MMIX constants, from memory).
struct Dice(u64);

impl Dice {
    fn below(&mut self, n: usize) -> usize {
        self.0 = self
            .0
            .wrapping_mul(6_364_136_223_846_793_005)
            .wrapping_add(1_442_695_040_888_963_407);
        usize::try_from(self.0 >> 33).unwrap() % n
    }
    fn one<'a>(&mut self, all: &[&'a str]) -> &'a str {
        all[self.below(all.len())]
    }
    fn heads(&mut self) -> bool {
        self.below(4) > 0
    }
}

#[test]
fn the_text_is_under_20_rows_and_110_columns_with_any_options() {
    let mut dice = Dice(7);
    let (mut answered, mut shortened) = (0, 0);
    for _ in 0..1500 {
        let op = Operation::ALL[dice.below(Operation::ALL.len())];
        let material = Material::ALL[dice.below(Material::ALL.len())].id();
        let tool = Tool::ALL[dice.below(Tool::ALL.len())].id();
        let machine = dice.one(&["geared-lathe", "variable-lathe", "drill-press"]);
        let mut all = vec![
            ("--material", material),
            ("--tool", tool),
            ("--operation", op.id()),
            (
                "--diameter",
                dice.one(&["0.5 mm", "3 mm", "12 mm", "50 mm", "300 mm", "2000 mm"]),
            ),
            ("--coolant", dice.one(&["dry", "flood"])),
            ("--machine", machine),
        ];
        let holder = match machine {
            "geared-lathe" => dice.one(&["three-jaw", "four-jaw", "collet", "faceplate"]),
            _ => "",
        };
        if !holder.is_empty() {
            all.push(("--holder", holder));
        }
        let (turned, milled) = (op.is_turning(), op.is_milling());
        let threads = op == Operation::Threading;
        let box_ok = turned || op == Operation::Milling;
        let carbide = tool.ends_with("carbide");
        for (option, values, goes) in [
            ("--cap", &["1", "60", "100000"][..], true),
            ("--depth", &["0.1 mm", "0.25 mm"], turned || milled),
            ("--depth", &["99 mm"], op == Operation::Facing || milled),
            ("--feed", &["0.01 mm", "10 mm"], !op.is_threading()),
            ("--ra", &["0.05 um", "50 um"], turned),
            ("--nose-radius", &["0.01 mm", "0.8 mm"], turned),
            ("--life", &["15 min", "4 h"], true),
            ("--box-speed", &["1 m/min", "2000 m/min"], box_ok && carbide),
            ("--lead", &["1.75 mm", "100 mm"], op.is_threading()),
            ("--length", &["0.1 mm", "100000 mm", "900 mm"], true),
            ("--teeth", &["1", "100"], op == Operation::Milling),
            (
                "--width",
                &["0.01 mm", "1000 mm"],
                milled || op == Operation::Parting,
            ),
            ("--off-balance", &[""], true),
            ("--interrupted", &[""], true),
        ] {
            if goes && dice.heads() && all.iter().all(|(o, _)| *o != option) {
                all.push((option, dice.one(values)));
            }
        }
        if threads && all.iter().any(|(o, _)| *o == "--lead") {
            all.push(("--runout", dice.one(&["0.1 mm", "6 mm"])));
            if dice.heads() {
                all.push(("--half-nut", dice.one(&["opened", "closed", "away"])));
            }
        }
        if dice.heads() {
            all.push(("--stick-out", dice.one(&["5 mm", "9000 mm"])));
            all.push(("--stock", dice.one(&["6 mm", "40 mm"])));
            all.push(("--support", dice.one(&["free", "tailstock", "behind"])));
        }
        if holder.ends_with("jaw") && dice.heads() {
            all.extend([
                ("--jaws", "3"),
                ("--jaw-mass", "1 kg"),
                ("--jaw-radius", "60 mm"),
                ("--grip", "9 kN"),
            ]);
        }
        let output = advise(&all);
        if output.status.code() != Some(0) {
            let error = String::from_utf8(output.stderr).unwrap();
            // No cutting speed for the combination, or no such operation on this machine: nothing else.
            assert!(
                error.contains("no cutting speed is known")
                    || error.contains("with this machine")
                    || error.contains("middle of the work"),
                "{all:?}: {error}"
            );
            continue;
        }
        answered += 1;
        let text = String::from_utf8(output.stdout).unwrap();
        let rows = text.lines().count();
        assert!(rows < 20, "{rows} rows of {all:?}\n{text}");
        assert!(
            text.lines().all(|l| l.chars().count() <= 110),
            "{all:?}\n{text}"
        );
        // What is always said is there, and so is the most pressing caution.
        let flat = text.split_whitespace().collect::<Vec<_>>().join(" ");
        for words in [
            "best speed",
            "Stop the spindle before shifting",
            "Advisory only",
        ] {
            assert!(flat.contains(words), "{words} of {all:?}\n{text}");
        }
        for absurd in [" 0 % too", "+0 %"] {
            assert!(!flat.contains(absurd), "{all:?}\n{text}");
        }
        if flat.contains(" more in --json.") {
            shortened += 1;
        }
        let said = json(&all);
        // What may hurt somebody is told, however short.
        let hazards = [
            "needs-cap",
            "needs-cap-for-work",
            "off-balance",
            "side-load",
            "slender",
            "chuck-unscrews",
            "material",
        ];
        let codes = said["caution_codes"].as_array().unwrap();
        for (code, words) in codes.iter().zip(said["cautions"].as_array().unwrap()) {
            let words = words.as_str().unwrap();
            assert!(
                !hazards.contains(&code.as_str().unwrap()) || flat.contains(words),
                "`{words}` of {all:?}\n{text}"
            );
        }
    }
    assert!(answered > 600 && shortened > 10, "{answered} {shortened}");
}

#[test]
fn an_option_that_does_not_apply_is_refused_by_name_value_and_what_it_goes_with() {
    for (operation, option, value, with) in [
        (
            "rough-turning",
            "--lead",
            "1 mm",
            "tapping, threading, die-threading",
        ),
        ("drilling", "--lead", "1 mm", "threading"),
        ("drilling", "--teeth", "2", "milling"),
        ("rough-turning", "--teeth", "2", "milling"),
        (
            "rough-turning",
            "--width",
            "3 mm",
            "milling, fly-cutting, parting",
        ),
        (
            "drilling",
            "--ra",
            "1.6 um",
            "rough-turning, finish-turning, facing, boring",
        ),
        ("milling", "--ra", "1.6 um", "boring"),
        ("drilling", "--nose-radius", "0.8 mm", "boring"),
        ("milling", "--nose-radius", "0.8 mm", "boring"),
        ("drilling", "--depth", "2 mm", "milling"),
        ("threading", "--feed", "0.2 mm", "drilling"),
    ] {
        let field = format!("error: {}: `{value}`", option.trim_start_matches('-'));
        refused(
            &cut("hss", operation, &[(option, value)]),
            &[&field, operation, "allowed: ", with],
        );
    }
    // A tap's lead is its feed, but it ends at no half-nut.
    for more in [("--runout", "6 mm"), ("--half-nut", "opened")] {
        let field = more.0.trim_start_matches('-');
        refused(
            &cut("hss", "tapping", &[("--lead", "1 mm"), more]),
            &[field, "tapping", "allowed: with threading"],
        );
    }
    let jaws = [
        ("--jaws", "3"),
        ("--jaw-mass", "1 kg"),
        ("--jaw-radius", "60 mm"),
        ("--grip", "9 kN"),
    ];
    for holder in ["collet", "faceplate"] {
        let mut all = cut("hss", "rough-turning", &jaws);
        all.push(("--holder", holder));
        refused(&all, &["jaws: `3`", holder, "three-jaw or four-jaw chuck"]);
    }
    well(&cut("hss", "rough-turning", &jaws));
}

#[test]
fn a_box_speed_is_for_the_cuts_that_the_box_speaks_of() {
    let boxed = [("--box-speed", "200 m/min")];
    // Boring takes 0.75 of turning, in the table as from the box (common practice, no source).
    for (operation, stated) in [
        ("rough-turning", 200.0),
        ("finish-turning", 200.0),
        ("facing", 200.0),
        ("milling", 200.0),
        ("boring", 150.0),
    ] {
        let answer = json(&cut("carbide", operation, &boxed));
        assert_eq!(answer["edge_life"]["stated_m_min"], stated, "{operation}");
        assert_eq!(answer["surface_speed_m_min"], stated, "{operation}");
    }
    assert!(well(&cut("carbide", "boring", &boxed)).contains("x 0.75 boring"));
    for operation in [
        "drilling",
        "reaming",
        "threading",
        "parting",
        "fly-cutting",
        "countersinking",
    ] {
        refused(
            &cut("carbide", operation, &boxed),
            &["box-speed: `200 m/min`", operation, "does not speak of"],
        );
    }
}

#[test]
fn a_feed_beyond_twice_the_nose_radius_has_no_roughness_and_says_so() {
    let finish = |feed| {
        json(&cut(
            "hss",
            "finish-turning",
            &[("--feed", feed), ("--nose-radius", "0.2 mm")],
        ))
    };
    // Arcs of the radius r meet while the feed is at most 2 r: geometry.
    let (meet, apart) = (finish("0.4 mm"), finish("0.41 mm"));
    assert!(meet["finish"]["ra_um"].is_number());
    assert_eq!(apart["finish"], Value::Null);
    let warned = |v: &Value| v["caution_codes"].to_string().contains("feed-beyond-nose");
    assert!(!warned(&meet) && warned(&apart));
}

#[test]
fn a_single_published_figure_stands_once() {
    let text = well(&[
        ("--material", "mild-steel"),
        ("--tool", "hss"),
        ("--operation", "milling"),
        ("--diameter", "25 mm"),
    ]);
    assert!(text.contains("published 28 m/min"), "{text}");
}

#[test]
fn a_drill_press_does_no_turning_and_a_drill_chuck_no_milling_without_a_word() {
    let press = ("--machine", "drill-press");
    for operation in [
        "rough-turning",
        "finish-turning",
        "facing",
        "boring",
        "threading",
        "parting",
        "knurling",
    ] {
        refused(
            &cut("hss", operation, &[press]),
            &[
                &format!("operation: `{operation}`"),
                "drill press",
                "allowed: drilling",
            ],
        );
    }
    for operation in ["milling", "fly-cutting"] {
        let codes = json(&cut("hss", operation, &[press]))["caution_codes"].to_string();
        assert!(codes.contains("side-load"), "{operation}: {codes}");
    }
    let drilled = json(&cut("hss", "drilling", &[press]))["caution_codes"].to_string();
    assert!(!drilled.contains("side-load"), "{drilled}");
    let lathe = json(&cut("hss", "milling", &[]))["caution_codes"].to_string();
    assert!(!lathe.contains("side-load"), "{lathe}");
}
