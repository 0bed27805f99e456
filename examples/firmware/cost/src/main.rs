//! What a channel costs on a microcontroller. On a target it measures and prints what it found; on the host it builds
//! and runs the programs for each target and prints one table.
#![cfg_attr(target_os = "none", no_std, no_main)]

#[cfg(target_os = "none")]
mod counter;
#[cfg(target_os = "none")]
mod measure;
#[cfg(target_os = "none")]
mod stack;

#[cfg(not(target_os = "none"))]
mod flash;
#[cfg(not(target_os = "none"))]
mod table;

#[cfg(not(target_os = "none"))]
fn main() -> Result<(), Box<dyn std::error::Error>> {
    table::print()
}
