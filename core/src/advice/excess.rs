//! How much faster one speed is than another, in words that fit: for text and for the screen.

use core::fmt;

/// Above this many percent the figure says nothing more: ten times as fast.
const TEN_TIMES: f32 = 900.0;

/// An excess in percent; it prints as `12 %`, `just` or `over 10 times`, to stand before "too fast".
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Excess(pub f32);

impl Excess {
    /// How far above, as `+12 %`, `just above` or `over 10 times`.
    pub fn above(self) -> impl fmt::Display {
        Above(self.0)
    }

    /// So short that it fits a column of six characters: `+349%`, `x31`, `far`.
    pub fn short(self) -> impl fmt::Display {
        Short(self.0)
    }
}

impl fmt::Display for Excess {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.0 {
            p if p < 1.0 => f.write_str("just"),
            p if p <= TEN_TIMES => write!(f, "{p:.0} %"),
            _ => f.write_str("over 10 times"),
        }
    }
}

struct Above(f32);

impl fmt::Display for Above {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.0 {
            p if p < 1.0 => f.write_str("just above"),
            p if p <= TEN_TIMES => write!(f, "+{p:.0} %"),
            p => Excess(p).fmt(f),
        }
    }
}

struct Short(f32);

impl fmt::Display for Short {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.0 {
            p if p < 999.5 => write!(f, "+{p:.0}%"),
            p if p < 98_950.0 => write!(f, "x{:.0}", p / 100.0 + 1.0),
            _ => f.write_str("far"),
        }
    }
}
