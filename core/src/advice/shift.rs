//! From the step that the spindle seems to turn in to the one advised: which levers to move.

use core::fmt;

use heapless::String;

use super::{Advice, Setting};
use crate::error::text;
use crate::machine::{Drive, Machine};
use crate::units::{Decimal, Rpm};

/// A move of the levers, or of the dial.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Shift<'a> {
    /// Label of the step that the spindle seems to turn in, where a step explains its speed.
    pub from: Option<&'a str>,
    /// What to set.
    pub to: &'a Setting,
    /// The speed is set with a dial: it may be turned while the spindle runs.
    pub dial: bool,
}

impl<'a> Shift<'a> {
    /// What to move for a spindle that turns at `speed`; `None` where nothing is advised or the step is right already.
    pub fn of(machine: &'a Machine, advice: &'a Advice, speed: Rpm) -> Option<Self> {
        let to = advice.pick.setting()?;
        let dial = matches!(machine.drive(), Drive::Variable(_));
        let from = machine.step_at(speed).map(|s| s.label.as_str());
        (from != Some(to.label.as_str())).then_some(Shift { from, to, dial })
    }

    /// In at most `room` characters: `stop; B-2 to A-3`, or the whole label where the moves do not fit.
    pub fn words(&self, room: usize) -> String<64> {
        let moves: String<64> = text(self);
        if moves.len() <= room {
            return moves;
        }
        text(format_args!("stop; set {}", self.to.label))
    }
}

/// Prints every lever that differs: `stop; B-2 to A-3, back gear in to back gear out`.
impl fmt::Display for Shift<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let to = self.to.label.as_str();
        if self.dial {
            let rpm = Decimal {
                value: self.to.rpm.get(),
                decimals: 0,
            };
            return write!(f, "dial to {rpm}, {to}");
        }
        fn levers(label: &str) -> impl Iterator<Item = &str> {
            label.split(',').map(str::trim)
        }
        let Some(from) = self
            .from
            .filter(|from| levers(from).count() == levers(to).count())
        else {
            return write!(f, "stop; set {to}");
        };
        f.write_str("stop; ")?;
        let mut first = true;
        for (from, to) in levers(from).zip(levers(to)).filter(|(a, b)| a != b) {
            write!(f, "{}{from} to {to}", if first { "" } else { ", " })?;
            first = false;
        }
        Ok(())
    }
}
