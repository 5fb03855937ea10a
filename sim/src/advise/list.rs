//! Everything that the tables know.

use std::fmt::Write as _;

use rimrate_core::trade::{self, Coolant, Material, Operation, Tool};

/// Every known combination with its range, where we sit in it, and the source.
pub(super) fn list() -> String {
    let mut text = String::from("materials (ISO 513 group, identifier, name)\n");
    for m in Material::ALL {
        let _ = writeln!(
            text,
            "  {}  {:<24} {}",
            m.group().letter(),
            m.id(),
            m.name()
        );
    }
    text.push_str("tools\n");
    for t in Tool::ALL {
        let _ = writeln!(text, "  {:<27} {}", t.id(), t.name());
    }
    text.push_str("operations\n");
    for o in Operation::ALL {
        let _ = writeln!(
            text,
            "  {:<27} {}, by the diameter of the {}",
            o.id(),
            o.name(),
            o.diameter_word()
        );
    }
    text.push_str("cutting speeds with fluid, m/min: ours, from the published range, and how\n");
    for m in Material::ALL {
        for t in Tool::ALL {
            for o in Operation::ALL {
                let place = format!("{} {} {}", m.id(), t.id(), o.id());
                let coolant = if trade::cutting_speed(m, t, o, Coolant::Flood).is_ok() {
                    Coolant::Flood
                } else {
                    Coolant::Dry
                };
                let _ = match trade::cutting_speed(m, t, o, coolant) {
                    Ok(c) => writeln!(
                        text,
                        "  {place:<52} {:7.1}  from {:.1} to {:.1}{}: {}",
                        c.ours.m_min(),
                        c.range.0.m_min(),
                        c.range.1.m_min(),
                        if coolant == Coolant::Dry { ", dry" } else { "" },
                        c.how
                    ),
                    Err(refusal) => writeln!(text, "  {place:<52} refused: {refusal}"),
                };
            }
        }
    }
    text
}
