//! The `rimrate` command as somebody types it: answers, files, and what it says to bad input.

mod advice;
mod play;
mod profiles;
mod replay;
mod usage;

use std::fs;
use std::path::Path;
use std::process::{Command, Output};

fn rimrate(args: &[&str]) -> Output {
    rimrate_in(Path::new("."), args)
}

fn rimrate_in(folder: &Path, args: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_rimrate"))
        .args(args)
        .current_dir(folder)
        .env("CI", "true")
        .output()
        .unwrap()
}

fn stdout(output: &Output) -> String {
    String::from_utf8(output.stdout.clone()).unwrap()
}

fn stderr(output: &Output) -> String {
    String::from_utf8(output.stderr.clone()).unwrap()
}

/// The answer of a run that goes well.
fn well(output: Output) -> String {
    assert_eq!(stderr(&output), "", "{}", stdout(&output));
    assert_eq!(output.status.code(), Some(0));
    stdout(&output)
}

/// One `error:` line with all of these words, exit status 2, nothing printed, no panic.
fn refused(output: &Output, words: &[&str]) -> String {
    let error = stderr(output);
    assert_eq!(output.status.code(), Some(2), "{error}");
    let lines: Vec<&str> = error.lines().collect();
    assert!(
        matches!(lines[..], [line] if line.starts_with("error: ")),
        "not one line: {error}"
    );
    for word in words {
        assert!(error.contains(word), "`{word}` is not in: {error}");
    }
    assert!(!error.contains("panicked"), "{error}");
    assert_eq!(stdout(output), "");
    error
}

/// A cut on the geared lathe with some options in another way, or more of them.
fn advise(changed: &[(&str, &str)]) -> Vec<String> {
    let mut options = vec![
        ("--material", "mild-steel"),
        ("--tool", "hss"),
        ("--operation", "rough-turning"),
        ("--diameter", "25 mm"),
    ];
    for &(option, value) in changed {
        match options.iter_mut().find(|(o, _)| *o == option) {
            Some(known) => known.1 = value,
            None => options.push((option, value)),
        }
    }
    let words = options.into_iter().flat_map(|(o, v)| [o, v]);
    ["advise"]
        .into_iter()
        .chain(words)
        .filter(|w| !w.is_empty())
        .map(str::to_owned)
        .collect()
}

fn run(args: &[String]) -> Output {
    let args: Vec<&str> = args.iter().map(String::as_str).collect();
    rimrate(&args)
}

fn assert_empty(folder: &Path) {
    let left: Vec<_> = fs::read_dir(folder)
        .unwrap()
        .map(|e| e.unwrap().path())
        .collect();
    assert!(left.is_empty(), "{left:?}");
}
