//! `rimrate advise` for cuts of which more is known: the substance of each answer, text and JSON side by side, and bad input.

use std::path::PathBuf;
use std::process::{Command, Output};

use serde_json::Value;

fn advise(line: &str, extra: &[&str]) -> Output {
    // Words in quotes stay together, as in a shell.
    let mut words = Vec::new();
    for (i, part) in line.split('"').enumerate() {
        match i % 2 {
            0 => words.extend(part.split_whitespace()),
            _ => words.push(part),
        }
    }
    Command::new(env!("CARGO_BIN_EXE_rimrate"))
        .arg("advise")
        .args(words)
        .args(extra)
        .output()
        .unwrap()
}

fn well(output: Output) -> String {
    let error = String::from_utf8(output.stderr).unwrap();
    assert_eq!(error, "");
    assert_eq!(output.status.code(), Some(0));
    String::from_utf8(output.stdout).unwrap()
}

/// The answer as text, of which the rows are counted, in one line, and as JSON; both must say the same.
fn answer(line: &str) -> (String, Value) {
    let text = well(advise(line, &[]));
    let rows = text.lines().count();
    assert!(rows < 20, "{rows} rows\n{text}");
    assert!(
        text.lines().all(|l| l.chars().count() <= 110),
        "too wide\n{text}"
    );
    let text = text.split_whitespace().collect::<Vec<_>>().join(" ");
    let json: Value = serde_json::from_str(&well(advise(line, &["--json"]))).unwrap();

    let number = |v: &Value, places: usize| {
        // Halves away from zero, as the text has them.
        let tens = 10_f64.powi(places as i32);
        let full = format!("{:.places$}", (v.as_f64().unwrap() * tens).round() / tens);
        match full.contains('.') {
            true => full.trim_end_matches('0').trim_end_matches('.').to_owned(),
            false => full,
        }
    };
    let rpm = |v: &Value| number(v, if v.as_f64().unwrap() < 100.0 { 1 } else { 0 });
    let says = |words: String| assert!(text.contains(&words), "`{words}` is not in: {text}");
    says(format!(
        "best speed {} rpm",
        rpm(&json["window_rpm"]["best"])
    ));
    says(format!("{} m/min", number(&json["surface_speed_m_min"], 1)));
    for bound in json["bounds"].as_array().unwrap() {
        says(format!("{} rpm ", rpm(&bound["rpm"])));
    }
    for caution in json["cautions"].as_array().unwrap() {
        says(caution.as_str().unwrap().to_owned());
    }
    match &json["pick"] {
        Value::Null => says("set no step".to_owned()),
        pick => says(format!(
            "{} at {} rpm",
            pick["label"].as_str().unwrap(),
            rpm(&pick["rpm"])
        )),
    }
    if let Some(feed) = json["feed"]["mm_per_rev"].as_f64() {
        says(format!("{} mm a turn", number(&Value::from(feed), 3)));
    }
    // The binding reason is the lowest upper bound.
    let uppers = json["bounds"]
        .as_array()
        .unwrap()
        .iter()
        .filter(|b| b["side"] == "upper");
    let lowest = uppers
        .min_by(|a, b| {
            a["rpm"]
                .as_f64()
                .unwrap()
                .total_cmp(&b["rpm"].as_f64().unwrap())
        })
        .unwrap();
    assert_eq!(json["held_by"], lowest["reason"]);
    assert_eq!(json["window_rpm"]["high"], lowest["rpm"]);
    (text, json)
}

fn has(text: &str, all: &[&str]) {
    for words in all {
        assert!(text.contains(words), "`{words}` is not in: {text}");
    }
}

fn warns(json: &Value, code: &str) -> bool {
    json["caution_codes"]
        .as_array()
        .unwrap()
        .iter()
        .any(|c| c == code)
}

