//! The load from slip, against a simulated lathe whose true load is known at every instant. The law
//! itself is tried in `physics.rs` and `formulas.rs`.
//!
//! The lathe's motor is not built on the law under test: it follows Kloss's formula, with a belt that slips and creeps, and
//! friction of its own in every step.

#[path = "load/overload.rs"]
mod overload;

use rimrate_core::edge_account::Counted;
use rimrate_core::instrument::{Event, Instrument};
use rimrate_core::load::Mark;
use rimrate_core::machine::{Drive, Machine, NoLoad};
use rimrate_core::panel::{Field, Knob, Page};
use rimrate_core::setup::Setup;
use rimrate_core::time::{Duration, Edge, Instant};
use rimrate_sim::frame::Frame;
use rimrate_sim::lathe::{Cut, Engagement, Lathe, LatheSpec, MotorSwitch};
use rimrate_sim::profile;
use rimrate_sim::random::Random;
use rimrate_sim::sensor::{Fault, Sensor, SensorSpec};
use rimrate_tests::{bar, machine};

/// A lathe, its sensor and a box; the box is polled as the firmware does it.
struct Shop {
    lathe: Lathe,
    sensor: Sensor,
    instrument: Instrument,
    next: Instant,
    now: Instant,
    plate: f64,
    spec: LatheSpec,
}

/// What was seen in a tenth of a second.
#[derive(Clone, Copy, Debug)]
struct Seen {
    /// Cutting torque over the motor's rated torque.
    cut: f64,
    /// For how long the cut has been as it is, s.
    steady: f64,
    plate: f64,
    truth: Mark,
    mark: Option<Mark>,
}

impl Shop {
    fn new(machine: &Machine, setup: Setup, spec: LatheSpec, seed: u64) -> Self {
        let magnets = u32::from(machine.pulses().get());
        let mut shop = Shop {
            lathe: Lathe::new(spec, seed),
            sensor: Sensor::new(
                SensorSpec {
                    magnets,
                    ..SensorSpec::default()
                },
                seed,
            ),
            instrument: Instrument::new(Instant::ZERO, machine.clone(), Some(setup)),
            next: Instant::ZERO,
            now: Instant::ZERO,
            plate: 0.0,
            spec,
        };
        shop.press(Knob::Left);
        shop
    }

    fn press(&mut self, knob: Knob) {
        self.instrument.handle(self.now, Event::Press(knob));
        self.run(0.1);
        self.instrument.handle(self.now, Event::Release(knob));
        self.run(0.1);
    }

    fn turn(&mut self, knob: Knob, detents: i8) {
        self.instrument.handle(self.now, Event::Turn(knob, detents));
        self.run(0.1);
    }

    fn run(&mut self, seconds: f64) {
        let until = self.now + Duration::from_nanos((seconds * 1e9) as u64);
        while self.now < until {
            let to = (self.now + Duration::from_millis(5)).min(until);
            let mut edges: Vec<Edge> = Vec::new();
            let sensor = &mut self.sensor;
            self.lathe.advance(to, &mut |segment| {
                sensor.sense(segment, &mut |edge| edges.push(edge))
            });
            self.now = to;
            if !edges.is_empty() {
                self.instrument.handle(to, Event::Edges(&edges));
            }
            if !edges.is_empty() || to >= self.next {
                self.next = self.instrument.poll(to).next;
            }
        }
    }

    fn start(&mut self, plate: f32) {
        self.plate = f64::from(plate);
        self.lathe.select(self.plate);
        self.lathe.motor(MotorSwitch::Forward);
    }

    fn stop(&mut self) {
        self.lathe.brake(1.0);
        self.run(4.0);
        self.lathe.brake(0.0);
        assert_eq!(self.lathe.speed_rpm(), 0.0);
    }

