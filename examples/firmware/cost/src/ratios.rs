//! How much dearer a call becomes by input that no board should give: the worst of hostile scripts over what the
//! recorded traces cost.

use std::error::Error;

use crate::table::Table;

/// Rows of the table, and how many times the worst on the traces the worst of hostile scripts may be.
struct Limit {
    fuzzed: &'static str,
    recorded: &'static [&'static str],
    most: f64,
}

const FEED: &[&str] = &["any feed"];
const READING: &[&str] = &["reading in a run", "reading after a run"];

/// A little above the most that the five targets, and a search fifteen times as long on two of them, have shown: 2.75
/// (Cortex-M4F), 3.44 (M0), 1.21 (M3) and 1.60 (M0). What hostile input leads to, a trace leads to as well; but more of
/// it may fall to one sample. On the traces a segment of a run fills the window before it ends. One that ends before
/// leaves the line after the interruption before it and its bridge to the same sample as either the line before the
/// next interruption, or the run's total and the beginning of a zero. On the dear boards leak, branches of soakage,
/// walks and uncertain figures add to each of them. A loop that input can lengthen would come to far more.
const LIMITS: [Limit; 4] = [
    Limit { fuzzed: "feed, fuzzed", recorded: FEED, most: 3.0 },
    Limit { fuzzed: "feed, fuzzed, on dear boards", recorded: FEED, most: 3.5 },
    Limit { fuzzed: "reading, fuzzed", recorded: READING, most: 1.3 },
    Limit { fuzzed: "reading, fuzzed, on dear boards", recorded: READING, most: 1.7 },
];

/// The ratios of one row on one target.
#[derive(Debug)]
pub(crate) struct Ratio {
    row: &'static str,
    column: String,
    /// The worst, over the worst on the traces and over their mean.
    to_worst: f64,
    to_mean: f64,
    most: f64,
}

/// All of them; an error if a row is missing.
pub(crate) fn of(table: &Table) -> Result<Vec<Ratio>, Box<dyn Error>> {
    let mut ratios = Vec::new();
    for limit in &LIMITS {
        for column in table.columns() {
            let numbers = |row: &str| match table.numbers(row, column).as_deref() {
                Some(&[mean, worst]) => Ok((mean as f64, worst as f64)),
                _ => Err(format!("{row} is not measured on {column}")),
            };
            let (_, fuzzed) = numbers(limit.fuzzed)?;
            let recorded = limit.recorded.iter().map(|row| numbers(row)).collect::<Result<Vec<_>, _>>()?;
            // Of several rows the dearest call, and the mean of the cheapest row.
            let worst = recorded.iter().map(|(_, worst)| *worst).fold(0.0, f64::max);
            let mean = recorded.iter().map(|(mean, _)| *mean).fold(f64::INFINITY, f64::min);
            let (row, column) = (limit.fuzzed, column.to_owned());
            ratios.push(Ratio { row, column, to_worst: fuzzed / worst, to_mean: fuzzed / mean, most: limit.most });
        }
    }
    Ok(ratios)
}

pub(crate) fn print(ratios: &[Ratio]) {
    println!("\n| worst of | target | over the worst on the traces | at most | over the mean on the traces |");
    println!("| --- | --- | ---: | ---: | ---: |");
    for Ratio { row, column, to_worst, to_mean, most } in ratios {
        println!("| {row} | {column} | {to_worst:.2} | {most:.1} | {to_mean:.1} |");
    }
}

/// An error that names every ratio above its limit.
pub(crate) fn hold(ratios: &[Ratio]) -> Result<(), Box<dyn Error>> {
    let above = ratios.iter().filter(|ratio| {
        // What is no number is not held.
        let held = ratio.to_worst <= ratio.most;
        !held
    });
    let lines: Vec<String> = above
        .map(|Ratio { row, column, to_worst, most, .. }| format!("{row}, {column}: {to_worst:.2}, at most {most:.1}"))
        .collect();
    if lines.is_empty() {
        return Ok(());
    }
    Err(format!("hostile input makes a call too much dearer than any on the traces:\n{}", lines.join("\n")).into())
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Traces with a feed of 10 and 100 and readings of 40 and 200, and the same on hostile input but for one row.
    fn table(row: &str, worst: u64) -> Table {
        let mut text = String::from("| x | M0 | M4F |\n| --- | ---: | ---: |\n");
        for (name, cell) in [("any feed", "10 / 100"), ("reading in a run", "40 / 150")] {
            text += &format!("| {name} | {cell} | {cell} |\n");
        }
        text += "| reading after a run | 50 / 200 | 50 / 200 |\n";
        for limit in &LIMITS {
            let same = if limit.recorded == FEED { 100 } else { 200 };
            let on_m4f = if limit.fuzzed == row { worst } else { same };
            text += &format!("| {} | 1 / {same} | 1 / {on_m4f} |\n", limit.fuzzed);
        }
        Table::parse(&text)
    }

    #[test]
    fn ratios_are_to_the_dearest_call_and_to_the_cheapest_mean() {
        let ratios = of(&table("reading, fuzzed", 240)).unwrap_or_default();
        assert_eq!(ratios.len(), 2 * LIMITS.len());
        let found = ratios.iter().find(|ratio| ratio.row == "reading, fuzzed" && ratio.column == "M4F");
        assert!(found.is_some_and(|ratio| (ratio.to_worst, ratio.to_mean) == (1.2, 6.0)), "{found:?}");
        let feed = ratios.iter().find(|ratio| ratio.row == "feed, fuzzed");
        assert!(feed.is_some_and(|ratio| (ratio.to_worst, ratio.to_mean) == (1.0, 10.0)), "{feed:?}");
    }

    #[test]
    fn each_limit_is_held_on_each_target() {
        for limit in &LIMITS {
            let same = if limit.recorded == FEED { 100.0 } else { 200.0 };
            let allowed = (limit.most * same) as u64;
            for (worst, held) in [(allowed, true), (allowed + 1, false)] {
                let verdict = of(&table(limit.fuzzed, worst)).and_then(|ratios| hold(&ratios));
                assert_eq!(verdict.is_ok(), held, "{}: {worst}", limit.fuzzed);
                let told = verdict.err().map(|e| e.to_string()).unwrap_or_default();
                assert_eq!(told.contains(&format!("{}, M4F", limit.fuzzed)), !held, "{told}");
                assert!(!told.contains("M0"), "{told}");
            }
        }
    }

    #[test]
    fn a_row_that_is_missing_or_counts_nothing_is_no_pass() {
        assert!(of(&Table::parse("| x | M0 |\n| --- | ---: |\n| any feed | 1 / 2 |\n")).is_err());
        let text = table("", 0).to_string().replace("10 / 100", "0 / 0").replace("1 / 100", "0 / 0");
        assert!(of(&Table::parse(&text)).and_then(|ratios| hold(&ratios)).is_err());
    }
}
