//! Slip of an induction motor on the mains, and the load that it tells.
//!
//! The field turns at n_s = 120 f / p; the rotor lacks s = (n_s - n) / n_s to it. Up to the rated point the torque is close to
//! proportional to the slip (Hubert, Electric Machines, ch. 5, worked example on p. 201; that small slips make it so follows
//! from the equivalent circuit: Fitzgerald, Kingsley and Umans, Electric Machinery, polyphase induction machines, from memory).
//! Beyond, the curve bends until the motor breaks down at two to three times its rated torque: there the law says less than
//! is true.
//!
//! A spindle turns with the motor through a fixed ratio, so that ratios of its own speeds are ratios of the motor's.

/// Synchronous speeds, rev/min, of motors of 2 to 8 poles on 50 and 60 Hz: 120 f / p.
pub const SYNCHRONOUS_RPM: [f32; 8] =
    [750.0, 900.0, 1000.0, 1200.0, 1500.0, 1800.0, 3000.0, 3600.0];

/// Rated slips of motors as they are built: from large ones of good efficiency to small and single-phase ones (common
/// practice, no source).
pub const RATED_SLIP: (f32, f32) = (0.005, 0.12);

/// The slip, a share of the synchronous speed `n_s`, at `n` rev/min; `None` where the rotor is not slower than the field, or
/// an argument is no positive number.
pub fn slip(n_s: f32, n: f32) -> Option<f32> {
    (n > 0.0 && n < n_s && n_s.is_finite()).then(|| (n_s - n) / n_s)
}

/// The rated slip of a motor with `rated` rev/min on its plate: to the nearest synchronous speed above it, for none slips by
/// the whole way to the next. `None` where that is not within [`RATED_SLIP`]: no motor of 2 to 8 poles on 50 or 60 Hz.
pub fn rated(rated: f32) -> Option<f32> {
    let n_s = SYNCHRONOUS_RPM.into_iter().find(|n_s| rated < *n_s)?;
    let (least, most) = RATED_SLIP;
    slip(n_s, rated).filter(|s| (least..=most).contains(s))
}

/// The load as a share of what the rated torque leaves beyond free running: 0 at the free speed `n_0`, 1 at the rated slip.
///
/// (n_0 - n) / (n_0 (s_rated - s_free)) with `n` the speed, in the unit of `n_0`, and the motor's rated slip and its slip at
/// the free speed as shares. A share of the rated torque itself where `n_0` is the synchronous speed and `s_free` 0.
/// Good up to 1; above, the motor gives less than it says. `None` where an argument is no finite number, `n` is not above 0,
/// or `s_rated` is not above `s_free`. At `n` above `n_0`: 0.
pub fn load(n_0: f32, n: f32, s_rated: f32, s_free: f32) -> Option<f32> {
    let span = n_0 * (s_rated - s_free);
    let sound = n > 0.0 && n_0.is_finite() && span > f32::MIN_POSITIVE && span.is_finite();
    sound.then(|| ((n_0 - n) / span).max(0.0))
}
