//! The capture's words to the instrument's edges.

use embassy_time::Instant as Now;
use heapless::Vec;
use rimrate_core::time::{Edge, Instant};

use crate::board::Capture;

/// Edges that are handed on at once.
const BATCH: usize = 32;
/// Edges taken in one step; with the dearest edges it stays well below 5 ms.
const STEP: u32 = 256;
const MASK: u32 = (1 << Capture::BITS) - 1;
/// The count is taken to begin this long before it wraps, so that every power-up passes the wrap (51.5 s apart
/// otherwise) and no build can get by without it.
const FIRST: u64 = (1 << Capture::BITS) - 5 * 1_000_000_000 / Capture::TICK_NS;

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
                ..Taken::default()
            };
        }
        // Timer and PIO run from the same crystal: the timer tells which turn of the 31-bit count it is, the count the rest.
        let ticks_now = FIRST + now.saturating_sub(self.started) / Capture::TICK_NS;
        let count = fresh.count.min(STEP);
        let mut batch: Vec<Edge, BATCH> = Vec::new();
        for _ in 0..count {
            let word = self.capture.pull();
            let fall = word & 1 == 1;
            // X counts down from 0.
            let elapsed = 0_u32.wrapping_sub(word >> 1).wrapping_sub(if fall {
                Capture::FALL_LATE
            } else {
                0
            });
            let tick = elapsed.wrapping_add(FIRST as u32) & MASK;
            let age = (ticks_now as u32).wrapping_sub(tick) & MASK;
            // The timer counts microseconds, the PIO less: the newest edge may seem to lie ahead.
            let age = if age > MASK / 2 { 0 } else { age };
            let ticks = ticks_now - u64::from(age) - FIRST;
            let at = Instant::from_nanos(self.started + ticks * Capture::TICK_NS);
            let fall = self.wiring.straighten(tick, fall);
            let edge = if fall { Edge::fall(at) } else { Edge::rise(at) };
            if batch.push(edge).is_err() {
                hand_on(&batch);
                batch.clear();
                let _ = batch.push(edge);
            }
        }
        hand_on(&batch);
        self.edges = self.edges.wrapping_add(count);
        Taken {
            edges: count,
            lost: fresh.lost,
            more: fresh.count > count,
        }
    }
}

/// Notices a sensor that is wired the other way round: low all the time but at the magnet.
struct Wiring {
    /// Teeth are as wide as their gaps: nothing can be told.
    ambiguous: bool,
    inverted: bool,
    last_fall: Option<u32>,
    last_rise: Option<u32>,
    last_period: Option<u32>,
    /// Regular periods in a row that speak against the present notion.
    against: u8,
}

impl Wiring {
    /// As in core's tacho: from here on it is a toothed wheel.
    const MANY_PULSES: u16 = 8;
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
            against: 0,
        }
    }

    fn forget(&mut self) {
        self.last_fall = None;
        self.last_rise = None;
        self.last_period = None;
        self.against = 0;
    }

    /// Takes an edge as the line shows it and says whether it is a fall as the instrument means it: a magnet arrives.
    fn straighten(&mut self, tick: u32, fall: bool) -> bool {
        if self.ambiguous {
            return fall;
        }
        if !fall {
            self.last_rise = Some(tick);
            return self.inverted;
        }
        if let (Some(fell), Some(rose)) = (self.last_fall, self.last_rise) {
            let period = tick.wrapping_sub(fell) & MASK;
            let low = rose.wrapping_sub(fell) & MASK;
            let regular = self
                .last_period
                .is_some_and(|last| period / 10 > last / 14 && period / 14 < last / 10);
            // Magnets cover a small part of their circle: less than a quarter.
            let mostly_low = low > period / 4 * 3;
            let mostly_high = low < period / 4;
            let against = if self.inverted {
                mostly_high
            } else {
                mostly_low
            };
            self.against = if regular && against {
                self.against + 1
            } else {
                0
            };
            self.last_period = Some(period);
            if self.against >= Self::SURE {
                self.against = 0;
                self.inverted = !self.inverted;
                defmt::warn!("sensor: inverted {=bool}", self.inverted);
            }
        }
        self.last_fall = Some(tick);
        !self.inverted
    }
}
