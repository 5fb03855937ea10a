//! The capture's words to the instrument's edges.

use embassy_time::{Duration, Instant as Now};
use heapless::Vec;
use rimrate_core::time::{Edge, EdgeKind, Instant};

use crate::board::Capture;

/// Edges that are handed on at once.
const BATCH: usize = 16;
/// A step ends with the batch in which this time runs out; a picture may be due after it, and both stay below 5 ms.
const STEP: Duration = Duration::from_micros(1000);
/// In a silence the anchor goes on in such steps: a quarter of the count's range,
const STRIDE: u32 = 1 << 30;
const STRIDE_NS: u64 = STRIDE as u64 * HALF_TICK_NS as u64;
/// and stays behind by more than this, ns: every edge that has not been handed on yet is later.
const BEHIND_NS: u64 = 2_000_000_000;
/// A word holds the count above its lowest bit, so that words count half ticks and wrap as the count does.
const HALF_TICK_NS: u32 = {
    assert!(Capture::BITS == 31 && Capture::TICK_NS.is_multiple_of(2));
    Capture::TICK_NS as u32 / 2
};

/// Time as the instrument means it.
pub(crate) fn now() -> Instant {
    Instant::from_nanos(Now::now().as_micros() * 1000)
}

/// A count whose time is known: that of the last edge, or a later one in a silence. The count passes all of its range in
/// 51.5 s, so from an anchor on that is younger than half of that every edge has one time only. Timer and PIO run from the
/// same crystal, so that no error adds up.
struct Anchor {
    /// As a word has it, without the edge's kind; it counts down from 0, so that it wraps with the first tick.
    count: u32,
    ns: u64,
}

impl Anchor {
    /// Follows the timer through a silence.
    fn follow(&mut self, now_ns: u64) {
        while now_ns.saturating_sub(self.ns) > STRIDE_NS + BEHIND_NS {
            self.count = self.count.wrapping_sub(STRIDE);
            self.ns += STRIDE_NS;
        }
    }

    /// The time of the next edge, which is not earlier than the one before, ns.
    fn advance(&mut self, count: u32) -> u64 {
        let half_ticks = self.count.wrapping_sub(count);
        if half_ticks <= u32::MAX / HALF_TICK_NS {
            // Up to 4.3 s: the chip has no longer product.
            self.ns += u64::from(half_ticks * HALF_TICK_NS);
        } else if half_ticks <= u32::MAX / 2 {
            self.ns += u64::from(half_ticks) * u64::from(HALF_TICK_NS);
        } else {
            // Earlier by a count or two, as a fall is that comes with a rise.
            return self.ns;
        }
        self.count = count;
        self.ns
    }
}

/// Takes the edges.
pub(crate) struct Sense {
    capture: Capture,
    anchor: Anchor,
    wiring: Wiring,
    edges: u32,
    lost: u32,
}

/// What a step has taken.
#[derive(Clone, Copy, Default)]
pub(crate) struct Taken {
    /// Edges handed on.
    pub(crate) edges: u32,
    /// A window was lost before them.
    pub(crate) lost: bool,
    /// Some were not handed on, or turned over: see [`Wiring`].
    pub(crate) withheld: bool,
    /// There is more already.
    pub(crate) more: bool,
    /// Every edge up to this time has been handed on. The instrument must not be told a later one: silence that is none
    /// would look like a spindle that slows down.
    pub(crate) until: Instant,
}

impl Sense {
    /// `pulses` in a revolution: with many, as with teeth, both ways of wiring are alike.
    pub(crate) fn new(capture: Capture, pulses: u16) -> Self {
        Sense {
            anchor: Anchor {
                count: 0,
                ns: capture.started().as_micros() * 1000,
            },
            wiring: Wiring::new(pulses),
            edges: 0,
            lost: 0,
            capture,
        }
    }

    /// From here on there are so many pulses in a revolution.
    pub(crate) fn expect(&mut self, pulses: u16) {
        self.wiring.expect(pulses);
    }

    /// Edges so far, windows lost so far, and whether the sensor is wired the other way round.
    pub(crate) fn counts(&self) -> (u32, u32, bool) {
        (self.edges, self.lost, self.wiring.inverted)
    }

