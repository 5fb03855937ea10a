//! What lies in the flash beside the program: the machine's profile, and what the operator chose last.
//!
//! A crate of its own so that it is built for size: it runs at the start, and once in minutes while the spindle is at rest.

#![no_std]

pub mod profile;
pub mod records;
mod start;
pub mod stored;
