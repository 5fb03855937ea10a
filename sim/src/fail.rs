//! What goes wrong, and which exit status says so.

use std::fmt;
use std::path::Path;

/// A failed command.
#[derive(Debug)]
pub enum Fail {
    /// The input is wrong; exit status 2.
    Input(String),
    /// The run did not do what was expected; exit status 1.
    Missed(String),
}

impl Fail {
    /// Wrong input, in one line.
    pub fn input(message: impl fmt::Display) -> Self {
        Fail::Input(message.to_string())
    }

    /// A file that could not be read or written.
    pub fn file(path: &Path, what: impl fmt::Display) -> Self {
        Fail::Input(format!("{}: {what}", path.display()))
    }

    /// The exit status that goes with it.
    pub fn status(&self) -> u8 {
        match self {
            Fail::Missed(_) => 1,
            Fail::Input(_) => 2,
        }
    }
}

impl fmt::Display for Fail {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Fail::Input(message) | Fail::Missed(message) => f.write_str(message),
        }
    }
}

impl std::error::Error for Fail {}