    /// Cuts with this share of the motor's rated torque.
    fn cut(&mut self, share: f64) {
        let torque = share * self.rated_at_spindle();
        self.lathe.cut((share > 0.0).then_some(Cut {
            specific_force: torque * 2000.0 / 25.0,
            depth: 1.0,
            feed: 1.0,
            diameter: 25.0,
            engagement: Engagement::Continuous,
        }));
    }

    fn ratio(&self) -> f64 {
        self.spec.motor.rated_rpm / self.plate
    }

    fn rated_at_spindle(&self) -> f64 {
        self.spec.motor.rated_torque() * self.ratio()
    }

    /// The motor's torque, as a share of its rated torque, that friction takes at the present speed.
    fn free_load(&self) -> f64 {
        let spindle = self.spec.spindle_friction
            + self.spec.spindle_drag * self.lathe.smooth_rpm() * std::f64::consts::TAU / 60.0;
        (spindle / self.ratio() + self.spec.motor_friction) / self.spec.motor.rated_torque()
    }

    /// The true mark of a cut with this share of the rated torque: its part of what free running leaves.
    fn truth(&self, share: f64) -> Mark {
        if share == 0.0 {
            return Mark::Free;
        }
        Mark::of((share / (1.0 - self.free_load())) as f32)
    }

    fn watch(&mut self, seconds: f64, share: f64, seen: &mut Vec<Seen>) {
        self.cut(share);
        for i in 1..=(seconds * 10.0) as u32 {
            self.run(0.1);
            seen.push(Seen {
                cut: share,
                steady: f64::from(i) / 10.0,
                plate: self.plate,
                truth: self.truth(share),
                mark: self.instrument.view().load,
            });
        }
    }
}

fn loaded(mm: f32) -> Setup {
    Setup {
        load: true,
        ..bar(mm)
    }
}

fn plates(machine: &Machine) -> Vec<f32> {
    let Drive::Stepped(steps) = machine.drive() else {
        panic!("no steps");
    };
    steps.iter().map(|s| s.rpm.get()).collect()
}

/// Shares of what was seen, of the steady seconds.
#[derive(Clone, Copy, Debug)]
struct Shares {
    /// Cutting told from free, and the bar there.
    told: f64,
    /// The bar's mark off by one at most, and exact, where there is a bar.
    within_one: f64,
    exact: f64,
    /// Shown as cutting while it was free, of all free seconds that were not within a second of a cut.
    false_cutting: f64,
}

/// `settled`: from so many seconds after a change on it counts as steady; at slow steps from ten turns on.
fn shares(seen: &[Seen], settled: f64) -> Shares {
    let share = |of: &dyn Fn(&Seen) -> bool, among: &dyn Fn(&Seen) -> bool| {
        let all = seen.iter().filter(|s| among(s)).count();
        let found = seen.iter().filter(|s| among(s) && of(s)).count();
        assert!(all > 0);
        found as f64 / all as f64
    };
    let steady = |s: &Seen| s.steady > (600.0 / s.plate).max(settled);
    let cuts = |s: &Seen| s.mark.is_some_and(|m| m > Mark::Free);
    let off = |s: &Seen| (s.mark.unwrap() as i32 - s.truth as i32).abs();
    let barred = |s: &Seen| steady(s) && s.mark.is_some();
    Shares {
        told: share(&|s| s.mark.is_some() && cuts(s) == (s.cut > 0.0), &steady),
        within_one: share(&|s| off(s) <= 1, &barred),
        exact: share(&|s| off(s) == 0, &barred),
        false_cutting: share(&cuts, &|s| {
            s.cut == 0.0 && s.steady > (300.0 / s.plate).max(1.0)
        }),
    }
}

/// What DEVELOPERS.md states, less what one set of seeds may miss it by.
fn assert_good(shares: Shares, exact: f64) {
    println!("{shares:?}");
    assert!(shares.told >= 0.99, "{shares:?}");
    assert!(shares.within_one == 1.0, "{shares:?}");
    assert!(shares.exact >= exact, "{shares:?}");
    assert!(shares.false_cutting < 0.003, "{shares:?}");
}

