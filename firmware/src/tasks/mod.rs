//! The tasks, and what they tell one another.

pub(crate) mod knobs;
pub(crate) mod owner;
pub(crate) mod screen;
pub(crate) mod sense;
pub(crate) mod supervise;

use embassy_sync::blocking_mutex::raw::CriticalSectionRawMutex;
use embassy_sync::channel::Channel;
use rimrate_core::panel::Knob;

/// What the owner is told.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(crate) enum Message {
    /// A knob went one detent further, clockwise positive.
    Turn(Knob, i8),
    /// A knob went down.
    Press(Knob),
    /// A knob came up.
    Release(Knob),
    /// Something is wrong with a knob, or no longer.
    Stuck(Knob, bool),
    /// The display answers, or does not.
    Display(bool),
}

/// To the owner. Knobs send far less than the owner takes; what does not fit is counted by the sender.
pub(crate) static MESSAGES: Channel<CriticalSectionRawMutex, Message, 16> = Channel::new();
