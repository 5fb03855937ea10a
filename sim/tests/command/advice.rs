//! `rimrate advise`: text, JSON, the list, and refused values.

use serde_json::Value;

use super::{advise, refused, rimrate, run, well};

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
