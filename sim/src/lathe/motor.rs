//! The motor: an induction motor straight on the mains, or behind a regulated drive.

use core::f64::consts::TAU;

/// A three-phase induction motor, by its name plate and one catalogue figure.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct MotorSpec {
    /// Mains frequency, Hz.
    pub mains_hz: f64,
    /// Number of poles; even, at least 2.
    pub poles: u32,
    /// Rated power at the shaft, W.
    pub rated_power: f64,
    /// Speed at rated power, rpm; below the synchronous speed.
    pub rated_rpm: f64,
    /// Breakdown torque over rated torque; above 1, 2 to 3 as a rule (common practice, no source).
    pub breakdown_ratio: f64,
}

impl Default for MotorSpec {
    /// 1.1 kW, four poles, 50 Hz, 4 % slip: an ordinary small motor (common practice, no source).
    fn default() -> Self {
        MotorSpec {
            mains_hz: 50.0,
            poles: 4,
            rated_power: 1100.0,
            rated_rpm: 1440.0,
            breakdown_ratio: 2.5,
        }
    }
}

/// A torque and how it changes with speed.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(super) struct Pull {
    /// N m.
    pub(super) torque: f64,
    /// N m s/rad; negative where more speed means less torque.
    pub(super) slope: f64,
}

impl MotorSpec {
    /// Speed of the rotating field, rpm: 120 times the frequency over the number of poles.
    pub fn synchronous_rpm(&self) -> f64 {
        120.0 * self.mains_hz / f64::from(self.poles)
    }

    /// Slip at a speed in rpm: what the rotor lacks to the field, as a share of the field's speed.
    pub fn slip(&self, rpm: f64) -> f64 {
        let field = self.synchronous_rpm();
        (field - rpm) / field
    }

    /// Torque at rated power and speed, N m.
    pub fn rated_torque(&self) -> f64 {
        self.rated_power * 60.0 / (TAU * self.rated_rpm)
    }

    /// The largest torque, N m.
    pub fn breakdown_torque(&self) -> f64 {
        self.breakdown_ratio * self.rated_torque()
    }

    /// The slip at the largest torque: Kloss's formula solved so that the curve passes the rated point,
    /// s_b = s_r (k + sqrt(k^2 - 1)) with k the breakdown ratio.
    pub fn breakdown_slip(&self) -> f64 {
        let k = self.breakdown_ratio;
        self.slip(self.rated_rpm) * (k + libm::sqrt(k * k - 1.0))
    }

    /// Torque at a slip, N m, by Kloss's formula T = 2 T_b / (s / s_b + s_b / s), written so that slip 0 is no special
    /// case. (M. Kloss, "Drehmoment und Schlupf des Drehstrommotors", Archiv fuer Elektrotechnik 5, 1917; from memory.)
    ///
    /// It leaves out stator resistance and skin effect, so that the torque at standstill is lower than that of a real
    /// motor with deep bars.
    pub fn torque(&self, slip: f64) -> f64 {
        let s_b = self.breakdown_slip();
        2.0 * self.breakdown_torque() * slip * s_b / (slip * slip + s_b * s_b)
    }
}

/// The numbers of the curve, worked out once.
#[derive(Clone, Copy, Debug)]
pub(super) struct Curve {
    /// Nominal speed of the field, rad/s.
    field: f64,
    breakdown_torque: f64,
    breakdown_slip: f64,
}

impl Curve {
    pub(super) fn new(motor: &MotorSpec) -> Self {
        Curve {
            field: motor.synchronous_rpm() * TAU / 60.0,
            breakdown_torque: motor.breakdown_torque(),
            breakdown_slip: motor.breakdown_slip(),
        }
    }

    /// On the mains: at a speed in rad/s, with the field turning forwards (`way` 1) or backwards (-1).
    pub(super) fn pull(&self, speed: f64, way: f64, frequency_factor: f64) -> Pull {
        let field = way * self.field * frequency_factor;
        let s = (field - speed) / field;
        let s_b = self.breakdown_slip;
        let over = 1.0 / (s * s + s_b * s_b);
        let scale = 2.0 * self.breakdown_torque * s_b * over;
        Pull {
            torque: way * scale * s,
            // dT/ds (s_b^2 - s^2) ... times ds/dspeed = -1 / field.
            slope: -way * scale * (s_b * s_b - s * s) * over / field,
        }
    }
}

/// How the motor is fed.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Feed {
    /// Straight from the mains through a switch.
    Mains,
    /// From a regulated drive with a speed setting.
    Regulated(DriveSpec),
}

/// A regulated variable-speed drive: constant torque up to the base speed, constant power above it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct DriveSpec {
    /// Speed up to which the full torque is there, rpm of the motor.
    pub base_rpm: f64,
    /// The highest speed that it can be set to, rpm of the motor.
    pub top_rpm: f64,
    /// How fast it changes its speed, up and down, rpm of the motor per second.
    pub ramp: f64,
    /// What the speed falls by from no load to rated torque, as a share of the base speed; above 0.
    pub droop: f64,
    /// Largest torque over rated torque; at least 1.
    pub overload: f64,
}

