//! The machine's profile as `build.rs` packed it.

use crc::{CRC_32_ISO_HDLC, Crc, NoTable};
use rimrate_core::machine::Machine;
use rimrate_core::setup::Setup;

use crate::start::Record;

/// Bytes reserved in flash.
const ROOM: usize = 2048;

/// In flash, under this name, on its own: length (u16) and CRC-32 (u32), both little-endian, then a postcard record.
#[used]
#[unsafe(no_mangle)]
static RIMRATE_PROFILE: [u8; ROOM] = *include_bytes!(concat!(env!("OUT_DIR"), "/profile.bin"));

/// The machine and what is chosen at the start, checked once more by the same rules as at build time.
///
/// Panics, and so restarts, where the flash does not hold what was built.
#[inline(never)]
pub(crate) fn load() -> (Machine, Option<Setup>) {
    // Read as it is in flash, not as the compiler remembers it.
    let bytes: &[u8] = core::hint::black_box(&RIMRATE_PROFILE);
    let Some((&[l0, l1, c0, c1, c2, c3], rest)) = bytes.split_first_chunk::<6>() else {
        panic!("profile: no header");
    };
    let length = usize::from(u16::from_le_bytes([l0, l1]));
    let record = rest.get(..length).unwrap_or(&[]);
    let crc = Crc::<u32, NoTable>::new(&CRC_32_ISO_HDLC).checksum(record);
    if crc != u32::from_le_bytes([c0, c1, c2, c3]) {
        panic!("profile: checksum differs");
    }
    let Ok(record) = postcard::from_bytes::<Record>(record) else {
        panic!("profile: no record of a machine");
    };
    let start = record.start.map(|s| s.check());
    match (Machine::new(record.machine), start.transpose()) {
        (Ok(machine), Ok(start)) => (machine, start),
        (Err(refused), _) | (_, Err(refused)) => panic!("profile: {}", refused),
    }
}
