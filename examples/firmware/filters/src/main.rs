//! On a target: instructions for each update. On the host: the error of the drift after ten million updates.
#![cfg_attr(target_os = "none", no_std, no_main)]

#[cfg(target_os = "none")]
mod target;

#[cfg(not(target_os = "none"))]
mod endurance;

#[cfg(not(target_os = "none"))]
fn main() {
    endurance::print();
}