impl Default for DriveSpec {
    /// An ordinary small inverter (common practice, no source).
    fn default() -> Self {
        DriveSpec {
            base_rpm: 1440.0,
            top_rpm: 2880.0,
            ramp: 1000.0,
            droop: 0.005,
            overload: 1.5,
        }
    }
}

/// A regulated drive at work.
#[derive(Clone, Copy, Debug)]
pub(super) struct Regulator {
    spec: DriveSpec,
    rated_torque: f64,
    /// The speed that it holds at this moment, rpm of the motor, on its way to the setting.
    held: f64,
}

impl Regulator {
    pub(super) fn new(spec: DriveSpec, motor: &MotorSpec) -> Self {
        Regulator {
            spec,
            rated_torque: motor.rated_torque(),
            held: 0.0,
        }
    }

    /// Moves the held speed towards `setting` (rpm of the motor; 0 is stop) for a time in seconds.
    ///
    /// A drive that is started catches a motor that already turns, so from rest it begins at the motor's own speed, rpm.
    pub(super) fn ramp(&mut self, setting: f64, motor_rpm: f64, secs: f64) {
        let setting = setting.clamp(-self.spec.top_rpm, self.spec.top_rpm);
        if self.held == 0.0 && setting != 0.0 {
            self.held = motor_rpm;
        }
        let step = self.spec.ramp * secs;
        self.held += (setting - self.held).clamp(-step, step);
    }

    /// Lets go of the motor at once, without a ramp.
    pub(super) fn let_go(&mut self) {
        self.held = 0.0;
    }

    /// At a speed in rad/s; a drive that holds 0 has let go of the motor.
    pub(super) fn pull(&self, speed: f64) -> Pull {
        if self.held == 0.0 {
            return Pull::default();
        }
        let base = self.spec.base_rpm * TAU / 60.0;
        let stiffness = self.rated_torque / (self.spec.droop * base);
        let most = self.spec.overload * self.rated_torque * (base / speed.abs()).min(1.0);
        let torque = stiffness * (self.held * TAU / 60.0 - speed);
        if torque.abs() <= most {
            Pull {
                torque,
                slope: -stiffness,
            }
        } else {
            Pull {
                torque: most.copysign(torque),
                slope: 0.0,
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn published_worked_examples_of_slip() {
        // Hubert, "Electric Machines", examples 4.2 and 4.3 (book pp. 143, 146): six poles, 60 Hz.
        let six = MotorSpec {
            mains_hz: 60.0,
            poles: 6,
            ..MotorSpec::default()
        };
        assert!((six.slip(1100.0) - 0.08333).abs() < 0.000005);
        assert!((six.slip(1164.0) - 0.03).abs() < 1e-12);
        let rpm = six.synchronous_rpm() * (1.0 - 0.0124);
        assert!((rpm - 1185.12).abs() < 0.005);
        assert!((six.slip(1185.12) - 0.0124).abs() < 1e-9);
    }

    #[test]
    fn the_curve_passes_its_three_points() {
        let motor = MotorSpec::default();
        let at = |rpm: f64| motor.torque(motor.slip(rpm));
        assert_eq!(at(motor.synchronous_rpm()), 0.0);
        assert!((at(motor.rated_rpm) - motor.rated_torque()).abs() < 1e-9);
        let top = motor.torque(motor.breakdown_slip());
        assert!((top - motor.breakdown_torque()).abs() < 1e-9);
        for slip in [0.01, 0.1, 0.15, 0.25, 0.5, 1.0, 1.5, 2.0, -0.1] {
            assert!(motor.torque(slip) < top);
        }
    }

    #[test]
    fn the_slope_is_the_curve_s_own() {
        let curve = Curve::new(&MotorSpec::default());
        for way in [1.0, -1.0] {
            for speed in [-170.0, -150.0, -30.0, 0.0, 80.0, 140.0, 156.0, 160.0] {
                let d = 1e-4;
                let rise = curve.pull(speed + d, way, 1.001).torque
                    - curve.pull(speed - d, way, 1.001).torque;
                let slope = curve.pull(speed, way, 1.001).slope;
                assert!(
                    (rise / (2.0 * d) - slope).abs() < 1e-6,
                    "{way} {speed} {slope}"
                );
            }
        }
    }

    #[test]
    fn a_reversed_field_is_the_mirror_image() {
        let curve = Curve::new(&MotorSpec::default());
        for speed in [-150.0, 0.0, 42.0, 156.0] {
            let there = curve.pull(speed, 1.0, 1.0);
            let back = curve.pull(-speed, -1.0, 1.0);
            assert_eq!(there.torque, -back.torque);
            assert_eq!(there.slope, back.slope);
        }
    }
}
