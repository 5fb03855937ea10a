//! The pages as a person sees them. Golden pictures are text, two rows of pixels in a row of half blocks, so that a
//! change can be read in a diff; after a wanted change accept them with `INSTA_UPDATE=always`.

#[path = "screens/counting.rs"]
mod counting;
#[path = "screens/layout.rs"]
mod layout;

use std::convert::Infallible;

use embedded_graphics::pixelcolor::BinaryColor;
use embedded_graphics::prelude::*;
use rimrate_core::advice::{Advice, Excess, Pick, advise};
use rimrate_core::edge_account::EdgeAccount;
use rimrate_core::load::Mark;
use rimrate_core::machine::{
    HolderKind, HolderSpec, Machine, MachineKind, MachineSpec, SensorSpec, StepSpec,
};
use rimrate_core::panel::{Bench, Field, Knob, Notice, Page, Panel};
use rimrate_core::screen::{self, HEIGHT, View, WIDTH};
use rimrate_core::sensor_setup::SensorSetup;
use rimrate_core::setup::{self, Details, Diameter, Life, Setup, Support};
use rimrate_core::tacho::{Health, Reading, Signal};
use rimrate_core::time::Duration;
use rimrate_core::trade::{Material, Operation, Tool, cutting_speed};
use rimrate_core::units::{Length, UnitSystem};
use rimrate_core::verdict::Verdict;
use rimrate_sim::frame::Frame;
use rimrate_tests::{at, bar, machine, machines, rpm, turning};

/// What a page shows.
#[derive(Clone)]
struct Scene {
    setup: Setup,
    machine: Machine,
    reading: Reading,
    verdict: Verdict,
    page: Page,
    notice: Option<Notice>,
    edge: EdgeAccount,
    load: Option<Mark>,
    sensor: Health,
    sensor_setup: SensorSetup,
}

impl Scene {
    /// A 25 mm bar on the geared lathe, at 279 rpm, right.
    fn new() -> Self {
        Scene {
            setup: bar(25.0),
            machine: machine("geared-lathe"),
            reading: turning(279.0),
            verdict: Verdict::Right,
            page: Page::Run,
            notice: None,
            edge: EdgeAccount::default(),
            sensor: counting::health(2),
            sensor_setup: SensorSetup::default(),
            load: None,
        }
    }

    fn at(self, n: f32, verdict: Verdict) -> Self {
        Scene {
            reading: turning(n),
            verdict,
            ..self
        }
    }

    fn loaded(self, load: Option<Mark>) -> Self {
        Scene { load, ..self }
    }

    fn without_speed(self, signal: Signal, verdict: Verdict) -> Self {
        let reading = Reading {
            signal,
            speed: None,
            quick: None,
            ..Reading::NOTHING
        };
        Scene {
            reading,
            verdict,
            ..self
        }
    }

    /// A speed that is read, whatever may be said of it.
    fn reads(mut self, n: f32) -> Self {
        self.reading.speed = Some(rpm(n));
        self
    }

    /// The right knob, or the left one, turned while the spindle runs.
    fn turned(mut self, knob: Knob, detents: i8) -> Self {
        let mut panel = Panel::new(true);
        let advice = self.advice();
        let bench = Bench {
            setup: &mut self.setup,
            machine: &self.machine,
            advice: &advice,
            running: true,
            sensor: &mut self.sensor_setup,
        };
        panel.turn(at(1.0), knob, detents, bench);
        self.notice = panel.notice().cloned();
        assert!(self.notice.is_some());
        self
    }

    fn advice(&self) -> Advice {
        advise(&self.setup, &self.machine)
    }

    fn draw<D: DrawTarget<Color = BinaryColor>>(&self, target: &mut D) -> Result<(), D::Error> {
        let advice = self.advice();
        let view = View {
            setup: &self.setup,
            machine: &self.machine,
            advice: &advice,
            reading: &self.reading,
            verdict: self.verdict,
            page: self.page,
            notice: self.notice.as_ref(),
            edge: self.edge,
            load: self.load,
            sensor: self.sensor,
            sensor_setup: &self.sensor_setup,
        };
        screen::draw(&view, target)
    }

    fn frame(&self) -> Frame {
        let mut frame = Frame::new();
        let Ok(()) = self.draw(&mut frame);
        frame
    }
}

