//! `rimrate replay`: faulty captures, refused without a file left.

use std::fs;

use super::{assert_empty, refused, rimrate, rimrate_in};

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
