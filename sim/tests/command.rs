//! The `rimrate` command as somebody types it: answers, files, and what it says to bad input.

use std::fs;
use std::path::Path;
use std::process::{Command, Output};

use serde_json::Value;

fn rimrate(args: &[&str]) -> Output {
    rimrate_in(Path::new("."), args)
}

fn rimrate_in(folder: &Path, args: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_rimrate"))
        .args(args)
        .current_dir(folder)
        .env("CI", "true")
        .output()
        .unwrap()
}

fn stdout(output: &Output) -> String {
    String::from_utf8(output.stdout.clone()).unwrap()
}

fn stderr(output: &Output) -> String {
    String::from_utf8(output.stderr.clone()).unwrap()
}

/// The answer of a run that goes well.
fn well(output: Output) -> String {
    assert_eq!(stderr(&output), "", "{}", stdout(&output));
    assert_eq!(output.status.code(), Some(0));
    stdout(&output)
}

/// One `error:` line with all of these words, exit status 2, nothing printed, no panic.
fn refused(output: &Output, words: &[&str]) -> String {
    let error = stderr(output);
    assert_eq!(output.status.code(), Some(2), "{error}");
    let lines: Vec<&str> = error.lines().collect();
    assert!(
        matches!(lines[..], [line] if line.starts_with("error: ")),
        "not one line: {error}"
    );
    for word in words {
        assert!(error.contains(word), "`{word}` is not in: {error}");
    }
    assert!(!error.contains("panicked"), "{error}");
    assert_eq!(stdout(output), "");
    error
}

/// A cut on the geared lathe with some options in another way, or more of them.
fn advise(changed: &[(&str, &str)]) -> Vec<String> {
    let mut options = vec![
        ("--material", "mild-steel"),
        ("--tool", "hss"),
        ("--operation", "rough-turning"),
        ("--diameter", "25 mm"),
    ];
    for &(option, value) in changed {
        match options.iter_mut().find(|(o, _)| *o == option) {
            Some(known) => known.1 = value,
            None => options.push((option, value)),
        }
    }
    let words = options.into_iter().flat_map(|(o, v)| [o, v]);
    ["advise"]
        .into_iter()
        .chain(words)
        .filter(|w| !w.is_empty())
        .map(str::to_owned)
        .collect()
}

fn run(args: &[String]) -> Output {
    let args: Vec<&str> = args.iter().map(String::as_str).collect();
    rimrate(&args)
}

fn json(changed: &[(&str, &str)]) -> Value {
    let mut args = advise(changed);
    args.push("--json".to_owned());
    serde_json::from_str(&well(run(&args))).unwrap()
}

#[test]
fn a_bar_on_the_geared_lathe_as_text_and_as_json() {
    let text = well(run(&advise(&[])));
    let json = json(&[]);
    // 27.4 m/min on 25 mm: 1000 x 27.4 / (pi x 25) = 349 rpm.
    let best = json["window_rpm"]["best"].as_f64().unwrap();
    assert!((best - 348.9).abs() < 0.1, "{best}");
    assert_eq!(json["window_rpm"]["high"], json["window_rpm"]["best"]);
    let pick = &json["pick"];
    assert!(pick["rpm"].as_f64().unwrap() <= best);
    assert_eq!(pick["label"], "A-1, back gear out");
    assert_eq!(json["nearest"], Value::Null);
    assert_eq!(json["held_by"], "cutting-speed");
    assert_eq!(json["conflict"], false);
    let v = json["surface_speed_m_min"].as_f64().unwrap();
    assert!((v - 27.4).abs() < 0.01, "{v}");
    // The text says the same.
    for words in [
        format!("{best:.0} rpm"),
        pick["label"].as_str().unwrap().to_owned(),
        format!("at {:.0} rpm", pick["rpm"].as_f64().unwrap()),
        "25 mm".to_owned(),
        "mild steel".to_owned(),
        "three-jaw chuck".to_owned(),
        "cutting speed".to_owned(),
    ] {
        assert!(text.contains(&words), "`{words}` is not in:\n{text}");
    }
    // Wrapped lines are one line again.
    let flat = text.split_whitespace().collect::<Vec<_>>().join(" ");
    for caution in json["cautions"].as_array().unwrap() {
        assert!(
            flat.contains(caution.as_str().unwrap()),
            "{caution}\n{text}"
        );
    }
}