/// A session that the seed makes up: a lathe of its own, and on each of some steps cuts between free stretches.
fn made_up(seed: u64, wander: f64) -> Vec<Seen> {
    let mut random = Random::new(seed, 0x6c6f_6164);
    let mut spec = LatheSpec {
        mains_wander: wander,
        mains_period: random.between(4.0, 60.0),
        belt_slip: random.between(0.002, 0.01),
        belt_creep: random.between(0.001, 0.004),
        belt_warming: random.between(100.0, 600.0),
        belt_ripple: random.between(0.0, 0.003),
        turn_ripple: random.between(0.0, 0.003),
        motor_friction: random.between(0.1, 0.5),
        spindle_friction: random.between(0.2, 0.8),
        ..LatheSpec::default()
    };
    spec.motor.rated_rpm = random.between(1425.0, 1460.0);
    spec.motor.breakdown_ratio = random.between(2.0, 3.0);
    let machine = plated("geared-lathe", spec.motor.rated_rpm);
    let mut shop = Shop::new(&machine, loaded(25.0), spec, seed);
    let mut seen = Vec::new();
    let plates = plates(&machine);
    for _ in 0..6 {
        // The fastest two take half of the motor to turn free.
        let plate = plates[4 + (random.uniform() * 6.0) as usize];
        shop.start(plate);
        // Time to run up, and for the hand to find the wheel.
        shop.run(random.between(4.0, 8.0));
        for _ in 0..8 {
            shop.watch(random.between(3.0, 30.0), 0.0, &mut seen);
            shop.watch(
                random.between(3.0, 40.0),
                random.between(0.2, 1.1),
                &mut seen,
            );
            if random.chance(0.3) {
                shop.watch(
                    random.between(3.0, 30.0),
                    random.between(0.2, 1.1),
                    &mut seen,
                );
            }
        }
        shop.watch(5.0, 0.0, &mut seen);
        shop.stop();
    }
    seen
}

/// A built-in machine with another speed on its motor's plate.
fn plated(name: &str, rated_rpm: f64) -> Machine {
    let path = format!("{}/../sim/machines/{name}.toml", env!("CARGO_MANIFEST_DIR"));
    let text = std::fs::read_to_string(path).unwrap();
    let own = format!("rated_rpm = {rated_rpm:.0}");
    let text = text.replace("rated_rpm = 1440", &own);
    assert!(text.contains(&own));
    profile::parse(&text, name).unwrap_or_else(|e| panic!("{e}"))
}

/// Free and cut in turns: seconds, and the cut as a share of the motor's rated torque.
const PASSES: [(f64, f64); 14] = [
    (5.0, 0.0),
    (15.0, 0.2),
    (6.0, 0.0),
    (12.0, 0.5),
    (20.0, 0.0),
    // A deeper pass without a free stretch before it.
    (8.0, 0.35),
    (8.0, 0.8),
    (4.0, 0.0),
    (10.0, 1.0),
    (5.0, 0.0),
    (10.0, 1.1),
    (10.0, 0.0),
    (25.0, 0.25),
    (10.0, 0.0),
];

#[test]
fn a_session_with_warmth_and_a_wandering_mains() {
    let machine = machine("geared-lathe");
    let mut all = Vec::new();
    for (seed, period) in [(1, 5.0), (2, 20.0), (3, 60.0)] {
        let spec = LatheSpec {
            mains_wander: 0.003,
            mains_period: period,
            ..LatheSpec::default()
        };
        let mut shop = Shop::new(&machine, loaded(25.0), spec, seed);
        for plate in plates(&machine).into_iter().filter(|n| *n > 100.0) {
            shop.start(plate);
            shop.run(6.0);
            for (seconds, share) in PASSES {
                shop.watch(seconds, share, &mut all);
            }
            shop.stop();
        }
    }
    // Half of the rated torque is, on the quicker steps, where the next mark begins.
    assert_good(shares(&all, 2.0), 0.91);
    // Nobody has to wait for the two seconds.
    let early = shares(&all, 1.4);
    assert!(early.told >= 0.99, "{early:?}");
}