/// A lathe whose every text is as long as a profile allows.
fn wordy() -> Machine {
    let spec = MachineSpec {
        name: "A machine with as long a name as can".parse().unwrap(),
        kind: MachineKind::Lathe,
        units: UnitSystem::Inch,
        top_speed_rpm: None,
        brake_rpm_per_s: None,
        slowest_rpm: None,
        motor: None,
        feeds_mm: Default::default(),
        half_nut_stop_s: None,
        spindle_nose: None,
        sensor: SensorSpec { pulses: 2 },
        steps: [(100.0, "1"), (12_345.0, "2")]
            .into_iter()
            .map(|(rpm, end)| StepSpec {
                label: format!("{:<31}{end}", "C-3, back gear out, motor high,")
                    .parse()
                    .unwrap(),
                rpm,
                ..StepSpec::default()
            })
            .collect(),
        ranges: Default::default(),
        holders: [HolderSpec {
            kind: HolderKind::BetweenCentres,
            name: Some("Mandrel W, 17 characters".parse().unwrap()),
            rated_rpm: Some(99_999.0),
        }]
        .into_iter()
        .collect(),
    };
    Machine::new(spec).unwrap_or_else(|e| panic!("{e}"))
}

/// Every golden picture with its name.
fn scenes() -> Vec<(&'static str, Scene)> {
    let lathe = Scene::new;
    let faceplate = || Scene {
        setup: Setup {
            holder: 3,
            ..bar(120.0)
        },
        ..lathe()
    };
    let refused = || Scene {
        setup: Setup {
            material: Material::UnknownSteel,
            tool: Tool::Carbide,
            ..bar(25.0)
        },
        ..lathe()
    };
    let drill = || Scene {
        setup: Setup {
            material: Material::Brass,
            operation: Operation::Drilling,
            diameter: Diameter::parse("3/8 in").unwrap(),
            ..bar(25.0)
        },
        machine: machine("drill-press"),
        ..lathe()
    };
    let fast_drill = || Scene {
        setup: Setup {
            material: Material::TitaniumAlloy,
            operation: Operation::Drilling,
            diameter: Diameter::parse("2 in").unwrap(),
            ..bar(25.0)
        },
        machine: machine("drill-press"),
        ..lathe()
    };
    let long = || Scene {
        setup: Setup {
            material: Material::StainlessPrecipitation,
            tool: Tool::CoatedCarbide,
            operation: Operation::Milling,
            diameter: Diameter::parse("1 63/64 in").unwrap(),
            ..bar(25.0)
        },
        machine: wordy(),
        ..lathe()
    };
    let capped = || Scene {
        setup: Setup {
            cap: Some(rpm(300.0)),
            ..bar(25.0)
        },
        ..lathe()
    };
    let choose = |field, setup: Setup| Scene {
        setup,
        page: Page::Choose(field),
        ..lathe()
    };
    let mm = |x: f32| Length::from_mm(x).ok();
    // A deep cut in alloy steel under carbide, with a wanted life, a cap and a bar that sticks out.
    let heavy = Setup {
        material: Material::LowAlloySteel,
        tool: Tool::Carbide,
        cap: Some(rpm(1500.0)),
        details: Details {
            depth: mm(4.0),
            life: Life::new("life", 120.0).ok(),
            bar: mm(150.0).map(|length| setup::Bar {
                length,
                support: Support::Free,
                stock: None,
                bore: None,
            }),
            ..Details::NONE
        },
        ..bar(50.0)
    };
    let thread = Setup {
        operation: Operation::Threading,
        details: Details {
            thread: mm(1.75).map(|lead| setup::Thread {
                lead,
                runout: mm(6.0),
                half_nut: None,
            }),
            ..Details::NONE
        },
        ..bar(12.0)
    };
    let worn = {
        let mut edge = EdgeAccount::default();
        let life = advise(&bar(25.0), &machine("geared-lathe"))
            .cut
            .edge
            .unwrap();
        // A third of its 60 min at the speed of the table.
        (0..1224).for_each(|_| edge.add(Duration::from_secs(1), life.stated.m_min(), &life, None));
        edge
    };
    let why = |first, setup: Setup| Scene {
        setup,
        page: Page::Why(first),
        edge: worn,
        ..lathe()
    };
    let mut all = vec![
        ("why-cutting-speed", why(0, bar(25.0))),
        ("why-thread", why(0, thread)),
        ("why-power", why(0, heavy)),
        ("why-power-further-down", why(9, heavy)),
        ("run-right", lathe()),
        ("run-right-free", lathe().loaded(Some(Mark::Free))),
        ("run-right-heavy", lathe().loaded(Some(Mark::Heavy))),
        (
            "run-slow-stalling",
            lathe()
                .at(262.0, Verdict::Slow)
                .loaded(Some(Mark::Stalling)),
        ),
        (
            "run-fast-working",
            lathe().at(446.0, Verdict::Fast).loaded(Some(Mark::Working)),
        ),
        ("run-slow", lathe().at(180.0, Verdict::Slow)),
        ("run-up", lathe().at(96.0, Verdict::RunUp)),
        ("run-fast", lathe().at(446.0, Verdict::Fast)),
        ("run-danger", capped().at(448.0, Verdict::Danger)),
        (
            "run-lost",
            lathe().without_speed(Signal::Lost, Verdict::Lost),
        ),
        (
            "run-doubtful",
            lathe().without_speed(Signal::Doubtful, Verdict::Doubtful),
        ),
        (
            "run-no-pulses",
            Scene {
                reading: Reading::NOTHING,
                verdict: Verdict::NoPulses,
                ..lathe()
            },
        ),
        ("run-unconfirmed", lathe().at(279.0, Verdict::Unconfirmed)),
        ("run-needs-cap", faceplate().at(45.0, Verdict::NeedsCap)),
        ("run-no-advice", refused().at(279.0, Verdict::NoAdvice)),
        ("run-too-fast", fast_drill().at(354.0, Verdict::Fast)),
        ("run-inch", drill().at(893.0, Verdict::Right)),
        ("run-long-labels", long().at(98.0, Verdict::Right)),
        ("run-five-digits", long().at(12_345.0, Verdict::Danger)),
        ("run-seven-digits", long().at(1_234_567.0, Verdict::Danger)),
        ("run-notice", lathe().turned(Knob::Right, 5)),
        (
            "run-notice-in-two-lines",
            lathe().at(279.0, Verdict::Fast).turned(Knob::Left, 5),
        ),
        ("choose-job", choose(Field::Operation, bar(25.0))),
        (
            "choose-holder",
            choose(
                Field::Holder,
                Setup {
                    holder: 4,
                    ..bar(25.0)
                },
            ),
        ),
        (
            "choose-cap",
            choose(
                Field::Cap,
                Setup {
                    cap: Some(rpm(1250.0)),
                    ..bar(25.0)
                },
            ),
        ),
        (
            "choose-load",
            choose(
                Field::Load,
                Setup {
                    load: true,
                    ..bar(25.0)
                },
            ),
        ),
        (
            "choose-load-refused",
            Scene {
                machine: machine("variable-lathe"),
                page: Page::Choose(Field::Load),
                ..lathe()
            },
        ),
    ];
    all.extend(counting::scenes());
    all
}

