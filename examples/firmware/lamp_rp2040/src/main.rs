//! Lamp monitor of a seaweed hatchery on an RP2040; the wiring is in `README.md`.
#![cfg_attr(target_os = "none", no_std, no_main)]
#![deny(clippy::indexing_slicing, clippy::unwrap_used, clippy::expect_used, clippy::panic)]

#[cfg(target_os = "none")]
mod rp2040;

#[cfg(target_os = "none")]
mod target {
    use core::panic::PanicInfo;

    use lamp_rp2040::Monitor;

    use crate::rp2040::Pico;

    /// Where the boot ROM finds how to set up the flash.
    #[allow(unsafe_code, reason = "the linker has to put it first")]
    #[unsafe(link_section = ".boot2")]
    #[used]
    static BOOT2: [u8; 256] = rp2040_boot2::BOOT_LOADER_GENERIC_03H;

    #[rp2040_hal::entry]
    fn main() -> ! {
        let Some(mut board) = Pico::start() else { rp2040_hal::reset() };
        let mut monitor = Monitor::start();
        loop {
            let fault = monitor.measure(&mut board);
            monitor.pause(fault, &mut board);
        }
    }

    /// A restart lets go of the pins, and all switches open.
    #[panic_handler]
    fn panic(_: &PanicInfo) -> ! {
        rp2040_hal::reset()
    }
}

#[cfg(not(target_os = "none"))]
fn main() {
    println!("This program is for an RP2040; on a host only its tests run.");
}