/// An invented drill press that tops out at 1500 rpm.
fn slow_press() -> PathBuf {
    let path = PathBuf::from(env!("CARGO_TARGET_TMPDIR")).join("slow-press.toml");
    let text = "name = \"Tarrow old drill press\"\nkind = \"drill-press\"\nsensor = { pulses = 1 }\n\
        step = [{ label = \"belt 1\", rpm = 500 }, { label = \"belt 2\", rpm = 1500 }]\n\
        holder = [{ kind = \"drill-chuck\", rated_rpm = 3000 }]\n";
    std::fs::write(&path, text).unwrap();
    path
}

#[test]
fn a_small_drill_in_brass_on_a_slow_machine() {
    let press = slow_press();
    let (text, json) = answer(&format!(
        "--material brass --tool hss --operation drilling --diameter \"3 mm\" --machine \"{}\"",
        press.display()
    ));
    assert_eq!(json["held_by"], "machine-top-speed");
    assert!(warns(&json, "machine-too-slow") && warns(&json, "drill-breaks"));
    // 0.025 + (0.25 - 0.025) x 1.5 / 11 = 0.0557 mm (table 23.11), times 1500: 83.5 mm/min, 7.2 s for 10 mm.
    assert!((json["hand_feed"]["mm_per_min"].as_f64().unwrap() - 83.5).abs() < 0.1);
    assert!((json["hand_feed"]["s_per_10_mm"].as_f64().unwrap() - 7.18).abs() < 0.01);
    has(
        &text,
        &[
            "too slow",
            "the hand is the limit",
            "83.5 mm/min",
            "7.2 s or more",
            "breaks",
        ],
    );
}

#[test]
fn cast_iron_on_a_faceplate_wants_a_cap_and_balance() {
    let line = "--material grey-cast-iron --tool carbide --operation facing --diameter \"150 mm\" --holder faceplate";
    let (text, json) = answer(line);
    assert_eq!(
        (&json["needs_cap"], &json["pick"]),
        (&Value::Bool(true), &Value::Null)
    );
    assert!(warns(&json, "needs-cap") && warns(&json, "off-balance") && warns(&json, "material"));
    has(
        &text,
        &[
            "give a cap",
            "no stamped speed",
            "balance",
            "turn it once by hand",
            "Dust",
        ],
    );
    // No cap is ever worked out for a faceplate.
    assert!(!text.contains("assumed, no source"));
    let (_, capped) = answer(&format!("{line} --cap 120"));
    assert_eq!(capped["needs_cap"], false);
    assert_eq!(capped["pick"]["rpm"], 71.0);
    assert!(
        warns(&capped, "off-balance"),
        "the balance stays to be minded"
    );
}

#[test]
fn a_thin_stainless_bar_is_not_cut_unsupported() {
    let line = "--material stainless-austenitic --tool hss --operation finish-turning --diameter \"6 mm\" --stick-out \"250 mm\"";
    let (text, json) = answer(line);
    let bar = &json["stick_out"];
    assert!((bar["length_per_diameter"].as_f64().unwrap() - 250.0 / 6.0).abs() < 0.01);
    // By hand: 1.8751^2 / (2 pi 0.25^2) x 0.0015 sqrt(190e9 / 8000) = 65.4 Hz, half of it 1964 rpm.
    assert!((bar["fastest_rpm"].as_f64().unwrap() - 1964.0).abs() < 2.0);
    has(
        &text,
        &[
            "41.7 times its diameter",
            "do not cut unsupported",
            "Tailstock or steady",
        ],
    );
    let (text, held) = answer(&format!("{line} --support tailstock"));
    has(&text, &["41.7 times as long", "set a steady"]);
    assert!(held["stick_out"]["fastest_rpm"].as_f64().unwrap() > 4.0 * 1964.0);
}

