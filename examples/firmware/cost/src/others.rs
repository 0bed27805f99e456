//! The crate's filter of level and drift beside others.

use std::error::Error;

use crate::build::{TARGETS, cargo, run};
use crate::table::Table;

/// Instructions for each update, optimised for size and for speed.
pub(crate) fn filters() -> Result<Table, Box<dyn Error>> {
    let mut table = Table::new("instructions for each update, opt-level \"s\" / 3");
    for target in TARGETS {
        let (small, fast) = (run("filters", &target, "s")?, run("filters", &target, "3")?);
        let both = small.into_iter().zip(fast).map(|((name, s), (_, o3))| (name, format!("{s} / {o3}")));
        table.add_column(target.name, both.collect())?;
    }
    Ok(table)
}

/// What drift they find.
pub(crate) fn print_endurance() -> Result<(), Box<dyn Error>> {
    let printed = cargo(&["run", "--package", "filters"], "s")?;
    let lines: Vec<&str> = printed.lines().collect();
    let (high, low) = lines.split_at(lines.len() / 2);
    println!("Error of a drift of 0.5 counts/s in the last of ten million updates, rms, counts/s:\n");
    println!("| filter | bytes | level of 2^23 | level from 0 |\n| --- | ---: | ---: | ---: |");
    for (high, low) in high.iter().zip(low) {
        let (_, error) = low.rsplit_once(" | ").ok_or("no error of the drift")?;
        println!("| {high} | {error} |");
    }
    Ok(())
}
