//! Machine profiles: TOML files, and the three that come with Rimrate.

use std::ops::Range;
use std::path::Path;

use rimrate_core::error::Rejected;
use rimrate_core::machine::{Machine, MachineSpec};

use crate::fail::Fail;

/// The machines that come with Rimrate, all invented: name and profile.
pub const BUILT_IN: [(&str, &str); 3] = [
    (
        "geared-lathe",
        include_str!("../machines/geared-lathe.toml"),
    ),
    (
        "variable-lathe",
        include_str!("../machines/variable-lathe.toml"),
    ),
    ("drill-press", include_str!("../machines/drill-press.toml")),
];

/// Loads a built-in machine by its name, or a profile file.
pub fn load(name_or_path: &Path) -> Result<Machine, Fail> {
    if let Some((name, text)) = BUILT_IN
        .iter()
        .find(|(name, _)| Path::new(name) == name_or_path)
    {
        return parse(text, name);
    }
    let text = std::fs::read_to_string(name_or_path).map_err(|e| {
        let known: Vec<&str> = BUILT_IN.iter().map(|(name, _)| *name).collect();
        Fail::input(format!(
            "machine: `{}` cannot be read ({e}); allowed: a profile file, or one of {}",
            name_or_path.display(),
            known.join(", ")
        ))
    })?;
    parse(&text, &name_or_path.display().to_string())
}

/// Reads and checks a profile; the error names the line.
pub fn parse(text: &str, origin: &str) -> Result<Machine, Fail> {
    let spec: MachineSpec = toml::from_str(text).map_err(|e| not_toml(text, origin, &e))?;
    Machine::new(spec).map_err(|e| rejected(text, origin, &e))
}

/// An error of the TOML reader as one line with the line's number.
pub fn not_toml(text: &str, origin: &str, error: &toml::de::Error) -> Fail {
    let place = error.span().map_or_else(String::new, |span| {
        let line = line_of(text, span.start);
        let source = text.lines().nth(line - 1).unwrap_or_default().trim();
        format!(":{line}: `{source}`")
    });
    Fail::input(format!(
        "{origin}{place}: {}",
        error.message().trim().replace('\n', " ")
    ))
}

/// A refused value with the line on which it stands.
pub fn rejected(text: &str, origin: &str, error: &Rejected) -> Fail {
    let line = span_of(text, &error.field).map_or_else(String::new, |span| {
        format!(":{}", line_of(text, span.start))
    });
    Fail::input(format!("{origin}{line}: {error}"))
}

fn line_of(text: &str, at: usize) -> usize {
    text.as_bytes()
        .iter()
        .take(at)
        .filter(|&&b| b == b'\n')
        .count()
        + 1
}

/// Finds the value at a path such as `step[3].rpm`, or the closest thing around it that is written down.
fn span_of(text: &str, path: &str) -> Option<Range<usize>> {
    let document = toml::de::DeTable::parse(text).ok()?;
    let mut table = document.get_ref();
    let mut span = None;
    for part in path.split('.') {
        let (key, index) = match part.split_once('[') {
            Some((key, rest)) => (key, rest.strip_suffix(']')?.parse::<usize>().ok()),
            None => (part, None),
        };
        let Some((_, mut value)) = table.iter().find(|(k, _)| k.get_ref() == key) else {
            break;
        };
        if let (Some(index), toml::de::DeValue::Array(items)) = (index, value.get_ref()) {
            value = items.get(index)?;
        }
        span = Some(value.span());
        match value.get_ref() {
            toml::de::DeValue::Table(inner) => table = inner,
            _ => break,
        }
    }
    span
}
