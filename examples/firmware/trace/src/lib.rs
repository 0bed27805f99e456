//! Recorded traces small enough for a microcontroller's flash, and the log that a run through a channel prints.
#![no_std]

mod boards;
mod fnv;
mod log;
mod table;

pub use log::write_logs;
pub use table::{BLOCKS_OF_16, CHARGE, FLUX, Trace, UNBLOCKED};