/// Cuts of this share between free stretches of a lathe with this rated speed, on a profile that says another.
fn at_the_limit(real_rpm: f64, plate_rpm: f64, share: f64) -> Vec<Seen> {
    let mut seen = Vec::new();
    for seed in 1..4 {
        let mut spec = LatheSpec {
            mains_wander: 0.003,
            mains_period: 10.0,
            ..LatheSpec::default()
        };
        spec.motor.rated_rpm = real_rpm;
        let machine = plated("geared-lathe", plate_rpm);
        let mut shop = Shop::new(&machine, loaded(25.0), spec, seed);
        shop.start(280.0);
        shop.run(6.0);
        for _ in 0..8 {
            shop.watch(15.0, 0.0, &mut seen);
            shop.watch(15.0, share, &mut seen);
        }
    }
    seen
}

#[test]
fn its_limits_are_where_they_are_stated() {
    // A twentieth is never seen; it does not do harm either.
    let light = at_the_limit(1440.0, 1440.0, 0.05);
    assert!(light.iter().all(|s| s.mark == Some(Mark::Free)));
    // A tenth is seen nine times in ten, not of a motor that slips by 1.3 %.
    for (rated, expected) in [(1440.0, 0.9..1.0), (1480.0, 0.0..0.5)] {
        let mut seen = at_the_limit(rated, rated, 0.1);
        seen.retain(|s| s.cut > 0.0 && s.steady > 2.0);
        let marked = seen.iter().filter(|s| s.mark > Some(Mark::Free)).count();
        let share = marked as f64 / seen.len() as f64;
        assert!(expected.contains(&share), "{rated} {share}");
    }
    // 0.15 is always, and 0.2 of a motor that slips little.
    for (rated, share) in [(1440.0, 0.15), (1480.0, 0.2)] {
        let shares = shares(&at_the_limit(rated, rated, share), 2.0);
        assert!(shares.told >= 0.98, "{rated} {share} {shares:?}");
    }
    // A warm motor slips more than its plate says: one mark at most.
    for share in [0.2, 0.5, 0.9] {
        let shares = shares(&at_the_limit(1425.0, 1440.0, share), 2.0);
        assert!(
            shares.told >= 0.95 && shares.within_one == 1.0,
            "{share} {shares:?}"
        );
    }
}

#[test]
fn slow_steps_take_some_turns() {
    let machine = machine("geared-lathe");
    let mut all = Vec::new();
    let mut shop = Shop::new(&machine, loaded(25.0), LatheSpec::default(), 5);
    for plate in plates(&machine).into_iter().filter(|n| *n < 100.0) {
        shop.start(plate);
        shop.run(1200.0 / f64::from(plate));
        for share in [0.0, 0.4, 0.0, 0.9, 0.0] {
            shop.watch(3000.0 / f64::from(plate), share, &mut all);
        }
        shop.stop();
    }
    assert_good(shares(&all, 2.0), 0.95);
}

#[test]
fn any_lathe_any_session() {
    let mut all = Vec::new();
    let from = std::env::var("RIMRATE_SEED").map_or(1, |s| s.parse().unwrap());
    for seed in from..from + 16 {
        let seen = made_up(seed, 0.003);
        let alone = shares(&seen, 2.0);
        assert!(
            alone.told >= 0.97 && alone.false_cutting < 0.003,
            "{seed}: {alone:?}"
        );
        all.extend(seen);
    }
    assert_good(shares(&all, 2.0), 0.95);
}

/// How the bar stands after some seconds of this.
fn after(shop: &mut Shop, seconds: f64, share: f64) -> Option<Mark> {
    shop.watch(seconds, share, &mut Vec::new());
    shop.instrument.view().load
}

