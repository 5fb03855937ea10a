//! What is read off the track: spans, the fast and the calm view, what is expected next.

use super::rhythm::EARLY;
use super::{Span, Track, rev};
use crate::tacho::{CARRY, RIPPLE};
use crate::time::{Duration, Instant};

/// Mean size of the third difference of four times with white noise, over the noise's standard deviation:
/// sqrt(20) sqrt(2 / pi). A steady acceleration is not in it.
const SCATTER: f32 = 3.568_2;
/// The error of a speed of which nothing but one turn is known: the largest error that placement makes (see the start).
const UNKNOWN: f32 = 0.1;

impl Track {
    /// The stretch between the pulses `from` and `to` magnets before the newest one.
    pub(in crate::tacho) fn span(&self, from: u32, to: u32) -> Option<Span> {
        let time = self
            .marks
            .back(to)?
            .since(self.marks.back(from)?)
            .secs_f32();
        let angle = self.placement.angle(self.magnet, from, to);
        (time > 0.0 && angle > 0.0).then_some(Span { angle, time })
    }

    /// The stretch from the newest pulse to one that may be coming at `at`; where placement is unknown it may be shorter than
    /// an even one by the factor `unknown`.
    pub(in crate::tacho) fn next_span(&self, at: Instant, unknown: f32) -> Span {
        let even = rev(self.placement.gap(self.next_magnet()));
        let angle = if self.placement.known() {
            even
        } else {
            even / unknown
        };
        let time = self
            .last()
            .map_or(Duration::ZERO, |last| at.since(last))
            .secs_f32();
        Span {
            angle,
            time: time.max(f32::MIN_POSITIVE),
        }
    }

    /// The last whole turn, or all that is known where that is less.
    pub(in crate::tacho) fn turn(&self) -> Option<Span> {
        (1..=self.pulses)
            .rev()
            .find_map(|back| self.span(back, 0))
            .or_else(|| (self.pulses..self.marks.held()).find_map(|back| self.span(back, 0)))
    }

    /// The fast view, rev/s: a quarter of a turn where placement is known, a whole one before. While the speed changes it
    /// is carried on from the middle of that stretch to its end, as far as it is safe.
    pub(in crate::tacho) fn quick(&self) -> Option<f32> {
        let part = self.pulses.div_ceil(4);
        let (speed, back) = match self.span(part, 0).filter(|_| self.placement.known()) {
            Some(span) => (span.speed(), part),
            None => (self.turn()?.speed(), self.pulses),
        };
        let Some(before) = self.span(2 * back, back).map(Span::speed) else {
            return Some(speed);
        };
        let gain = (speed - before) / 2.0;
        if gain.abs() < RIPPLE * speed || self.calm.is_steady() {
            return Some(speed);
        }
        Some(speed + gain.clamp(-CARRY * speed, CARRY * speed))
    }

    /// The calm view, rev/s, and its standard error as a share of it: the line through the window, or whole turns from
    /// end to end where there is none yet.
    pub(in crate::tacho) fn calm(&self) -> Option<(f64, f32)> {
        if let Some(speed) = self.calm.speed() {
            return Some(speed);
        }
        let turns = self
            .calm
            .steady_turns()
            .min(self.marks.held() / self.pulses);
        let span = (1..=turns)
            .rev()
            .find_map(|turns| self.span(turns * self.pulses, 0))
            .or_else(|| self.turn())?;
        let speed = span.speed();
        // Nothing is known of the scatter about a line yet: what the last two turns differ by stands for it.
        let before = self.span(2 * self.pulses, self.pulses).map(Span::speed);
        let last = self.span(self.pulses, 0).map_or(speed, Span::speed);
        let error = before.map_or(UNKNOWN, |before| (before / last - 1.0).abs());
        Some((
            f64::from(speed),
            error.max(self.jitter().unwrap_or(0.0) / span.time),
        ))
    }

    /// Whether one speed has explained the pulses for this long and for three turns.
    pub(in crate::tacho) fn steady_for(&self, time: Duration) -> bool {
        let past = self
            .calm
            .one_speed_for(self.last().unwrap_or(Instant::ZERO));
        past > Duration::ZERO && past >= time
    }

    /// Standard deviation of a pulse's time, s, from how much turns differ; ripple is in it. `None` before it is known.
    pub(in crate::tacho) fn jitter(&self) -> Option<f32> {
        (self.scatter > 0).then(|| Duration::from_nanos(self.scatter).secs_f32() / SCATTER)
    }

    /// Low share of the spacing over the last steady turn, once.
    pub(in crate::tacho) fn take_low_share(&mut self) -> Option<f32> {
        self.low_share.take()
    }

    /// More than a quarter of the last 32 magnets gave no pulse.
    pub(in crate::tacho) fn often_missing(&self) -> bool {
        self.missed.count_ones() > 8
    }

    /// The longest row of magnets without a pulse among the last 32.
    pub(in crate::tacho) fn longest_missing(&self) -> u32 {
        let mut rest = self.missed;
        let mut longest = 0;
        while rest != 0 {
            rest &= rest << 1;
            longest += 1;
        }
        longest
    }

    /// When the next pulse is expected after the newest one, s.
    pub(in crate::tacho) fn expected(&self) -> Option<f32> {
        let next = self.placement.gap(self.next_magnet()) as f32;
        (self.interval > 0)
            .then(|| Duration::from_nanos(self.interval).secs_f32() * next / self.gap as f32)
    }

    /// Whether a pulse at this time keeps the rhythm of those before.
    pub(in crate::tacho) fn goes_on(&self, at: Instant) -> bool {
        let steps = self
            .last()
            .zip(self.expected())
            .map(|(last, expected)| at.since(last).secs_f32() / expected);
        self.marks.held() > 2 && steps.is_some_and(|steps| (EARLY..1.0 / EARLY).contains(&steps))
    }

    /// A piece of noise just before a passage looks like its beginning: of all the pieces' falls the one that a steady spindle
    /// makes one expect, and else the first.
    #[cold]
    pub(in crate::tacho) fn likeliest(&self, begins: &[Instant]) -> Instant {
        let first = begins.first().copied().unwrap_or(Instant::ZERO);
        let turn_ago = self.marks.back(self.pulses - 1);
        match turn_ago.zip(self.calm.period()) {
            Some((turn_ago, period)) if self.calm.is_steady() => {
                let expected = turn_ago + Duration::from_nanos(period);
                let off = |at: &Instant| at.since(expected).max(expected.since(*at));
                begins.iter().copied().min_by_key(off).unwrap_or(first)
            }
            _ => first,
        }
    }

    /// The last interval, if it may have been one slow spacing as well as several with pulses missing.
    pub(in crate::tacho) fn doubtful_interval(&self, unknown: f32) -> Option<Span> {
        if self.late == 0 {
            return None;
        }
        let missing = (1..self.marks.held()).find(|&back| self.marks.back(back).is_some())? - 1;
        let time = self
            .marks
            .last()?
            .since(self.marks.back(missing + 1)?)
            .secs_f32();
        // The first of those magnets.
        let first = (self.magnet + self.pulses - missing % self.pulses) % self.pulses;
        let angle = rev(self.placement.gap(first)) / unknown;
        (time > 0.0).then_some(Span { angle, time })
    }
}
