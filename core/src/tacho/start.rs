//! What is a start: pulses that agree as those of a spindle do, and not as a parked magnet's that shakes.

use super::{LOW_SHARE_AGREES, State, Tacho};

/// With experience: how far, as a factor, the low share of a start may be from what was seen while turning. Placement makes it
/// differ by a fifth, and a run-up from rest by a sixth.
const START_AGREES: f32 = 1.5;
/// How well pulses must agree to be a start. The fewer there are, the better.
struct Start {
    /// Intervals between them.
    intervals: usize,
    /// How far, as a factor, neighbouring intervals may differ.
    interval: f32,
    /// How far, as a factor, neighbouring low shares may differ.
    share: f32,
    by: Experience,
}

/// What the low shares of a start are held against.
#[derive(Clone, Copy, PartialEq)]
enum Experience {
    /// Experience where there is any, else the widest that turning explains.
    Any,
    /// Experience, closely.
    Needed,
    /// Half of the widest that turning explains: the sensor was moved, or experience began with an odd turn. No parked magnet
    /// shakes so evenly and passes so narrow. What was known is forgotten.
    Outdated,
}

/// Any of these is a start. A run-up from rest at constant torque shortens its third interval to 0.77 of its second, its
/// seventh to 0.93 of its sixth; six magnets each 3 degrees off make neighbouring intervals differ by up to a fifth.
/// A magnet that shakes at random meets each of them less than once in an hour (see the tests).
const STARTS: [Start; 5] = [
    Start {
        intervals: 3,
        interval: 1.03,
        share: 1.08,
        by: Experience::Any,
    },
    Start {
        intervals: 3,
        interval: 1.05,
        share: 1.08,
        by: Experience::Needed,
    },
    Start {
        intervals: 5,
        interval: 1.40,
        share: 1.40,
        by: Experience::Needed,
    },
    Start {
        intervals: 7,
        interval: 1.38,
        share: 1.50,
        by: Experience::Any,
    },
    Start {
        intervals: 7,
        interval: 1.03,
        share: 1.08,
        by: Experience::Outdated,
    },
];
/// Six magnets each 3 degrees off: 66 degrees after 54.
const LONGER: f32 = 1.23;
/// From so many magnets on a start takes one interval more.
const SEVERAL: u16 = 4;
/// The longest start has this many pulses.
pub(super) const START_PULSES: usize = 8;
/// From lost, two intervals as before are enough.
const RETURN: Start = Start {
    intervals: 2,
    interval: 1.40,
    share: 1.60,
    by: Experience::Any,
};
/// How far the speed may be from the last one to end a loss.
const SPEEDS_AGREE: f32 = 0.10;

impl Tacho {
    /// How many of the last pulses are a start.
    pub(super) fn starts(&mut self) -> Option<usize> {
        // More magnets are more chances for one that shakes, and a pulse more costs less time.
        let more = usize::from(self.config.pulses.get() >= SEVERAL);
        for start in &STARTS {
            let intervals = (start.intervals + more).min(START_PULSES - 1);
            if self.agree(intervals, start) {
                if start.by == Experience::Outdated {
                    self.low_share = None;
                    self.widest = self.widest();
                }
                return Some(intervals + 1);
            }
        }
        let State::Lost(speed) = self.state else {
            return None;
        };
        let count = RETURN.intervals + 1;
        let as_before = self
            .starting_speed(count)
            .is_some_and(|n| (n / speed - 1.0).abs() < SPEEDS_AGREE);
        (as_before && self.agree(RETURN.intervals, &RETURN)).then_some(count)
    }

    /// Whether the last pulses are such a start.
    fn agree(&self, intervals: usize, start: &Start) -> bool {
        let Some(skip) = self.latest.len().checked_sub(intervals + 1) else {
            return false;
        };
        // With experience at both ends, without only at the wide one.
        let (narrowest, widest) = match (start.by, self.low_share) {
            (Experience::Needed, None) => return false,
            (Experience::Needed, Some(share)) => (share / START_AGREES, share * START_AGREES),
            (Experience::Any, Some(share)) => (share / LOW_SHARE_AGREES, share * LOW_SHARE_AGREES),
            (Experience::Any, None) => (0.0, self.widest_share()),
            (Experience::Outdated, _) => (0.0, self.without_experience() / 2.0),
        };
        let alike = |a: f32, b: f32, factor: f32| a < factor * b && b < factor * a;
        // A spindle that starts does not slow down: longer intervals come from placement alone.
        let longer = start.interval.min(LONGER);
        let mut pulses = self.latest.oldest_ordered().skip(skip);
        let Some(mut before) = pulses.next() else {
            return false;
        };
        let mut last: Option<(f32, f32)> = None;
        for pulse in pulses {
            let interval = pulse.at.since(before.at).secs_f32();
            let share = before.width as f32 * 1e-9 / interval;
            let as_last = last.is_none_or(|(i, s)| {
                interval < longer * i
                    && i < start.interval * interval
                    && alike(share, s, start.share)
            });
            if !(narrowest..=widest).contains(&share) || !as_last {
                return false;
            }
            last = Some((interval, share));
            before = pulse;
        }
        true
    }

    fn starting_speed(&self, count: usize) -> Option<f32> {
        let skip = self.latest.len().checked_sub(count)?;
        let from = self.latest.oldest_ordered().nth(skip)?;
        let span = self.latest.recent()?.at.since(from.at).secs_f32();
        (span > 0.0).then(|| (count - 1) as f32 / f32::from(self.config.pulses.get()) / span)
    }
}
