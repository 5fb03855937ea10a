//! Faulty machine profiles, refused by name.

use std::fs;
use std::path::Path;

use super::{advise, refused, run, well};

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
            "kind = \"lathe\"\nslowest_rpm = 90",
            &[":3:", "slowest_rpm", "`90`", "still", "at most 85 rpm"],
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
