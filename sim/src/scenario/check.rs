//! What a scenario's file says, checked: every refusal names field, value and what is allowed.

use rimrate_core::machine::MAX_PULSES;
use rimrate_core::machine::{Drive, Machine};
use rimrate_core::setup::{Details, Diameter, Pulses, Setup};
use rimrate_core::tacho::Signal;
use rimrate_core::verdict::Verdict;

use super::{
    Action, Wanted, WrittenExpectation, WrittenSensor, WrittenSetup, find_holder, parse_cap,
};
use crate::sensor::SensorSpec;

impl WrittenSetup {
    pub(super) fn check(self, machine: &Machine) -> Result<Setup, String> {
        let diameter = Diameter::parse(&self.diameter).map_err(|e| e.to_string())?;
        let cap = self.cap.map(|text| parse_cap(&text)).transpose()?;
        let holder = find_holder(machine, &self.holder)?;
        let pulses = self
            .pulses
            .map(Pulses::new)
            .transpose()
            .map_err(|e| e.to_string())?;
        Ok(Setup {
            material: self.material,
            tool: self.tool,
            operation: self.operation,
            coolant: self.coolant,
            diameter,
            holder,
            cap,
            cap_is_old: false,
            load: false,
            details: Details::NONE,
            pulses,
        })
    }
}

impl WrittenSensor {
    pub(super) fn check(
        self,
        machine: &Machine,
    ) -> Result<SensorSpec, (&'static str, f64, &'static str)> {
        let magnets = match self.magnets {
            Some(n) if !(1..=u32::from(MAX_PULSES)).contains(&n) => {
                return Err(("sensor.magnets", f64::from(n), "1 to 240 on the collar"));
            }
            Some(n) => n,
            None => u32::from(machine.pulses().get()),
        };
        let fits = SensorSpec::ideal(magnets).width;
        let mut spec = SensorSpec {
            magnets,
            ..SensorSpec::default()
        };
        spec.width = spec.width.min(fits);
        spec.hysteresis = spec.hysteresis.min(spec.width / 4.0);
        let set = |place: &mut f64, field, value: Option<f64>, (low, high): (f64, f64), allowed| {
            match value {
                Some(v) if !(low..=high).contains(&v) => Err((field, v, allowed)),
                Some(v) => {
                    *place = v;
                    Ok(())
                }
                None => Ok(()),
            }
        };
        let pitch = 360.0 / f64::from(magnets);
        set(
            &mut spec.width,
            "sensor.width_deg",
            self.width_deg,
            (0.1, pitch * 0.9),
            "0.1 to 0.9 of the pitch",
        )?;
        set(
            &mut spec.jitter_deg,
            "sensor.jitter_deg",
            self.jitter_deg,
            (0.0, 2.0),
            "0 to 2 degrees",
        )?;
        set(
            &mut spec.dropout,
            "sensor.dropout",
            self.dropout,
            (0.0, 1.0),
            "0 to 1",
        )?;
        set(
            &mut spec.spike_rate,
            "sensor.spike_rate",
            self.spike_rate,
            (0.0, 10_000.0),
            "0 to 10000 a second",
        )?;
        set(
            &mut spec.shake_hz,
            "sensor.shake_hz",
            self.shake_hz,
            (0.1, 1000.0),
            "0.1 to 1000 Hz",
        )?;
        set(
            &mut spec.shake_low,
            "sensor.shake_low",
            self.shake_low,
            (0.01, 0.99),
            "0.01 to 0.99",
        )?;
        spec.placement = self.placement_deg.unwrap_or_default();
        let limit = (pitch - spec.width) / 2.0;
        let field = "sensor.placement_deg";
        // Not a number is no place either.
        let astray = |v: &&f64| v.is_nan() || v.abs() >= limit;
        if let Some(&v) = spec.placement.iter().find(astray) {
            let allowed = "less than half of the room between two magnets";
            return Err((field, v, allowed));
        }
        match spec.placement.get(magnets as usize) {
            Some(&v) => Err((field, v, "at most one place for each magnet")),
            None => Ok(spec),
        }
    }
}