#[test]
fn json_has_every_promised_key() {
    let json = json(&[("--cap", "300")]);
    for key in [
        "surface_speed_m_min",
        "window_rpm",
        "held_by",
        "bounds",
        "pick",
        "nearest",
        "conflict",
        "cautions",
    ] {
        assert!(json.get(key).is_some(), "{key}");
    }
    for key in ["low", "best", "high"] {
        assert!(json["window_rpm"][key].is_number(), "{key}");
    }
    let bounds = json["bounds"].as_array().unwrap();
    let reasons: Vec<&str> = bounds
        .iter()
        .map(|b| b["reason"].as_str().unwrap())
        .collect();
    for reason in [
        "cutting-speed",
        "machine-top-speed",
        "holder-rating",
        "operator-cap",
    ] {
        assert!(reasons.contains(&reason), "{reasons:?}");
    }
    for bound in bounds {
        assert!(bound["rpm"].is_number());
        assert!(["hard", "soft"].contains(&bound["kind"].as_str().unwrap()));
        assert!(!bound["text"].as_str().unwrap().is_empty());
    }
    // The lowest upper bound holds.
    assert_eq!(json["held_by"], "operator-cap");
    assert_eq!(json["window_rpm"]["best"], 300.0);
}

#[test]
fn an_unrated_faceplate_gives_no_pick_and_says_why() {
    let faceplate = [("--holder", "faceplate")];
    let answer = json(&faceplate);
    assert_eq!(answer["pick"], Value::Null);
    assert_eq!(answer["nearest"], Value::Null);
    assert_eq!(answer["needs_cap"], true);
    let text = well(run(&advise(&faceplate)));
    assert!(text.contains("cap"), "{text}");
    assert!(!text.contains("right from"), "{text}");
    assert!(answer["cautions"].to_string().contains("no stamped speed"));
    // With a cap there is one.
    let capped = json(&[("--holder", "faceplate"), ("--cap", "200 rpm")]);
    assert_eq!(capped["needs_cap"], false);
    assert!(capped["pick"]["rpm"].as_f64().unwrap() <= 200.0);
}

#[test]
fn where_no_step_is_slow_enough_the_nearest_is_named() {
    let answer = json(&[
        ("--material", "titanium-alloy"),
        ("--operation", "drilling"),
        ("--diameter", "2 in"),
        ("--machine", "drill-press"),
    ]);
    assert_eq!(answer["pick"], Value::Null);
    let nearest = &answer["nearest"];
    assert_eq!(
        (&nearest["label"], &nearest["rpm"]),
        (&"belt 1".into(), &355.0.into())
    );
    assert!(nearest["over_percent"].as_f64().unwrap() > 0.0);
}

#[test]
fn list_prints_every_word_with_ranges_and_sources() {
    let text = well(rimrate(&["advise", "--list"]));
    for words in [
        "mild-steel",
        "unknown-steel",
        "titanium-alloy",
        "hss",
        "coated-carbide",
        "rough-turning",
        "milling",
        "refused",
        "m/min",
        "The Ferrous Metals Data Book",
    ] {
        assert!(text.contains(words), "{words}");
    }
    // Every word that it prints for a combination is one that it takes.
    let line = text
        .lines()
        .find(|l| l.trim_start().starts_with("grey-cast-iron carbide facing"))
        .unwrap();
    let words: Vec<&str> = line.split_whitespace().take(3).collect();
    json(&[
        ("--material", words[0]),
        ("--tool", words[1]),
        ("--operation", words[2]),
    ]);
}

#[test]
fn bad_diameters_and_caps_are_refused_by_name_value_and_range() {
    for value in [
        "0 mm",
        "-3 mm",
        "-0 mm",
        "nan mm",
        "inf mm",
        "-inf mm",
        "1e9 mm",
        "99999 mm",
        "0.01 mm",
        "25",
        "mm",
        "",
        " ",
        "3/0 in",
        "twelve",
        "25 furlong",
        "25 m/min",
        "\u{fc} mm",
    ] {
        let args = advise(&[]);
        let mut args: Vec<&str> = args.iter().map(String::as_str).collect();
        let last = args.len() - 1;
        args[last] = value;
        refused(
            &rimrate(&args),
            &["diameter", &format!("`{value}`"), "0.1 mm to 2000 mm"],
        );
    }
    for value in [
        "0", "-5", "-5 rpm", "nan", "inf", "1e9", "100001", "0.5", "fast",
    ] {
        refused(
            &run(&advise(&[("--cap", value)])),
            &["cap", &format!("`{value}"), "1 rpm to 100000 rpm"],
        );
    }
}

