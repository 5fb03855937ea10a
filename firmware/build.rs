//! Checks the machine's profile with core's own rules, packs it, names the build, and places the linker's memory map.

use std::path::{Path, PathBuf};
use std::process::{Command, exit};
use std::{env, fs};

use rimrate_core::machine::{Machine, MachineSpec};
use start::StartSpec;

#[path = "flash/src/start.rs"]
mod start;

/// Room for the packed profile; the largest one allowed, 32 steps and 10 holders with full names, takes 1.6 KiB.
const ROOM: usize = 2048;

fn main() {
    let root = PathBuf::from(variable("CARGO_MANIFEST_DIR"));
    let out = PathBuf::from(variable("OUT_DIR"));

    let profile = root.join("machine.toml");
    println!("cargo::rerun-if-changed={}", profile.display());
    match packed(&profile) {
        Ok(bytes) => fs::write(out.join("profile.bin"), bytes).expect("OUT_DIR can be written"),
        Err(problem) => {
            eprintln!("error: {}: {problem}", profile.display());
            exit(1);
        }
    }

    let chip = if env::var_os("CARGO_FEATURE_PICO2").is_some() {
        "rp2350"
    } else {
        "rp2040"
    };
    let memory = root.join("memory").join(chip).with_extension("x");
    println!("cargo::rerun-if-changed={}", memory.display());
    fs::copy(&memory, out.join("memory.x")).expect("the memory map can be copied");
    println!("cargo::rustc-link-search={}", out.display());
    println!("cargo::rustc-link-arg-bins=--nmagic");
    println!("cargo::rustc-link-arg-bins=-Tlink.x");
    if chip == "rp2040" {
        println!("cargo::rustc-link-arg-bins=-Tlink-rp.x");
    }
    println!("cargo::rustc-link-arg-bins=-Tdefmt.x");

    println!("cargo::rustc-env=RIMRATE_BUILD={}", build_name(&root));
}

/// The profile as the firmware reads it: length and CRC-32 of the record, the record (postcard: machine, then start), zeros.
fn packed(profile: &Path) -> Result<Vec<u8>, String> {
    let text = fs::read_to_string(profile).map_err(|e| e.to_string())?;
    let mut table: toml::Table = text.parse().map_err(|e: toml::de::Error| e.to_string())?;
    let start: Option<StartSpec> = match table.remove("start") {
        None => None,
        Some(value) => Some(value.try_into().map_err(|e| format!("start: {e}"))?),
    };
    let machine: MachineSpec = table
        .try_into()
        .map_err(|e: toml::de::Error| e.to_string())?;
    let record = postcard::to_stdvec(&(&machine, &start)).map_err(|e| e.to_string())?;
    if let Some(start) = &start {
        start.check().map_err(|e| e.to_string())?;
    }
    Machine::new(machine).map_err(|e| e.to_string())?;
    let length = u16::try_from(record.len()).map_err(|e| e.to_string())?;
    let crc = crc::Crc::<u32, crc::NoTable>::new(&crc::CRC_32_ISO_HDLC).checksum(&record);
    let mut bytes = Vec::with_capacity(ROOM);
    bytes.extend(length.to_le_bytes());
    bytes.extend(crc.to_le_bytes());
    bytes.extend(record);
    if bytes.len() > ROOM {
        return Err(format!(
            "takes {} bytes packed, allowed are {ROOM}",
            bytes.len()
        ));
    }
    bytes.resize(ROOM, 0);
    Ok(bytes)
}

/// The commit, with a mark where the tree differs from it; a source archive has none.
fn build_name(root: &Path) -> String {
    println!("cargo::rerun-if-env-changed=RIMRATE_BUILD");
    let head = root.join("../.git/HEAD");
    if head.exists() {
        println!("cargo::rerun-if-changed={}", head.display());
    }
    env::var("RIMRATE_BUILD").unwrap_or_else(|_| {
        Command::new("git")
            .args(["describe", "--always", "--dirty=+", "--abbrev=8"])
            .current_dir(root)
            .output()
            .ok()
            .filter(|o| o.status.success())
            .and_then(|o| String::from_utf8(o.stdout).ok())
            .map_or_else(|| "unnamed".into(), |name| name.trim().into())
    })
}

fn variable(name: &str) -> String {
    env::var(name).unwrap_or_else(|_| panic!("cargo sets {name}"))
}
