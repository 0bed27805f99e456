//! What a program without an operating system needs, at no cost in flash.
#![no_std]

#[cfg(all(target_os = "none", target_arch = "arm"))]
pub use cortex_m_rt::entry;
#[cfg(all(target_os = "none", target_arch = "riscv32"))]
pub use riscv_rt::entry;

#[cfg(target_os = "none")]
mod handler {
    use core::panic::PanicInfo;

    unsafe extern "C" {
        safe fn a_panic_is_reachable() -> !;
    }

    /// Calls what does not exist: the program links only if the linker can drop this function, that is if no panic is
    /// reachable.
    #[panic_handler]
    fn panic(_: &PanicInfo) -> ! {
        a_panic_is_reachable()
    }
}