#[test]
fn unknown_words_are_refused_with_those_that_are_known() {
    for (option, field, known) in [
        ("--material", "material", "mild-steel"),
        ("--tool", "tool", "coated-carbide"),
        ("--operation", "operation", "rough-turning"),
        ("--coolant", "coolant", "flood"),
        ("--holder", "holder", "three-jaw"),
        ("--machine", "machine", "geared-lathe"),
    ] {
        for word in ["unobtainium", "-", "Mild steel", "\u{201c}hss\u{201d}"] {
            let error = refused(
                &run(&advise(&[(option, word)])),
                &[field, &format!("`{word}`"), "allowed: ", known],
            );
            assert!(error.starts_with(&format!("error: {field}: ")), "{error}");
        }
    }
    // Two holders of a kind: the kind alone names neither.
    refused(
        &run(&advise(&[
            ("--machine", "variable-lathe"),
            ("--holder", "three-jaw"),
        ])),
        &["holder", "`three-jaw`", "80 mm three-jaw"],
    );
}

#[test]
fn a_combination_without_a_basis_is_refused_with_its_reason() {
    let error = refused(
        &run(&advise(&[
            ("--material", "unknown-steel"),
            ("--tool", "carbide"),
        ])),
        &["unknown-steel", "carbide", "no cutting speed is known"],
    );
    assert!(error.contains("high-speed steel"), "{error}");
}

/// A profile of two steps and a holder, with one piece of text replaced.
fn profile(folder: &Path, from: &str, to: &str) -> String {
    let text = r#"name = "Bench lathe"
kind = "lathe"
[sensor]
pulses = 2
[[step]]
label = "slow"
rpm = 100
[[step]]
label = "fast"
rpm = 200
[[holder]]
kind = "collet"
rated_rpm = 3000
"#;
    assert!(text.contains(from), "{from}");
    let path = folder.join("machine.toml");
    fs::write(&path, text.replacen(from, to, 1)).unwrap();
    path.to_str().unwrap().to_owned()
}

#[test]
fn a_faulty_profile_is_refused_with_line_field_value_and_range() {
    let folder = tempfile::tempdir().unwrap();
    let sound = profile(folder.path(), "200", "200");
    well(run(&advise(&[("--machine", &sound)])));
    let steps: String = (3..=40)
        .map(|i| format!("[[step]]\nlabel = \"s{i}\"\nrpm = {}\n", 200 + i))
        .collect();
    for (from, to, words) in [
        (
            "rpm = 200",
            "rpm = 50",
            &[":10:", "step[1].rpm", "`50`", "above 100 rpm"][..],
        ),
        (
            "rpm = 200",
            "rpm = 100",
            &[":10:", "step[1].rpm", "`100`", "above 100 rpm"],
        ),
        (
            "\"fast\"",
            "\"slow\"",
            &[":9:", "step[1].label", "`slow`", "stands twice"],
        ),
        (
            "rpm = 100",
            "rpm = -1",
            &[":7:", "step[0].rpm", "`-1`", "1 to 100000 rpm"],
        ),
        (
            "rpm = 100",
            "rpm = nan",
            &[":7:", "step[0].rpm", "`NaN`", "1 to 100000 rpm"],
        ),
        (
            "rpm = 100",
            "rpm = inf",
            &[":7:", "step[0].rpm", "`inf`", "1 to 100000 rpm"],
        ),
        (
            "pulses = 2",
            "pulses = 0",
            &[":4:", "sensor.pulses", "`0`", "1 to 240"],
        ),
        (
            "pulses = 2",
            "pulses = 241",
            &[":4:", "sensor.pulses", "`241`", "1 to 240"],
        ),
        ("pulses = 2", "pulses = -2", &[":4:", "pulses = -2"]),
        (
            "rated_rpm = 3000",
            "rated_rpm = 0",
            &[":13:", "holder[0].rated_rpm", "`0`", "1 to 100000"],
        ),
        ("\"lathe\"", "\"loom\"", &[":2:", "loom", "drill-press"]),
        (
            "\"slow\"",
            "\"\"",
            &[":6:", "step[0].label", "printable ASCII"],
        ),
        (
            "\"slow\"",
            "\"langsam \u{fc}\"",
            &[":6:", "step[0].label", "printable ASCII"],
        ),
        (
            "kind = \"lathe\"",
            "kind = \"lathe\"\ntop_speed_rpm = 150",
            &[":3:", "top_speed_rpm", "`150`", "200 rpm or more"],
        ),
        (
            "kind = \"lathe\"",
            "kind = \"lathe\"\nbrake_rpm_per_s = 0",
            &[":3:", "brake_rpm_per_s", "`0`", "10 to 100000"],
        ),
        (
            "kind = \"lathe\"",
            "kind = \"lathe\"\nslowest_rpm = nan",
            &[":3:", "slowest_rpm", "`NaN`", "1 to 1000"],
        ),
        (
            "kind = \"lathe\"",
            "kind = \"lathe\"\ncolour = \"green\"",
            &[":3:", "colour"],
        ),
        (
            "[[holder]]",
            "[[range]]\nlabel = \"r\"\nlow_rpm = 1\nhigh_rpm = 2\n[[holder]]",
            &["range", "either steps or ranges"],
        ),
        ("[[holder]]", &format!("{steps}[[holder]]"), &["step"]),
        (
            "[[holder]]\nkind = \"collet\"\nrated_rpm = 3000\n",
            "",
            &["holder"],
        ),
        ("rpm = 100", "rpm = ", &[":7:", "rpm ="]),
        ("rpm = 100", "rpm = \"fast\"", &[":7:", "rpm = \"fast\""]),
    ] {
        let path = profile(folder.path(), from, to);
        let error = refused(&run(&advise(&[("--machine", &path)])), words);
        assert!(error.contains("machine.toml"), "{error}");
    }
    refused(
        &run(&advise(&[("--machine", "/nowhere/machine.toml")])),
        &["machine", "`/nowhere/machine.toml`", "geared-lathe"],
    );
    fs::write(folder.path().join("bytes.toml"), b"name = \"\xff\xfe\"").unwrap();
    let bytes = folder.path().join("bytes.toml");
    refused(
        &run(&advise(&[("--machine", bytes.to_str().unwrap())])),
        &["machine", "bytes.toml"],
    );
}

