//! Pulses out of the rhythm: extra ones, missing ones, and a spindle that has become faster or slower.

use heapless::Vec;

use super::{LONGEST, RESTLESS, Track, rev};
use crate::tacho::gate::{Pulse, Rejected};
use crate::tacho::placement::REV;
use crate::tacho::signal;
use crate::time::{Duration, Instant};

/// A pulse earlier than this share of the expected spacing is suspected to be an extra one.
pub(super) const EARLY: f32 = 0.75;
/// A pulse after a suspected one that keeps the rhythm so closely, in spacings, makes that one an extra one.
const IN_TIME: f32 = 0.08;
/// The second of two early intervals may be shorter than the first by so much: a spindle that is clutched in.
const FASTER: f32 = 0.55;
const ALIKE: f32 = 1.3;
/// Noise is shorter than this, ns (common practice, no source); with few magnets passages are longer.
const NOISE: u32 = 200_000;
const MANY: u32 = 8;
/// So many spacings without a pulse, and longer than a signal needs to be lost, were a stop.
const PAUSE: f32 = 4.5;
/// A spindle whose pulses are expected so far apart, s, may stand, with a magnet that shakes;
const CRAWLS: f32 = 0.3;
/// no clutch makes it faster by more than so many times the hardest braking (common practice, no source).
const HARDEST: f32 = 4.0;
/// A pulse later than this share may mean that pulses are missing.
const LATE: f32 = 1.5;
/// A whole number of spacings must be met this closely, in spacings, to say that pulses are missing.
const MISSING_WITHIN: f32 = 0.25;
/// A spindle that slows down is not late by whole spacings time and again: so closely,
const EXACT: f32 = 0.1;
/// nor for longer than this, s, or this often in a row where that is longer.
const LATE_FOR: f32 = 0.3;
const LATE_OF_TWO: usize = 2;
const LATE_OF_OTHERS: usize = 4;
const LATE_IN_A_ROW: usize = 8;
/// Fewer missing pulses in a row than this, or than a turn, are filled in for the calm view.
const FILLED: u32 = 4;

impl Track {
    /// Takes a pulse that takes a closer look.
    #[cold]
    pub(super) fn irregular(&mut self, pulse: Pulse, plausible: bool, rejected: &mut Rejected) {
        self.irregular = true;
        let Some(newest) = self.last().filter(|_| self.interval > 0) else {
            return self.accept(pulse, 1, rejected);
        };
        if self.is_due(pulse.at, newest) && self.suspect.is_none() {
            self.late = 0;
            self.before = None;
            self.accept(pulse, 1, rejected);
        } else {
            self.out_of_time(pulse, newest, plausible, rejected);
        }
    }

    /// Whether a pulse comes at 3/4 to 3/2 of what is expected, without a division.
    fn is_due(&self, at: Instant, newest: Instant) -> bool {
        let interval = at.since(newest).nanos().min(LONGEST);
        let come = interval * u64::from(self.gap);
        let due = self.interval * u64::from(self.placement.gap(self.next_magnet()));
        let thrice = due + (due << 1);
        come << 2 >= thrice && come << 1 < thrice
    }

