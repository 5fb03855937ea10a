//! The line itself: toggles in any order become edges in order.

use rimrate_core::time::{Edge, Instant};
use std::cmp::Reverse;
use std::collections::BinaryHeap;

/// The line's level, by counting how often it was toggled, unless it is stuck.
#[derive(Clone, Debug, Default)]
pub(super) struct Line {
    /// Toggles that lie ahead, ns.
    ahead: BinaryHeap<Reverse<u64>>,
    /// Low by the toggles so far.
    low: bool,
    /// Low as it was last shown to the outside.
    shown: bool,
    /// Where the line is held, if it is.
    stuck: Option<bool>,
    /// The time from which that holds, until it is worked in.
    changed: Option<u64>,
}

impl Line {
    /// Sets the level from which the toggles count; before the first edge.
    pub(super) fn begin(&mut self, low: bool) {
        self.low = low;
        self.shown = self.stuck.unwrap_or(low);
        self.changed = None;
    }

    /// Toggles the line at a time; not before one up to which it was already played.
    pub(super) fn toggle(&mut self, at: u64) {
        self.ahead.push(Reverse(at));
    }

    /// Holds the line low or high, or lets it go, from the time on up to which it was played.
    pub(super) fn hold(&mut self, stuck: Option<bool>, at: u64) {
        if stuck != self.stuck {
            self.stuck = stuck;
            self.changed = Some(at);
        }
    }

    /// Hands out every edge before a time.
    ///
    /// Toggles at the very same nanosecond count together, so two of them are none: the edges alternate and never share
    /// a time.
    pub(super) fn play(&mut self, until: u64, on_edge: &mut impl FnMut(Edge)) {
        loop {
            let toggle = self.ahead.peek().map(|Reverse(at)| *at);
            // A change of `stuck` is never later than a toggle that still lies ahead.
            let Some(at) = self.changed.or(toggle) else {
                return;
            };
            if at >= until {
                return;
            }
            self.changed = None;
            while self.ahead.peek().is_some_and(|Reverse(next)| *next == at) {
                self.ahead.pop();
                self.low = !self.low;
            }
            let low = self.stuck.unwrap_or(self.low);
            if low != self.shown {
                self.shown = low;
                let at = Instant::from_nanos(at);
                on_edge(if low { Edge::fall(at) } else { Edge::rise(at) });
            }
        }
    }

    /// True where the line is low after the edges handed out so far.
    pub(super) fn is_low(&self) -> bool {
        self.shown
    }
}
