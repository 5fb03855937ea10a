//! A lathe that behaves like one: motor, belt, steps, masses, friction, brake and cut.
//!
//! ```text
//! mains -> motor (Kloss) or drive -> belt (slip, creep) -> step -> spindle + chuck + work -> angle (+ ripple)
//!                                                                    friction, brake, cut
//! ```
//!
//! [`Lathe`] moves in short steps and hands each one out as a [`Segment`]: a polynomial of the angle that a sensor can
//! solve for the exact time of an edge.

mod cut;
mod dynamics;
mod hand;
mod mains;
mod motor;
mod segment;
mod spec;
#[cfg(test)]
mod tests;

pub use cut::{Cut, Engagement};
pub use dynamics::{Lathe, MotorSwitch};
pub use motor::{DriveSpec, Feed, MotorSpec};
pub use segment::{Ripple, Segment, Wave};
pub use spec::{LatheSpec, round_bar_inertia};
