//! The equation of motion, step by step.

use super::cut::Cut;
use super::hand::Hand;
use super::mains::Wander;
use super::motor::{Curve, Feed, Pull, Regulator};
use super::segment::{Ripple, Segment, Wave};
use super::spec::LatheSpec;
use crate::random::Random;
use core::f64::consts::TAU;
use rimrate_core::time::{Duration, Instant};

/// The longest step, ns: six degrees at 1000 rpm. Against steps a sixty-fourth as long a motor on the mains, through run-up,
/// interrupted cut and plug reversal, stays within 0.04 % of the plate speed (see the tests).
const STEP_NS: u64 = 1_000_000;
/// A step is cut short when the motor would change its speed by more than this share of the field's, but not below the
/// shortest step, ns.
const LEAP: f64 = 0.02;
const SHORTEST_STEP_NS: u64 = 500;
/// How quickly the belt's slip follows the torque, s (an estimate; it keeps slip and torque from being one equation).
const SLIP_LAG: f64 = 0.05;
/// Streams of the run's seed.
const STREAM_MAINS: u64 = 0x6d61_696e;
const STREAM_START: u64 = 0x7374_6172;
const STREAM_HAND: u64 = 0x6861_6e64;

/// The motor's switch.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum MotorSwitch {
    /// Off: on the mains the motor coasts; a regulated drive ramps down and lets go.
    #[default]
    Off,
    /// Forward, as most work is turned.
    Forward,
    /// Reverse.
    Reverse,
}

impl MotorSwitch {
    /// 1 forward, -1 in reverse, 0 off.
    fn way(self) -> f64 {
        match self {
            MotorSwitch::Off => 0.0,
            MotorSwitch::Forward => 1.0,
            MotorSwitch::Reverse => -1.0,
        }
    }
}

/// A lathe in motion.
///
/// It starts at time 0, standing still at an angle drawn from the seed, switched off and in neutral: [`Lathe::select`] a
/// step first.
#[derive(Clone, Debug)]
pub struct Lathe {
    spec: LatheSpec,
    curve: Curve,
    /// Rated torque of the motor, N m.
    rated_torque: f64,
    regulator: Option<Regulator>,
    mains: Wander,

    now: Instant,
    /// Smooth angle, rev.
    angle: f64,
    /// Smooth speed, rev/s.
    speed: f64,
    ripple: Ripple,
    /// The belt's slip under load, and its creep, as shares of the speed.
    slip: f64,
    creep: f64,
    /// Torque of the motor in the last step, N m.
    motor_torque: f64,

    switch: MotorSwitch,
    /// When a jog ends.
    jog_ends: Option<Instant>,
    /// The motor brakes against its own direction and goes off at standstill.
    plugging: bool,
    /// Turns of the motor in one of the spindle; nothing in neutral.
    ratio: Option<f64>,
    /// Spindle speed that a regulated drive is set to, rpm.
    setting: f64,
    pedal: f64,
    cut: Option<Cut>,
    work_inertia: f64,
    /// Somebody turns the chuck.
    hand: Option<Hand>,
    hand_chance: Random,
}

impl Lathe {
    /// A lathe at rest at time 0; the same seed gives the same run.
    pub fn new(spec: LatheSpec, seed: u64) -> Self {
        let mut start = Random::new(seed, STREAM_START);
        let angle = start.uniform();
        let turn = Wave {
            share: spec.turn_ripple,
            per_turn: 1.0,
            phase: start.between(0.0, TAU),
        };
        let belt = Wave {
            share: spec.belt_ripple,
            per_turn: 1.0,
            phase: start.between(0.0, TAU),
        };
        Lathe {
            curve: Curve::new(&spec.motor),
            rated_torque: spec.motor.rated_torque(),
            regulator: match spec.feed {
                Feed::Mains => None,
                Feed::Regulated(drive) => Some(Regulator::new(drive, &spec.motor)),
            },
            mains: Wander::new(
                spec.mains_wander,
                spec.mains_period,
                Random::new(seed, STREAM_MAINS),
            ),
            now: Instant::ZERO,
            angle,
            speed: 0.0,
            ripple: Ripple { turn, belt },
            slip: 0.0,
            creep: 0.0,
            motor_torque: 0.0,
            switch: MotorSwitch::Off,
            jog_ends: None,
            plugging: false,
            ratio: None,
            setting: 0.0,
            pedal: 0.0,
            cut: None,
            work_inertia: 0.0,
            hand: None,
            hand_chance: Random::new(seed, STREAM_HAND),
            spec,
        }
    }