#[test]
fn a_tool_that_was_in_the_metal_at_the_start_is_found_out() {
    let machine = machine("geared-lathe");
    let mut shop = Shop::new(&machine, loaded(25.0), LatheSpec::default(), 3);
    shop.cut(0.6);
    shop.start(280.0);
    shop.run(8.0);
    // What was taken for free turns out to be slow when the tool leaves the metal.
    assert_eq!(after(&mut shop, 3.0, 0.0), Some(Mark::Free));
    assert_eq!(after(&mut shop, 3.0, 0.5), Some(Mark::Working));
    assert_eq!(after(&mut shop, 3.0, 0.0), Some(Mark::Free));
    shop.stop();
    // And with the step known, the next such start is seen at once.
    shop.cut(0.6);
    shop.start(280.0);
    assert!(after(&mut shop, 5.0, 0.6) > Some(Mark::Free));
    assert_eq!(after(&mut shop, 3.0, 0.0), Some(Mark::Free));
}

#[test]
fn a_long_cut_is_never_learned_as_free() {
    let machine = machine("geared-lathe");
    let mut shop = Shop::new(&machine, loaded(25.0), LatheSpec::default(), 8);
    shop.start(450.0);
    assert_eq!(after(&mut shop, 6.0, 0.0), Some(Mark::Free));
    let mut seen = Vec::new();
    shop.watch(1200.0, 0.3, &mut seen);
    let wrong = seen
        .iter()
        .filter(|s| s.steady > 2.0 && s.mark != Some(Mark::Working));
    assert_eq!(wrong.count(), 0);
    assert_eq!(after(&mut shop, 3.0, 0.0), Some(Mark::Free));
}

#[test]
fn a_facing_cut_fades_and_a_gentle_one_grows() {
    let machine = machine("geared-lathe");
    let mut shop = Shop::new(&machine, loaded(25.0), LatheSpec::default(), 4);
    shop.start(450.0);
    assert_eq!(after(&mut shop, 6.0, 0.0), Some(Mark::Free));
    // At a constant speed the torque falls with the diameter.
    for tenth in (0..10).rev() {
        let mark = after(&mut shop, 2.0, 0.08 * f64::from(tenth));
        assert!(tenth < 3 || mark > Some(Mark::Free), "{tenth} {mark:?}");
    }
    assert_eq!(after(&mut shop, 8.0, 0.0), Some(Mark::Free));
    // Fed in by hand over three seconds.
    for tenth in 1..=10 {
        after(&mut shop, 0.3, 0.05 * f64::from(tenth));
    }
    assert_eq!(after(&mut shop, 2.0, 0.5), Some(Mark::Working));
}

#[test]
fn speeding_up_and_slowing_down_is_no_load() {
    let machine = machine("geared-lathe");
    let mut shop = Shop::new(&machine, loaded(25.0), LatheSpec::default(), 6);
    for plate in [112.0, 280.0, 710.0, 1800.0] {
        let mut seen = Vec::new();
        shop.start(plate);
        shop.watch(8.0, 0.0, &mut seen);
        shop.lathe.motor(MotorSwitch::Off);
        shop.watch(20.0, 0.0, &mut seen);
        shop.lathe.motor(MotorSwitch::Forward);
        shop.watch(8.0, 0.0, &mut seen);
        shop.lathe.plug();
        shop.watch(6.0, 0.0, &mut seen);
        assert!(seen.iter().any(|s| s.mark == Some(Mark::Free)), "{plate}");
        let cut = seen.iter().find(|s| s.mark > Some(Mark::Free));
        assert!(cut.is_none(), "{cut:?}");
    }
}

#[test]
fn a_poor_sensor_makes_no_load() {
    let machine = machine("geared-lathe");
    for fault in [Fault::Chatter, Fault::Spikes, Fault::Dropouts] {
        let mut shop = Shop::new(&machine, loaded(25.0), LatheSpec::default(), 9);
        shop.sensor.set(fault, true);
        let mut seen = Vec::new();
        for plate in [280.0, 1120.0] {
            shop.start(plate);
            shop.run(6.0);
            for share in [0.0, 0.4, 0.0, 0.9, 0.0] {
                shop.watch(20.0, share, &mut seen);
            }
            shop.stop();
        }
        let shares = shares(&seen, 2.0);
        assert!(
            shares.told >= 0.95 && shares.false_cutting < 0.01,
            "{fault:?} {shares:?}"
        );
    }
}