const HEADER: &str = "$timescale 1 us $end\n$scope module bench $end\n$var wire 1 ! hall $end\n\
    $var wire 1 \" other $end\n$upscope $end\n$enddefinitions $end\n";

#[test]
fn faulty_captures_are_refused_and_leave_no_file() {
    let folder = tempfile::tempdir().unwrap();
    let good = "#0\n1!\n0\"\n#100\n0!\n#200\n1!\n#5000\n";
    for (name, text, words) in [
        (
            "empty",
            String::new(),
            &["empty.vcd", "no value change dump"][..],
        ),
        (
            "junk",
            "once upon a time".into(),
            &["junk.vcd", "no value change dump"],
        ),
        (
            "header",
            HEADER[..70].into(),
            &["header.vcd", "no value change dump"],
        ),
        (
            "no-values",
            HEADER.into(),
            &["no-values.vcd", "signal", "cut short"],
        ),
        (
            "cut",
            format!("{HEADER}#0\n1!\n#100\n0"),
            &["cut.vcd", "unexpected end"],
        ),
        (
            "backwards",
            format!("{HEADER}#0\n1!\n#100\n0!\n#50\n1!\n"),
            &["backwards.vcd:11", "timestamp", "`50`", "100 or later"],
        ),
        (
            "no-timescale",
            format!("{}{good}", HEADER.split_once('\n').unwrap().1),
            &["no-timescale.vcd", "timescale"],
        ),
        (
            "too-late",
            format!("{HEADER}#0\n1!\n#99999999999999999\n0!\n"),
            &["too-late.vcd", "timestamp", "`99999999999999999`"],
        ),
    ] {
        let file = format!("{name}.vcd");
        fs::write(folder.path().join(&file), text).unwrap();
        let output = rimrate_in(
            folder.path(),
            &[
                "replay", &file, "--pulses", "2", "--signal", "hall", "--csv", "out.csv",
            ],
        );
        refused(&output, words);
        fs::remove_file(folder.path().join(&file)).unwrap();
        assert_empty(folder.path());
    }
    fs::write(folder.path().join("good.vcd"), format!("{HEADER}{good}")).unwrap();
    let replay = |more: &[&str]| {
        let args: Vec<&str> = ["replay", "good.vcd"].iter().chain(more).copied().collect();
        rimrate_in(folder.path(), &args)
    };
    refused(
        &replay(&["--pulses", "2"]),
        &["signal", "--signal", "hall, other"],
    );
    refused(
        &replay(&["--pulses", "2", "--signal", "tacho"]),
        &["signal", "`tacho`", "hall, other"],
    );
    for pulses in ["0", "-1", "241", "70000", "1.5", "two", ""] {
        refused(
            &replay(&["--signal", "hall", "--pulses", pulses]),
            &["pulses", &format!("`{pulses}`"), "1 to 240 in a revolution"],
        );
    }
    for (option, field, values, allowed) in [
        (
            "--brake",
            "brake",
            ["0", "-3000", "nan", "inf", "hard"],
            "10 to 100000 rpm per second",
        ),
        (
            "--slowest",
            "slowest",
            ["0", "-10", "nan", "1e9", "slow"],
            "1 to 1000 rpm",
        ),
    ] {
        for value in values {
            refused(
                &replay(&["--signal", "hall", "--pulses", "2", option, value]),
                &[field, &format!("`{value}`"), allowed],
            );
        }
    }
    refused(
        &rimrate(&["replay", "/nowhere/x.vcd", "--pulses", "2"]),
        &["/nowhere/x.vcd", "cannot be read"],
    );
    let output = replay(&[
        "--signal",
        "hall",
        "--pulses",
        "2",
        "--csv",
        "/nowhere/out.csv",
    ]);
    refused(&output, &["/nowhere/out.csv", "cannot be written"]);
    let output = replay(&["--signal", "hall", "--pulses", "2", "--csv", "/"]);
    refused(&output, &["/"]);
    fs::remove_file(folder.path().join("good.vcd")).unwrap();
    assert_empty(folder.path());
}