#[test]
fn golden_pictures() {
    for (name, scene) in scenes() {
        insta::assert_snapshot!(name, scene.frame().to_text());
    }
}

#[test]
fn every_golden_picture_belongs_to_a_scene_and_every_verdict_has_one() {
    let scenes = scenes();
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("snapshots");
    let mut count = 0;
    for entry in std::fs::read_dir(folder).unwrap() {
        let name = entry.unwrap().file_name().into_string().unwrap();
        let scene = name
            .strip_prefix("screens__")
            .and_then(|n| n.strip_suffix(".snap"))
            .unwrap_or_else(|| panic!("{name} is no golden picture"));
        assert!(scenes.iter().any(|(n, _)| *n == scene), "{name}");
        count += 1;
    }
    assert_eq!(count, scenes.len());
    for verdict in Verdict::ALL {
        assert!(
            scenes.iter().any(|(_, s)| s.verdict == verdict),
            "{verdict:?}"
        );
    }
}

/// Counts, for each pixel, how often it was lit, and what fell outside.
struct Ink {
    lit: Vec<u32>,
    dark: Vec<bool>,
    outside: Vec<Point>,
}

impl Ink {
    fn of(scene: &Scene) -> Self {
        let mut ink = Ink {
            lit: vec![0; (WIDTH * HEIGHT) as usize],
            dark: vec![false; (WIDTH * HEIGHT) as usize],
            outside: Vec::new(),
        };
        let Ok(()) = scene.draw(&mut ink);
        ink
    }
}

