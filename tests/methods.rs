//! Published ways to get a speed from a sensor's edges, written from their definitions, to be compared with ours.
//!
//! Each takes the falls of the line as they come and knows nothing of noise or placement. Speeds are in rev/min, times in
//! seconds.

use std::collections::VecDeque;

/// One way to get a speed.
pub trait Method {
    /// The line falls.
    fn fall(&mut self, at: f64);
    /// The speed as it would be shown at `now`, if there is one yet.
    fn speed(&mut self, now: f64) -> Option<f64>;
}

/// M method: pulses counted in a gate of fixed length; the quantum is 60 / (P Tg) rev/min (published row PV0488).
#[derive(Clone, Debug)]
pub struct GateCount {
    pulses: f64,
    gate: f64,
    ends: f64,
    count: u32,
    shown: Option<f64>,
}

impl GateCount {
    /// With so many pulses in a revolution and a gate of so many seconds.
    pub fn new(pulses: u32, gate: f64) -> Self {
        GateCount {
            pulses: f64::from(pulses),
            gate,
            ends: gate,
            count: 0,
            shown: None,
        }
    }
    fn until(&mut self, now: f64) {
        while now >= self.ends {
            self.shown = Some(60.0 * f64::from(self.count) / (self.pulses * self.gate));
            self.count = 0;
            self.ends += self.gate;
        }
    }
}

impl Method for GateCount {
    fn fall(&mut self, at: f64) {
        self.until(at);
        self.count += 1;
    }
    fn speed(&mut self, now: f64) -> Option<f64> {
        self.until(now);
        self.shown
    }
}

/// T method: the time from one pulse to the next.
#[derive(Clone, Debug)]
pub struct OnePeriod {
    pulses: f64,
    last: Option<f64>,
    period: Option<f64>,
}

impl OnePeriod {
    /// With so many pulses in a revolution.
    pub fn new(pulses: u32) -> Self {
        OnePeriod {
            pulses: f64::from(pulses),
            last: None,
            period: None,
        }
    }
}

impl Method for OnePeriod {
    fn fall(&mut self, at: f64) {
        self.period = self.last.map(|last| at - last);
        self.last = Some(at);
    }
    fn speed(&mut self, _now: f64) -> Option<f64> {
        self.period.map(|t| 60.0 / (self.pulses * t))
    }
}

/// M/T method: a gate that ends with the first pulse after its time; n = 60 fc m1 / (P m2) with m1 pulses in m2 clock counts
/// (Ohmae, Matsuda, Kamiyama, Tachikawa, IEEE Trans. Ind. Electron. IE-29 no. 3, 1982, 207-211; published row PV0490).
#[derive(Clone, Debug)]
pub struct PulsesOverTime {
    pulses: f64,
    gate: f64,
    clock_hz: f64,
    began: Option<f64>,
    m1: u32,
    shown: Option<f64>,
}

impl PulsesOverTime {
    /// With so many pulses in a revolution, a gate of so many seconds and a clock.
    pub fn new(pulses: u32, gate: f64, clock_hz: f64) -> Self {
        PulsesOverTime {
            pulses: f64::from(pulses),
            gate,
            clock_hz,
            began: None,
            m1: 0,
            shown: None,
        }
    }
}

impl Method for PulsesOverTime {
    fn fall(&mut self, at: f64) {
        let Some(began) = self.began else {
            self.began = Some(at);
            return;
        };
        self.m1 += 1;
        if at - began >= self.gate {
            let m2 = ((at - began) * self.clock_hz).round();
            self.shown = Some(60.0 * self.clock_hz * f64::from(self.m1) / (self.pulses * m2));
            self.began = Some(at);
            self.m1 = 0;
        }
    }
    fn speed(&mut self, _now: f64) -> Option<f64> {
        self.shown
    }
}

/// Edges of a sliding window: the last `seconds`, or so many edges where that is longer.
#[derive(Clone, Debug)]
struct Window {
    seconds: f64,
    edges: usize,
    falls: VecDeque<f64>,
}

impl Window {
    fn new(seconds: f64, edges: usize) -> Self {
        Window {
            seconds,
            edges,
            falls: VecDeque::new(),
        }
    }
    fn push(&mut self, at: f64) {
        self.falls.push_back(at);
        while self.falls.len() > self.edges
            && self.falls.front().is_some_and(|&f| at - f > self.seconds)
        {
            self.falls.pop_front();
        }
    }
}

/// First and last edge of a sliding window: the variance of the period is 2 sigma^2 / (N - 1)^2 (published row PV0495).
#[derive(Clone, Debug)]
pub struct EndPoints {
    pulses: f64,
    window: Window,
}

impl EndPoints {
    /// Over the last `seconds` or three revolutions, whichever is longer.
    pub fn new(pulses: u32, seconds: f64) -> Self {
        EndPoints {
            window: Window::new(seconds, 3 * pulses as usize),
            pulses: f64::from(pulses),
        }
    }
    /// Over the last `seconds`.
    pub fn over(pulses: u32, seconds: f64) -> Self {
        EndPoints {
            window: Window::new(seconds, 0),
            pulses: f64::from(pulses),
        }
    }
}

impl Method for EndPoints {
    fn fall(&mut self, at: f64) {
        self.window.push(at);
    }
    fn speed(&mut self, _now: f64) -> Option<f64> {
        let falls = &self.window.falls;
        let (first, last) = (falls.front()?, falls.back()?);
        let intervals = falls.len() as f64 - 1.0;
        (intervals > 0.0).then(|| 60.0 * intervals / (self.pulses * (last - first)))
    }
}

/// The slope of a straight line through points, by least squares.
pub fn slope(points: impl Iterator<Item = (f64, f64)> + Clone) -> f64 {
    let n = points.clone().count() as f64;
    let mx = points.clone().map(|(x, _)| x).sum::<f64>() / n;
    let my = points.clone().map(|(_, y)| y).sum::<f64>() / n;
    let xy: f64 = points.clone().map(|(x, y)| (x - mx) * (y - my)).sum();
    let xx: f64 = points.map(|(x, _)| (x - mx) * (x - mx)).sum();
    xy / xx
}

/// Least squares over all edges of a sliding window, as if evenly spaced: the variance of the period is
/// 12 sigma^2 / (N (N^2 - 1)) (Kay, Fundamentals of Statistical Signal Processing, line fit; published row PV0493).
#[derive(Clone, Debug)]
pub struct LeastSquares {
    pulses: f64,
    window: Window,
}

impl LeastSquares {
    /// Over the last `seconds` or three revolutions, whichever is longer.
    pub fn new(pulses: u32, seconds: f64) -> Self {
        LeastSquares {
            pulses: f64::from(pulses),
            window: Window::new(seconds, 3 * pulses as usize),
        }
    }
    /// Over the last `seconds`.
    pub fn over(pulses: u32, seconds: f64) -> Self {
        LeastSquares {
            pulses: f64::from(pulses),
            window: Window::new(seconds, 0),
        }
    }
}

impl Method for LeastSquares {
    fn fall(&mut self, at: f64) {
        self.window.push(at);
    }
    fn speed(&mut self, _now: f64) -> Option<f64> {
        let falls = &self.window.falls;
        let points = falls.iter().enumerate().map(|(i, &t)| (i as f64, t));
        (falls.len() > 1).then(|| 60.0 / (self.pulses * slope(points)))
    }
}
