//! What a channel costs on a microcontroller. On a target it measures and prints what it found; on the host it builds
//! and runs the programs for each target, prints the tables, and compares them with the committed figures, the goals
//! and the limits on what hostile input may cost.
#![cfg_attr(target_os = "none", no_std, no_main)]

#[cfg(target_os = "none")]
mod calls;
#[cfg(target_os = "none")]
mod fuzzed;
#[cfg(target_os = "none")]
mod measure;
#[cfg(target_os = "none")]
mod tally;

#[cfg(any(target_os = "none", test))]
mod boards;
#[cfg(any(target_os = "none", test))]
mod chance;
#[cfg(any(target_os = "none", test))]
mod dear;
#[cfg(any(target_os = "none", test))]
mod hostile;
#[cfg(any(target_os = "none", test))]
mod plant;

#[cfg(not(target_os = "none"))]
mod bounds;
#[cfg(not(target_os = "none"))]
mod build;
#[cfg(not(target_os = "none"))]
mod flash;
#[cfg(not(target_os = "none"))]
mod goals;
#[cfg(not(target_os = "none"))]
mod others;
#[cfg(not(target_os = "none"))]
mod ratios;
#[cfg(all(not(target_os = "none"), test))]
mod reach;
#[cfg(not(target_os = "none"))]
mod table;

/// Without an argument a figure that exceeds the committed ones is an error; `--record` commits what there is.
#[cfg(not(target_os = "none"))]
fn main() -> std::process::ExitCode {
    match run(std::env::args().any(|argument| argument == "--record")) {
        Ok(()) => std::process::ExitCode::SUCCESS,
        Err(e) => {
            eprintln!("{e}");
            std::process::ExitCode::FAILURE
        }
    }
}

#[cfg(not(target_os = "none"))]
fn run(record: bool) -> Result<(), Box<dyn std::error::Error>> {
    let mut table = table::Table::new("instructions, mean / worst of a single call");
    for target in build::TARGETS {
        table.add_column(target.name, build::measure(&target)?)?;
    }
    println!("{table}");
    goals::print(&table)?;
    let ratios = ratios::of(&table)?;
    ratios::print(&ratios);
    let filters = others::filters()?;
    println!("\n{filters}");
    others::print_endurance()?;
    ratios::hold(&ratios)?;
    bounds::hold("channel.md", &table, record)?;
    bounds::hold("filters.md", &filters, record)
}
