//! Pure functions, one law a file.

pub mod cutting_speed;
