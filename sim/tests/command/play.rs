//! `rimrate play`: the files that it leaves, the expectations that it checks, faulty scenarios.

use std::fs;
use std::path::Path;

use super::{assert_empty, refused, rimrate, rimrate_in, stderr, stdout, well};

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
        (
            "[0.0, 2.0]",
            "[0.0, nan]",
            &["sensor.placement_deg", "`NaN`"],
        ),
        (
            "[0.0, 2.0]",
            "[0.0, 2.0, 1.0]",
            &["sensor.placement_deg", "`1`", "each magnet"],
        ),
        (
            "verdict = \"right\"",
            "rpm = 700\nwithin_percent = -1",
            &["expect[0].within_percent", "`-1`", "0 to 100"],
        ),
        (
            "verdict = \"right\"",
            "rpm = nan\nwithin_percent = 1",
            &["expect[0].rpm", "`NaN`", "0 to 100000"],
        ),
        (
            "do = { press = \"left\" }",
            "do = { cut = { specific_force = 2000.0, depth_mm = 0.0, feed_mm = 0.1 } }",
            &["at[0].do.cut.depth_mm", "`0`", "0.001 to 50"],
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
