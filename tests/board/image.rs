//! The firmware's ELF file: what is flashed, where things are, and how its log is read.

use std::collections::BTreeMap;
use std::path::PathBuf;
use std::sync::LazyLock;

use defmt_decoder::Table;
use object::elf::PT_LOAD;
use object::read::elf::{ElfFile32, ProgramHeader};
use object::{Endianness, Object, ObjectSection, ObjectSymbol};
use rimrate_core::machine::MachineSpec;
use rimrate_core::setup::Setup;
use serde_json::{Map, Value};

/// Start of the flash (RP2040 data sheet, 2.2).
const FLASH: u64 = 0x1000_0000;
const FLASH_END: u64 = 0x1020_0000;

/// The one pin table; what is wired on the bench follows it.
const PIN_TABLE: &str = include_str!("../../firmware/src/board/pico.rs");

/// The image that all checks run.
pub(crate) static IMAGE: LazyLock<Image> = LazyLock::new(|| Image::load("rimrate-firmware.elf"));
/// The one for a display with the other controller.
pub(crate) static IMAGE_SH1106: LazyLock<Image> =
    LazyLock::new(|| Image::load("rimrate-firmware-sh1106.elf"));

/// The firmware as it is flashed.
pub(crate) struct Image {
    elf: Vec<u8>,
    /// From the start of the flash on.
    pub(crate) flash: Vec<u8>,
    /// Reads the log.
    pub(crate) table: Table,
}

impl Image {
    /// From the folder `RIMRATE_IMAGES`, or where `firmware/build.sh` leaves it.
    fn load(name: &str) -> Self {
        let built = concat!(env!("CARGO_MANIFEST_DIR"), "/../firmware/target/image");
        let folder = std::env::var_os("RIMRATE_IMAGES").unwrap_or_else(|| built.into());
        let path = PathBuf::from(folder).join(name);
        let elf = std::fs::read(&path).unwrap_or_else(|e| {
            panic!(
                "the firmware's image {} cannot be read ({e}): build it with firmware/build.sh, or name the folder of \
                 another one in RIMRATE_IMAGES",
                path.display()
            )
        });
        let file = ElfFile32::<Endianness>::parse(&*elf).expect("the image is an ELF file");
        let endian = file.endian();
        let mut flash = Vec::new();
        for header in file.elf_program_headers() {
            let data = header.data(endian, &*elf).expect("the segment can be read");
            if header.p_type(endian) != PT_LOAD || data.is_empty() {
                continue;
            }
            // The physical address: what belongs into RAM lies in flash, too, and the program copies it.
            let address = u64::from(header.p_paddr(endian));
            assert!(
                (FLASH..FLASH_END).contains(&address),
                "a segment with contents at {address:#x}"
            );
            let at = (address - FLASH) as usize;
            flash.resize(flash.len().max(at + data.len()), 0xff);
            flash[at..at + data.len()].copy_from_slice(data);
        }
        let table = Table::parse(&elf)
            .expect("the log's table can be read")
            .expect("the image has a log's table");
        Image { elf, flash, table }
    }

    fn file(&self) -> object::File<'_> {
        object::File::parse(&*self.elf).expect("was parsed before")
    }

    /// Address and size of a symbol by its full name, demangled, without generic arguments.
    pub(crate) fn symbol(&self, name: &str) -> (u64, u64) {
        let same = |mangled: &str| {
            let plain = format!("{:#}", rustc_demangle::demangle(mangled));
            plain == name || plain.replace(['<', '>'], "") == name
        };
        let file = self.file();
        let found = file
            .symbols()
            .find(|s| !s.is_undefined() && s.name().is_ok_and(same));
        let symbol = found.unwrap_or_else(|| panic!("the image has no symbol {name}"));
        (symbol.address() & !1, symbol.size())
    }

    /// Sizes of the sections that take flash or RAM.
    pub(crate) fn sections(&self) -> BTreeMap<String, u64> {
        self.file()
            .sections()
            .filter(|s| s.address() >= FLASH)
            .filter_map(|s| Some((s.name().ok()?.to_owned(), s.size())))
            .collect()
    }

    /// The flash with another machine and setup in the place of those that it was built with: as another `machine.toml`
    /// would have made it.
    pub(crate) fn flash_for(&self, machine: &MachineSpec, setup: Option<&Setup>) -> Vec<u8> {
        let start = setup.map(|s| {
            (
                s.material,
                s.tool,
                s.operation,
                s.coolant,
                s.diameter.mm(),
                s.holder,
                s.cap.map(|n| n.get()),
                s.pulses.map(|n| n.get().get()),
            )
        });
        let record = postcard::to_stdvec(&(machine, start)).expect("a record can be packed");
        let crc = crc::Crc::<u32>::new(&crc::CRC_32_ISO_HDLC).checksum(&record);
        let mut bytes = Vec::new();
        bytes.extend((record.len() as u16).to_le_bytes());
        bytes.extend(crc.to_le_bytes());
        bytes.extend(record);
        let (at, room) = self.symbol("RIMRATE_PROFILE");
        assert!(bytes.len() as u64 <= room, "the profile is too large");
        let at = (at - FLASH) as usize;
        let mut flash = self.flash.clone();
        flash[at..at + bytes.len()].copy_from_slice(&bytes);
        flash
    }
}

/// Which pin serves which purpose, from the firmware's own table.
pub(crate) fn pins() -> BTreeMap<String, u8> {
    PIN_TABLE
        .lines()
        .filter_map(|line| {
            let (name, pin) = line.trim().split_once(": PIN_")?;
            Some((
                name.to_owned(),
                pin.trim_end_matches(',').parse::<u8>().ok()?,
            ))
        })
        .collect()
}

/// The pins that the bench is wired to, under the emulator's names.
pub(crate) fn wires() -> Map<String, Value> {
    pins()
        .into_iter()
        .map(|(name, pin)| {
            let short = ["display_", "lamp_"]
                .iter()
                .find_map(|prefix| name.strip_prefix(prefix));
            (short.unwrap_or(&name).to_owned(), Value::from(pin))
        })
        .collect()
}

/// The pin tables of firmware and hardware agree; the Pico's own lamp is wired to nothing.
#[test]
fn pins_are_those_that_the_hardware_is_wired_to() {
    let path = concat!(env!("CARGO_MANIFEST_DIR"), "/../hardware/pins.csv");
    let mut table = csv::Reader::from_path(path).expect("the pin table can be read");
    let wired: BTreeMap<String, u8> = table
        .deserialize::<BTreeMap<String, String>>()
        .map(|row| row.expect("a row of the pin table"))
        .map(|row| (row["signal"].clone(), row["gpio"].parse().expect("a pin")))
        .collect();
    let mut programmed = pins();
    assert_eq!(programmed.remove("status"), Some(25));
    assert!(wired.len() > 10, "{wired:?}");
    assert_eq!(programmed, wired);
}
