//! The cut: life, load, threads, bars, feeds, mills, jaws, dangerous materials, and what to move. Worked out by hand beside each.

use rimrate_core::advice::{Advice, Bound, Caution, Kind, Reason, advise};
use rimrate_core::machine::Machine;
use rimrate_core::physics::cutting_speed::surface_speed_m_min;
use rimrate_core::physics::power;
use rimrate_core::setup::{
    Bar, Details, HalfNut, InsertBox, Jaws, Life, Ra, Setup, Support, Thread,
};
use rimrate_core::trade::{Coolant, Material, Operation, Tool};
use rimrate_core::units::{Length, SurfaceSpeed};
use rimrate_sim::profile;
use rimrate_tests::{bar, machine, rpm};

fn mm(x: f32) -> Length {
    Length::from_mm(x).unwrap_or_else(|e| panic!("{x}: {e}"))
}

fn at(setup: Setup, name: &str) -> Advice {
    advise(&setup, &machine(name))
}

fn of(advice: &Advice, reason: Reason) -> Option<Bound> {
    advice.bounds.iter().copied().find(|b| b.reason == reason)
}

#[test]
fn the_insert_box_is_taken_for_its_15_minutes_and_lengthened_by_the_largest_exponent() {
    let boxed = |minutes: Option<f32>| Setup {
        tool: Tool::CoatedCarbide,
        details: Details {
            insert_box: SurfaceSpeed::from_m_min(250.0).ok().map(|speed| InsertBox {
                speed,
                life: Life::OF_BOX,
            }),
            life: minutes.map(|t| Life::new("life", t).unwrap()),
            ..Details::NONE
        },
        ..bar(50.0)
    };
    let v = |advice: &Advice| advice.cut.edge.unwrap().for_wanted.unwrap();
    // 250 (15 / 120)^0.6, by hand.
    assert!((v(&at(boxed(Some(120.0)), "geared-lathe")) - 71.79).abs() < 0.01);
    // The life for which it is stated, and no wish at all, leave the box's speed.
    assert_eq!(v(&at(boxed(Some(15.0)), "geared-lathe")), 250.0);
    let plain = at(boxed(None), "geared-lathe");
    assert_eq!(plain.surface_speed().unwrap().m_min(), 250.0);
    assert_eq!(of(&plain, Reason::EdgeLife), None);
    // 240 min ask for 47.4 m/min, below the 50 at which carbide still cuts cleanly: held there, and said.
    let long = at(boxed(Some(240.0)), "geared-lathe");
    assert_eq!(v(&long), 50.0);
    assert!(long.cautions.contains(&Caution::LifeNotReached));
}

#[test]
fn a_life_shorter_than_stated_buys_no_speed() {
    let setup = Setup {
        details: Details {
            life: Life::new("life", 15.0).ok(),
            ..Details::NONE
        },
        ..bar(25.0)
    };
    let advice = at(setup, "geared-lathe");
    assert_eq!(
        of(&advice, Reason::EdgeLife).unwrap().at,
        advice.window.best()
    );
    assert_eq!(advice.window.high.reason, Reason::CuttingSpeed);
}

