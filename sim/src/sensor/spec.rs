//! What a sensor and its magnets are, in numbers, and what can go wrong with them.

/// The parameters of a sensor. They are taken as they are: whoever reads them from a file checks them.
///
/// The figures of a fault have no effect until the fault is switched on.
#[derive(Clone, Debug, PartialEq)]
pub struct SensorSpec {
    /// Number of magnets, evenly spaced but for [`SensorSpec::placement`].
    pub magnets: u32,
    /// How far each magnet sits from its even place, forwards, degrees; missing ones are 0.
    pub placement: Vec<f64>,
    /// How long the line is low in one passage, degrees of the spindle.
    pub width: f64,
    /// How far the magnet must go back before the sensor lets go, degrees; less than the width.
    pub hysteresis: f64,
    /// Standard deviation of an edge's delay, ns. The delay is four of these on average and never negative, as that of a
    /// sensor which samples its field is. 2 us: generic switches have 1 to 10 us (from memory).
    pub jitter_ns: f64,
    /// The same for a magnet or bearing that rattles, degrees of the spindle.
    pub jitter_deg: f64,

    /// [`Fault::Chatter`]: most extra pieces that one edge falls into; at least 1.
    pub chatter_pieces: u32,
    /// [`Fault::Chatter`]: how far behind its edge the last piece may come, degrees of the spindle.
    pub chatter_zone: f64,
    /// [`Fault::Spikes`]: how many a second on average.
    pub spike_rate: f64,
    /// [`Fault::Spikes`]: shortest and longest, ns.
    pub spike_width_ns: (f64, f64),
    /// [`Fault::Dropouts`]: probability that a passage makes no pulse.
    pub dropout: f64,
    /// [`Fault::ShakeRegular`] and [`Fault::ShakeRandom`]: how often a second the magnet comes to the sensor.
    pub shake_hz: f64,
    /// The same: the share of the time for which the line is low.
    pub shake_low: f64,
}

impl Default for SensorSpec {
    /// Two magnets, 12 degrees wide, a little jitter (estimates; common practice, no source).
    fn default() -> Self {
        SensorSpec {
            magnets: 2,
            placement: Vec::new(),
            width: 12.0,
            hysteresis: 1.0,
            jitter_ns: 2_000.0,
            jitter_deg: 0.0,
            chatter_pieces: 3,
            chatter_zone: 0.5,
            spike_rate: 20.0,
            spike_width_ns: (200.0, 20_000.0),
            dropout: 0.05,
            shake_hz: 24.0,
            shake_low: 0.5,
        }
    }
}

impl SensorSpec {
    /// A perfect sensor with evenly spaced magnets.
    pub fn ideal(magnets: u32) -> Self {
        SensorSpec {
            magnets,
            width: 12.0f64.min(120.0 / f64::from(magnets.max(1))),
            hysteresis: 0.0,
            jitter_ns: 0.0,
            ..SensorSpec::default()
        }
    }
}

/// What can go wrong; all of it can be switched on and off while the spindle turns.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Fault {
    /// Edges fall into pieces.
    Chatter,
    /// Electrical noise flips the line for moments, at random times.
    Spikes,
    /// Passages are missed at random.
    Dropouts,
    /// One magnet has come off; they are counted from 0.
    MagnetLost(u32),
    /// The line stays high: the cable is off, or the sensor dead.
    StuckHigh,
    /// The line stays low: a short circuit. It wins over [`Fault::StuckHigh`].
    StuckLow,
    /// A magnet is parked at the switching point of a still spindle that shakes regularly, as with the mains or a
    /// neighbouring machine.
    ShakeRegular,
    /// The same with a spindle that shakes at random. It wins over [`Fault::ShakeRegular`].
    ShakeRandom,
}