#[test]
fn a_thread_to_a_shoulder_has_both_half_nut_cases() {
    let line = "--material mild-steel --tool hss --operation threading --diameter \"12 mm\" --lead \"1.75 mm\" --runout \"6 mm\"";
    let (text, json) = answer(line);
    assert_eq!(json["held_by"], "thread-runout");
    // 60 x 6 / 1.75 and 120 x 6 / (1.75 x 1.5).
    assert_eq!(json["thread"]["opened_rpm"], 205.71);
    assert_eq!(json["thread"]["closed_rpm"], 274.29);
    has(
        &text,
        &[
            "half-nut opened by hand in 1 s: 206 rpm",
            "kept closed, spindle stopped in 1.5 s: 274 rpm",
        ],
    );
    let (_, closed) = answer(&format!("{line} --half-nut closed"));
    assert_eq!(closed["window_rpm"]["best"], 274.29);
    let (_, away) = answer(&format!("{line} --half-nut away"));
    assert_eq!(away["held_by"], "cutting-speed");
    // The same in threads per inch.
    let (_, inch) = answer(
        &line
            .replace("1.75 mm", "14.514286 tpi")
            .replace("12 mm", "0.4724409 in"),
    );
    assert_eq!(inch["thread"]["opened_rpm"], 205.71);
}

#[test]
fn a_deep_cut_in_alloy_steel_is_held_by_the_motor_which_says_what_it_pulls() {
    let line =
        "--material low-alloy-steel --tool hss --operation rough-turning --diameter \"50 mm\"";
    let (text, json) = answer(&format!("{line} --depth \"4 mm\""));
    assert_eq!(json["held_by"], "power");
    assert!(warns(&json, "overload"));
    let limit = json["depth_limit_mm"].as_f64().unwrap();
    assert!(limit < 4.0 && limit > 0.5, "{limit}");
    has(
        &text,
        &[
            "The motor is the limit",
            format!("pulls {limit:.2}").trim_end_matches('0'),
        ],
    );
    // At that depth the setting is that of all else, a little deeper it is not.
    let at = |depth: f64| answer(&format!("{line} --depth \"{depth} mm\"")).1;
    let plain = answer(line).1;
    assert_eq!(at(limit * 0.98)["pick"], plain["pick"]);
    assert!(!warns(&at(limit * 0.98), "overload"));
    assert_ne!(at(limit * 1.02)["pick"], plain["pick"]);
    assert!(warns(&at(limit * 1.02), "overload"));
}

#[test]
fn parting_aluminium_is_slower_than_turning_and_says_why() {
    let line =
        "--material aluminium --tool hss --operation parting --diameter \"40 mm\" --width \"3 mm\"";
    let (text, json) = answer(line);
    let turning = line.replace("parting", "rough-turning");
    let (_, turned) = answer(turning.split(" --width").next().unwrap());
    let best = |json: &Value| json["window_rpm"]["best"].as_f64().unwrap();
    assert!(best(&json) < 0.6 * best(&turned));
    has(
        &text,
        &[
            "Slower than turning, because the blade is thin",
            "rises towards the centre",
            "do not shift in mid-cut",
        ],
    );
}

#[test]
fn an_insert_box_for_two_hours() {
    let line = "--material mild-steel --tool coated-carbide --operation rough-turning --diameter \"50 mm\" --box-speed \"250 m/min\" --life \"2 h\"";
    let (text, json) = answer(line);
    let life = &json["edge_life"];
    assert_eq!(
        (&json["held_by"], &life["from"], &life["stated_min"]),
        (&"edge-life".into(), &"box".into(), &15.0.into())
    );
    assert_eq!(
        (&life["exponent"], &life["slowest_useful_m_min"]),
        (&0.6.into(), &50.0.into())
    );
    assert!((life["speed_m_min"].as_f64().unwrap() - 71.79).abs() < 0.01);
    assert!(life["expected_min"].as_f64().unwrap() >= 120.0);
    assert_eq!(life["reached"], true);
    has(
        &text,
        &[
            "120 min wanted: 71.8 m/min",
            "largest exponent of 0.4 to 0.6",
            "slowest useful 50 m/min",
        ],
    );
    // Four hours are not to be had from carbide in steel: held at the slowest useful speed, and said.
    let (text, long) = answer(&line.replace("2 h", "4 h"));
    assert_eq!(
        (
            &long["edge_life"]["speed_m_min"],
            &long["edge_life"]["reached"]
        ),
        (&50.0.into(), &false.into())
    );
    has(&text, &["the edge will not last as long"]);
}

