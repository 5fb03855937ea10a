//! What the operator chose last, kept in the flash over a power cut.
//!
//! Writing stops the program, for 400 ms at the very most, so the instrument hands a setup out only while the spindle gives no
//! pulses; one sector at most is erased in a step, and the watchdog's patience is longer than that.

use embassy_rp::Peri;
use embassy_rp::peripherals::FLASH;
use rimrate_core::setup::Setup;

use crate::records::{Found, ROOM, Records, SECTOR};
use crate::start::StartSpec;

/// To be raised whenever [`Record`] or [`StartSpec`] changes: an older record is not read as something that it is not.
const FORM: u8 = 1;
/// The last sectors, which the firmware's `memory/` leaves free.
const SECTORS: u32 = 2;

/// A setup as it is kept; unchecked.
#[derive(serde::Serialize, serde::Deserialize)]
struct Record {
    form: u8,
    /// The checksum of the machine's profile: with another one a holder's index would mean another holder.
    profile: u32,
    setup: StartSpec,
    cap_is_old: bool,
    load: bool,
}

/// What was kept is there and cannot be used.
pub struct Unreadable;

/// The setups that were kept, and what is still to be done.
pub struct Stored {
    records: Records,
    profile: u32,
    /// Waits to be written.
    waiting: Option<Setup>,
    /// Sectors that have to be erased before, from the last one on.
    spoilt: u32,
    /// That has been tried already, and nothing could be kept since.
    erased: bool,
}

impl Stored {
    /// At the end of the board's flash, so many bytes from its start; `profile` is a number that other profiles do not have.
    pub fn new(flash: Peri<'static, FLASH>, end: u32, profile: u32) -> Self {
        Stored {
            records: Records::new(flash, end - SECTORS * SECTOR..end),
            profile,
            waiting: None,
            spoilt: 0,
            erased: false,
        }
    }

    /// The setup that was kept last; without one it is `start`.
    ///
    /// # Errors
    /// There is one that cannot be used. The most cautious setup is not cautious in everything: the pulses in a revolution that
    /// were counted are lost with it, so somebody must be told.
    #[inline(never)]
    pub fn load(&mut self, start: Option<Setup>) -> Result<Option<Setup>, Unreadable> {
        let mut bytes = [0; ROOM];
        let record = match self.records.last(&mut bytes) {
            Found::Nothing => {
                defmt::info!("stored setup: none");
                return Ok(start);
            }
            Found::Record(length) => bytes
                .get(..length)
                .and_then(|bytes| postcard::take_from_bytes::<Record>(bytes).ok())
                .filter(|(record, rest)| record.form == FORM && rest.is_empty()),
            Found::Spoilt => None,
        };
        let Some((record, _)) = record else {
            defmt::error!("stored setup: unreadable, the most cautious instead");
            return Err(Unreadable);
        };
        if record.profile != self.profile {
            defmt::warn!("stored setup: of another profile, passed over");
            return Ok(start);
        }
        match record.setup.check() {
            Ok(setup) => {
                defmt::info!("stored setup: read");
                Ok(Some(Setup {
                    cap_is_old: record.cap_is_old,
                    load: record.load,
                    ..setup
                }))
            }
            Err(refused) => {
                defmt::error!("stored setup: {}, the most cautious instead", refused);
                Err(Unreadable)
            }
        }
    }

    /// Keeps a setup: with the next [`Self::go_on`].
    pub fn keep(&mut self, setup: &Setup) {
        self.waiting = Some(*setup);
    }

    /// Whether there is anything to write.
    pub fn waits(&self) -> bool {
        self.waiting.is_some()
    }

    /// Writes what waits. To be called only while the spindle gives no pulses.
    #[inline(never)]
    pub fn go_on(&mut self) {
        if let Some(left) = self.spoilt.checked_sub(1) {
            self.spoilt = left;
            if self.records.erase(left).is_err() {
                defmt::error!("stored setup: the flash cannot be erased");
                self.waiting = None;
            }
            return;
        }
        let Some(setup) = self.waiting.take() else {
            return;
        };
        let record = Record {
            form: FORM,
            profile: self.profile,
            setup: StartSpec::of(&setup),
            cap_is_old: setup.cap_is_old,
            load: setup.load,
        };
        let mut bytes = [0; ROOM];
        let Ok(bytes) = postcard::to_slice(&record, &mut bytes) else {
            defmt::error!("stored setup: too long to be kept");
            return;
        };
        if self.records.append(bytes).is_ok() {
            defmt::info!("stored setup: kept");
            self.erased = false;
        } else if self.erased {
            defmt::error!("stored setup: cannot be kept");
        } else {
            defmt::warn!("stored setup: the sectors are spoilt and erased");
            self.erased = true;
            self.spoilt = SECTORS;
            self.waiting = Some(setup);
        }
    }
}
