//! What programs need on the boards that QEMU emulates: an entry point, output and exit by semihosting, an instruction
//! counter, and how deep a call digs into the stack. Empty on the host.
#![no_std]

#[cfg(target_os = "none")]
mod counter;
#[cfg(target_os = "none")]
mod stack;

#[cfg(all(target_os = "none", target_arch = "arm"))]
pub use cortex_m_rt::entry;
#[cfg(all(target_os = "none", target_arch = "riscv32"))]
pub use riscv_rt::entry;

#[cfg(target_os = "none")]
pub use counter::Counter;
#[cfg(target_os = "none")]
pub use semihosting::{eprintln, io, println, process};
#[cfg(target_os = "none")]
pub use stack::{depth, dig_is_seen, paint, pointer};