#[test]
fn the_motor_is_weighed_in_its_own_way() {
    // 1.1 kW from the mains, 0.75 of it at the cut: 0.825 kW.
    let deep = |mm_deep: f32| Setup {
        details: Details {
            depth: Some(mm(mm_deep)),
            ..Details::NONE
        },
        ..bar(25.0)
    };
    let advice = at(deep(5.0), "geared-lathe");
    let (load, bound) = (
        advice.cut.load.unwrap(),
        of(&advice, Reason::Power).unwrap(),
    );
    assert!((load.power_kw(bound.at) - 0.825).abs() < 1e-4);
    assert_eq!(bound.kind, Kind::Soft);
    // The depth that pulls is what the motor gives where all else has its way: the step of the shallow cut.
    let shallow = at(deep(0.1), "geared-lathe");
    let step = shallow.pick.setting().unwrap();
    let limit = advice.cut.depth_limit_mm.unwrap();
    assert_eq!(advice.cut.depth_limit_mm, shallow.cut.depth_limit_mm);
    let torque = advice.cut.load.unwrap().torque_nm * limit / 5.0;
    assert!((power::of_torque(torque, step.rpm.get()) - 0.825).abs() < 1e-3);
    assert_eq!(at(deep(limit * 0.99), "geared-lathe").pick, shallow.pick);
    // On the inverter half the speed of the base is half the power: the lower belt pulls what the upper does not.
    let lathe = machine("variable-lathe");
    let (low, high) = (rpm(300.0), rpm(300.0));
    let (low, high) = (
        lathe.torque_at("belt low", low).unwrap(),
        lathe.torque_at("belt high", high).unwrap(),
    );
    assert!((low / high - 1100.0 / 450.0).abs() < 1e-3);
    let torque = high * 1.5;
    assert_eq!(
        lathe.torque_limit(torque),
        None,
        "power holds it below what the range reaches"
    );
    assert!(
        lathe.torque_limit(low * 1.5).unwrap() < rpm(60.0),
        "nothing pulls it"
    );
}

/// Two gears on a motor of two speeds, 1.5 and 0.75 kW, all of it at the cut.
fn two_speed() -> Machine {
    let steps: String = [(100, 0.75), (200, 1.5), (400, 0.75), (800, 1.5)]
        .iter()
        .map(|(n, kw)| format!("[[step]]\nlabel = \"{n}\"\nrpm = {n}\nkw = {kw}\n"))
        .collect();
    let text = format!(
        "name = \"two\"\nkind = \"lathe\"\n[motor]\nkind = \"two-speed\"\nkw = 1.5\nefficiency = 1.0\n\
         [sensor]\npulses = 1\n[[holder]]\nkind = \"three-jaw\"\nrated_rpm = 3000\n{steps}"
    );
    profile::parse(&text, "two").unwrap_or_else(|e| panic!("{e}"))
}

#[test]
fn the_fastest_step_that_pulls_is_picked_on_a_motor_of_two_speeds() {
    let machine = two_speed();
    // 9549 P / n: 71.6 N m at 100 and at 200 rev/min, 17.9 N m at 400 and 800.
    for (share, step) in [(0.24, "800"), (0.9, "200"), (0.98, "200")] {
        let deep = |mm_deep: f32| Setup {
            tool: Tool::CoatedCarbide,
            details: Details {
                depth: Some(mm(mm_deep)),
                ..Details::NONE
            },
            ..bar(50.0)
        };
        let one = advise(&deep(1.0), &machine).cut.load.unwrap().torque_nm;
        let advice = advise(&deep(share * 71.6 / one), &machine);
        let set = advice.pick.setting().unwrap_or_else(|| panic!("{share}"));
        assert_eq!(set.label, step, "{share}");
    }
}

#[test]
fn where_even_the_slowest_step_has_too_little_power_less_depth_is_the_answer() {
    // 50 mm deep at 200 mm: the slowest step of 18 rev/min is not too fast for the edge, but for the motor.
    let deep = Setup {
        details: Details {
            depth: Some(mm(50.0)),
            ..Details::NONE
        },
        ..bar(200.0)
    };
    let advice = at(deep, "geared-lathe");
    assert_eq!(advice.window.high.reason, Reason::Power);
    assert!(advice.nothing_pulls());
    let says = |c: &Caution| matches!(c, Caution::NothingPulls { depth_mm: Some(d) } if *d < 50.0);
    assert!(advice.cautions.iter().any(says), "{:?}", advice.cautions);
    assert!(!advice.cautions.contains(&Caution::SlowestTooFast));
}