#[test]
fn inch_and_metric_say_the_same() {
    let metric = "--material mild-steel --tool hss --operation finish-turning --diameter \"25.4 mm\" --depth \"0.508 mm\" --ra \"1.6 um\" --nose-radius \"0.79375 mm\" --stick-out \"76.2 mm\" --length \"63.5 mm\"";
    let inch = "--material mild-steel --tool hss --operation finish-turning --diameter \"1 in\" --depth \"0.02 in\" --ra \"62.992126 uin\" --nose-radius \"1/32 in\" --stick-out \"3 in\" --length \"2 1/2 in\"";
    assert_eq!(answer(metric), answer(inch));
}

#[test]
fn bad_details_are_refused_by_name_value_and_range() {
    let sound = "--material mild-steel --tool hss --operation rough-turning --diameter \"25 mm\"";
    for (option, value, words) in [
        (
            "--depth",
            "0 mm",
            &["depth", "0 mm", "not above zero", "0.001 mm to 100 mm"][..],
        ),
        ("--depth", "-1 mm", &["depth"]),
        ("--depth", "nan mm", &["depth"]),
        ("--depth", "3", &["depth", "no unit"]),
        ("--feed", "11 mm", &["feed", "0.001 mm to 10 mm"]),
        ("--nose-radius", "0.8 um", &["nose-radius", "unit"]),
        ("--ra", "1.6 mm", &["ra", "um or uin"]),
        ("--ra", "900 um", &["ra", "0.05 um to 50 um"]),
        ("--life", "10 min", &["life", "15 min to 240 min"]),
        ("--life", "5 h", &["life", "15 min to 240 min"]),
        ("--life", "inf h", &["life"]),
        (
            "--box-speed",
            "0 m/min",
            &["box-speed", "1 m/min to 2000 m/min"],
        ),
        ("--box-speed", "250", &["box-speed", "no unit"]),
        (
            "--stick-out",
            "11000 mm",
            &["stick-out", "0.1 mm to 10000 mm"],
        ),
        ("--lead", "0 tpi", &["lead", "not above zero"]),
        ("--lead", "1000 tpi", &["lead", "0.05 mm to 100 mm"]),
        ("--lead", "fine", &["lead"]),
        ("--length", "1e9 mm", &["length"]),
        ("--teeth", "0", &["teeth", "1 to 100"]),
        ("--teeth", "2.5", &["teeth"]),
        ("--width", "inf mm", &["width"]),
    ] {
        let output = advise(sound, &[&format!("{option}={value}")]);
        refused(&output, words);
    }
    for (line, words) in [
        (
            "--stick-out \"100 mm\" --support held",
            &["support", "held", "free, tailstock, behind"][..],
        ),
        (
            "--stick-out \"100 mm\" --tube-bore \"25 mm\"",
            &["tube-bore", "no wall", "25 mm"],
        ),
        ("--stick-out \"100 mm\" --stock \"0 mm\"", &["stock"]),
        (
            "--depth \"12.6 mm\"",
            &["depth", "12.6 mm", "middle", "0.001 mm to 12.5 mm"],
        ),
        (
            "--box-speed \"250 m/min\"",
            &["box-speed", "250 m/min", "hss", "carbide or coated-carbide"],
        ),
        (
            "--lead \"1 mm\" --half-nut ajar",
            &["half-nut", "ajar", "opened, closed, away"],
        ),
        ("--lead \"1 mm\" --runout \"0 mm\"", &["runout"]),
        (
            "--box-speed \"250 m/min\" --box-life \"1 min\"",
            &["box-life", "15 min to 240 min"],
        ),
        (
            "--jaws 9 --jaw-mass \"1 kg\" --jaw-radius \"50 mm\" --grip \"9 kN\"",
            &["jaws", "2 to 8"],
        ),
        (
            "--jaws 3 --jaw-mass \"1 stone\" --jaw-radius \"50 mm\" --grip \"9 kN\"",
            &["jaw-mass"],
        ),
        (
            "--jaws 3 --jaw-mass \"1 kg\" --jaw-radius \"0 mm\" --grip \"9 kN\"",
            &["jaw-radius"],
        ),
        (
            "--jaws 3 --jaw-mass \"1 kg\" --jaw-radius \"50 mm\" --grip \"9\"",
            &["grip", "no unit"],
        ),
    ] {
        refused(&advise(&format!("{sound} {line}"), &[]), words);
    }
    // The drill's diameter does not say how thick the bar is that sticks out.
    let drilling = sound.replace("rough-turning", "drilling");
    let words = &["stock", "missing", "drill", "0.1 mm to 2000 mm"];
    refused(
        &advise(&format!("{drilling} --stick-out \"100 mm\""), &[]),
        words,
    );
    // What belongs to another option does not stand alone.
    for alone in [
        "--support free",
        "--runout \"6 mm\"",
        "--box-life \"15 min\"",
        "--jaws 3",
        "--grip \"9 kN\"",
    ] {
        let output = advise(&format!("{sound} {alone}"), &[]);
        assert_eq!(output.status.code(), Some(2), "{alone}");
        assert!(output.stdout.is_empty());
    }
}