    /// Takes a pulse that is early or late, or one that decides about those before it.
    fn out_of_time(
        &mut self,
        pulse: Pulse,
        newest: Instant,
        plausible: bool,
        rejected: &mut Rejected,
    ) {
        let at = pulse.at;
        let Some(expected) = self.expected() else {
            return self.accept(pulse, 1, rejected);
        };
        let steps = at.since(newest).secs_f32() / expected;
        if self.late > 0 && steps >= LATE {
            let odd = (steps - libm::roundf(steps)).abs();
            // Of two magnets one may be gone: then every other pulse is missing for good, where none was before.
            let least = match self.pulses == 2 && !self.restless {
                true => LATE_OF_TWO,
                false => LATE_OF_OTHERS,
            };
            let enough = ((LATE_FOR / (steps * expected)) as usize).clamp(least, LATE_IN_A_ROW);
            if odd > EXACT || self.late >= enough {
                // Late again: the spindle has become slower, and none was missing.
                self.before = Some((self.interval, self.gap));
                self.retreat(rejected);
                return self.accept(pulse, 1, rejected);
            }
        } else {
            self.late = 0;
        }
        if let Some((interval, gap)) = self.before.take() {
            let come = at.since(newest).nanos().min(LONGEST) * u64::from(gap);
            let due = interval * u64::from(self.placement.gap(self.next_magnet()));
            if come.abs_diff(due) < due / 16 {
                // The rhythm from before the late ones returns: they were missing pulses.
                self.accept(pulse, 1, rejected);
                return self.begin_anew();
            }
        }
        let Some(suspect) = self.suspect.take() else {
            return match steps < EARLY {
                true if plausible && self.leaps(at, newest, expected) => self.leapt = true,
                true if plausible => self.suspect(pulse),
                true => self.extra(pulse, newest, rejected),
                false => self.accept_late(pulse, steps, expected, rejected),
            };
        };
        let (first, second) = (
            suspect.at.since(newest).secs_f32(),
            at.since(suspect.at).secs_f32(),
        );
        let halves_alike = alike(first, second);
        if plausible && expected > CRAWLS && second < FASTER * first {
            self.leapt = true;
            return;
        }
        // A pulse of noise does not move the one after it.
        let out_of_time = (steps - libm::roundf(steps).max(1.0)).abs() > IN_TIME;
        let no_noise = suspect.width >= NOISE && self.pulses < MANY;
        let faster = (FASTER * first..ALIKE * first).contains(&second) && (out_of_time || no_noise);
        if plausible && (faster || halves_alike && self.extra_in_a_row > 0) {
            // Early twice, out of the rhythm or time and again: the spindle is faster.
            self.extra_in_a_row = 0;
            self.accept(suspect, 1, rejected);
            self.accept(pulse, 1, rejected);
            return;
        }
        self.extra(suspect, newest, rejected);
        if steps < EARLY {
            self.suspect(pulse);
        } else {
            self.extra_in_a_row = u8::from(halves_alike);
            self.accept_late(pulse, steps, expected, rejected);
        }
    }

    /// Whether a spindle that crawls, or stands, cannot bring the next magnet so soon.
    fn leaps(&self, at: Instant, newest: Instant, expected: f32) -> bool {
        if expected <= CRAWLS {
            return false;
        }
        let gap = rev(self.placement.gap(self.next_magnet()));
        let time = at.since(newest).secs_f32();
        let most = gap / expected * time + HARDEST * self.brake * time * time / 2.0;
        most < gap
    }

    fn suspect(&mut self, pulse: Pulse) {
        self.suspect = Some(pulse);
        self.pace = 0;
    }

    /// Drops a pulse between two expected ones; close behind a passage it is that passage, doubled.
    fn extra(&self, pulse: Pulse, newest: Instant, rejected: &mut Rejected) {
        let behind = pulse
            .at
            .since(newest)
            .nanos()
            .saturating_sub(u64::from(self.width));
        if behind < u64::from(self.width / 2) {
            rejected.doubled = rejected.doubled.saturating_add(1);
        } else {
            rejected.extra = rejected.extra.saturating_add(1);
        }
    }

    /// Takes a pulse that is not early. Whole spacings late, it is taken as a sign of missing pulses, which is the higher
    /// speed; where braking might explain the gap as well, the next pulse tells.
    fn accept_late(&mut self, pulse: Pulse, steps: f32, expected: f32, rejected: &mut Rejected) {
        let whole = libm::roundf(steps);
        if steps > PAUSE && steps * expected > signal::LOST_AFTER.secs_f32() {
            // Had it turned on, the signal would have been lost where that can be known: it has stopped.
            self.leapt = true;
            return;
        }
        if steps < LATE || (steps - whole).abs() > MISSING_WITHIN {
            return self.accept(pulse, 1, rejected);
        }
        let interval = expected * steps;
        // Braking may have begun with the interval before.
        let speed = 1.0 / (expected * self.pulses as f32) - self.brake * expected / 2.0;
        let braked = (self.brake * interval).min(speed);
        let least = interval * (speed - braked / 2.0) * self.pulses as f32;
        let spacing = Duration::from_secs_f32(expected).nanos();
        if u64::from(self.width) > spacing - spacing / 4 {
            rejected.merged = rejected.merged.saturating_add(1);
        }
        if self.late == 0 {
            self.restless = self.since_missing < RESTLESS;
        }
        self.accept(pulse, whole as u32, rejected);
        self.late = if least < 1.0 + MISSING_WITHIN {
            self.late + 1
        } else {
            0
        };
    }