impl OriginDimensions for Ink {
    fn size(&self) -> Size {
        Size::new(WIDTH, HEIGHT)
    }
}

impl DrawTarget for Ink {
    type Color = BinaryColor;
    type Error = Infallible;

    fn draw_iter<I>(&mut self, pixels: I) -> Result<(), Infallible>
    where
        I: IntoIterator<Item = Pixel<BinaryColor>>,
    {
        for Pixel(p, color) in pixels {
            if p.x < 0 || p.y < 0 || p.x >= WIDTH as i32 || p.y >= HEIGHT as i32 {
                self.outside.push(p);
                continue;
            }
            let at = (p.y * WIDTH as i32 + p.x) as usize;
            if color.is_on() {
                self.lit[at] += 1;
            } else {
                self.dark[at] = true;
            }
        }
        Ok(())
    }
}

#[test]
fn a_speed_that_is_not_believed_is_never_shown() {
    for signal in [Signal::Still, Signal::Lost, Signal::Doubtful] {
        let reading = Reading {
            signal,
            speed: Some(rpm(888.0)),
            quick: Some(rpm(888.0)),
            ..Reading::NOTHING
        };
        assert_eq!(screen::digits(&reading), None);
        let with = Scene {
            reading,
            ..Scene::new()
        };
        let without = Scene::new().without_speed(signal, Verdict::Right);
        assert!(
            with.frame() == without.frame(),
            "neither digits nor pointer"
        );
    }
}

#[test]
fn the_screen_never_says_stopped_or_safe() {
    for (name, scene) in scenes() {
        let frame = scene.frame();
        for word in ["STOP", "SAFE", "stopped", "safe", "OK"] {
            assert!(!frame.shows(word), "{name}");
        }
        // As an order before a shift of levers it may.
        assert!(!frame.shows("stop") || frame.shows("stop; "), "{name}");
    }
}

#[test]
fn the_pointer_moves_with_the_speed() {
    let pointer = |n: f32| {
        let frame = Scene::new().at(n, Verdict::Right).frame();
        let wide = |x: &u32| (x - 2..=x + 2).all(|x| frame.lit(x, 45));
        let places: Vec<u32> = (2..WIDTH - 2).filter(wide).collect();
        // A tick right beside it leaves two places that may be its middle.
        assert!((1..=2).contains(&places.len()), "{n}: {places:?}");
        places[0]
    };
    let mut before = 0;
    for n in (180..700).step_by(20) {
        let x = pointer(n as f32);
        assert!(x >= before, "{n}");
        before = x;
    }
    // At the best speed it stands in the middle.
    assert!(pointer(348.9).abs_diff(WIDTH / 2) <= 1);
}

#[test]
fn every_refusal_is_told_with_its_reason() {
    let mut told = 0;
    for material in Material::ALL {
        for tool in Tool::ALL {
            for operation in Operation::ALL {
                let setup = Setup {
                    material,
                    tool,
                    operation,
                    ..bar(25.0)
                };
                if let Err(refusal) = cutting_speed(material, tool, operation, setup.coolant) {
                    let scene = Scene {
                        setup,
                        ..Scene::new()
                    };
                    // Its first words, as many as a row of the small letters has.
                    let mut row = String::new();
                    for word in refusal.reason.split(' ') {
                        if row.len() + 1 + word.len() > 32 {
                            break;
                        }
                        row += if row.is_empty() { "" } else { " " };
                        row += word;
                    }
                    assert!(
                        scene.frame().shows(&row),
                        "{row}\n{}",
                        scene.frame().to_text()
                    );
                    told += 1;
                }
            }
        }
    }
    assert!(told > 100);
}

/// Writes every scene as PNG into the folder that `RIMRATE_PICTURES` names, to be looked at.
#[test]
fn pictures_can_be_written() {
    let kept = std::env::var_os("RIMRATE_PICTURES").map(std::path::PathBuf::from);
    for (name, scene) in scenes() {
        let mut png = Vec::new();
        scene.frame().write_png(&mut png, 4).unwrap();
        assert!(png.starts_with(b"\x89PNG"));
        if let Some(folder) = &kept {
            std::fs::write(folder.join(format!("{name}.png")), png).unwrap();
        }
    }
}
