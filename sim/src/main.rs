//! The `rimrate` command.

fn main() {}
