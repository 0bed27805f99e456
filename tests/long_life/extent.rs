//! How long a test runs, what it tells meanwhile, and the table at its end.

use std::io::IsTerminal;
use std::time::Instant;

/// Days of a simulated life: `BRIMLINE_YEARS` years of 365 days, or what the suite takes.
pub(crate) fn days(suite: u64) -> u64 {
    let years: Option<f64> = std::env::var("BRIMLINE_YEARS").ok().and_then(|text| text.parse().ok());
    let suite = if cfg!(debug_assertions) { suite.div_ceil(20) } else { suite };
    years.map_or(suite, |years| (years * 365.0).ceil() as u64)
}

/// Updates of a filter: a tenth of a billion for each of `BRIMLINE_YEARS`, or what the suite takes.
pub(crate) fn updates(suite: u64) -> u64 {
    let years: Option<f64> = std::env::var("BRIMLINE_YEARS").ok().and_then(|text| text.parse().ok());
    let suite = if cfg!(debug_assertions) { suite / 20 } else { suite };
    years.map_or(suite, |years| (years * 1e8).ceil() as u64)
}

/// Tells on stderr how far a long test is; the suite's is short and silent.
pub(crate) struct Progress {
    name: &'static str,
    began: Instant,
    told: Instant,
}

impl Progress {
    pub(crate) fn new(name: &'static str) -> Self {
        Self { name, began: Instant::now(), told: Instant::now() }
    }

    pub(crate) fn tell(&mut self, done: u64, of: u64) {
        let pause_s = if std::io::stderr().is_terminal() { 2 } else { 20 };
        if self.told.elapsed().as_secs() >= pause_s {
            self.told = Instant::now();
            let percent = 100.0 * done as f64 / of as f64;
            eprintln!("{}: {percent:.1} % after {} s", self.name, self.began.elapsed().as_secs());
        }
    }

    /// Nanoseconds for each of `samples`.
    pub(crate) fn pace_ns(&self, samples: u64) -> f64 {
        self.began.elapsed().as_nanos() as f64 / samples as f64
    }
}

/// A Markdown table that is printed in one piece, since tests run side by side.
pub(crate) struct Table(String);

impl Table {
    pub(crate) fn new(heading: &str) -> Self {
        let columns = heading.matches('|').count() - 1;
        Self(format!("\n{heading}\n|{}|\n", vec!["--:"; columns].join("|")))
    }

    pub(crate) fn row(&mut self, row: &str) {
        self.0.push_str(row);
        self.0.push('\n');
    }

    pub(crate) fn print(&self) {
        println!("{}", self.0);
    }
}
