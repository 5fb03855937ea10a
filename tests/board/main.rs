//! The firmware's image, as it is flashed, in an emulated RP2040 with its display, knobs and sensor.
//!
//! The machine is rp2040js, which nobody here wrote; what it does not model is listed in `emulator/measures.mjs`. Times
//! here are the emulator's: cycle counts are lower bounds.

mod budget;
mod display;
mod endurance;
mod faults;
mod image;
mod parity;
mod rig;
mod sense;
mod stored;
mod support;
