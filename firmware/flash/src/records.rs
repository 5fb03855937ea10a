//! The last record, kept in two sectors of the flash that the program runs from.
//!
//! Records are appended one behind the other, each with the checksum of `sequential-storage`; the last one that is whole
//! counts, so a power cut while one is written leaves the one before. A sector is erased when both are full.
//!
//! While the flash is written to, nothing runs: neither tasks nor interrupts, which wait. Capture goes on, in the PIO, the DMA
//! and the RAM. Each of the two or three pieces of a record takes 0.4 ms, a sector 45 ms (3 ms and 400 ms at most; W25Q16JV
//! data sheet, 9.6).

use core::ops::Range;

use embassy_embedded_hal::adapter::BlockingAsync;
use embassy_futures::block_on;
use embassy_rp::Peri;
use embassy_rp::flash::{Blocking, ERASE_SIZE, Flash};
use embassy_rp::peripherals::FLASH;
use embedded_storage_async::nor_flash::{NorFlash, ReadNorFlash};
use sequential_storage::cache::{Cache, Uncached};
use sequential_storage::queue::{QueueConfig, QueueStorage};

/// What is erased at once, bytes.
pub const SECTOR: u32 = ERASE_SIZE as u32;
/// Longest record, bytes.
pub const ROOM: usize = 64;
/// All that the chip can address; the board says how much of it there is.
const WINDOW: usize = 16 * 1024 * 1024;

type Memory = BlockingAsync<Flash<'static, FLASH, Blocking, WINDOW>>;

/// What was found.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Found {
    /// Nothing was ever written.
    Nothing,
    /// A record of this length.
    Record(usize),
    /// Something, but no record that is whole.
    Spoilt,
}

/// The flash's chip refuses, or holds something that this crate did not write.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Failed;

/// Two sectors of the flash.
pub struct Records {
    queue: QueueStorage<Memory, Cache<Uncached, Uncached, Uncached>>,
    sectors: Range<u32>,
}

impl Records {
    /// In these whole sectors, counted in bytes from the start of the flash.
    ///
    /// # Panics
    /// Where they are not whole.
    #[inline(never)]
    pub fn new(flash: Peri<'static, FLASH>, sectors: Range<u32>) -> Self {
        let memory = BlockingAsync::new(Flash::new_blocking(flash));
        let config = QueueConfig::new(sectors.clone());
        Records {
            queue: QueueStorage::new(memory, config, Cache::new_uncached()),
            sectors,
        }
    }

    /// Reads the last record.
    #[inline(never)]
    pub fn last(&mut self, record: &mut [u8; ROOM]) -> Found {
        match block_on(self.find(record)) {
            Some(0) if self.is_blank() => Found::Nothing,
            Some(0) | None => Found::Spoilt,
            Some(length) => Found::Record(length),
        }
    }

    async fn find(&mut self, last: &mut [u8; ROOM]) -> Option<usize> {
        let mut length = 0;
        let mut records = self.queue.iter().await.ok()?;
        let mut next = [0; ROOM];
        while let Some(record) = records.next(&mut next).await.ok()? {
            length = record.len();
            last.get_mut(..length)?.copy_from_slice(&record);
        }
        Some(length)
    }

    fn is_blank(&mut self) -> bool {
        let mut bytes = [0; ROOM];
        self.sectors.clone().step_by(ROOM).all(|at| {
            let read = block_on(self.queue.flash().read(at, &mut bytes));
            read.is_ok() && bytes.iter().all(|&b| b == 0xff)
        })
    }

    /// Appends a record; the oldest ones make room.
    #[inline(never)]
    pub fn append(&mut self, record: &[u8]) -> Result<(), Failed> {
        block_on(self.queue.push(record, true)).map_err(|_| Failed)
    }

    /// Erases a sector.
    #[inline(never)]
    pub fn erase(&mut self, sector: u32) -> Result<(), Failed> {
        let from = self.sectors.start + sector * SECTOR;
        block_on(self.queue.flash().erase(from, from + SECTOR)).map_err(|_| Failed)
    }
}