fn assert_empty(folder: &Path) {
    let left: Vec<_> = fs::read_dir(folder)
        .unwrap()
        .map(|e| e.unwrap().path())
        .collect();
    assert!(left.is_empty(), "{left:?}");
}

#[test]
fn usage_errors_have_exit_status_two() {
    for args in [
        &["bogus"][..],
        &["replay"],
        &["replay", "x.vcd"],
        &["play"],
        &["advise"],
        &["advise", "--colour", "green"],
        &["advise", "--list", "--json"],
    ] {
        let output = rimrate(args);
        let error = stderr(&output);
        assert_eq!(output.status.code(), Some(2), "{args:?}: {error}");
        assert_eq!(
            error.lines().filter(|l| l.starts_with("error:")).count(),
            1,
            "{error}"
        );
        assert!(!error.contains("panicked"));
    }
}

#[test]
fn help_has_examples() {
    for args in [
        &["--help"][..],
        &["advise", "--help"],
        &["play", "--help"],
        &["replay", "--help"],
    ] {
        let text = well(rimrate(args));
        assert!(text.contains("Examples:\n  rimrate"), "{text}");
    }
    assert!(well(rimrate(&["--version"])).starts_with("rimrate "));
}

/// A story of twelve seconds: started at 1 s, the sensor dead from 9 s to the end.
const STORY: &str = r#"
title = "A short story"
machine = "geared-lathe"
seconds = 12
seed = 5
[sensor]
placement_deg = [0.0, 2.0]
[setup]
material = "mild-steel"
tool = "hss"
operation = "rough-turning"
coolant = "flood"
diameter = "10 mm"
holder = "three-jaw"
[[at]]
t = 0.2
do = { press = "left" }
[[at]]
t = 0.5
do = { lever = "A-3, back gear out" }
[[at]]
t = 1.0
do = { motor = "forward" }
[[at]]
t = 9.013
do = { fault = "stuck-high" }
[[expect]]
t = 5.0
until = 8.9
verdict = "right"
[[expect]]
t = 9.52
until = 12.0
signal = "lost"
"#;

type Row = (String, String, String);

fn rows(path: &Path) -> Vec<Row> {
    let text = fs::read_to_string(path).unwrap();
    let mut lines = text.lines();
    assert_eq!(lines.next(), Some("time_s,rpm,signal"));
    lines
        .map(|line| {
            let cells: Vec<&str> = line.split(',').collect();
            assert_eq!(cells.len(), 3, "{line}");
            (cells[0].into(), cells[1].into(), cells[2].into())
        })
        .collect()
}

