//! Calls every public entry of the crate with values that the compiler cannot know, and links only if no panic is
//! reachable from any of them. It is not run.
//!
//! Left out: the constructors `new` that are documented to panic, for use in a `const`; and `Debug`, whose text of a
//! float is the standard library's.
#![cfg_attr(target_os = "none", no_std, no_main)]

#[cfg(target_os = "none")]
mod boards;
#[cfg(target_os = "none")]
mod channels;
#[cfg(target_os = "none")]
mod estimates;
#[cfg(target_os = "none")]
mod quantities;

#[cfg(target_os = "none")]
#[no_panic::entry]
fn main() -> ! {
    loop {
        quantities::call();
        estimates::call();
        let (charge, flux) = boards::call();
        channels::call(charge);
        channels::call(flux);
        channels::switch();
    }
}

#[cfg(not(target_os = "none"))]
fn main() {}
