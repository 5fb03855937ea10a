//! The ring of magnets: between which two angles the line holds its level.

use super::spec::SensorSpec;

/// Where the sensor is in the ring. Places count up without end: turn by turn, magnet by magnet.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Place {
    /// After the magnet of this number and before the next.
    Behind(i64),
    /// Facing the magnet of this number.
    Facing(i64),
}

/// The magnets in the order in which they pass.
#[derive(Clone, Debug)]
pub(super) struct Track {
    /// Angle of each magnet's middle within the turn, rev, and its number in the specification.
    magnets: Vec<(f64, u32)>,
    /// From a magnet's middle to where the sensor takes it and where it lets go of it, rev.
    take: f64,
    release: f64,
}

impl Track {
    pub(super) fn new(spec: &SensorSpec) -> Self {
        let mut magnets: Vec<(f64, u32)> = (0..spec.magnets)
            .map(|number| {
                let off = spec.placement.get(number as usize).copied().unwrap_or(0.0);
                let at = f64::from(number) / f64::from(spec.magnets) + off / 360.0;
                (at - libm::floor(at), number)
            })
            .collect();
        magnets.sort_by(|a, b| a.0.total_cmp(&b.0));
        // Taken half the hysteresis late and released half of it late: low for exactly the width, in either direction.
        Track {
            magnets,
            take: (spec.width - spec.hysteresis) / 720.0,
            release: (spec.width + spec.hysteresis) / 720.0,
        }
    }

    /// The angle of the middle of a magnet, rev, and its number in the specification. None without magnets.
    fn middle(&self, place: i64) -> Option<(f64, u32)> {
        let count = i64::try_from(self.magnets.len()).ok()?;
        let turn = place.checked_div_euclid(count)?;
        let index = usize::try_from(place.rem_euclid(count)).ok()?;
        let (at, number) = self.magnets.get(index)?;
        Some((turn as f64 + at, *number))
    }

    /// The number in the specification of the magnet at a place.
    pub(super) fn number(&self, place: i64) -> Option<u32> {
        self.middle(place).map(|(_, number)| number)
    }

    /// The place at an angle, as if the sensor had just been switched on there.
    pub(super) fn place(&self, angle: f64) -> Place {
        let turn = libm::floor(angle) as i64;
        let count = self.magnets.len() as i64;
        let mut last = turn * count - 1;
        for place in turn * count - 1..=(turn + 1) * count {
            let Some((middle, _)) = self.middle(place) else {
                break;
            };
            if (angle - middle).abs() <= self.take {
                return Place::Facing(place);
            }
            if middle <= angle {
                last = place;
            }
        }
        Place::Behind(last)
    }

    /// The angles at which the place changes, turning backwards and turning forwards, rev.
    pub(super) fn limits(&self, place: Place) -> (f64, f64) {
        let middle = |place| self.middle(place).map(|(at, _)| at);
        match place {
            Place::Behind(n) => (
                middle(n).map_or(f64::NEG_INFINITY, |at| at + self.take),
                middle(n + 1).map_or(f64::INFINITY, |at| at - self.take),
            ),
            Place::Facing(n) => (
                middle(n).map_or(f64::NEG_INFINITY, |at| at - self.release),
                middle(n).map_or(f64::INFINITY, |at| at + self.release),
            ),
        }
    }

    /// The next place, turning forwards or backwards.
    pub(super) fn next(place: Place, forwards: bool) -> Place {
        match (place, forwards) {
            (Place::Behind(n), true) => Place::Facing(n + 1),
            (Place::Behind(n), false) => Place::Facing(n),
            (Place::Facing(n), true) => Place::Behind(n),
            (Place::Facing(n), false) => Place::Behind(n - 1),
        }
    }
}
