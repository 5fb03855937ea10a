//! The live view of a shift in a terminal.
//!
//! ```text
//! keys --> command --> app (bench, script, clock) --> ui --> terminal
//! ```
//!
//! `app` knows no terminal, `ui` draws what it finds there, and this file holds the terminal and lets real time pass.

mod app;
mod keys;
#[cfg(test)]
mod tests;
mod ui;
mod words;

use std::io::{self, IsTerminal};
use std::time::{Duration, Instant};

use ratatui::DefaultTerminal;
use ratatui::crossterm::event::{self, Event, KeyEventKind};

use crate::fail::Fail;
use crate::scenario::Scenario;
use app::App;

/// A picture this often: thirty a second.
const PICTURE: Duration = Duration::from_millis(33);

/// Whether somebody sits at a terminal that can show the live view. Under `CI` nobody does.
pub fn somebody_watches() -> bool {
    let set = |name| std::env::var_os(name).is_some_and(|value| !value.is_empty());
    let dumb = std::env::var_os("TERM").is_some_and(|term| term == "dumb");
    io::stdout().is_terminal() && io::stdin().is_terminal() && !set("CI") && !dumb
}

/// Plays a scenario live until somebody quits. The terminal is put back in order whatever happens, a panic included.
pub fn run(scenario: &Scenario) -> Result<(), Fail> {
    let failed = |e: io::Error| Fail::input(format!("terminal: {e}"));
    // Takes care of panics; the guard takes care of every other way out.
    let mut terminal = ratatui::try_init().map_err(failed)?;
    let _restore = Restore;
    watch(&mut terminal, &mut App::new(scenario)).map_err(failed)
}

struct Restore;

impl Drop for Restore {
    fn drop(&mut self) {
        ratatui::restore();
    }
}

fn watch(terminal: &mut DefaultTerminal, app: &mut App<'_>) -> io::Result<()> {
    let mut last = Instant::now();
    loop {
        terminal.draw(|frame| ui::draw(frame, app))?;
        loop {
            let left = PICTURE.saturating_sub(last.elapsed());
            if !event::poll(left)? {
                break;
            }
            match event::read()? {
                Event::Key(key) if key.kind != KeyEventKind::Release => {
                    if let Some(command) = keys::command(key) {
                        app.command(command);
                    }
                }
                // Drawn anew at once, at the new size.
                Event::Resize(..) => break,
                _ => {}
            }
            if app.quit() || left.is_zero() {
                break;
            }
        }
        if app.quit() {
            return Ok(());
        }
        let now = Instant::now();
        app.advance(now - last);
        last = now;
    }
}