#[test]
fn threads_are_held_by_the_slower_case_unless_it_is_said() {
    let thread = |half_nut, name: &str| {
        let setup = Setup {
            operation: Operation::Threading,
            details: Details {
                thread: Some(Thread {
                    lead: mm(1.75),
                    runout: Some(mm(6.0)),
                    half_nut,
                }),
                ..Details::NONE
            },
            ..bar(12.0)
        };
        let advice = at(setup, name);
        (
            of(&advice, Reason::ThreadRunout).map(|b| b.at.get()),
            advice,
        )
    };
    let near = |n: Option<f32>, want: f32| (n.unwrap() - want).abs() < 0.05;
    // 60 x 6 / 1.75 = 205.7; 120 x 6 / (1.75 x 1.5) = 274.3.
    assert!(near(thread(None, "geared-lathe").0, 205.71));
    assert!(near(
        thread(Some(HalfNut::Opened), "geared-lathe").0,
        205.71
    ));
    assert!(near(
        thread(Some(HalfNut::Closed), "geared-lathe").0,
        274.29
    ));
    // Away from the shoulder, with cam locks, nothing holds; a screwed-on chuck takes that way back.
    assert_eq!(thread(Some(HalfNut::Away), "geared-lathe").0, None);
    let (n, advice) = thread(Some(HalfNut::Away), "variable-lathe");
    assert!(near(n, 205.71));
    assert!(advice.cautions.contains(&Caution::ChuckUnscrews));
    assert_eq!(advice.cut.feed.unwrap().per_rev, Some(1.75));
    // A profile without a timed stop says that it was assumed.
    let (_, press) = thread(None, "drill-press");
    assert!(
        press
            .cautions
            .contains(&Caution::StopNotTimed { taken_s: 3.0 })
    );
}

#[test]
fn slender_bars_are_told_apart_by_their_support() {
    let out = |ratio: f32, support| {
        let setup = Setup {
            details: Details {
                bar: Some(Bar {
                    length: mm(20.0 * ratio),
                    support,
                    stock: None,
                    bore: None,
                }),
                ..Details::NONE
            },
            ..bar(20.0)
        };
        let advice = at(setup, "geared-lathe");
        let warned = advice
            .cautions
            .iter()
            .any(|c| matches!(c, Caution::Slender { .. }));
        (warned, of(&advice, Reason::StickOut).unwrap())
    };
    for (support, limit) in [
        (Support::Free, 4.0),
        (Support::Tailstock, 10.0),
        (Support::Behind, 10.0),
    ] {
        assert!(
            !out(limit * 0.999, support).0 && out(limit * 1.001, support).0,
            "{support:?}"
        );
    }
    assert_eq!(out(5.0, Support::Free).1.kind, Kind::Hard);
    // A tailstock lifts the bending speed by (3.9266 / 1.8751)^2.
    let (free, held) = (
        out(5.0, Support::Free).1.at.get(),
        out(5.0, Support::Tailstock).1.at.get(),
    );
    assert!((held / free - 4.385).abs() < 0.005);
    // A tube of thin wall is stiffer for its weight than a solid bar, by up to sqrt(2).
    let tube = |bore| {
        let setup = Setup {
            details: Details {
                bar: Some(Bar {
                    length: mm(200.0),
                    support: Support::Free,
                    stock: None,
                    bore,
                }),
                ..Details::NONE
            },
            ..bar(20.0)
        };
        of(&at(setup, "geared-lathe"), Reason::StickOut)
            .unwrap()
            .at
            .get()
    };
    assert!((tube(Some(mm(19.9))) / tube(None) - 1.4107).abs() < 0.001);
}

