//! A lathe on the desk.

#![forbid(unsafe_code)]

pub mod lathe;
pub mod random;
pub mod sensor;
