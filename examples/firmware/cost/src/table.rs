//! A table with a column for each target, as it is printed and committed.

use std::error::Error;
use std::fmt;

use crate::build::Rows;

/// Cells hold one number, or two parted by ` / `.
#[derive(Debug, Default, PartialEq)]
pub(crate) struct Table {
    corner: String,
    columns: Vec<String>,
    rows: Vec<(String, Vec<String>)>,
}

impl Table {
    /// An empty table; `corner` says what its numbers are.
    pub(crate) fn new(corner: &str) -> Self {
        Self { corner: corner.into(), ..Self::default() }
    }

    /// Every column must have the same rows.
    pub(crate) fn add_column(&mut self, name: &str, rows: Rows) -> Result<(), Box<dyn Error>> {
        if self.columns.is_empty() {
            self.rows = rows.iter().map(|(row, _)| (row.clone(), Vec::new())).collect();
        }
        if self.rows.iter().map(|(row, _)| row).ne(rows.iter().map(|(row, _)| row)) {
            return Err(format!("{name}: other things were measured than on the other targets").into());
        }
        self.columns.push(name.into());
        self.rows.iter_mut().zip(rows).for_each(|((_, cells), (_, value))| cells.push(value));
        Ok(())
    }

    /// The names of the columns.
    pub(crate) fn columns(&self) -> impl Iterator<Item = &str> {
        self.columns.iter().map(String::as_str)
    }

    /// The names of rows and columns of all cells, with their numbers.
    pub(crate) fn cells(&self) -> impl Iterator<Item = (&str, &str, Vec<u64>)> {
        self.rows.iter().flat_map(|(row, cells)| {
            let numbers = |cell: &String| cell.split(" / ").filter_map(|number| number.parse().ok()).collect();
            self.columns.iter().zip(cells).map(move |(column, cell)| (row.as_str(), column.as_str(), numbers(cell)))
        })
    }

    /// The numbers of a cell.
    pub(crate) fn numbers(&self, row: &str, column: &str) -> Option<Vec<u64>> {
        self.cells().find(|cell| (cell.0, cell.1) == (row, column)).map(|cell| cell.2)
    }

    /// Reads what was printed.
    pub(crate) fn parse(text: &str) -> Self {
        let mut lines = text.lines().filter_map(|line| line.strip_prefix("| ")?.strip_suffix(" |"));
        let split = |line: &str| line.split(" | ").map(str::to_owned).collect::<Vec<_>>();
        let mut head = lines.next().map_or_else(|| vec![String::new()], split);
        let columns = head.split_off(1);
        let rows = lines.skip(1).map(|line| {
            let mut cells = split(line);
            let rest = cells.split_off(1);
            (cells.remove(0), rest)
        });
        Self { corner: head.remove(0), columns, rows: rows.collect() }
    }
}

impl fmt::Display for Table {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        writeln!(f, "| {} | {} |", self.corner, self.columns.join(" | "))?;
        writeln!(f, "| --- |{}", " ---: |".repeat(self.columns.len()))?;
        for (row, cells) in &self.rows {
            writeln!(f, "| {row} | {} |", cells.join(" | "))?;
        }
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_was_printed_is_read_again() {
        let mut table = Table::new("number");
        for (column, value) in [("a", "1 / 2"), ("b", "3")] {
            assert!(table.add_column(column, vec![("one".into(), value.into()), ("two".into(), "4".into())]).is_ok());
        }
        assert_eq!(Table::parse(&table.to_string()), table);
        assert_eq!(table.numbers("one", "a"), Some(vec![1, 2]));
        assert!(table.add_column("c", vec![("one".into(), "5".into())]).is_err());
    }
}