    /// Turns the motor's switch.
    pub fn motor(&mut self, to: MotorSwitch) {
        self.switch = to;
        self.jog_ends = None;
        self.plugging = false;
        self.hand = None;
    }

    /// Switches the motor off and, once the spindle stands, turns it by hand: so many turns forwards, pull by pull, each as
    /// long and as fast as it happens. The hand lets go when the motor is switched.
    pub fn turn_by_hand(&mut self, turns: f64) {
        self.motor(MotorSwitch::Off);
        self.hand = Some(Hand::new(turns));
    }

    /// Switches the motor on for a short time.
    pub fn jog(&mut self, way: MotorSwitch, time: Duration) {
        self.motor(way);
        self.jog_ends = Some(self.now + time);
    }

    /// Brakes with the motor: reversed until the spindle stands, then off. A spindle at rest stays at rest.
    pub fn plug(&mut self) {
        self.motor(if self.speed > 0.0 {
            MotorSwitch::Reverse
        } else if self.speed < 0.0 {
            MotorSwitch::Forward
        } else {
            MotorSwitch::Off
        });
        self.plugging = self.switch != MotorSwitch::Off;
    }

    /// Moves the levers to the step of this plate speed: the spindle's speed when the motor turns at its rated speed (a
    /// regulated drive: at its base speed), rpm, without slip of the belt. Anything but a positive number is neutral.
    ///
    /// It does so even while the spindle turns. The spindle keeps its speed, and the motor then pulls it to the new one.
    pub fn select(&mut self, plate_rpm: f64) {
        if !(plate_rpm > 0.0 && plate_rpm.is_finite()) {
            self.ratio = None;
            return;
        }
        let motor_rpm = match self.spec.feed {
            Feed::Mains => self.spec.motor.rated_rpm,
            Feed::Regulated(drive) => drive.base_rpm,
        };
        let ratio = motor_rpm / plate_rpm;
        self.ratio = Some(ratio);
        // The belt now comes round more or less often per turn; the spindle itself does not jump.
        let true_angle = self.ripple.angle(self.angle);
        self.ripple.belt.per_turn = self.spec.belt_rounds * ratio;
        self.angle = self.ripple.smooth(true_angle);
    }

    /// Sets the spindle speed that a regulated drive is to hold, rpm; a motor on the mains knows no setting.
    pub fn set_speed(&mut self, spindle_rpm: f64) {
        self.setting = if spindle_rpm.is_finite() {
            spindle_rpm.max(0.0)
        } else {
            0.0
        };
    }

    /// Moves the brake's pedal: 0 free, 1 down.
    pub fn brake(&mut self, pedal: f64) {
        // Not a number compares false everywhere and leaves the pedal up.
        self.pedal = if pedal > 0.0 { pedal.min(1.0) } else { 0.0 };
        if self.pedal > 0.0 && self.spec.brake_stops_motor {
            self.motor(MotorSwitch::Off);
            // The pedal takes a drive's enable away: it would else pull against the brake on its way down.
            if let Some(regulator) = &mut self.regulator {
                regulator.let_go();
            }
        }
    }

    /// Puts the tool to the work, or takes it off.
    pub fn cut(&mut self, cut: Option<Cut>) {
        self.cut = cut;
    }

    /// Grips work of this moment of inertia, kg m2 (see [`super::round_bar_inertia`]).
    pub fn grip(&mut self, inertia: f64) {
        self.work_inertia = inertia;
    }

