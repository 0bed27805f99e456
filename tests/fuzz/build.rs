//! The packed traces' tables are private to their module, which includes what a build script wrote: here empty ones,
//! and a door to unpack any other. Their packer is a build script itself, and its function is made to be seen.

use std::error::Error;
use std::fmt::Write;
use std::path::Path;
use std::{env, fs};

const TRACES: [&str; 9] = [
    "HATCHERY",
    "TICK_WRAP",
    "STUCK_SWITCH",
    "DIM_LAMP",
    "SOAKAGE",
    "WANDERING_OFFSET",
    "SEARCH_COIL",
    "LEAKY",
    "HELD",
];

const DOOR: &str = "
pub(crate) fn unpack(
    first: (u32, i32),
    millidegrees: i32,
    spans: &'static [(Mode, u32)],
    ticks: &'static [(u16, u16)],
    steps: &'static [i16],
) -> Vec<Sample> {
    let table = Table { name: \"\", first, millidegrees, spans, ticks, steps };
    Trace { table, setup: &boards::HATCHERY, si: Charge::as_coulombs }.samples().collect()
}
";

fn main() -> Result<(), Box<dyn Error>> {
    println!("cargo::rerun-if-changed=build.rs");
    let mut source = String::new();
    for name in TRACES {
        writeln!(
            source,
            "const {name}: Table = \
             Table {{ name: \"\", first: (0, 0), millidegrees: 0, spans: &[], ticks: &[], steps: &[] }};"
        )?;
    }
    source.push_str(DOOR);
    let out = env::var("OUT_DIR")?;
    fs::write(Path::new(&out).join("tables.rs"), source)?;

    let packer = Path::new(&env::var("CARGO_MANIFEST_DIR")?).join("../../examples/firmware/trace/build.rs");
    println!("cargo::rerun-if-changed={}", packer.display());
    let source: String = fs::read_to_string(&packer)?.lines().fold(String::new(), |source, line| {
        let line = if line.starts_with("//!") { "" } else { line };
        source + &line.replace("fn pack(", "pub(crate) fn pack(") + "\n"
    });
    fs::write(Path::new(&out).join("packing.rs"), source)?;
    Ok(())
}