    /// No pulses were missing before the newest marks after all.
    fn retreat(&mut self, rejected: &mut Rejected) {
        let mut late: Vec<Instant, LATE_IN_A_ROW> = Vec::new();
        let mut missing = 0;
        for _ in 0..core::mem::take(&mut self.late) {
            if let Some((at, before)) = self.marks.pop() {
                missing += before;
                // There are never more of them.
                let _ = late.push(at);
            }
        }
        let count = late.len() as u32;
        while let Some(at) = late.pop() {
            self.marks.push(at);
        }
        self.turn_back(missing);
        rejected.missing = rejected.missing.saturating_sub(missing);
        self.missed = self.missed.checked_shr(missing + count).unwrap_or(0) << count;
        if let Some((newest, before)) = self.last().zip(self.marks.back(1)) {
            self.newest = before;
            self.paced(newest);
        }
        self.begin_anew();
    }

    /// The count of magnets was too high by so many.
    fn turn_back(&mut self, magnets: u32) {
        self.magnet = (self.magnet + self.pulses - magnets % self.pulses) % self.pulses;
    }

    /// The count of magnets has been corrected: no window goes through that.
    fn begin_anew(&mut self) {
        self.unbroken = 0;
        let turn = self.span(self.pulses, 0).map(|turn| turn.time);
        let turn = turn.map_or(0, |time| Duration::from_secs_f32(time).nanos());
        let since = self.marks.back(self.pulses).unwrap_or(Instant::ZERO);
        self.calm.restart(turn, since);
    }

    fn miss(&mut self, missing: u32, rejected: &mut Rejected) {
        rejected.missing = rejected.missing.saturating_add(missing);
        let ones = 1_u32.checked_shl(missing).map_or(u32::MAX, |bit| bit - 1);
        self.missed = self.missed.checked_shl(missing).unwrap_or(0) | ones;
    }

    /// The pace of the newest pulse where it came `steps` magnets after the one before.
    fn paced_over(&mut self, interval: u64, steps: u32) {
        self.pace = 0;
        self.interval = (interval.clamp(1, LONGEST) / u64::from(steps)).max(1);
        let angle = self.placement.angle(self.magnet, steps, 0);
        self.gap = ((angle * REV as f32 / steps as f32) as u32).max(1);
    }

    /// Takes a pulse as the `steps`-th magnet after the newest one.
    #[cold]
    pub(super) fn accept(&mut self, pulse: Pulse, steps: u32, rejected: &mut Rejected) {
        let before = self.last();
        if steps > 1 {
            self.skip(pulse.at, steps - 1, rejected);
        }
        self.next(pulse, rejected);
        match before {
            Some(before) if steps > 1 => self.paced_over(pulse.at.since(before).nanos(), steps),
            Some(_) => {}
            // There is no interval before the first pulse.
            None => {
                self.interval = 0;
                self.pace = 0;
            }
        }
        if self.suspect.is_some() {
            self.pace = 0;
        }
    }

    /// Passes magnets whose pulses are missing before the one at `at`; their times are filled in evenly by angle.
    fn skip(&mut self, at: Instant, missing: u32, rejected: &mut Rejected) {
        self.miss(missing, rejected);
        let before = self.last().unwrap_or(at);
        let interval = at.since(before).secs_f32();
        self.unbroken = 0;
        self.since_missing = 0;
        let fill = missing < self.pulses.max(FILLED);
        let next = (self.magnet + missing + 1) % self.pulses;
        let whole = self.placement.angle(next, missing + 1, 0);
        for skipped in 1..=missing.min(u32::from(u8::MAX)) {
            self.marks.push_missing();
            if fill {
                self.magnet = self.next_magnet();
                let part = self.placement.angle(self.magnet, skipped, 0) / whole;
                self.calm
                    .pulse(before + Duration::from_secs_f32(interval * part));
            }
        }
        if !fill {
            self.magnet = (self.magnet + missing) % self.pulses;
            self.calm.clear();
        }
    }
}

/// Within 30 % of each other.
fn alike(a: f32, b: f32) -> bool {
    a < ALIKE * b && b < ALIKE * a
}