    /// Runs until a point in time and hands out the motion, piece by piece without gaps.
    pub fn advance(&mut self, until: Instant, on_segment: &mut impl FnMut(&Segment)) {
        while self.now < until {
            if self.jog_ends.is_some_and(|end| end <= self.now) {
                self.motor(MotorSwitch::Off);
            }
            // Steps end on a fixed grid, where a control moves, and at standstill.
            let now = self.now.nanos();
            let mut end = (now / STEP_NS + 1)
                .saturating_mul(STEP_NS)
                .min(until.nanos());
            if let Some(jog) = self.jog_ends {
                end = end.min(jog.nanos());
            }
            let by_hand = self.pulled();
            if let Some((until, _)) = by_hand {
                end = end.min(until.nanos());
            }
            if let Some(segment) = self.step(end - now, by_hand.map(|(_, accel)| accel)) {
                on_segment(&segment);
            }
        }
    }

    /// Until when a hand moves the spindle as it does now, and its acceleration, rev/s2.
    fn pulled(&mut self) -> Option<(Instant, f64)> {
        let stands = self.speed == 0.0;
        let phase = self
            .hand
            .as_mut()?
            .phase(self.now, stands, &mut self.hand_chance);
        match phase {
            None if stands => self.hand = None,
            // At the end of a pull the spindle stands, whatever the rounding.
            Some((_, 0.0)) => self.speed = 0.0,
            _ => {}
        }
        phase
    }

    /// One step of at most `len_ns`, with the acceleration that a hand forces on the spindle, if one does. None where the
    /// spindle has just come to its stop: it takes no time.
    fn step(&mut self, longest_ns: u64, by_hand: Option<f64>) -> Option<Segment> {
        let mut len_ns = longest_ns;
        let mut accel = match by_hand {
            // A stop that comes a nanosecond early is one.
            Some(accel) if self.speed == 0.0 => accel.max(0.0),
            Some(accel) => accel,
            None => self.acceleration(len_ns as f64 * 1e-9),
        };
        // A rotor next to nothing would leap over the bends of the motor's curve in one step.
        let leap = LEAP * self.spec.motor.synchronous_rpm() / 60.0 / self.ratio.unwrap_or(0.0);
        while by_hand.is_none()
            && (accel * len_ns as f64 * 1e-9).abs() > leap
            && len_ns > SHORTEST_STEP_NS
        {
            len_ns /= 2;
            accel = self.acceleration(len_ns as f64 * 1e-9);
        }
        let secs = len_ns as f64 * 1e-9;
        let mut segment = Segment {
            start: self.now,
            len_ns,
            angle: self.angle,
            speed: self.speed,
            accel,
            ripple: self.ripple,
        };
        let mut end_speed = segment.speed_at(secs);
        if self.speed * end_speed < 0.0 {
            // Friction turns round with the motion: the step ends at standstill, to the nanosecond.
            segment.len_ns = (-self.speed / accel * 1e9) as u64;
            end_speed = 0.0;
        }
        let secs = segment.secs();
        self.angle = segment.angle_at(secs);
        self.speed = end_speed;
        self.now += Duration::from_nanos(segment.len_ns);
        if self.speed == 0.0 && self.plugging {
            self.motor(MotorSwitch::Off);
        }
        self.settle_belt(secs);
        let motor_rpm = self.motor_rpm();
        if let Some(regulator) = &mut self.regulator {
            let setting = self.switch.way() * self.setting * self.ratio.unwrap_or(0.0);
            regulator.ramp(setting, motor_rpm, secs);
        }
        (segment.len_ns > 0).then_some(segment)
    }

