//! What a lathe is, in numbers.

use super::motor::{Feed, MotorSpec};
use core::f64::consts::PI;

/// The physical parameters of a lathe. They are taken as they are: whoever reads them from a file checks them.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LatheSpec {
    /// The motor.
    pub motor: MotorSpec,
    /// How the motor is fed.
    pub feed: Feed,
    /// Moment of inertia of rotor, motor pulley and whatever else turns with the motor, kg m2; above 0.
    pub motor_inertia: f64,
    /// Moment of inertia of spindle and chuck, kg m2; above 0.
    pub spindle_inertia: f64,
    /// Dry (speed-independent) friction on the motor's side: bearings, belt, N m at the motor.
    pub motor_friction: f64,
    /// Dry friction of the spindle's bearings and seals, N m.
    pub spindle_friction: f64,
    /// Viscous friction of the spindle, N m s/rad.
    pub spindle_drag: f64,
    /// What the belt slips at rated torque of the motor, as a share of the speed; in proportion at other torques.
    pub belt_slip: f64,
    /// What the belt creeps in addition once it is warm, as a share of the speed.
    pub belt_creep: f64,
    /// How long it takes to warm up to 63 %, and to cool down, s; above 0.
    pub belt_warming: f64,
    /// Rounds of the belt in one turn of the motor: circumference of the motor pulley over length of the belt; above 0.
    pub belt_rounds: f64,
    /// Belt-frequency ripple of the speed, as a share of it.
    pub belt_ripple: f64,
    /// Once-per-turn ripple of the speed, as a share of it.
    pub turn_ripple: f64,
    /// How far the mains frequency strays, as a share of it.
    pub mains_wander: f64,
    /// Time between the turns of its wandering, s; above 0.
    pub mains_period: f64,
    /// The deceleration that the foot brake reaches at full pedal, friction and cut included, rpm of the spindle per second.
    /// (Where those two alone slow it faster, the brake adds nothing.)
    pub brake_limit: f64,
    /// Whether the pedal switches the motor off.
    pub brake_stops_motor: bool,
}

impl Default for LatheSpec {
    /// A small 1.1 kW bench lathe with a 160 mm chuck. The figures are estimates from sizes and masses; ripple, wander and
    /// brake limit are those that Rimrate is designed for (all common practice, no source).
    fn default() -> Self {
        LatheSpec {
            motor: MotorSpec::default(),
            feed: Feed::Mains,
            motor_inertia: 0.006,
            spindle_inertia: 0.032,
            motor_friction: 0.3,
            spindle_friction: 0.4,
            spindle_drag: 0.004,
            belt_slip: 0.008,
            belt_creep: 0.003,
            belt_warming: 300.0,
            belt_rounds: 0.23,
            belt_ripple: 0.002,
            turn_ripple: 0.002,
            mains_wander: 0.002,
            mains_period: 5.0,
            brake_limit: 3000.0,
            brake_stops_motor: true,
        }
    }
}

impl LatheSpec {
    /// The same lathe without anything that makes its speed uneven or lossy: no friction, slip, creep, ripple or wander.
    pub fn without_losses(self) -> Self {
        LatheSpec {
            motor_friction: 0.0,
            spindle_friction: 0.0,
            spindle_drag: 0.0,
            belt_slip: 0.0,
            belt_creep: 0.0,
            belt_ripple: 0.0,
            turn_ripple: 0.0,
            mains_wander: 0.0,
            ..self
        }
    }
}

/// Moment of inertia of a solid round bar about its axis, kg m2: J = m D^2 / 8. Diameter and length in mm, density in
/// kg/m3 (steel 7850).
pub fn round_bar_inertia(diameter: f64, length: f64, density: f64) -> f64 {
    let (d, l) = (diameter * 1e-3, length * 1e-3);
    density * PI / 4.0 * d * d * l * d * d / 8.0
}