#[test]
fn it_is_off_until_somebody_switches_it_on() {
    const { assert!(!Setup::CAUTIOUS.load) }
    let machine = machine("geared-lathe");
    let mut shop = Shop::new(&machine, bar(25.0), LatheSpec::default(), 2);
    shop.start(280.0);
    shop.run(6.0);
    for share in [0.0, 0.8, 0.0] {
        assert_eq!(after(&mut shop, 4.0, share), None);
    }
    let account = shop.instrument.view().edge;
    assert_eq!(account.counted(), Counted::Turning);
    // The knobs: the Choose page, down to the last field, one detent.
    shop.press(Knob::Left);
    shop.turn(Knob::Left, 10);
    assert_eq!(shop.instrument.view().page, Page::Choose(Field::Load));
    shop.turn(Knob::Right, 1);
    assert!(shop.instrument.view().setup.load);
    shop.press(Knob::Left);
    // Nobody saw it run up since: it is known after the next start.
    assert_eq!(after(&mut shop, 6.0, 0.0), None);
    shop.stop();
    shop.start(280.0);
    assert_eq!(after(&mut shop, 5.0, 0.0), Some(Mark::Free));
    assert_eq!(after(&mut shop, 4.0, 0.8), Some(Mark::Heavy));
    shop.press(Knob::Left);
    shop.turn(Knob::Right, -1);
    assert!(!shop.instrument.view().setup.load);
    assert_eq!(shop.instrument.view().load, None);
}

#[test]
fn the_edge_stands_still_while_the_spindle_turns_free() {
    let machine = machine("geared-lathe");
    let mut shop = Shop::new(&machine, loaded(25.0), LatheSpec::default(), 2);
    shop.start(450.0);
    shop.run(60.0);
    let used = |shop: &Shop| shop.instrument.view().edge.used();
    assert_eq!(used(&shop), 0.0);
    shop.watch(30.0, 0.5, &mut Vec::new());
    let cut = used(&shop);
    shop.watch(60.0, 0.0, &mut Vec::new());
    let free = used(&shop);
    shop.lathe.motor(MotorSwitch::Off);
    shop.run(20.0);
    let account = shop.instrument.view().edge;
    assert_eq!(account.counted(), Counted::Cutting);
    // A second or so until a cut, and its end, is told.
    assert!(free - cut < 0.06 * cut, "{cut} {free}");
    assert_eq!(account.used(), free);
    // The same with the load off counts all of it, 150 s and more for 30, and free it turns even faster.
    let mut blind = Shop::new(&machine, bar(25.0), LatheSpec::default(), 2);
    blind.start(450.0);
    blind.run(60.0);
    blind.watch(30.0, 0.5, &mut Vec::new());
    blind.watch(60.0, 0.0, &mut Vec::new());
    assert!(used(&blind) > 5.0 * free, "{} {free}", used(&blind));
}

