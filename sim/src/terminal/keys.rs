//! Which key does what. The help and the line of hints are made from the same table that keys are looked up in.
//!
//! The hands lie on the keys as on the box: the left hand's `a s d` turn and press the left knob, the right hand's
//! `j k l` the right one; the row above them and the arrows move the lathe.

use ratatui::crossterm::event::{KeyCode, KeyEvent, KeyModifiers};

use crate::scenario::{KnobName, MotorTo};

/// What somebody wants who has pressed a key.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Command {
    /// Hands on the box or the lathe; the shift waits.
    Hand(Hand),
    /// Back to the shift, where it was left.
    Resume,
    /// On to the next stage of the shift.
    NextStage,
    /// Time goes one gear faster, or at its own pace again.
    Pace,
    /// Time stands, or goes on.
    Pause,
    /// Shows or hides the help.
    Help,
    /// Enough.
    Quit,
}

/// What a hand does.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Hand {
    /// Turns a knob by one detent, clockwise positive.
    Turn(KnobName, i8),
    /// Presses a knob shortly.
    Press(KnobName),
    /// Holds a knob down.
    Hold(KnobName),
    /// Throws the motor's switch.
    Motor(MotorTo),
    /// Levers to the next faster step (1) or the next slower one (-1).
    Step(i8),
    /// A foot on the brake until the spindle stands.
    Brake,
    /// Engages a cut, or leaves it.
    Cut {
        /// Through six flats, not round.
        interrupted: bool,
    },
    /// Pulls the sensor's cable, or plugs it in.
    Cable,
    /// Takes a magnet off the collar, or puts it back.
    Magnet,
}

/// One key.
#[derive(Clone, Copy, Debug)]
pub(super) struct Key {
    /// The key.
    pub code: KeyCode,
    /// The key in print.
    pub shown: &'static str,
    /// What it does, in words.
    pub does: &'static str,
    /// What it does.
    pub command: Command,
}

/// Keys that belong together.
#[derive(Clone, Copy, Debug)]
pub(super) struct Group {
    /// Of what.
    pub title: &'static str,
    /// The keys, in few words for the line of hints.
    pub hint: &'static str,
    /// The keys.
    pub keys: &'static [Key],
}

const fn key(code: char, shown: &'static str, does: &'static str, command: Command) -> Key {
    Key {
        code: KeyCode::Char(code),
        shown,
        does,
        command,
    }
}

const fn hand(code: char, shown: &'static str, does: &'static str, hand: Hand) -> Key {
    key(code, shown, does, Command::Hand(hand))
}

const LEFT: KnobName = KnobName::Left;
const RIGHT: KnobName = KnobName::Right;

