//! What the fuzz targets share. Each target turns bytes into a case; what must hold for any case is told here.

use std::sync::OnceLock;

/// Prints a step of a case if `FUZZ_SHOW` is in the environment: for a look at what a fuzzer has found.
pub fn show(step: impl FnOnce() -> String) {
    static WANTED: OnceLock<bool> = OnceLock::new();
    if *WANTED.get_or_init(|| std::env::var_os("FUZZ_SHOW").is_some()) {
        println!("{}", step());
    }
}

pub mod board;
pub mod draw;
pub mod drill;
pub mod excluded;
pub mod plant;
pub mod script;
pub mod shadow;
pub mod sound;
pub mod story;
pub mod texts;

// A recorded trace's packed form, with its boards; `build.rs` adds a way to unpack any table.
#[path = "../../../examples/firmware/trace/src/boards.rs"]
#[allow(dead_code, reason = "boards of traces that are not packed here")]
mod boards;
#[allow(dead_code, reason = "a build script has a `main` of its own")]
mod packing {
    include!(concat!(env!("OUT_DIR"), "/packing.rs"));
}
#[path = "../../../examples/replay/setup_file.rs"]
mod setup_file;
#[path = "../../../examples/firmware/trace/src/table.rs"]
#[allow(dead_code, reason = "logs are not written here")]
mod table;
#[path = "../../../examples/replay/trace_file.rs"]
mod trace_file;
