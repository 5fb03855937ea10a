//! Help, usage errors, and the command without arguments.

use std::process::Command;

use super::{rimrate, stderr, well};

#[test]
fn usage_errors_have_exit_status_two() {
    for args in [
        &["bogus"][..],
        &["replay"],
        &["replay", "x.vcd"],
        &["play"],
        &["advise"],
        &["advise", "--colour", "green"],
        &["advise", "--list", "--json"],
    ] {
        let output = rimrate(args);
        let error = stderr(&output);
        assert_eq!(output.status.code(), Some(2), "{args:?}: {error}");
        assert_eq!(
            error.lines().filter(|l| l.starts_with("error:")).count(),
            1,
            "{error}"
        );
        assert!(!error.contains("panicked"));
    }
}

#[test]
fn help_has_examples() {
    for args in [
        &["--help"][..],
        &["advise", "--help"],
        &["play", "--help"],
        &["replay", "--help"],
    ] {
        let text = well(rimrate(args));
        assert!(text.contains("Examples:\n  rimrate"), "{text}");
    }
    assert!(well(rimrate(&["--version"])).starts_with("rimrate "));
}

#[test]
fn the_main_job_plays_the_shift_and_ends_with_a_summary() {
    let text = well(rimrate(&[]));
    assert!(text.contains("Fennick geared lathe"), "{text}");
    assert!(text.contains("times real time"), "{text}");
    assert!(!text.contains("MISSED"), "{text}");
    // Whoever closes the pipe has read enough.
    let mut child = Command::new(env!("CARGO_BIN_EXE_rimrate"))
        .args(["advise", "--list"])
        .stdout(std::process::Stdio::piped())
        .stderr(std::process::Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let output = child.wait_with_output().unwrap();
    assert_eq!(stderr(&output), "");
    assert_eq!(output.status.code(), Some(0));
}
