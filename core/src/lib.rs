//! Rimrate's core: from hall edges and knob turns to speed, advice, verdict and picture.
//!
//! ```text
//! hall edges --> tacho ----> Reading ---+
//!                                       +--> verdict --> beacon   (lamps, buzzer, relay)
//! knobs ----> panel --> Setup -> advice-+           \--> screen   (128 x 64)
//!                         ^
//!                         +-- Machine (steps, holders, limits)
//! ```
//!
//! Data flows left to right, once; nothing on the right is read back by anything on the left. Everything that decides
//! lives here; firmware and simulator turn hardware, or a simulated lathe, into [`instrument::Event`]s and effects back.
//!
//! Invariants:
//! - nothing here does input or output, asks for the time, allocates, or waits;
//! - no input panics;
//! - mathematics comes from `libm` on every target, so that desk and chip agree to the bit;
//! - a bound is never applied without its reason reaching the screen;
//! - a speed that is not believed is never shown; in doubt nothing is green;
//! - every default has a source or the mark "common practice, no source".
//!
//! What is right for a 25 mm bar of mild steel under high-speed steel:
//!
//! ```
//! use rimrate_core::{physics::cutting_speed::spindle_speed, setup::Diameter, trade::*};
//! let bar = Diameter::parse("25 mm").unwrap();
//! let speed = cutting_speed(Material::MildSteel, Tool::Hss, Operation::RoughTurning, Coolant::Flood).unwrap();
//! let n = spindle_speed(speed.ours, bar);
//! assert!((300.0..400.0).contains(&n.get()));
//! ```

#![no_std]

pub mod advice;
pub mod beacon;
pub mod edge_account;
pub mod error;
pub mod instrument;
pub mod load;
pub mod machine;
pub mod panel;
pub mod physics;
pub mod screen;
pub mod sensor_setup;
pub mod setup;
pub mod tacho;
pub mod time;
pub mod trade;
pub mod units;
pub mod verdict;
