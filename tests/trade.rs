//! The trade table as a whole: words, order, completeness, honesty of its sources.

use rimrate_core::trade::{
    Confidence, Coolant, CuttingSpeed, IsoGroup, Material, Operation, Refusal, Tool, cutting_speed,
    rows,
};
use serde_json::{from_value, json, to_value};

/// Every combination with its answer.
fn all() -> impl Iterator<
    Item = (
        Material,
        Tool,
        Operation,
        Coolant,
        Result<CuttingSpeed, Refusal>,
    ),
> {
    Material::ALL.into_iter().flat_map(|m| {
        Tool::ALL.into_iter().flat_map(move |t| {
            Operation::ALL.into_iter().flat_map(move |o| {
                Coolant::ALL
                    .into_iter()
                    .map(move |c| (m, t, o, c, cutting_speed(m, t, o, c)))
            })
        })
    })
}

fn ours(m: Material, t: Tool, o: Operation) -> Option<f32> {
    let c = if m == Material::Magnesium {
        Coolant::Dry
    } else {
        Coolant::Flood
    };
    cutting_speed(m, t, o, c).ok().map(|s| s.ours.m_min())
}

/// Ids are plain words, serialise as themselves, and lead back; labels fit the screen.
macro_rules! words {
    ($name:ident, $type:ty, $label:expr) => {
        #[test]
        fn $name() {
            let mut seen = std::collections::BTreeSet::new();
            for x in <$type>::ALL {
                let id = x.id();
                assert!(seen.insert(id), "{id} twice");
                assert!(
                    id.chars().all(|c| c.is_ascii_lowercase() || c == '-'),
                    "{id}"
                );
                assert_eq!(<$type>::from_id(id), Some(x));
                assert_eq!(to_value(x).unwrap(), json!(id));
                assert_eq!(from_value::<$type>(json!(id)).unwrap(), x);
                assert!(
                    x.label().is_ascii() && (1..=$label).contains(&x.label().len()),
                    "{}",
                    x.label()
                );
                assert!(!x.name().is_empty());
            }
            let labels: std::collections::BTreeSet<_> = <$type>::ALL.map(|x| x.label()).into();
            assert_eq!(labels.len(), <$type>::ALL.len(), "labels tell apart");
            assert_eq!(<$type>::from_id("unobtainium"), None);
            assert!(from_value::<$type>(json!("unobtainium")).is_err());
        }
    };
}
words!(materials, Material, 12);
words!(tools, Tool, 10);
words!(operations, Operation, 10);
words!(coolants, Coolant, 10);

#[test]
fn enough_materials_in_five_groups() {
    assert!(Material::ALL.len() >= 24);
    for group in [
        IsoGroup::P,
        IsoGroup::M,
        IsoGroup::K,
        IsoGroup::N,
        IsoGroup::S,
    ] {
        assert!(
            Material::ALL.iter().any(|m| m.group() == group),
            "{group:?}"
        );
    }
}

#[test]
fn diameter_words_fit() {
    for o in Operation::ALL {
        assert!(o.diameter_word().len() <= 6);
    }
    assert_eq!(Operation::Drilling.diameter_word(), "drill");
    assert_eq!(Operation::Boring.diameter_word(), "bore");
    assert_eq!(Operation::Parting.diameter_word(), "work");
    assert_eq!(Operation::Milling.diameter_word(), "cutter");
}

#[test]
fn stored_rows_obey_the_rule_and_are_unique() {
    for (i, r) in rows().enumerate() {
        let (low, high) = (r.range.0.m_min(), r.range.1.m_min());
        let v = r.ours.m_min();
        assert!(low <= high && v <= high && v >= 0.6 * low, "{r:?}");
        assert!(!r.why.is_empty(), "{r:?}");
        // A stored range was published somewhere; habits of the trade are factors only.
        assert_ne!(r.source.confidence, Confidence::CommonPractice, "{r:?}");
        assert!(!r.source.text.is_empty(), "{r:?}");
        let same = |s: &&_| {
            let s: &rimrate_core::trade::Row = s;
            (s.material, s.tool, s.operation) == (r.material, r.tool, r.operation)
        };
        assert_eq!(
            rows().position(|s| same(&s)),
            Some(i),
            "stored twice: {r:?}"
        );
        // Nothing is stored that is then refused.
        assert!(ours(r.material, r.tool, r.operation) == Some(v), "{r:?}");
    }
}

#[test]
fn every_combination_answers_or_says_why_not() {
    let (mut answers, mut refusals) = (0, 0);
    for (m, t, o, c, answer) in all() {
        match answer {
            Ok(s) => {
                answers += 1;
                let (low, high, v) = (s.range.0.m_min(), s.range.1.m_min(), s.ours.m_min());
                assert!(
                    v.is_finite() && v <= high * 1.0001 && v >= 0.599 * low,
                    "{m:?} {t:?} {o:?} {c:?}: {s:?}"
                );
                assert!((0.5..=500.0).contains(&v), "{m:?} {t:?} {o:?}: {v}");
                let by = s.how.factors.product();
                assert!(
                    (s.how.row.ours.m_min() * by - v).abs() < 1e-3,
                    "{m:?} {t:?} {o:?}"
                );
                // Asked for one thing and answered from another: a factor says so.
                let same = (s.how.row.material, s.how.row.tool, s.how.row.operation) == (m, t, o);
                assert!(
                    same || s.how.factors.iter().next().is_some(),
                    "{m:?} {t:?} {o:?}"
                );
            }
            Err(Refusal { reason }) => {
                refusals += 1;
                assert!(
                    reason.len() > 30 && !reason.contains("no published speed was found for this"),
                    "{m:?} {t:?} {o:?}: {reason}"
                );
            }
        }
    }
    assert!(
        answers > 1800 && refusals > 100,
        "{answers} answers, {refusals} refusals"
    );
}