fn refused(output: &Output, words: &[&str]) {
    let error = String::from_utf8(output.stderr.clone()).unwrap();
    assert_eq!(output.status.code(), Some(2), "{words:?}: {error}");
    assert_eq!(error.lines().count(), 1, "{error}");
    for word in words {
        assert!(error.contains(word), "`{word}` is not in: {error}");
    }
    assert!(output.stdout.is_empty());
}

#[test]
fn a_profile_with_a_faulty_motor_or_feeds_is_refused_with_its_line() {
    let geared = include_str!("../machines/geared-lathe.toml");
    let variable = include_str!("../machines/variable-lathe.toml");
    let path = PathBuf::from(env!("CARGO_TARGET_TMPDIR")).join("faulty.toml");
    let sound = "--material mild-steel --tool hss --operation rough-turning --diameter \"25 mm\"";
    for (text, from, to, words) in [
        (
            geared,
            "kw = 1.1",
            "kw = 0",
            &["motor.kw", "`0`", "0.02 to 100 kW"][..],
        ),
        (geared, "kw = 1.1", "kw = nan", &["motor.kw"]),
        (
            geared,
            "kw = 1.1",
            "kw = 1.1\nefficiency = 1.5",
            &["motor.efficiency", "0.2 to 1"],
        ),
        (geared, "kind = \"mains\"", "kind = \"steam\"", &["steam"]),
        (
            geared,
            "0.04, 0.05",
            "0.05, 0.05",
            &["feeds_mm[1]", "not coarser"],
        ),
        (
            geared,
            "0.04, 0.05",
            "0, 0.05",
            &["feeds_mm[0]", "0.005 to 10"],
        ),
        (
            geared,
            "half_nut_stop_s = 1.5",
            "half_nut_stop_s = -1",
            &["half_nut_stop_s", "0.1 to 60 s"],
        ),
        (
            geared,
            "spindle_nose = \"cam\"",
            "spindle_nose = \"glued\"",
            &["glued"],
        ),
        (
            geared,
            "rpm = 18",
            "rpm = 18\nkw = 0.5",
            &["step[0].kw", "two-speed"],
        ),
        (
            variable,
            "base_rpm = 450",
            "base_rpm = 45",
            &["range[0].base_rpm", "60 to 900"],
        ),
        (
            variable,
            "cool_rpm = 250",
            "cool_rpm = 5000",
            &["range[1].cool_rpm", "150 to 2200"],
        ),
        (
            variable,
            "kind = \"inverter\"",
            "kind = \"mains\"",
            &["base_rpm", "inverter"],
        ),
    ] {
        assert!(text.contains(from), "{from}");
        std::fs::write(&path, text.replacen(from, to, 1)).unwrap();
        let output = advise(&format!("{sound} --machine \"{}\"", path.display()), &[]);
        refused(&output, words);
        let error = String::from_utf8(output.stderr).unwrap();
        assert!(error.contains("faulty.toml:"), "no line: {error}");
    }
}