fn assert_rows(rows: &[Row], seconds: u32) {
    assert_eq!(
        rows.len() as u32,
        seconds * 20 + 1,
        "a row every 50 ms, both ends included"
    );
    for ((time, rpm, signal), ms) in rows.iter().zip((0..).step_by(50)) {
        assert_eq!(*time, format!("{}.{:03}", ms / 1000, ms % 1000));
        match signal.as_str() {
            "still" => assert_eq!(rpm, "0"),
            "lost" => assert_eq!(rpm, ""),
            "turning" | "doubtful" => assert!(rpm.parse::<f64>().unwrap() > 0.0, "{rpm}"),
            other => panic!("{other}"),
        }
    }
}

#[test]
fn play_leaves_what_it_was_asked_for_and_replay_reads_the_same() {
    let folder = tempfile::tempdir().unwrap();
    fs::write(folder.path().join("story.toml"), STORY).unwrap();
    let text = well(rimrate_in(
        folder.path(),
        &[
            "play",
            "story.toml",
            "--csv",
            "played.csv",
            "--vcd",
            "line.vcd",
            "--frames",
            "frames",
        ],
    ));
    for words in [
        "A short story",
        "right",
        "lost",
        "2 of 2 expectations met",
        "times real time",
    ] {
        assert!(text.contains(words), "{words}\n{text}");
    }
    let frames: Vec<_> = fs::read_dir(folder.path().join("frames"))
        .unwrap()
        .map(|e| e.unwrap())
        .collect();
    assert_eq!(
        frames.len(),
        25,
        "one every half second, both ends included"
    );
    for frame in frames {
        let png = fs::read(frame.path()).unwrap();
        assert!(png.starts_with(b"\x89PNG\r\n"));
    }
    let capture = fs::read_to_string(folder.path().join("line.vcd")).unwrap();
    assert!(capture.contains("$timescale") && capture.contains("hall"));

    let text = well(rimrate_in(
        folder.path(),
        &[
            "replay",
            "line.vcd",
            "--pulses",
            "2",
            "--csv",
            "replayed.csv",
        ],
    ));
    assert!(
        text.contains("12.000 s") && text.contains("turning"),
        "{text}"
    );
    let (played, replayed) = (
        rows(&folder.path().join("played.csv")),
        rows(&folder.path().join("replayed.csv")),
    );
    assert_rows(&played, 12);
    assert_rows(&replayed, 12);
    let mut turning = 0;
    for (a, b) in played.iter().zip(&replayed) {
        assert_eq!((&a.0, &a.2), (&b.0, &b.2), "{a:?} {b:?}");
        if a.2 == "turning" {
            turning += 1;
            let (x, y): (f64, f64) = (a.1.parse().unwrap(), b.1.parse().unwrap());
            assert!((x - y).abs() <= 1e-4 + 1e-6 * x, "{a:?} {b:?}");
        }
    }
    assert!(turning > 140, "{turning}");
    // Dead at 9 s, lost half a second later; lost does not turn into still by waiting.
    assert!(replayed[191..].iter().all(|row| row.2 == "lost"));
    let mut names: Vec<String> = fs::read_dir(folder.path())
        .unwrap()
        .map(|e| e.unwrap().file_name().into_string().unwrap())
        .collect();
    names.sort();
    assert_eq!(
        names,
        [
            "frames",
            "line.vcd",
            "played.csv",
            "replayed.csv",
            "story.toml"
        ]
    );
}

#[test]
fn a_missed_expectation_is_named_with_its_time_and_has_exit_status_one() {
    let folder = tempfile::tempdir().unwrap();
    let wrong = STORY.replace("verdict = \"right\"", "verdict = \"slow\"");
    fs::write(folder.path().join("story.toml"), wrong).unwrap();
    let output = rimrate_in(folder.path(), &["play", "story.toml"]);
    assert_eq!(output.status.code(), Some(1));
    assert_eq!(stderr(&output), "error: 1 of 2 expectations missed\n");
    let text = stdout(&output);
    assert!(
        text.contains("MISSED at 5.00 s: expected verdict slow, saw right"),
        "{text}"
    );
}

