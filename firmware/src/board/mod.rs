//! Which board: its pin table, its clock, its peripherals. Nothing outside of this module names a pin.
//!
//! A board is a file like [`pico`](self): a `parts!` table and a few constants. What the RP chips have in common is in `rp`.

#[cfg(feature = "pico")]
mod pico;
#[cfg(feature = "pico2")]
mod pico2;
mod rp;

#[cfg(all(feature = "pico", feature = "pico2"))]
compile_error!(
    "two boards are chosen; build a second one with --no-default-features --features pico2"
);
#[cfg(not(any(feature = "pico", feature = "pico2")))]
compile_error!("no board is chosen: --features pico or --features pico2");

#[cfg(feature = "pico")]
pub(crate) use pico::*;
#[cfg(feature = "pico2")]
pub(crate) use pico2::*;
pub(crate) use rp::{Capture, Display, Encoder, Signs, outputs_safe, restart};

/// One table of what is used for what; each line is `purpose: peripheral`.
macro_rules! parts {
    ($($(#[$doc:meta])* $name:ident: $part:ident,)+) => {
        /// Every pin and peripheral that is used, each under its purpose.
        pub(crate) struct Board {
            $($(#[$doc])* pub(crate) $name: embassy_rp::Peri<'static, embassy_rp::peripherals::$part>,)+
        }

        impl Board {
            /// Starts the clocks and deals out the parts.
            pub(crate) fn start() -> Self {
                let p = embassy_rp::init(Default::default());
                Board { $($name: p.$part,)+ }
            }

            /// The parts once more, for a panic.
            ///
            /// # Safety
            /// Nothing else may run any more.
            pub(crate) unsafe fn steal() -> Self {
                // SAFETY: as above.
                let p = unsafe { embassy_rp::Peripherals::steal() };
                Board { $($name: p.$part,)+ }
            }
        }
    };
}
use parts;