#[test]
fn feeds_follow_the_gearbox_the_finish_and_the_drill() {
    let feed = |setup: Setup, name: &str| at(setup, name).cut.feed.unwrap();
    // 0.374 mm of the table for 25 mm stock; the next lower of the gearbox is 0.315.
    let plain = feed(bar(25.0), "geared-lathe");
    assert_eq!((plain.per_rev, plain.by_hand), (Some(0.315), false));
    // The bench lathe has none: by hand.
    assert!(feed(bar(25.0), "variable-lathe").by_hand);
    // Ra 1.6 um at 0.8 mm: f = sqrt(0.0016 x 0.8 x 18 sqrt 3) = 0.1998 mm, next lower 0.16.
    let fine = Setup {
        operation: Operation::FinishTurning,
        details: Details {
            ra: Ra::parse("1.6 um").ok(),
            nose_radius: Some(mm(0.8)),
            ..Details::NONE
        },
        ..bar(50.0)
    };
    assert_eq!(feed(fine, "geared-lathe").per_rev, Some(0.16));
    assert!((feed(fine, "variable-lathe").per_rev.unwrap() - 0.19976).abs() < 1e-4);
    let finish = at(fine, "geared-lathe").cut.finish.unwrap();
    assert!(finish.ra_um <= 1.6 && !finish.nose_assumed);
    // Drills: 0.025 mm at 1.5 mm, 0.3 mm at 12.5 mm (Kalpakjian & Schmid, table 23.11), pecked beyond three diameters.
    for (d, f) in [
        (1.5, 0.025),
        (12.5, 0.3),
        (7.0, 0.1625),
        (25.0, 0.3),
        (0.75, 0.0125),
    ] {
        let drill = Setup {
            operation: Operation::Drilling,
            details: Details {
                length: Some(mm(3.0 * d + 1.0)),
                ..Details::NONE
            },
            ..bar(d)
        };
        assert!(
            (feed(drill, "drill-press").per_rev.unwrap() - f).abs() < 1e-5,
            "{d} mm"
        );
        let pecks =
            |c: &Caution| matches!(c, Caution::Peck { first_mm, .. } if *first_mm == 3.0 * d);
        assert!(
            at(drill, "drill-press").cautions.iter().any(pecks),
            "{d} mm"
        );
    }
}

#[test]
fn milling_counts_its_teeth_and_thickens_thin_chips() {
    let mill = |width: f32, teeth: Option<u8>| Setup {
        operation: Operation::Milling,
        details: Details {
            width: Some(mm(width)),
            depth: Some(mm(2.0)),
            teeth: teeth.and_then(std::num::NonZeroU8::new),
            ..Details::NONE
        },
        ..bar(10.0)
    };
    let wide = at(mill(5.0, Some(4)), "geared-lathe");
    let feed = wide.cut.feed.unwrap();
    assert_eq!((feed.per_tooth, feed.per_rev), (Some(0.05), Some(0.2)));
    // A tenth of the diameter: 2 sqrt(0.1 x 0.9) = 0.6, so the feed rises to 1/0.6.
    let narrow = at(mill(1.0, Some(4)), "geared-lathe").cut.feed.unwrap();
    assert!((narrow.per_tooth.unwrap() - 0.05 / 0.6).abs() < 1e-4);
    // Removal and load follow: 5 x 2 x 0.2 mm3 a turn.
    let n = wide.pick.setting().unwrap().rpm.get();
    assert!((wide.cut.removal_cm3_min.unwrap() - 2.0 * n / 1000.0).abs() < 1e-3);
    assert!(wide.cut.load.is_some());
    let uncounted = at(mill(5.0, None), "geared-lathe");
    assert!(uncounted.cautions.contains(&Caution::CountTeeth));
    assert_eq!((uncounted.cut.load, uncounted.cut.time_min), (None, None));
}

#[test]
fn jaws_lose_a_third_of_their_grip_and_no_more() {
    // 3 jaws of 0.8 kg at 60 mm holding with 15 kN: 5 kN are lost at 1779 rpm.
    let setup = Setup {
        details: Details {
            jaws: Jaws::parse("3", "0.8 kg", "60 mm", "15 kN").ok(),
            ..Details::NONE
        },
        ..bar(25.0)
    };
    let bound = of(&at(setup, "geared-lathe"), Reason::JawGrip).unwrap();
    // n = sqrt(5000 / (3 x 0.8 x 0.06)) x 60 / (2 pi).
    assert!((bound.at.get() - 1779.4).abs() < 0.5, "{}", bound.at);
    assert_eq!(bound.kind, Kind::Hard);
    // A collet has no jaws to lose.
    let collet = Setup { holder: 2, ..setup };
    assert_eq!(of(&at(collet, "geared-lathe"), Reason::JawGrip), None);
}

