//! A hall sensor on the spindle: from the motion to the edges of its line, and everything that can be wrong with them.
//!
//! ```text
//! Segment -> track (which magnet, when: solved) -> toggles -> line -> Edge
//!              faults: lost magnet, dropout         chatter, jitter, spikes, shaking    stuck
//! ```
//!
//! Every disturbance is a toggle of the line at a point in time, so that whatever comes together, the edges alternate and
//! their times increase.

mod hall;
mod line;
mod noise;
pub mod profile;
mod spec;
#[cfg(test)]
mod tests;
mod track;

pub use hall::Sensor;
pub use spec::{Fault, SensorSpec};