#[test]
fn it_is_refused_with_its_reason() {
    let variable = machine("variable-lathe");
    assert_eq!(variable.tells_load(), Err(NoLoad::Drive));
    let mut instrument = Instrument::new(Instant::ZERO, variable.clone(), Some(loaded(25.0)));
    assert!(
        !instrument.view().setup.load,
        "not even where it is remembered"
    );
    let mut now = Instant::ZERO;
    let mut press = |instrument: &mut Instrument| {
        for event in [Event::Press(Knob::Left), Event::Release(Knob::Left)] {
            now += Duration::from_millis(100);
            instrument.handle(now, event);
            instrument.poll(now);
        }
    };
    press(&mut instrument);
    press(&mut instrument);
    instrument.handle(Instant::ZERO, Event::Turn(Knob::Left, 10));
    instrument.handle(Instant::ZERO, Event::Turn(Knob::Right, 3));
    assert!(!instrument.view().setup.load);
    let mut frame = Frame::new();
    let Ok(()) = instrument.draw(&mut frame);
    assert!(frame.shows(NoLoad::Drive.words()), "{frame:?}");

    let text = |motor: &str| {
        format!(
            "name = \"A lathe\"\nkind = \"lathe\"\n{motor}\n[sensor]\npulses = 2\n\
             [[step]]\nlabel = \"slow\"\nrpm = 100\n[[holder]]\nkind = \"collet\"\n"
        )
    };
    let of = |motor: &str| {
        profile::parse(&text(motor), "a profile")
            .unwrap()
            .tells_load()
    };
    assert_eq!(of(""), Err(NoLoad::NoMotor));
    assert_eq!(of("[motor]\nkw = 1.1"), Err(NoLoad::NoRatedSpeed));
    assert_eq!(of("[motor]\nkw = 1.1\nrated_rpm = 1440"), Ok(()));
    assert_eq!(
        of("[motor]\nkind = \"inverter\"\nkw = 1.1\nrated_rpm = 1440"),
        Err(NoLoad::Drive)
    );
    let ranges = text("[motor]\nkw = 1.1\nrated_rpm = 1440").replace(
        "[[step]]\nlabel = \"slow\"\nrpm = 100",
        "[[range]]\nlabel = \"all\"\nlow_rpm = 100\nhigh_rpm = 900",
    );
    let ranges = profile::parse(&ranges, "a profile").unwrap();
    assert_eq!(ranges.tells_load(), Err(NoLoad::NoSteps));
}

/// The geared lathe's steps replaced by these.
fn stepped(plates: &[f32]) -> Machine {
    let steps: String = plates
        .iter()
        .map(|n| format!("[[step]]\nlabel = \"{n}\"\nrpm = {n}\n"))
        .collect();
    let text = format!(
        "name = \"A lathe\"\nkind = \"lathe\"\n[motor]\nkw = 1.1\nrated_rpm = 1440\n\
         [sensor]\npulses = 2\n{steps}[[holder]]\nkind = \"collet\"\n"
    );
    profile::parse(&text, "a profile").unwrap_or_else(|e| panic!("{e}"))
}

#[test]
fn no_bar_where_slip_cannot_tell_the_steps_apart() {
    // Steps of R40, R20 and R10 of ISO 3, and one far from both.
    for (near, told) in [(475.0, false), (500.0, false), (560.0, true)] {
        let machine = stepped(&[450.0, near, 1120.0]);
        let mut shop = Shop::new(&machine, loaded(25.0), LatheSpec::default(), 2);
        for plate in [450.0, near, 1120.0] {
            shop.start(plate);
            let free = after(&mut shop, 6.0, 0.0);
            let heavy = after(&mut shop, 4.0, 0.9);
            let expected = told || plate == 1120.0;
            assert_eq!(
                free == Some(Mark::Free),
                expected,
                "{near} {plate} {free:?}"
            );
            assert_eq!(heavy.is_some(), expected, "{near} {plate} {heavy:?}");
            shop.cut(0.0);
            shop.stop();
        }
    }
}

#[test]
fn marks_are_coarse_and_in_order() {
    assert!(Mark::ALL.windows(2).all(|w| w[0] < w[1]));
    assert!(Mark::ALL.iter().all(|m| m.word().len() <= 8));
    for (load, mark) in [
        (-1.0, Mark::Working),
        (0.0, Mark::Working),
        (0.59, Mark::Working),
        (0.61, Mark::Heavy),
        (1.29, Mark::Heavy),
        (1.31, Mark::Stalling),
        (f32::INFINITY, Mark::Stalling),
        (f32::NAN, Mark::Working),
    ] {
        assert_eq!(Mark::of(load), mark, "{load}");
    }
}
