//! The capture's words to the instrument's edges.

use embassy_time::{Duration, Instant as Now};
use heapless::Vec;
use rimrate_core::time::{Edge, Instant};

use crate::board::Capture;

/// Edges that are handed on at once.
const BATCH: usize = 16;
/// A step ends with the batch in which this time runs out; a picture may be due after it, and both stay below 5 ms.
const STEP: Duration = Duration::from_micros(1000);
const MASK: u32 = (1 << Capture::BITS) - 1;
/// The count is taken to begin this long before it wraps, so that every power-up passes the wrap (51.5 s apart
/// otherwise) and no build can get by without it.
const FIRST: u64 = (1 << Capture::BITS) - 5 * 1_000_000_000 / Capture::TICK_NS;

/// Time as the instrument means it.
pub(crate) fn now() -> Instant {
    Instant::from_nanos(Now::now().as_micros() * 1000)
}

/// Takes the edges.
pub(crate) struct Sense {
    capture: Capture,
    started: u64,
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
            started: capture.started().as_micros() * 1000,
            wiring: Wiring::new(pulses),
            edges: 0,
            lost: 0,
            capture,
        }
    }

    /// Edges so far, windows lost so far, and whether the sensor is wired the other way round.
    pub(crate) fn counts(&self) -> (u32, u32, bool) {
        (self.edges, self.lost, self.wiring.inverted)
    }

    /// Hands on what has come, oldest first.
    pub(crate) fn take(&mut self, mut hand_on: impl FnMut(&[Edge])) -> Taken {
        let until = now();
        let fresh = self.capture.look();
        // After the look, so that no edge is later than now.
        let now = Now::now().as_micros() * 1000;
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
        // Timer and PIO run from the same crystal: the timer tells which turn of the 31-bit count it is, the count the rest.
        let ticks_now = FIRST + now.saturating_sub(self.started) / Capture::TICK_NS;
        let enough = Now::now() + STEP;
        let mut left = fresh.count;
        let mut reached = Instant::ZERO;
        let mut batch: Vec<Edge, BATCH> = Vec::new();
        while left > 0 {
            batch.clear();
            while left > 0 && !batch.is_full() {
                let edge = self.edge(ticks_now, &mut reached);
                if let Some(edge) = edge {
                    // Room was just seen.
                    let _ = batch.push(edge);
                }
                left -= 1;
            }
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
            more: left > 0,
            until: if left > 0 {
                reached
            } else {
                until.max(reached)
            },
        }
    }

    /// The next word as an edge, if it is worth one, and its time.
    fn edge(&mut self, ticks_now: u64, at: &mut Instant) -> Option<Edge> {
        let word = self.capture.pull();
        let fall = word & 1 == 1;
        // X counts down from 0.
        let elapsed =
            0_u32
                .wrapping_sub(word >> 1)
                .wrapping_sub(if fall { Capture::FALL_LATE } else { 0 });
        let tick = elapsed.wrapping_add(FIRST as u32) & MASK;
        let age = (ticks_now as u32).wrapping_sub(tick) & MASK;
        // The timer counts microseconds, the PIO less: the newest edge may seem to lie ahead.
        let age = if age > MASK / 2 { 0 } else { age };
        let ticks = (ticks_now - FIRST).saturating_sub(u64::from(age));
        *at = Instant::from_nanos(self.started + ticks * Capture::TICK_NS);
        self.wiring.straighten(tick, fall).map(|fall| {
            if fall {
                Edge::fall(*at)
            } else {
                Edge::rise(*at)
            }
        })
    }
}

/// Notices a sensor that is wired the other way round: low all the time but at the magnet.
///
/// Lows that fill more than three quarters of their circle are no magnet's. What is handed on of them is little, so that the
/// instrument is not left with one endless passage when the notion changes.
struct Wiring {
    /// Teeth are as wide as their gaps: nothing can be told.
    ambiguous: bool,
    inverted: bool,
    last_fall: Option<u32>,
    last_rise: Option<u32>,
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

    fn forget(&mut self) {
        *self = Wiring {
            inverted: self.inverted,
            ambiguous: self.ambiguous,
            ..Self::new(1)
        };
    }

    /// Takes an edge as the line shows it and says whether it is a fall as the instrument means it, a magnet that arrives;
    /// `None` where it is better not handed on.
    fn straighten(&mut self, tick: u32, fall: bool) -> Option<bool> {
        if self.ambiguous {
            return Some(fall);
        }
        let fall = fall != self.inverted;
        if !fall {
            self.last_rise = Some(tick);
            return (self.regular < Self::LIKELY).then_some(false);
        }
        if let (Some(fell), Some(rose)) = (self.last_fall, self.last_rise) {
            let period = tick.wrapping_sub(fell) & MASK;
            let low = rose.wrapping_sub(fell) & MASK;
            // Within 0.7 and 1.4 of the one before, as core's tacho asks of a start.
            let regular = self
                .last_period
                .is_some_and(|last| period / 14 < last / 10 && last / 14 < period / 10);
            self.last_period = Some(period);
            let wide = low > period / 4 * 3;
            self.regular = if wide && regular { self.regular + 1 } else { 0 };
        }
        self.last_fall = Some(tick);
        if self.regular >= Self::SURE {
            self.inverted = !self.inverted;
            defmt::warn!("sensor: inverted {=bool}", self.inverted);
            self.forget();
            return None;
        }
        (self.regular < Self::LIKELY).then_some(true)
    }
}
