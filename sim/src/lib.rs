//! A lathe on the desk: motor, gears, belt and cut, a hall sensor on the spindle, and the instrument that reads it.
//!
//! ```text
//! scenario --> bench --> rig ----> frame, lamps, verdict
//!   (file)      |  ^      (the instrument here, or the firmware's image in an emulator)
//!               |  +--- edges
//!               +--> lathe --> sensor
//! ```
//!
//! Nothing here decides: the bench moves a simulated lathe and hands edges and knob turns to a box. Every run with the
//! same scenario and seed is the same, on every computer.

#![forbid(unsafe_code)]

pub mod advise;
pub mod bench;
pub mod fail;
pub mod files;
pub mod frame;
pub mod lathe;
pub mod play;
pub mod profile;
pub mod random;
pub mod record;
pub mod replay;
pub mod rig;
pub mod scenario;
pub mod sensor;
pub mod terminal;