    /// Hands on what has come, oldest first.
    pub(crate) fn take(&mut self, mut hand_on: impl FnMut(&[Edge])) -> Taken {
        let until = now();
        self.anchor.follow(until.nanos());
        let fresh = self.capture.look();
        if fresh.lost {
            self.lost = self.lost.wrapping_add(1);
            self.wiring.forget();
        }
        if fresh.count == 0 {
            return Taken {
                lost: fresh.lost,
                until,
                ..Taken::default()
            };
        }
        let enough = Now::now() + STEP;
        let mut left = fresh.count;
        let mut reached = Instant::ZERO;
        let mut withheld = false;
        let mut batch: Vec<Edge, BATCH> = Vec::new();
        while left > 0 {
            batch.clear();
            let some = left.min(BATCH as u32);
            for _ in 0..some {
                let (at, fall) = self.next();
                reached = at;
                let kind = match self.wiring.straighten(at, fall) {
                    Some(true) => EdgeKind::Fall,
                    Some(false) => EdgeKind::Rise,
                    None => {
                        withheld = true;
                        continue;
                    }
                };
                // There is room for so many.
                let _ = batch.push(Edge { at, kind });
            }
            left -= some;
            hand_on(&batch);
            if Now::now() >= enough {
                break;
            }
        }
        let edges = fresh.count - left;
        self.edges = self.edges.wrapping_add(edges);
        Taken {
            edges,
            lost: fresh.lost,
            withheld,
            more: left > 0,
            until: if left > 0 {
                reached
            } else {
                until.max(reached)
            },
        }
    }

    /// The time of the next word, and whether the line fell.
    fn next(&mut self) -> (Instant, bool) {
        let word = self.capture.pull();
        let (count, fall) = (word & !1, word & 1 == 1);
        // Late is lower: it counts down.
        let late = if fall { 2 * Capture::FALL_LATE } else { 0 };
        let ns = self.anchor.advance(count.wrapping_add(late));
        (Instant::from_nanos(ns), fall)
    }
}

/// Notices a sensor that is wired the other way round: low all the time but at the magnet.
///
/// Lows that fill more than three quarters of their circle are no magnet's. What is handed on of them is little, so that the
/// instrument is not left with one endless passage when the notion changes. Whoever counts passages is told: a toothed wheel
/// on a machine that is said to have few magnets may look like that.
struct Wiring {
    /// Teeth are as wide as their gaps: nothing can be told.
    ambiguous: bool,
    inverted: bool,
    last_fall: Option<Instant>,
    last_rise: Option<Instant>,
    /// In 1024 ns.
    last_period: Option<u32>,
    /// Periods in a row that are mostly low and regular.
    regular: u8,
}

impl Wiring {
    /// As in core's tacho: from here on it is a toothed wheel.
    const MANY_PULSES: u16 = 8;
    /// From this many on nothing is handed on. A magnet that was parked at the sensor makes one wide low, and a passage that
    /// chatters comes in pieces that are wide against their gaps, but not so many alike.
    const LIKELY: u8 = 8;
    /// A magnet that is parked at its switching point and shakes is not this regular for this long
    /// (common practice, no source).
    const SURE: u8 = 16;

    fn new(pulses: u16) -> Self {
        Wiring {
            ambiguous: pulses >= Self::MANY_PULSES,
            inverted: false,
            last_fall: None,
            last_rise: None,
            last_period: None,
            regular: 0,
        }
    }

    fn expect(&mut self, pulses: u16) {
        if self.ambiguous != (pulses >= Self::MANY_PULSES) {
            *self = Self::new(pulses);
        }
    }

    fn forget(&mut self) {
        *self = Wiring {
            inverted: self.inverted,
            ambiguous: self.ambiguous,
            ..Self::new(1)
        };
    }

    /// Takes an edge as the line shows it and says whether it is a fall as the instrument means it, a magnet that arrives;
    /// `None` where it is better not handed on.
    fn straighten(&mut self, at: Instant, fall: bool) -> Option<bool> {
        if self.ambiguous {
            return Some(fall);
        }
        let fall = fall != self.inverted;
        if !fall {
            self.last_rise = Some(at);
            return (self.regular < Self::LIKELY).then_some(false);
        }
        if let (Some(fell), Some(rose)) = (self.last_fall, self.last_rise) {
            // In 1024 ns: 32 bits hold seven times four minutes.
            let short =
                |later: Instant, earlier| (later.since(earlier).nanos() >> 10).min(1 << 28) as u32;
            let (period, low) = (short(at, fell), short(rose, fell));
            let last = self.last_period.replace(period);
            // Within 5/7 and 7/5 of the one before, as core's tacho asks of a start.
            let regular = last.is_some_and(|last| 5 * period < 7 * last && 5 * last < 7 * period);
            let wide = low > period / 4 * 3;
            self.regular = if wide && regular { self.regular + 1 } else { 0 };
        }
        self.last_fall = Some(at);
        if self.regular >= Self::SURE {
            self.inverted = !self.inverted;
            defmt::warn!("sensor: inverted {=bool}", self.inverted);
            self.forget();
            return None;
        }
        (self.regular < Self::LIKELY).then_some(true)
    }
}
