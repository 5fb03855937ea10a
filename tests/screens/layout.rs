//! Nothing on a page lies outside it, over something else, or cut off: over many scenes, whatever they show.

use super::*;

/// Many scenes: every demo machine, every material, operation and holder, and what else changes the page.
fn many() -> impl Iterator<Item = Scene> {
    let machines: Vec<Machine> = machines().chain([wordy()]).collect();
    machines.into_iter().flat_map(|machine| {
        let holders = machine.holders().len() as u8;
        Material::ALL.into_iter().flat_map(move |material| {
            let machine = machine.clone();
            Operation::ALL.into_iter().flat_map(move |operation| {
                let machine = machine.clone();
                (0..holders).map(move |holder| Scene {
                    setup: Setup {
                        material,
                        operation,
                        holder,
                        // A fraction of every length that the scale of either unit has.
                        diameter: Diameter::nearest(if operation == Operation::Milling {
                            1_000.0
                        } else {
                            1.984_375
                        }),
                        ..bar(25.0)
                    },
                    machine: machine.clone(),
                    ..Scene::new()
                })
            })
        })
    })
}

#[test]
fn nothing_is_drawn_outside_or_over_something_else() {
    let verdicts = Verdict::ALL;
    let speeds = [0.0, 7.0, 45.4, 279.0, 2240.0, 9999.0, 12_345.0, 1_000_000.0];
    let loads = [None].into_iter().chain(Mark::ALL.map(Some));
    let loads: Vec<_> = loads.collect();
    let mut seen = 0;
    let all = many().chain(scenes().into_iter().map(|(_, s)| s));
    for (i, scene) in all.enumerate() {
        let scene = scene
            .clone()
            .at(speeds[i % speeds.len()], verdicts[i % verdicts.len()])
            .loaded(loads[i % loads.len()]);
        let ink = Ink::of(&scene);
        assert_eq!(ink.outside, [], "{:?}", scene.setup);
        for (at, &times) in ink.lit.iter().enumerate() {
            // The scale's ticks and pointer stand on its line.
            let (x, y) = (at as u32 % WIDTH, at as u32 / WIDTH);
            let on_scale = scene.page == Page::Run && (45..=47).contains(&y);
            assert!(
                times <= 1 || on_scale,
                "({x}, {y}) was lit {times} times\n{}",
                scene.frame().to_text()
            );
        }
        seen += 1;
    }
    assert!(seen > 5_000);
}

/// Rows and columns that must stay dark, so that the parts stand apart: head, digits, verdict, scale, and two lines.
#[test]
fn the_parts_of_the_run_page_stand_apart() {
    for scene in many().step_by(7) {
        for verdict in Verdict::ALL {
            let scene = scene
                .clone()
                .at(888.0, verdict)
                .loaded(Some(Mark::Stalling));
            let frame = scene.frame();
            let dark = |y: u32, x: std::ops::Range<u32>| x.into_iter().all(|x| !frame.lit(x, y));
            let refused = matches!(scene.advice().pick, Pick::NoBasis(_));
            let rows: &[u32] = if refused {
                &[7, 44, 45]
            } else {
                &[7, 44, 48, 56]
            };
            for &y in rows {
                assert!(dark(y, 0..WIDTH), "row {y}\n{}", frame.to_text());
            }
            for y in 8..44 {
                assert!(dark(y, 81..85), "row {y}\n{}", frame.to_text());
            }
        }
    }
}

#[test]
fn the_digits_are_36_pixels_high_for_every_speed() {
    for n in [8.0, 88.0, 888.0, 8888.0, 88_888.0, 888_888.0] {
        let frame = Scene::new().at(n, Verdict::Right).frame();
        let lit = |y: u32| (0..82).any(|x| frame.lit(x, y));
        assert_eq!((8..44).filter(|&y| lit(y)).count(), 36, "{n}");
        assert!(!lit(7) && !lit(44), "{n}");
    }
}

#[test]
fn no_line_is_cut_on_any_demo_machine() {
    let demo = |s: &Scene| s.machine.name() != wordy().name();
    for scene in many().filter(demo) {
        let (frame, advice) = (scene.frame(), scene.advice());
        let shown = |words: &str| assert!(frame.shows(words), "{words}\n{}", frame.to_text());
        let word = scene.setup.operation.diameter_word();
        let diameter = scene.setup.diameter.length().display(scene.machine.units());
        shown(scene.setup.material.label());
        shown(&format!("{word} {diameter}"));
        match &advice.pick {
            Pick::Set(setting) => {
                shown(&setting.label);
                shown(&format!("set {:.0}", setting.rpm.get()));
            }
            Pick::TooFast { over_percent, .. } => {
                shown(&format!("slowest {} too fast", Excess(*over_percent)))
            }
            Pick::NeedsCap => shown("holder unrated: set a cap"),
            // Reasons may be longer than the screen.
            Pick::NoBasis(_) => continue,
        }
        let held_by = advice.window.high.reason.short();
        shown(&format!(
            "best {:.0}: {held_by}",
            advice.window.best().get()
        ));
    }
}

#[test]
fn no_choice_is_cut_on_any_demo_machine() {
    for machine in machines() {
        for holder in 0..machine.holders().len() as u8 {
            for operation in Operation::ALL {
                for tool in Tool::ALL {
                    let scene = Scene {
                        setup: Setup {
                            holder,
                            operation,
                            tool,
                            cap: Some(rpm(10_000.0)),
                            ..bar(25.0)
                        },
                        machine: machine.clone(),
                        page: Page::Choose(Field::CHOOSE[usize::from(holder) % 6]),
                        ..Scene::new()
                    };
                    let frame = scene.frame();
                    for field in Field::CHOOSE {
                        let value = field.value(&scene.setup, &scene.machine).to_string();
                        let label = field.label();
                        assert!(frame.shows(&value), "{value}\n{}", frame.to_text());
                        assert!(frame.shows(label), "{label}\n{}", frame.to_text());
                    }
                }
            }
        }
    }
}

#[test]
fn a_label_of_the_full_length_fits() {
    let scene = Scene {
        machine: wordy(),
        ..Scene::new()
    };
    let label = scene.advice().pick.setting().unwrap().label.clone();
    assert_eq!(label.len(), 32);
    assert!(scene.frame().shows(&label), "{}", scene.frame().to_text());
}
