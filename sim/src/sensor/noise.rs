//! Toggles that come with time, not with the motion: electrical noise, and a magnet that shakes at the switching point.

use super::line::Line;
use super::spec::SensorSpec;
use crate::random::Random;

/// Noise spikes: a Poisson process, each spike with a width drawn evenly.
#[derive(Clone, Debug, Default)]
pub(super) struct Spikes {
    /// When the next one comes, ns.
    next: Option<u64>,
}

impl Spikes {
    /// Puts all spikes that begin in a stretch of time on the line.
    pub(super) fn play(
        &mut self,
        on: bool,
        (from, to): (u64, u64),
        spec: &SensorSpec,
        random: &mut Random,
        line: &mut Line,
    ) {
        if !on || spec.spike_rate <= 0.0 {
            self.next = None;
            return;
        }
        let wait = |random: &mut Random| nanos(random.wait(1e9 / spec.spike_rate));
        let mut next = match self.next {
            Some(next) => next,
            None => from.saturating_add(wait(random)),
        };
        while next < to {
            let (shortest, longest) = spec.spike_width_ns;
            line.toggle(next);
            line.toggle(next.saturating_add(nanos(random.between(shortest, longest))));
            next = next.saturating_add(wait(random));
        }
        self.next = Some(next);
    }
}

/// How the magnet shakes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Shake {
    Regular,
    Random,
}

/// A magnet parked at the switching point of a still spindle that shakes.
#[derive(Clone, Debug, Default)]
pub(super) struct Shaking {
    /// When the next toggle comes, ns, and of which kind of shaking.
    next: Option<(u64, Shake)>,
    /// The line is at the other level than the magnets alone would give it.
    away: bool,
}

impl Shaking {
    /// Puts the shaking in a stretch of time on the line; without shaking the line comes back to the level that the
    /// magnets alone give it (`facing`: low).
    pub(super) fn play(
        &mut self,
        shake: Option<Shake>,
        facing: bool,
        (from, to): (u64, u64),
        spec: &SensorSpec,
        random: &mut Random,
        line: &mut Line,
    ) {
        let Some(shake) = shake.filter(|_| spec.shake_hz > 0.0) else {
            self.next = None;
            if self.away {
                self.away = false;
                line.toggle(from);
            }
            return;
        };
        let mut next = match self.next {
            Some((next, kind)) if kind == shake => next,
            _ => from.saturating_add(self.stay(shake, facing, spec, random)),
        };
        while next < to {
            line.toggle(next);
            self.away = !self.away;
            next = next.saturating_add(self.stay(shake, facing, spec, random));
        }
        self.next = Some((next, shake));
    }

    /// How long the line now stays where it is, ns; at least 1.
    fn stay(&self, shake: Shake, facing: bool, spec: &SensorSpec, random: &mut Random) -> u64 {
        let share = if self.away != facing {
            spec.shake_low
        } else {
            1.0 - spec.shake_low
        };
        let mean = share * 1e9 / spec.shake_hz;
        nanos(match shake {
            Shake::Regular => mean,
            Shake::Random => random.wait(mean),
        })
        .max(1)
    }
}

/// Nanoseconds rounded to whole ones; anything negative or not a number is 0.
pub(super) fn nanos(x: f64) -> u64 {
    libm::round(x) as u64
}