#[test]
fn dangerous_materials_say_so_in_the_trades_words() {
    for (material, words) in [
        (Material::Magnesium, &["burn", "No water", "class D"][..]),
        (Material::TitaniumAlloy, &["burn", "class D"]),
        (Material::TitaniumPure, &["burn"]),
        (Material::Copper, &["beryllium", "dust"]),
        (Material::Bronze, &["beryllium"]),
        (Material::GreyCastIron, &["Dust", "mask"]),
        (Material::Thermoset, &["Dust"]),
        (Material::Thermoplastic, &["fumes", "PVC"]),
    ] {
        let setup = Setup {
            material,
            coolant: Coolant::Dry,
            ..bar(25.0)
        };
        let advice = at(setup, "geared-lathe");
        let caution = Caution::Material(material);
        assert!(advice.cautions.contains(&caution), "{material}");
        for word in words {
            assert!(caution.to_string().contains(word), "{material}: {word}");
        }
    }
}

#[test]
fn the_step_it_is_in_is_named_with_what_to_move() {
    use rimrate_core::advice::Shift;
    let lathe = machine("geared-lathe");
    let advice = advise(&bar(25.0), &lathe);
    let words =
        |n: f32, room: usize| Shift::of(&lathe, &advice, rpm(n)).map(|s| s.words(room).to_string());
    // 280 rpm is right: A-1, back gear out.
    assert_eq!(words(280.0, 32), None);
    assert_eq!(words(262.0, 32), None, "loaded, still that step");
    assert_eq!(words(446.0, 32).unwrap(), "stop; A-2 to A-1");
    assert_eq!(
        words(18.0, 40).unwrap(),
        "stop; back gear in to back gear out"
    );
    assert_eq!(
        words(180.0, 60).unwrap(),
        "stop; B-3 to A-1, back gear in to back gear out"
    );
    // Where the moves do not fit, the whole label; a speed between the steps names none to come from.
    assert_eq!(words(180.0, 32).unwrap(), "stop; set A-1, back gear out");
    assert_eq!(words(330.0, 32).unwrap(), "stop; set A-1, back gear out");
    // A dial is turned, not shifted.
    let bench = machine("variable-lathe");
    let advice = advise(&bar(25.0), &bench);
    let shift = Shift::of(&bench, &advice, rpm(200.0)).unwrap();
    assert_eq!(shift.words(32).as_str(), "dial to 349, belt high");
    let seen = |n: f32| lathe.step_at(rpm(n)).map(|s| s.rpm.get());
    assert_eq!(
        (
            seen(0.0),
            seen(19.0),
            seen(20.0),
            seen(2790.0),
            seen(3100.0)
        ),
        (None, Some(18.0), None, Some(2800.0), None)
    );
}

#[test]
fn the_edge_account_adds_up_and_says_what_it_counted() {
    use rimrate_core::edge_account::{Counted, EdgeAccount};
    use rimrate_core::time::Duration;
    let edge = at(bar(25.0), "geared-lathe").cut.edge.unwrap();
    let look = Duration::from_millis(20);
    let run = |v: f32, seconds: u32, cutting| {
        let mut account = EdgeAccount::default();
        (0..seconds * 50).for_each(|_| account.add(look, v, &edge, cutting));
        account
    };
    let v1 = edge.stated.m_min();
    // 60 min at the stated speed use up one edge, to a thousandth after 180,000 looks.
    let whole = run(v1, 3600, None);
    assert!((whole.used() - 1.0).abs() < 1e-3, "{}", whole.used());
    assert_eq!(
        (whole.counted(), whole.percent() / 10),
        (Counted::Turning, 9 + u32::from(whole.percent() >= 100))
    );
    // A tenth faster: 1.1^(1/0.08) = 3.29 times as fast, the smallest exponent; a tenth slower only 1.69 times as slow.
    assert!((run(1.1 * v1, 600, None).used() / run(v1, 600, None).used() - 3.292).abs() < 0.01);
    assert!((run(v1, 600, None).used() / run(0.9 * v1, 600, None).used() - 1.694).abs() < 0.01);
    // Where somebody knows, only the cut counts; once not known, it is turning.
    let mut known = run(v1, 10, Some(true));
    assert_eq!(known.counted(), Counted::Cutting);
    let before = known.used();
    known.add(look, v1, &edge, Some(false));
    assert_eq!(known.used(), before);
    known.add(look, v1, &edge, None);
    assert_eq!(known.counted(), Counted::Turning);
    known.renew();
    assert_eq!(known, EdgeAccount::default());
    // A long silence is not counted, and nothing overflows.
    known.add(Duration::from_secs(100_000), v1, &edge, None);
    assert!(known.used() < 0.001);
    known.add(look, f32::NAN, &edge, None);
    (0..2000).for_each(|_| known.add(look, 1e4, &edge, None));
    assert!(known.used() <= 1000.0 && known.percent() <= 100_000);
}

