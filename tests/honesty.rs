//! How true the uncertainty is: seeded Monte Carlo over noise mixes, disturbances and wrong figures. `--nocapture`
//! shows the tables as Markdown; `BRIMLINE_TRIALS=2000` makes them full-size.
#![allow(clippy::disallowed_methods, reason = "a reference on the host computes in f64; only src must give equal bits")]

mod common;

#[path = "honesty/changes.rs"]
mod changes;
#[path = "honesty/hum.rs"]
mod hum;
#[path = "honesty/mixes.rs"]
mod mixes;
#[path = "honesty/onset.rs"]
mod onset;
#[path = "honesty/spikes.rs"]
mod spikes;
#[path = "honesty/wrong_figures.rs"]
mod wrong_figures;

use brimline::{Event, Notice};
use common::board::Character;
use common::plant::Timing;

/// Readout noise and random walk that both count in a zero of some seconds.
const WHITE_AND_WALK: Character = Character { readout: 1.0, walk: 0.5, wander: 0.0, drift_limit: 15.0 };

const TIMING: Timing = Timing { opening_s: 10.0, run_s: 20.0, closing_s: 10.0 };

/// Trials of each mix: what the suite takes, or what the environment asks for.
fn trials(suite: u64) -> u64 {
    std::env::var("BRIMLINE_TRIALS").ok().and_then(|text| text.parse().ok()).unwrap_or(suite)
}

/// Index of the sample that brought the first notice of a kind, and its tick.
fn first_of(notices: &[(usize, Notice)], event: Event) -> Option<(usize, u32)> {
    notices.iter().find(|(_, notice)| notice.event == event).map(|&(index, notice)| (index, notice.tick))
}

/// A Markdown table that is printed in one piece, since tests run side by side.
struct Table(String);

impl Table {
    fn new(heading: &str) -> Self {
        let columns = heading.matches('|').count() - 1;
        Self(format!("\n{heading}\n|---{}|\n", "|--:".repeat(columns - 1)))
    }

    fn row(&mut self, row: String) {
        self.0.push_str(&row);
        self.0.push('\n');
    }

    fn print(&self) {
        println!("{}", self.0);
    }
}

fn percent(part: u32, of: u32) -> f64 {
    100.0 * f64::from(part) / f64::from(of)
}

fn median(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    values.get(values.len() / 2).copied().unwrap_or(f64::NAN)
}