/// What is refused: the field, its value, what is allowed.
type Refused = (&'static str, String, String);

/// Checks what happens against the machine that it happens to.
pub(super) fn action(action: &Action, machine: &Machine) -> Result<(), Refused> {
    let range = |field, value: f64, low: f64, high: f64| {
        let refused = (field, value.to_string(), format!("{low} to {high}"));
        if (low..=high).contains(&value) {
            Ok(())
        } else {
            Err(refused)
        }
    };
    match (action, machine.drive()) {
        (Action::Lever(label), Drive::Stepped(steps)) => {
            let known: Vec<&str> = steps.iter().map(|s| s.label.as_str()).collect();
            if known.contains(&label.as_str()) {
                Ok(())
            } else {
                Err(("do.lever", label.clone(), known.join("; ")))
            }
        }
        (Action::Lever(label), Drive::Variable(_)) => Err((
            "do.lever",
            label.clone(),
            "dial, for a variable drive".into(),
        )),
        (Action::Dial(n), Drive::Stepped(_)) => Err((
            "do.dial",
            n.to_string(),
            "lever, for a stepped drive".into(),
        )),
        (Action::Dial(n), Drive::Variable(ranges)) => {
            let fits = ranges
                .iter()
                .any(|r| (f64::from(r.low.get())..=f64::from(r.high.get())).contains(n));
            if fits {
                Ok(())
            } else {
                Err((
                    "do.dial",
                    n.to_string(),
                    "a speed inside one of the ranges".into(),
                ))
            }
        }
        (Action::Brake(pedal), _) => range("do.brake", *pedal, 0.0, 1.0),
        (Action::Jog(seconds), _) => range("do.jog", *seconds, 0.01, 60.0),
        (Action::HandTurn(turns), _) => range("do.hand-turn", *turns, 0.1, 100.0),
        (Action::Cut(cut), _) => range("do.cut.specific_force", cut.specific_force, 1.0, 20_000.0)
            .and(range("do.cut.depth_mm", cut.depth_mm, 0.001, 50.0))
            .and(range("do.cut.feed_mm", cut.feed_mm, 0.001, 10.0))
            .and(range(
                "do.cut.times",
                f64::from(cut.times.unwrap_or(1)),
                1.0,
                100.0,
            ))
            .and(range("do.cut.share", cut.share.unwrap_or(1.0), 0.0, 1.0)),
        _ => Ok(()),
    }
}

impl WrittenExpectation {
    pub(super) fn check(self) -> Result<Vec<Wanted>, Refused> {
        let verdict = |field, word: String| {
            Verdict::ALL
                .into_iter()
                .find(|v| v.id() == word)
                .ok_or_else(|| (field, word, Verdict::ALL.map(Verdict::id).join(", ")))
        };
        let mut all = Vec::new();
        if let Some(word) = self.verdict {
            all.push(Wanted::Verdict(verdict("verdict", word)?));
        }
        if let Some(word) = self.never {
            all.push(Wanted::NeverVerdict(verdict("never", word)?));
        }
        if let Some(word) = self.signal {
            let known = [
                Signal::Still,
                Signal::Turning,
                Signal::Lost,
                Signal::Doubtful,
            ];
            let signal = known
                .into_iter()
                .find(|s| s.id() == word)
                .ok_or_else(|| ("signal", word, known.map(Signal::id).join(", ")))?;
            all.push(Wanted::Signal(signal));
        }
        match (self.rpm, self.within_percent) {
            (Some(rpm), _) if !(0.0..=100_000.0).contains(&rpm) => {
                return Err(("rpm", rpm.to_string(), "0 to 100000 rpm".into()));
            }
            (_, Some(percent)) if !(0.0..=100.0).contains(&percent) => {
                return Err(("within_percent", percent.to_string(), "0 to 100 %".into()));
            }
            (rpm, Some(within_percent)) => all.push(Wanted::Speed {
                rpm,
                within_percent,
            }),
            (Some(rpm), None) => {
                return Err((
                    "within_percent",
                    format!("none beside rpm {rpm}"),
                    "a percentage".into(),
                ));
            }
            (None, None) => {}
        }
        all.extend(self.text.map(Wanted::Text));
        all.extend(self.lamp.map(Wanted::Lamp));
        all.extend(self.relay.map(Wanted::Relay));
        if all.is_empty() {
            return Err((
                "verdict",
                "nothing".into(),
                "verdict, never, signal, rpm with within_percent, text, lamp or relay".into(),
            ));
        }
        Ok(all)
    }
}
