//! Where the instructions of a call and the bytes of flash go. On the target it feeds a trace, each call between two
//! markers; on the host it runs that in QEMU one instruction at a time and tells which function each belongs to.
#![cfg_attr(target_os = "none", no_std, no_main)]

#[cfg(target_os = "none")]
mod target;

#[cfg(not(target_os = "none"))]
mod calls;
#[cfg(not(target_os = "none"))]
mod flash;
#[cfg(not(target_os = "none"))]
mod names;
#[cfg(not(target_os = "none"))]
mod report;
#[cfg(not(target_os = "none"))]
mod run;

#[cfg(not(target_os = "none"))]
fn main() -> Result<(), Box<dyn std::error::Error>> {
    let target = std::env::args().nth(1).unwrap_or_else(|| "thumbv6m-none-eabi".into());
    flash::print(&run::build(&target, "cost", "channel")?)?;
    let elf = run::build(&target, "profile", "profile")?;
    let names = names::Names::of(&elf)?;
    let calls = run::calls(&target, &elf, &names)?;
    report::print(&calls);
    Ok(())
}
