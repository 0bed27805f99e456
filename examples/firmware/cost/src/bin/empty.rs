//! A program that does nothing: what the channel's flash is counted from.
#![cfg_attr(target_os = "none", no_std, no_main)]

#[cfg(target_os = "none")]
#[no_panic::entry]
fn main() -> ! {
    loop {
        core::hint::black_box(());
    }
}

#[cfg(not(target_os = "none"))]
fn main() {}