    /// Smooth acceleration for a step of this length, rev/s2.
    fn acceleration(&mut self, secs: f64) -> f64 {
        let omega = self.speed * TAU;
        let pull = self.pull();
        self.motor_torque = pull.torque;
        let (ratio, yield_) = (self.ratio.unwrap_or(0.0), 1.0 - self.slip - self.creep);
        let drive = pull.torque * ratio;
        let slope = pull.slope * ratio * ratio / yield_ - self.spec.spindle_drag;
        let inertia = self.inertia();
        let dry = self.dry_friction(secs);
        let brake = self.pedal * self.spec.brake_limit / 60.0;

        let way = if self.speed != 0.0 {
            1.0f64.copysign(self.speed)
        } else if drive.abs() > dry + brake * TAU * inertia {
            1.0f64.copysign(drive)
        } else {
            return 0.0;
        };
        let torque = drive - way * dry - self.spec.spindle_drag * omega;

        // Linearly implicit: second order while the motor is soft against the step, and damped instead of ringing where
        // it is so stiff that it would settle inside one step (theta rises from 1/2 towards 1).
        let stiffness = (-slope * secs / inertia).max(-0.5);
        let theta = if stiffness > 2.0 {
            1.0 - 1.0 / stiffness
        } else {
            0.5
        };
        let free = torque / (inertia * (1.0 + theta * stiffness)) / TAU;

        // The foot presses as hard as it takes to slow the spindle at this rate, and no harder.
        let braking = (brake + way * free).clamp(0.0, brake);
        let accel = free - way * braking;
        if self.speed == 0.0 && accel * way <= 0.0 {
            return 0.0;
        }
        accel
    }

    /// The motor's torque at this moment.
    fn pull(&mut self) -> Pull {
        let speed = self.motor_rpm() * TAU / 60.0;
        let way = self.switch.way();
        if let Some(regulator) = &self.regulator {
            regulator.pull(speed)
        } else if way == 0.0 {
            Pull::default()
        } else {
            let factor = self.mains.factor(self.now.nanos());
            self.curve.pull(speed, way, factor)
        }
    }

    /// Everything that turns, seen from the spindle, kg m2.
    fn inertia(&self) -> f64 {
        let ratio = self.ratio.unwrap_or(0.0);
        self.spec.spindle_inertia + self.work_inertia + self.spec.motor_inertia * ratio * ratio
    }

    /// What holds against the motion whatever its speed, seen from the spindle, N m.
    fn dry_friction(&self, secs: f64) -> f64 {
        let cutting = self.cut.map_or(0.0, |cut| {
            cut.torque_between(self.angle, self.angle + self.speed * secs)
        });
        self.spec.spindle_friction + self.spec.motor_friction * self.ratio.unwrap_or(0.0) + cutting
    }

    /// Lets the belt's slip follow the torque and its creep the warmth.
    fn settle_belt(&mut self, secs: f64) {
        let way = if self.speed < 0.0 { -1.0 } else { 1.0 };
        let slip = self.spec.belt_slip * way * self.motor_torque / self.rated_torque;
        self.slip += (slip - self.slip) * (secs / SLIP_LAG).min(1.0);
        let creep = if self.speed == 0.0 {
            0.0
        } else {
            self.spec.belt_creep
        };
        self.creep += (creep - self.creep) * (secs / self.spec.belt_warming).min(1.0);
    }

    /// The time that the lathe has reached.
    pub fn now(&self) -> Instant {
        self.now
    }

    /// The spindle's true speed at this instant, ripple included, rpm; negative in reverse.
    pub fn speed_rpm(&self) -> f64 {
        self.speed * self.ripple.speed(self.angle) * 60.0
    }

    /// The spindle's speed without ripple, rpm; negative in reverse.
    pub fn smooth_rpm(&self) -> f64 {
        self.speed * 60.0
    }

    /// The spindle's true angle since the start, rev; it grows forwards and never wraps.
    pub fn angle(&self) -> f64 {
        self.ripple.angle(self.angle)
    }

    /// The motor's speed, rpm; 0 in neutral, where nobody asks.
    pub fn motor_rpm(&self) -> f64 {
        let ratio = self.ratio.unwrap_or(0.0);
        self.speed * 60.0 * ratio / (1.0 - self.slip - self.creep)
    }

    /// The motor's torque in the last step, N m; negative in reverse.
    pub fn motor_torque(&self) -> f64 {
        self.motor_torque
    }

    /// The motor's torque in the last step over its rated torque, whichever way.
    pub fn load(&self) -> f64 {
        (self.motor_torque / self.rated_torque).abs()
    }

    /// Where the motor's switch is: a finished jog or plug reversal has turned it off.
    pub fn switch(&self) -> MotorSwitch {
        self.switch
    }

    /// What the belt loses at this moment, as a share of the speed.
    pub fn belt_loss(&self) -> f64 {
        self.slip + self.creep
    }
}