/// Every key.
pub(super) const GROUPS: &[Group] = &[
    Group {
        title: "Left knob: material",
        hint: "a s d left knob",
        keys: &[
            hand('a', "a", "turn back", Hand::Turn(LEFT, -1)),
            hand('s', "s", "press", Hand::Press(LEFT)),
            hand('d', "d", "turn on", Hand::Turn(LEFT, 1)),
            hand('S', "S", "hold: mute", Hand::Hold(LEFT)),
        ],
    },
    Group {
        title: "Right knob: diameter",
        hint: "j k l right knob",
        keys: &[
            hand('j', "j", "turn back", Hand::Turn(RIGHT, -1)),
            hand('k', "k", "press", Hand::Press(RIGHT)),
            hand('l', "l", "turn on", Hand::Turn(RIGHT, 1)),
            hand('K', "K", "hold: no cap", Hand::Hold(RIGHT)),
        ],
    },
    Group {
        title: "Motor and brake",
        hint: "f r o motor  b brake",
        keys: &[
            hand('f', "f", "forward", Hand::Motor(MotorTo::Forward)),
            hand('r', "r", "reverse", Hand::Motor(MotorTo::Reverse)),
            hand('o', "o", "off", Hand::Motor(MotorTo::Off)),
            hand('b', "b", "brake to a stop", Hand::Brake),
        ],
    },
    Group {
        title: "Levers and cut",
        hint: "↑ ↓ levers  c x cut",
        keys: &[
            Key {
                code: KeyCode::Up,
                shown: "↑",
                does: "a step faster",
                command: Command::Hand(Hand::Step(1)),
            },
            Key {
                code: KeyCode::Down,
                shown: "↓",
                does: "a step slower",
                command: Command::Hand(Hand::Step(-1)),
            },
            hand(
                'c',
                "c",
                "cut, or leave it",
                Hand::Cut { interrupted: false },
            ),
            hand('x', "x", "cut six flats", Hand::Cut { interrupted: true }),
        ],
    },
    Group {
        title: "Faults",
        hint: "w cable  g magnet",
        keys: &[
            hand('w', "w", "cable off, on", Hand::Cable),
            hand('g', "g", "magnet off, on", Hand::Magnet),
        ],
    },
    Group {
        title: "The shift",
        hint: "Enter shift  n next  t pace  space pause  h help  q quit",
        keys: &[
            Key {
                code: KeyCode::Enter,
                shown: "Enter",
                does: "back to the shift",
                command: Command::Resume,
            },
            key('n', "n", "next stage", Command::NextStage),
            key('t', "t", "time x1, x5, x20", Command::Pace),
            key(' ', "space", "pause, go on", Command::Pause),
            key('h', "h", "this help", Command::Help),
            key('q', "q", "quit", Command::Quit),
        ],
    },
];

/// What a key asks for, if anything.
pub(super) fn command(event: KeyEvent) -> Option<Command> {
    let control = event.modifiers.contains(KeyModifiers::CONTROL);
    match event.code {
        KeyCode::Char('c' | 'd') if control => Some(Command::Quit),
        _ if control => None,
        KeyCode::Char('?') => Some(Command::Help),
        code => GROUPS
            .iter()
            .flat_map(|group| group.keys)
            .find(|key| key.code == code)
            .map(|key| key.command),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn pressed(code: KeyCode, modifiers: KeyModifiers) -> Option<Command> {
        command(KeyEvent::new(code, modifiers))
    }

    #[test]
    fn keys_ask_for_what_the_help_says() {
        let plain = |c| pressed(KeyCode::Char(c), KeyModifiers::NONE);
        assert_eq!(plain('d'), Some(Command::Hand(Hand::Turn(LEFT, 1))));
        assert_eq!(plain('j'), Some(Command::Hand(Hand::Turn(RIGHT, -1))));
        assert_eq!(
            pressed(KeyCode::Char('S'), KeyModifiers::SHIFT),
            Some(Command::Hand(Hand::Hold(LEFT)))
        );
        assert_eq!(
            pressed(KeyCode::Down, KeyModifiers::NONE),
            Some(Command::Hand(Hand::Step(-1)))
        );
        assert_eq!(plain('?'), plain('h'));
        assert_eq!(plain('z'), None);
    }

    #[test]
    fn control_c_quits_and_is_no_cut() {
        assert_eq!(
            pressed(KeyCode::Char('c'), KeyModifiers::CONTROL),
            Some(Command::Quit)
        );
        assert_eq!(pressed(KeyCode::Char('s'), KeyModifiers::CONTROL), None);
    }

    #[test]
    fn no_key_does_two_things() {
        let all: Vec<&Key> = GROUPS.iter().flat_map(|g| g.keys).collect();
        for (i, key) in all.iter().enumerate() {
            assert!(
                all.iter().skip(i + 1).all(|other| other.code != key.code),
                "{}",
                key.shown
            );
        }
    }

    #[test]
    fn every_hint_names_keys_of_its_group() {
        for group in GROUPS {
            let hinted = group
                .hint
                .split_whitespace()
                .filter(|word| group.keys.iter().any(|key| key.shown == *word))
                .count();
            // Holds stand in the help alone.
            let shown = group.keys.iter().filter(|k| !k.does.starts_with("hold"));
            assert_eq!(hinted, shown.count(), "{}", group.title);
        }
    }
}