#[test]
fn high_speed_steel_turns_everything() {
    for m in Material::ALL {
        assert!(
            ours(m, Tool::Hss, Operation::RoughTurning).is_some(),
            "{m:?}"
        );
    }
}

#[test]
fn better_tools_are_never_slower() {
    for m in Material::ALL {
        for o in Operation::ALL {
            let speeds: Vec<f32> = Tool::ALL
                .into_iter()
                .filter_map(|t| ours(m, t, o))
                .collect();
            assert!(speeds.is_sorted(), "{m:?} {o:?}: {speeds:?}");
        }
    }
}

#[test]
fn operations_stand_in_the_order_of_the_trade() {
    // Common practice, no source: finishing is the fastest turning, threads, parting and reaming are slow, tapping slowest.
    for m in Material::ALL {
        let at = |o| ours(m, Tool::Hss, o).unwrap();
        assert!(
            at(Operation::FinishTurning) > at(Operation::RoughTurning),
            "{m:?}"
        );
        for slower in [
            Operation::Boring,
            Operation::Parting,
            Operation::Threading,
            Operation::Reaming,
        ] {
            assert!(at(slower) < at(Operation::RoughTurning), "{m:?} {slower:?}");
        }
        assert!(
            at(Operation::Tapping) < at(Operation::Reaming)
                && at(Operation::Reaming) < at(Operation::Drilling)
        );
    }
}

#[test]
fn unknown_steel_is_the_slowest_steel_and_takes_high_speed_steel_only() {
    let steels: Vec<Material> = Material::ALL
        .into_iter()
        .filter(|m| matches!(m.group(), IsoGroup::P | IsoGroup::M))
        .collect();
    for t in [Tool::Hss, Tool::CobaltHss] {
        for o in Operation::ALL {
            let Some(unknown) = ours(Material::UnknownSteel, t, o) else {
                assert_eq!(o, Operation::Knurling);
                continue;
            };
            for &steel in &steels {
                assert!(
                    ours(steel, t, o).is_none_or(|v| unknown <= v),
                    "{steel:?} {t:?} {o:?}"
                );
            }
        }
    }
    for t in [Tool::Carbide, Tool::CoatedCarbide] {
        for o in Operation::ALL {
            let refusal = cutting_speed(Material::UnknownSteel, t, o, Coolant::Flood).unwrap_err();
            assert!(
                refusal.to_string().contains("high-speed steel only"),
                "{refusal}"
            );
        }
    }
}

#[test]
fn dry_costs_a_fifth_where_the_heat_goes_into_the_edge() {
    // Common practice, no source: high-speed steel loses it in all that runs hot, carbide in titanium and nickel, whose
    // published rows are wet and whose chips may burn.
    for (m, t, o, c, answer) in all() {
        if c != Coolant::Dry || m == Material::Magnesium {
            continue;
        }
        let (Ok(dry), Ok(flood)) = (answer, cutting_speed(m, t, o, Coolant::Flood)) else {
            continue;
        };
        let hot = matches!(m.group(), IsoGroup::P | IsoGroup::M | IsoGroup::S);
        let wet_rows = m.group() == IsoGroup::S;
        let want = if wet_rows || hot && matches!(t, Tool::Hss | Tool::CobaltHss) {
            0.8
        } else {
            1.0
        };
        assert!(
            (dry.ours.m_min() / flood.ours.m_min() - want).abs() < 1e-4,
            "{m:?} {t:?} {o:?}"
        );
        assert!(
            dry.how.factors.iter().any(|f| f.what.starts_with("dry")),
            "{m:?} {t:?} {o:?}"
        );
    }
}

#[test]
fn magnesium_is_cut_dry() {
    let refusal = cutting_speed(
        Material::Magnesium,
        Tool::Hss,
        Operation::RoughTurning,
        Coolant::Flood,
    )
    .unwrap_err();
    assert!(refusal.reason.contains("hydrogen"));
    assert!(
        cutting_speed(
            Material::Magnesium,
            Tool::Hss,
            Operation::RoughTurning,
            Coolant::Dry
        )
        .is_ok()
    );
}

#[test]
fn the_basis_prints_row_source_and_factors() {
    let s = cutting_speed(
        Material::LowAlloySteel,
        Tool::Hss,
        Operation::Reaming,
        Coolant::Dry,
    )
    .unwrap();
    let text = s.how.to_string();
    for part in [
        "drilling",
        "15.24 m/min to 21.34 m/min",
        "US Navy NAVEDTRA 14345",
        "(read)",
        "x 0.50 reaming",
        "TM 1-420",
        "x 0.80 dry",
        "common practice, no source",
    ] {
        assert!(text.contains(part), "{part} in\n{text}");
    }
    assert!((s.ours.m_min() - 16.0 * 0.5 * 0.8).abs() < 1e-4);
}

#[test]
fn some_refusals_name_their_reason() {
    let reason = |m, t, o| cutting_speed(m, t, o, Coolant::Flood).unwrap_err().reason;
    assert!(reason(Material::MildSteel, Tool::Carbide, Operation::Knurling).contains("rolls"));
    assert!(
        reason(Material::MildSteel, Tool::CoatedCarbide, Operation::Tapping).contains("reverses")
    );
    assert!(reason(Material::GreyCastIron, Tool::Hss, Operation::Knurling).contains("brittle"));
    assert!(
        reason(
            Material::Aluminium,
            Tool::CoatedCarbide,
            Operation::RoughTurning
        )
        .contains("honed edge")
    );
}
