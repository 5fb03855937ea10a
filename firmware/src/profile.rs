//! The machine's profile as `build.rs` packed it.

use crc::{CRC_32_ISO_HDLC, Crc, NoTable};
use rimrate_core::machine::{Machine, MachineSpec};
use rimrate_core::setup::Setup;
use static_cell::StaticCell;

use crate::start::StartSpec;

/// Bytes reserved in flash.
const ROOM: usize = 2048;

/// In flash, under this name, on its own: length (u16) and CRC-32 (u32), both little-endian, then a postcard record.
#[used]
#[unsafe(no_mangle)]
static RIMRATE_PROFILE: [u8; ROOM] = *include_bytes!(concat!(env!("OUT_DIR"), "/profile.bin"));

/// The machine and what is chosen at the start, checked once more by the same rules as at build time.
///
/// Panics, and so restarts, where the flash does not hold what was built.
///
/// A machine takes three kilobytes, its unchecked form as much, and moving them takes copies: hence the statics and the
/// functions that are not inlined. What they need on the stack they need one after the other.
#[inline(never)]
pub(crate) fn load() -> (&'static Machine, Option<Setup>) {
    static MACHINE: StaticCell<Machine> = StaticCell::new();
    let record = record();
    let Ok((spec, rest)) = postcard::take_from_bytes::<MachineSpec>(record) else {
        panic!("profile: no machine");
    };
    let machine = MACHINE.init_with(|| match Machine::new(spec) {
        Ok(machine) => machine,
        Err(refused) => panic!("profile: {}", refused),
    });
    (machine, start(rest))
}

/// The packed bytes, if they are whole.
#[inline(never)]
fn record() -> &'static [u8] {
    // Read as it is in flash, not as the compiler remembers it.
    let bytes: &'static [u8] = core::hint::black_box(&RIMRATE_PROFILE);
    let Some((&[l0, l1, c0, c1, c2, c3], rest)) = bytes.split_first_chunk::<6>() else {
        panic!("profile: no header");
    };
    let length = usize::from(u16::from_le_bytes([l0, l1]));
    let record = rest.get(..length).unwrap_or(&[]);
    let crc = Crc::<u32, NoTable>::new(&CRC_32_ISO_HDLC).checksum(record);
    if crc != u32::from_le_bytes([c0, c1, c2, c3]) {
        panic!("profile: checksum differs");
    }
    record
}

#[inline(never)]
fn start(rest: &[u8]) -> Option<Setup> {
    let Ok(start) = postcard::from_bytes::<Option<StartSpec>>(rest) else {
        panic!("profile: no start");
    };
    match start.map(|s| s.check()).transpose() {
        Ok(setup) => setup,
        Err(refused) => panic!("profile: {}", refused),
    }
}
