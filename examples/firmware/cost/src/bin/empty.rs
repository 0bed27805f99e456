//! A program that does nothing: what the channel's flash is counted from.
#![cfg_attr(target_os = "none", no_std, no_main)]

#[cfg(target_os = "none")]
#[path = "../bare.rs"]
mod bare;

#[cfg(target_os = "none")]
#[cortex_m_rt::entry]
fn main() -> ! {
    loop {
        core::hint::black_box(());
    }
}

#[cfg(not(target_os = "none"))]
fn main() {}
