//! What a channel should cost, beside what it does.

use std::error::Error;

use crate::table::Table;

/// A row of the table, which of its numbers, and the most that it should be on M0 and on M4F.
struct Goal {
    row: &'static str,
    worst: bool,
    m0: Option<u64>,
    m4f: Option<u64>,
}

const GOALS: [Goal; 8] = [
    Goal { row: "feed in Integrate", worst: false, m0: Some(250), m4f: Some(70) },
    Goal { row: "feed in Zero, blocks of 16 samples", worst: false, m0: Some(500), m4f: Some(80) },
    Goal { row: "feed in Zero, sample by sample", worst: false, m0: Some(5000), m4f: Some(150) },
    Goal { row: "any feed", worst: true, m0: Some(12_000), m4f: None },
    Goal {
        row: "flash for code and tables, with a set-up, bytes",
        worst: false,
        m0: Some(12 << 10),
        m4f: Some(9 << 10),
    },
    Goal { row: "RAM for a channel, bytes", worst: false, m0: Some(400), m4f: Some(400) },
    Goal { row: "stack of feed, bytes", worst: false, m0: Some(700), m4f: None },
    Goal { row: "stack of reading, bytes", worst: false, m0: Some(700), m4f: None },
];

/// A goal that is missed is no error.
pub(crate) fn print(table: &Table) -> Result<(), Box<dyn Error>> {
    println!("| goal | target | at most | is | |\n| --- | --- | ---: | ---: | --- |");
    for goal in &GOALS {
        for (column, most) in [("Cortex-M0", goal.m0), ("Cortex-M4F", goal.m4f)] {
            let Some(most) = most else { continue };
            let numbers = table.numbers(goal.row, column).ok_or_else(|| format!("{} is not measured", goal.row))?;
            let chosen = if goal.worst { numbers.last() } else { numbers.first() };
            let is = *chosen.ok_or_else(|| format!("{} has no number", goal.row))?;
            let what = match (goal.worst, numbers.len()) {
                (true, _) => ", worst",
                (false, 2) => ", mean",
                _ => "",
            };
            let verdict =
                if is <= most { "met".into() } else { format!("missed: {:.1} times", is as f64 / most as f64) };
            println!("| {}{what} | {column} | {most} | {is} | {verdict} |", goal.row);
        }
    }
    Ok(())
}
