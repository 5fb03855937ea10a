//! The machine's profile as the firmware's `build.rs` packed it: length (u16) and CRC-32 (u32), both little-endian, then a
//! postcard record.

use crc::{CRC_32_ISO_HDLC, Crc, NoTable};
use rimrate_core::machine::{Machine, MachineSpec};
use rimrate_core::setup::Setup;
use static_cell::StaticCell;

use crate::start::StartSpec;

/// The machine and what is chosen at the start, checked once more by the same rules as at build time, and a number that
/// another profile does not have.
///
/// Panics, and so restarts, where the flash does not hold what was built.
///
/// A machine takes three kilobytes, its unchecked form as much, and moving them takes copies: hence the statics and the
/// functions that are not inlined. What they need on the stack they need one after the other.
#[inline(never)]
pub fn load(packed: &'static [u8]) -> (&'static Machine, Option<Setup>, u32) {
    static MACHINE: StaticCell<Machine> = StaticCell::new();
    let (record, mark) = record(packed);
    let Ok((spec, rest)) = postcard::take_from_bytes::<MachineSpec>(record) else {
        panic!("profile: no machine");
    };
    let machine = MACHINE.init_with(|| match Machine::new(spec) {
        Ok(machine) => machine,
        Err(refused) => panic!("profile: {}", refused),
    });
    (machine, start(rest), mark)
}

/// The packed bytes, if they are whole, and their checksum.
#[inline(never)]
fn record(packed: &'static [u8]) -> (&'static [u8], u32) {
    let Some((&[l0, l1, c0, c1, c2, c3], rest)) = packed.split_first_chunk::<6>() else {
        panic!("profile: no header");
    };
    let length = usize::from(u16::from_le_bytes([l0, l1]));
    let record = rest.get(..length).unwrap_or(&[]);
    let crc = Crc::<u32, NoTable>::new(&CRC_32_ISO_HDLC).checksum(record);
    if crc != u32::from_le_bytes([c0, c1, c2, c3]) {
        panic!("profile: checksum differs");
    }
    (record, crc)
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
