//! Reads the published values in this directory (each file names its source in its first lines) and compares.
#![allow(dead_code, reason = "each test file reads its own part")]

use std::collections::HashMap;

/// 2^-24: the largest relative error of one rounding to `f32`.
pub(crate) const ROUNDING: f64 = 1.0 / 16_777_216.0;

/// `actual` lies within `tolerance` of `expected`, on either side. Run with `--nocapture` to see by how much.
#[track_caller]
pub(crate) fn close(what: &str, actual: impl Into<f64>, expected: f64, tolerance: f64) {
    let actual = actual.into();
    let error = (actual - expected).abs();
    println!("{what}: {actual} for {expected}, {:.2} of the tolerance", error / tolerance);
    assert!(error <= tolerance, "{what}: {actual} is not {expected} within {tolerance:e}");
}

/// The same with a tolerance in roundings of `expected` to `f32`.
#[track_caller]
pub(crate) fn close_by_roundings(what: &str, actual: impl Into<f64>, expected: f64, roundings: f64) {
    close(what, actual, expected, roundings * ROUNDING * expected.abs());
}

/// `actual`, rounded to `decimals`, is what the document prints.
#[track_caller]
pub(crate) fn prints_as(what: &str, actual: f64, printed: f64, decimals: i32) {
    close(what, actual, printed, 0.5 * libm::pow(10.0, -f64::from(decimals)));
}

/// The figures of a TOML file, or of one of its sections.
pub(crate) struct Figures(toml::Table);

impl Figures {
    /// Of a whole file.
    pub(crate) fn of(text: &str) -> Self {
        match text.parse() {
            Ok(table) => Self(table),
            Err(e) => panic!("{e}"),
        }
    }

    /// Of one section.
    pub(crate) fn section(&self, name: &str) -> Self {
        match self.0.get(name) {
            Some(toml::Value::Table(table)) => Self(table.clone()),
            _ => panic!("no section {name}"),
        }
    }

    /// One figure.
    pub(crate) fn number(&self, name: &str) -> f64 {
        self.0.get(name).and_then(number).unwrap_or_else(|| panic!("no number {name}"))
    }

    /// A row of figures.
    pub(crate) fn list(&self, name: &str) -> Vec<f64> {
        self.0.get(name).and_then(list).unwrap_or_else(|| panic!("no list {name}"))
    }

    /// A table of figures with `N` columns.
    pub(crate) fn rows<const N: usize>(&self, name: &str) -> Vec<[f64; N]> {
        let rows = self.0.get(name).and_then(toml::Value::as_array).unwrap_or_else(|| panic!("no table {name}"));
        rows.iter()
            .map(|row| list(row).and_then(|row| row.try_into().ok()).unwrap_or_else(|| panic!("{name}: bad row {row}")))
            .collect()
    }
}

fn number(value: &toml::Value) -> Option<f64> {
    value.as_float().or_else(|| value.as_integer().map(|whole| whole as f64))
}

fn list(value: &toml::Value) -> Option<Vec<f64>> {
    value.as_array()?.iter().map(number).collect()
}

/// One line of a CSV file.
#[derive(Clone)]
pub(crate) struct Record(HashMap<String, String>);

impl Record {
    /// A cell as it stands; empty if it is missing.
    pub(crate) fn text(&self, column: &str) -> &str {
        self.0.get(column).map_or("", String::as_str)
    }

    /// A cell's number.
    pub(crate) fn number(&self, column: &str) -> f64 {
        self.text(column).parse().unwrap_or_else(|_| panic!("no number in column {column}: {:?}", self.0))
    }
}

/// The lines of a CSV file with a heading; lines may be shorter than it.
pub(crate) fn records(text: &str) -> Vec<Record> {
    let mut lines =
        csv::ReaderBuilder::new().comment(Some(b'#')).flexible(true).has_headers(false).from_reader(text.as_bytes());
    let mut lines = lines.records().map(|line| line.unwrap_or_else(|e| panic!("{e}")));
    let heading = lines.next().unwrap_or_default();
    let cells =
        |line: csv::StringRecord| heading.iter().map(str::to_owned).zip(line.iter().map(str::to_owned)).collect();
    lines.map(|line| Record(cells(line))).collect()
}
