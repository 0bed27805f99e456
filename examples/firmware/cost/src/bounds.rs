//! The committed figures: what is measured may exceed none of them by more than a twentieth.

use std::error::Error;
use std::fs;
use std::path::Path;
use std::process::Command;

use crate::table::Table;

/// Compares `table` with the committed one, or commits it.
pub(crate) fn hold(file: &str, table: &Table, record: bool) -> Result<(), Box<dyn Error>> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("figures").join(file);
    if record {
        // Another compiler makes other code.
        let compiler = Command::new("rustc").arg("--version").output()?;
        return Ok(fs::write(path, format!("{}\n{table}", String::from_utf8(compiler.stdout)?))?);
    }
    let committed = Table::parse(&fs::read_to_string(&path).map_err(|e| format!("{}: {e}", path.display()))?);
    let exceeded = exceeded(&committed, table);
    if exceeded.is_empty() {
        return Ok(());
    }
    let advice = "if that is meant, run again with --record and commit what it writes";
    Err(format!("more than in {}:\n{}\n{advice}", path.display(), exceeded.join("\n")).into())
}

/// What is new, gone or more by over 5 %.
fn exceeded(committed: &Table, measured: &Table) -> Vec<String> {
    let mut lines = Vec::new();
    for (row, column, now) in measured.cells() {
        match committed.numbers(row, column) {
            Some(before) if before.len() == now.len() => {
                if before.iter().zip(&now).any(|(before, now)| now * 20 > before * 21) {
                    lines.push(format!("{row}, {column}: {now:?}, committed {before:?}"));
                }
            }
            _ => lines.push(format!("{row}, {column}: not committed")),
        }
    }
    let gone = committed.cells().filter(|(row, column, _)| measured.numbers(row, column).is_none());
    lines.extend(gone.map(|(row, column, _)| format!("{row}, {column}: no longer measured")));
    lines
}

#[cfg(test)]
mod tests {
    use super::*;

    fn table(cell: &str) -> Table {
        Table::parse(&format!("| x | M0 |\n| --- | ---: |\n| feed | {cell} |\n"))
    }

    #[test]
    fn a_twentieth_more_is_allowed_and_no_more() {
        let committed = table("100 / 200");
        for (cell, held) in [("105 / 210", true), ("106 / 200", false), ("100 / 211", false), ("1 / 2", true)] {
            assert_eq!(exceeded(&committed, &table(cell)).is_empty(), held, "{cell}");
        }
    }

    #[test]
    fn what_is_new_or_gone_is_told() {
        let renamed = Table::parse("| x | M0 |\n| --- | ---: |\n| read | 1 |\n");
        assert_eq!(exceeded(&table("1"), &renamed).len(), 2);
    }
}
