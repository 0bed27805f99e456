//! Search coil on an STM32F411; the wiring is in `README.md`.
#![cfg_attr(target_os = "none", no_std, no_main)]
#![deny(clippy::indexing_slicing, clippy::unwrap_used, clippy::expect_used, clippy::panic)]

#[cfg(target_os = "none")]
mod stm32;

#[cfg(target_os = "none")]
mod target {
    use core::panic::PanicInfo;

    use coil_stm32f4::Fluxmeter;
    use cortex_m::peripheral::SCB;

    use crate::stm32::BlackPill;

    #[cortex_m_rt::entry]
    fn main() -> ! {
        let Some(mut board) = BlackPill::start() else { SCB::sys_reset() };
        let mut meter = Fluxmeter::start();
        loop {
            let fault = meter.measure(&mut board);
            meter.pause(fault, &mut board);
        }
    }

    /// A restart lets go of the pins, and all switches open.
    #[panic_handler]
    fn panic(_: &PanicInfo) -> ! {
        SCB::sys_reset()
    }
}

#[cfg(not(target_os = "none"))]
fn main() {
    println!("This program is for an STM32F411; on a host only its tests run.");
}
