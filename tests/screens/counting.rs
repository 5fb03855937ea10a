//! The pages about the sensor: the Sensor page, and the two pages that find the pulses in a revolution.

use rimrate_core::setup::Pulses;
use rimrate_core::tacho::Rejected;
use rimrate_core::time::{Edge, Instant};

use super::*;

/// A sensor that works, with so many pulses in a revolution, and something of every kind rejected.
pub(super) fn health(pulses: u16) -> Health {
    Health {
        pulses: pulses.try_into().unwrap(),
        counted: 123_456,
        rejected: Rejected {
            joined: 3,
            slivers: 1234,
            missing: 56_789,
            noise: 999,
            ..Rejected::default()
        },
        placement: Some(1.02),
        jitter: Some(3.1e-6),
        highest: rpm(1.2e6 / f32::from(pulses)),
    }
}

/// Somebody who counts the pulses.
struct Counter {
    panel: Panel,
    scene: Scene,
    sensor: SensorSetup,
    now: f64,
    pulses: u32,
}

impl Counter {
    fn with<T>(&mut self, act: impl FnOnce(&mut Panel, Instant, Bench<'_>) -> T) -> T {
        let advice = self.scene.advice();
        let bench = Bench {
            setup: &mut self.scene.setup,
            machine: &self.scene.machine,
            advice: &advice,
            running: false,
            sensor: &mut self.sensor,
        };
        act(&mut self.panel, at(self.now), bench)
    }
    fn press(&mut self, knob: Knob) {
        self.panel.press(at(self.now), knob);
        self.with(|panel, now, bench| panel.release(now, knob, bench));
    }
    fn turn(&mut self, knob: Knob, detents: i8) {
        self.with(|panel, now, bench| panel.turn(now, knob, detents, bench));
    }
    /// So many magnets pass by hand.
    fn pass(&mut self, passages: u32) {
        for i in 0..passages {
            let (fall, rise) = (at(self.now + 0.45), at(self.now + 0.55));
            self.sensor.edges(&[Edge::fall(fall), Edge::rise(rise)]);
            // No hand is even.
            self.now += 0.7 + 0.1 * f64::from((i % 7).pow(2) % 7);
        }
        self.sensor.look(at(self.now), None);
    }
    /// The same, and the line chatters.
    fn chatter(&mut self, passages: u32) {
        for _ in 0..passages {
            for (fall, rise) in [(0.45, 0.451), (0.452, 0.55), (0.551, 0.552)] {
                let edges = [
                    Edge::fall(at(self.now + fall)),
                    Edge::rise(at(self.now + rise)),
                ];
                self.sensor.edges(&edges);
            }
            self.now += 1.0;
        }
        self.sensor.look(at(self.now), None);
    }
    fn count(&mut self, passages: u32) {
        self.press(Knob::Right);
        self.pass(passages);
        self.press(Knob::Right);
    }
    /// The spindle runs for some seconds and gives so many pulses in each.
    fn rate(&mut self, rate: f64, seconds: u32) {
        for _ in 0..seconds * 10 {
            self.now += 0.1;
            self.pulses = (self.now * rate) as u32;
            let last = at(f64::from(self.pulses) / rate);
            self.sensor.look(at(self.now), Some((self.pulses, last)));
        }
    }
    /// It runs steadily in the step of this number, and the ten turns are next.
    fn plate(&mut self, step: i8, rate: f64) {
        self.turn(Knob::Left, 1);
        self.turn(Knob::Right, step);
        self.rate(rate, 10);
        self.turn(Knob::Left, -1);
    }
}

/// The geared lathe with so many pulses in use, on the page of the ten turns; what then happens there.
fn counting(used: u16, happens: impl FnOnce(&mut Counter)) -> Scene {
    let mut scene = Scene::new();
    if used != 2 {
        scene.setup.pulses = Pulses::new(used).ok();
    }
    let mut counter = Counter {
        panel: Panel::new(true),
        scene,
        sensor: SensorSetup::default(),
        now: 1.0,
        pulses: 0,
    };
    counter.press(Knob::Right);
    counter.press(Knob::Left);
    counter.turn(Knob::Left, 1);
    happens(&mut counter);
    Scene {
        page: counter.panel.page(),
        sensor_setup: counter.sensor,
        ..counter.scene
    }
}

/// Every golden picture with its name.
pub(super) fn scenes() -> Vec<(&'static str, Scene)> {
    let lathe = Scene::new;
    vec![
        (
            "sensor-two-magnets",
            Scene {
                page: Page::Sensor,
                ..lathe()
            },
        ),
        (
            "sensor-toothed-wheel",
            Scene {
                page: Page::Sensor,
                sensor: health(60),
                ..lathe()
            },
        ),
        (
            "sensor-not-learned-yet",
            Scene {
                page: Page::Sensor,
                sensor: Health {
                    placement: None,
                    jitter: None,
                    ..health(240)
                },
                ..lathe()
            },
        ),
        (
            "sensor-counted-otherwise",
            Scene {
                page: Page::Sensor,
                setup: Setup {
                    pulses: Pulses::new(240).ok(),
                    ..bar(25.0)
                },
                sensor: health(240),
                ..lathe()
            },
        ),
        (
            "sensor-no-step-so-fast",
            Scene {
                page: Page::Sensor,
                setup: Setup {
                    pulses: Pulses::new(3).ok(),
                    ..bar(25.0)
                },
                sensor: health(3),
                ..lathe()
                    .without_speed(Signal::Doubtful, Verdict::Doubtful)
                    .reads(345.0)
            },
        ),
        (
            "sensor-too-slow-for-the-machine",
            Scene {
                page: Page::Sensor,
                sensor: health(240),
                machine: wordy(),
                ..lathe()
            },
        ),
        ("count-by-hand", counting(2, |_| {})),
        (
            "count-under-way",
            counting(2, |c| {
                c.press(Knob::Right);
                c.pass(13);
            }),
        ),
        ("count-new-number", counting(2, |c| c.count(30))),
        ("count-as-in-use", counting(3, |c| c.count(29))),
        ("count-again", counting(2, |c| c.count(25))),
        ("count-again-too-few", counting(2, |c| c.count(7))),
        ("count-nothing-passed", counting(2, |c| c.count(0))),
        ("count-too-many", counting(2, |c| c.count(2402))),
        (
            "count-edges-lost",
            counting(2, |c| {
                c.press(Knob::Right);
                c.pass(13);
                c.sensor.edges_lost();
            }),
        ),
        (
            "count-motor-runs",
            counting(2, |c| {
                c.press(Knob::Right);
                for _ in 0..13 {
                    c.pass(1);
                }
            }),
        ),
        (
            "count-chatter",
            counting(2, |c| {
                c.press(Knob::Right);
                c.chatter(250);
                c.press(Knob::Right);
            }),
        ),
        (
            "count-confirmed",
            counting(2, |c| {
                c.plate(7, 14.2);
                c.count(30);
            }),
        ),
        (
            "count-contradicted",
            counting(2, |c| {
                c.plate(12, 933.0);
                c.count(2400);
            }),
        ),
        ("plate-none-yet", counting(2, |c| c.turn(Knob::Left, 1))),
        (
            "plate-not-steady",
            counting(2, |c| {
                c.turn(Knob::Left, 1);
                c.turn(Knob::Right, 12);
                c.rate(8.0, 2);
            }),
        ),
        (
            "plate-not-chosen",
            counting(2, |c| {
                c.turn(Knob::Left, 1);
                c.rate(14.2, 10);
            }),
        ),
        (
            "plate-new-number",
            counting(2, |c| {
                c.turn(Knob::Left, 1);
                c.turn(Knob::Right, 1);
                c.rate(1.8, 30);
            }),
        ),
        (
            "plate-another-step",
            counting(2, |c| {
                c.turn(Knob::Left, 1);
                c.turn(Knob::Right, 7);
                c.rate(37.33, 10);
            }),
        ),
        (
            "plate-fits-in-use-too",
            counting(9, |c| {
                c.turn(Knob::Left, 1);
                c.turn(Knob::Right, 7);
                c.rate(37.33, 10);
            }),
        ),
        (
            "plate-several-steps",
            counting(2, |c| {
                c.turn(Knob::Left, 1);
                c.turn(Knob::Right, 7);
                c.rate(4.667, 20);
            }),
        ),
        (
            "plate-as-in-use",
            counting(3, |c| {
                c.plate(7, 14.2);
                c.turn(Knob::Left, 1);
                c.rate(14.2, 10);
            }),
        ),
        (
            "plate-several",
            counting(2, |c| {
                c.plate(12, 11_300.0);
                c.turn(Knob::Left, 1);
                c.rate(11_300.0, 10);
            }),
        ),
        (
            "plate-nothing",
            counting(2, |c| {
                c.plate(7, 11.7);
                c.turn(Knob::Left, 1);
                c.rate(11.7, 10);
            }),
        ),
        (
            "plate-contradicts",
            counting(2, |c| {
                c.plate(12, 11_300.0);
                c.count(2200);
                c.turn(Knob::Left, 1);
                c.rate(11_300.0, 10);
            }),
        ),
    ]
}

#[test]
fn nothing_is_cut_where_pulses_are_counted() {
    // A tilde alone looks like parts of other letters.
    let is_cut = |scene: &Scene| {
        let frame = scene.frame();
        let letters = ('a'..='z').chain('A'..='Z').chain('0'..='9');
        letters.into_iter().any(|c| frame.shows(&format!("{c}~")))
    };
    let whole = |scene: &Scene| assert!(!is_cut(scene), "{}", scene.frame().to_text());
    let cut = Scene {
        machine: wordy(),
        page: Page::Choose(Field::Holder),
        ..Scene::new()
    };
    assert!(is_cut(&cut), "a cut is seen\n{}", cut.frame().to_text());
    for pulses in [1, 60, 240_u16] {
        for other in [2, 200] {
            for passages in [
                0,
                7,
                10 * u32::from(pulses),
                10 * u32::from(pulses) + 5,
                99_999,
            ] {
                whole(&counting(other, |c| c.count(passages)));
                whole(&counting(other, |c| {
                    c.plate(12, f64::from(pulses) * 46.0);
                    c.count(passages);
                }));
            }
            for step in [1, 6, 12] {
                for rate in [0.3, 14.27, 99.96, 1234.5, 19_999.0] {
                    whole(&counting(other, |c| {
                        c.plate(step, rate);
                        c.count(10 * u32::from(pulses));
                        c.turn(Knob::Left, 1);
                        c.rate(rate, 150);
                    }));
                }
            }
        }
        for machine in machines().chain([wordy()]) {
            for placement in [None, Some(0.0), Some(29.96)] {
                for jitter in [None, Some(0.0), Some(9.9994e-3), Some(0.5)] {
                    let scene = Scene {
                        page: Page::Sensor,
                        machine: machine.clone(),
                        sensor: Health {
                            placement,
                            jitter,
                            ..health(pulses)
                        },
                        ..Scene::new()
                    };
                    whole(&scene);
                    assert!(Ink::of(&scene).lit.iter().all(|&times| times <= 1));
                    assert!(scene.frame().shows("turn: count"));
                    whole(
                        &scene
                            .without_speed(Signal::Doubtful, Verdict::Doubtful)
                            .reads(99_999.0),
                    );
                }
            }
        }
    }
}
