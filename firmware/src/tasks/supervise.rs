//! Feeds the watchdog, as long as every task checks in.

use embassy_rp::watchdog::Watchdog;
use embassy_time::{Duration, Timer};

use crate::fault;

/// How often to look.
const LOOK: Duration = Duration::from_millis(100);
/// Longest time without all check-ins. Tasks check in every 250 ms at the latest; the relay opens by this much later.
const PATIENCE: Duration = Duration::from_millis(1000);

/// Starts it.
pub(crate) fn start(watchdog: &mut Watchdog) {
    watchdog.pause_on_debug(true);
    watchdog.start(PATIENCE);
}

/// Runs for ever.
#[embassy_executor::task]
pub(crate) async fn run(mut watchdog: Watchdog) -> ! {
    loop {
        Timer::after(LOOK).await;
        if fault::all_checked_in() {
            watchdog.feed(PATIENCE);
        }
    }
}
