//! What happens at the lathe, in words.

use rimrate_core::tacho::{Reading, Signal};

use crate::scenario::{Action, CutSpec, FaultName, KnobName, MotorTo};

/// An action as a bystander would tell it.
pub(super) fn action(action: &Action) -> String {
    match action {
        Action::Turn { knob: which, by } => {
            let clicks = match by.unsigned_abs() {
                1 => "1 click".to_owned(),
                n => format!("{n} clicks"),
            };
            let way = if *by < 0 { "back" } else { "on" };
            format!("{} knob {clicks} {way}", knob(*which))
        }
        Action::Press(which) => format!("{} knob pressed", knob(*which)),
        Action::Hold(which) => format!("{} knob held down", knob(*which)),
        Action::Motor(MotorTo::Off) => "motor off".into(),
        Action::Motor(MotorTo::Forward) => "motor on, forward".into(),
        Action::Motor(MotorTo::Reverse) => "motor on, reverse".into(),
        Action::Jog(seconds) => format!("motor jogged for {seconds} s"),
        Action::HandTurn(turns) => format!("spindle turned by hand, {turns} turns"),
        Action::Lever(label) => format!("levers to {label}"),
        Action::Dial(rpm) => format!("dial to {rpm:.0} rpm"),
        Action::Cut(spec) => format!("tool in the cut: {}", cut(spec)),
        Action::Uncut => "tool out of the cut".into(),
        Action::Brake(pedal) if *pedal > 0.0 => "foot on the brake".into(),
        Action::Brake(_) => "foot off the brake".into(),
        Action::Plug => "motor reversed until the spindle stands".into(),
        Action::Fault(which) => fault(*which).into(),
        Action::Mend(which) => format!("no longer: {}", fault(*which)),
        Action::PowerCycle => "box switched off and on".into(),
    }
}

/// A cut in a few words.
pub(super) fn cut(cut: &CutSpec) -> String {
    let times = cut.times.map_or(String::new(), |n| format!(", {n} flats"));
    format!("{} mm deep, {} mm a turn{times}", cut.depth_mm, cut.feed_mm)
}

/// A fault of the sensor.
pub(super) fn fault(fault: FaultName) -> &'static str {
    match fault {
        FaultName::Chatter => "sensor chatters",
        FaultName::Spikes => "noise on the line",
        FaultName::Dropouts => "pulses drop out",
        FaultName::MagnetLost => "a magnet is off",
        FaultName::StuckHigh => "sensor cable off",
        FaultName::StuckLow => "sensor line shorted",
        FaultName::ShakeRegular => "parked magnet shakes",
        FaultName::ShakeRandom => "parked magnet rattles",
    }
}

/// What the box reads.
pub(super) fn reading(reading: &Reading) -> String {
    match (reading.signal, reading.speed) {
        (Signal::Turning, Some(n)) => format!("box reads {:.0}", n.get()),
        (Signal::Turning, None) => "box reads".into(),
        (Signal::Still, _) => "box: no pulses".into(),
        (Signal::Lost, _) => "box: signal lost".into(),
        (Signal::Doubtful, _) => "box: in doubt".into(),
    }
}

/// Minutes and seconds.
pub(super) fn clock(ms: u64) -> String {
    format!("{}:{:02}", ms / 60_000, ms / 1000 % 60)
}

fn knob(name: KnobName) -> &'static str {
    match name {
        KnobName::Left => "left",
        KnobName::Right => "right",
    }
}