#[test]
fn faulty_scenarios_are_refused_with_field_value_and_range() {
    let folder = tempfile::tempdir().unwrap();
    for (from, to, words) in [
        (
            "seconds = 12",
            "seconds = 0",
            &["seconds", "`0`", "0.1 to 86400"][..],
        ),
        (
            "seconds = 12",
            "seconds = nan",
            &["seconds", "`NaN`", "0.1 to 86400"],
        ),
        ("seconds = 12", "seconds = -1", &["seconds", "`-1`"]),
        (
            "\"10 mm\"",
            "\"-10 mm\"",
            &["diameter", "`-10 mm`", "0.1 mm to 2000 mm"],
        ),
        ("\"mild-steel\"", "\"cheese\"", &["cheese", "mild-steel"]),
        (
            "\"three-jaw\"",
            "\"vice\"",
            &["holder", "`vice`", "three-jaw"],
        ),
        (
            "\"geared-lathe\"",
            "\"loom\"",
            &["machine", "`loom`", "geared-lathe"],
        ),
        (
            "A-3, back gear out",
            "Z-9",
            &["at[1].do", "`Z-9`", "A-3, back gear out"],
        ),
        (
            "do = { press = \"left\" }",
            "do = { dial = 300.0 }",
            &["at[0].do", "`300`", "lever"],
        ),
        ("t = 9.013", "t = 900.0", &["at[3].t", "`900`"]),
        ("t = 9.013", "t = nan", &["at[3].t", "`NaN`"]),
        (
            "verdict = \"right\"",
            "verdict = \"splendid\"",
            &["expect[0].verdict", "`splendid`", "right"],
        ),
        (
            "verdict = \"right\"",
            "rpm = 700",
            &["expect[0]", "within_percent"],
        ),
        ("signal = \"lost\"", "", &["expect[1]", "nothing"]),
        ("until = 8.9", "until = 1.0", &["expect[0]"]),
        (
            "[0.0, 2.0]",
            "[0.0, 200.0]",
            &["sensor.placement_deg", "`200`"],
        ),
        ("title", "titel", &[":2:", "titel"]),
        ("seconds = 12", "seconds = ", &[":4:", "seconds"]),
    ] {
        assert!(STORY.contains(from), "{from}");
        fs::write(
            folder.path().join("story.toml"),
            STORY.replacen(from, to, 1),
        )
        .unwrap();
        let output = rimrate_in(
            folder.path(),
            &[
                "play",
                "story.toml",
                "--csv",
                "x.csv",
                "--vcd",
                "x.vcd",
                "--frames",
                "frames",
            ],
        );
        let error = refused(&output, words);
        assert!(
            error.contains("story.toml") || error.contains("machine"),
            "{error}"
        );
        fs::remove_file(folder.path().join("story.toml")).unwrap();
        assert_empty(folder.path());
    }
    refused(
        &rimrate(&["play", "/nowhere/story.toml"]),
        &["/nowhere/story.toml", "cannot be read"],
    );
}

#[test]
fn where_one_output_cannot_be_written_no_other_is_left() {
    let folder = tempfile::tempdir().unwrap();
    fs::write(folder.path().join("story.toml"), STORY).unwrap();
    for (args, words) in [
        (
            ["--csv", "/nowhere/x.csv", "--vcd", "x.vcd"],
            "/nowhere/x.csv",
        ),
        (
            ["--csv", "x.csv", "--vcd", "/nowhere/x.vcd"],
            "/nowhere/x.vcd",
        ),
        (["--csv", "x.csv", "--frames", "story.toml"], "story.toml"),
    ] {
        let args: Vec<&str> = ["play", "story.toml"].into_iter().chain(args).collect();
        refused(&rimrate_in(folder.path(), &args), &[words, "cannot be"]);
        let left: Vec<_> = fs::read_dir(folder.path()).unwrap().collect();
        assert_eq!(left.len(), 1, "{left:?}");
    }
}

#[test]
fn the_main_job_plays_the_shift_and_ends_with_a_summary() {
    let text = well(rimrate(&[]));
    assert!(text.contains("Fennick geared lathe"), "{text}");
    assert!(text.contains("times real time"), "{text}");
    assert!(!text.contains("MISSED"), "{text}");
    // Whoever closes the pipe has read enough.
    let mut child = Command::new(env!("CARGO_BIN_EXE_rimrate"))
        .args(["advise", "--list"])
        .stdout(std::process::Stdio::piped())
        .stderr(std::process::Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let output = child.wait_with_output().unwrap();
    assert_eq!(stderr(&output), "");
    assert_eq!(output.status.code(), Some(0));
}
