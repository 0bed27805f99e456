//! Prints a hash over the results' bits of each approximate function, which must be equal on host and targets; on a
//! target it prints to its standard error what a call costs, beside the exact function.
#![cfg_attr(target_os = "none", no_std, no_main)]

#[cfg(target_os = "none")]
mod cost;
mod hash;

#[cfg(not(target_os = "none"))]
fn main() {
    for (name, hash) in hash::all() {
        println!("{name} {hash:016x}");
    }
}

#[cfg(target_os = "none")]
#[emulated::entry]
fn main() -> ! {
    for (name, hash) in hash::all() {
        emulated::println!("{name} {hash:016x}");
    }
    emulated::process::exit(i32::from(!cost::print()))
}
