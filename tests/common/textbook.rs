//! What firmware usually does, for contrast.

use brimline::{Mode, Sample};

use super::Claim;
use super::board::Board;
use super::plant::Record;

/// A line through the opening zero by ordinary least squares, extrapolated to the stop, with its textbook standard
/// error: scatter about the line, as if the samples' errors were independent (prediction interval; any statistics
/// textbook).
pub(crate) fn ordinary_line(board: &Board, record: &Record) -> Claim {
    let zero = || record.samples.iter().take(record.opening_end + 1).filter(|s| s.mode == Mode::Zero);
    let (Some(first), Some(stop)) = (zero().next(), record.samples.get(record.run_end)) else { panic!("no zero") };
    let x = |s: &Sample| f64::from(s.tick.wrapping_sub(first.tick)) / board.converter.tick_hz;
    let n = zero().count() as f64;
    let x_mean = zero().map(x).sum::<f64>() / n;
    let y_mean = zero().map(|s| f64::from(s.counts)).sum::<f64>() / n;
    let xx: f64 = zero().map(|s| (x(s) - x_mean).powi(2)).sum();
    let slope = zero().map(|s| (x(s) - x_mean) * (f64::from(s.counts) - y_mean)).sum::<f64>() / xx;
    let line = |s: &Sample| y_mean + slope * (x(s) - x_mean);
    let variance = zero().map(|s| (f64::from(s.counts) - line(s)).powi(2)).sum::<f64>() / (n - 2.0);
    let movement = f64::from(stop.counts) - line(stop);
    let u = (variance * (1.0 + 1.0 / n + (x(stop) - x_mean).powi(2) / xx)).sqrt();
    claim(board, movement, u)
}

/// Last reading of the run less last reading of the zero, with the readout noise of both.
pub(crate) fn uncorrected(board: &Board, record: &Record) -> Claim {
    let (Some(start), Some(stop)) = (record.samples.get(record.opening_end), record.samples.get(record.run_end)) else {
        panic!("no run");
    };
    let variance = board.noise.readout_counts.powi(2) + 1.0 / 12.0;
    claim(board, f64::from(stop.counts - start.counts), (2.0 * variance).sqrt())
}

fn claim(board: &Board, movement: f64, u: f64) -> Claim {
    Claim { value: movement * board.sign() * board.input_per_count(), u: u * board.input_per_count() }
}