#[test]
fn speeds_and_feeds_of_the_whole_table_have_a_surface() {
    // Every answer of every machine has a cutting speed behind it that the edge meets at the advised setting or above it.
    for material in Material::ALL {
        for operation in Operation::ALL {
            let setup = Setup {
                material,
                operation,
                coolant: Coolant::Dry,
                ..bar(20.0)
            };
            let advice = at(setup, "geared-lathe");
            if let (Some(set), Some(v)) = (advice.pick.setting(), advice.surface_speed()) {
                let met = surface_speed_m_min(set.rpm, setup.diameter);
                assert!(
                    met <= v.m_min() * 1.001,
                    "{material} {operation}: {met} of {v}"
                );
            }
            let threads = operation.is_threading();
            assert_eq!(
                advice.cut.feed.is_none(),
                threads,
                "{operation}: only a thread waits for its lead"
            );
        }
    }
}

#[test]
fn the_box_counts_the_edge_shows_it_on_the_why_page_and_starts_anew_after_a_hold() {
    use rimrate_core::edge_account::Counted;
    use rimrate_core::instrument::Event;
    use rimrate_core::panel::{Knob, Page};
    use rimrate_tests::Clocked;
    let mut clocked = Clocked::new(machine("geared-lathe"), Some(bar(25.0)));
    let press = |clocked: &mut Clocked, seconds: f64| {
        clocked.event(Event::Press(Knob::Right));
        clocked.rest(seconds);
        clocked.event(Event::Release(Knob::Right));
    };
    press(&mut clocked, 0.1);
    clocked.rest(20.0);
    assert_eq!(
        clocked.instrument.view().edge.counted(),
        Counted::Nothing,
        "nothing turned"
    );
    // Two minutes in the step of 280 rpm, less the first turns, which the tacho needs.
    let life = clocked.instrument.view().advice.cut.edge.unwrap();
    let minutes = life.expected_min(std::f32::consts::PI * 25.0 * 280.0 / 1000.0);
    // (27.4 / 21.99)^(1 / 0.2) = 3.00 times the 60 min of the table.
    assert!((minutes - 180.0).abs() < 1.0, "{minutes}");
    clocked.spin(280.0, 120.0);
    let edge = clocked.instrument.view().edge;
    let want = 2.0 / minutes;
    assert!(
        (0.98..1.001).contains(&(edge.used() / want)),
        "{} of {want}",
        edge.used()
    );
    assert_eq!(edge.counted(), Counted::Turning);
    // Standing still uses nothing up.
    clocked.rest(60.0);
    let rested = clocked.instrument.view().edge;
    assert!((rested.used() - edge.used()) / want < 0.02);
    press(&mut clocked, 0.1);
    assert_eq!(clocked.instrument.view().page, Page::Why(0));
    press(&mut clocked, 1.0);
    let view = clocked.instrument.view();
    assert_eq!(
        (view.page, view.edge.percent(), view.edge.counted()),
        (Page::Why(0), 0, Counted::Nothing)
    );
}
