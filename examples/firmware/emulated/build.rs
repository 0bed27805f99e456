//! Tells the clock of the timer on the board that QEMU emulates for the target, MHz.

use std::error::Error;

fn main() -> Result<(), Box<dyn Error>> {
    println!("cargo::rerun-if-changed=build.rs");
    let clock = match std::env::var("TARGET")?.as_str() {
        "thumbv6m-none-eabi" => 16,
        "thumbv7m-none-eabi" | "thumbv7em-none-eabihf" => 25,
        "thumbv8m.main-none-eabihf" => 20,
        _ => return Ok(()),
    };
    println!("cargo::rustc-env=EMULATED_MHZ={clock}");
    Ok(())
}
