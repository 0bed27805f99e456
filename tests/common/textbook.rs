//! What firmware usually does, for contrast.

use brimline::{Mode, Sample};

use super::Claim;
use super::board::Board;
use super::plant::Record;

/// A line through the opening zero by ordinary least squares.
struct Line {
    slope: f64,
    x_mean: f64,
    y_mean: f64,
    xx: f64,
    n: f64,
    /// Scatter about the line.
    variance: f64,
}

impl Line {
    fn through(board: &Board, record: &Record) -> Self {
        let x = |s: &Sample| seconds(board, record, s);
        let n = zero(record).count() as f64;
        let x_mean = zero(record).map(x).sum::<f64>() / n;
        let y_mean = zero(record).map(|s| f64::from(s.counts)).sum::<f64>() / n;
        let xx: f64 = zero(record).map(|s| (x(s) - x_mean).powi(2)).sum();
        let slope = zero(record).map(|s| (x(s) - x_mean) * (f64::from(s.counts) - y_mean)).sum::<f64>() / xx;
        let line = Self { slope, x_mean, y_mean, xx, n, variance: 0.0 };
        let variance = zero(record).map(|s| (f64::from(s.counts) - line.at(x(s))).powi(2)).sum::<f64>() / (n - 2.0);
        Self { variance, ..line }
    }

    fn at(&self, x: f64) -> f64 {
        self.y_mean + self.slope * (x - self.x_mean)
    }
}

/// A line through the opening zero by ordinary least squares, extrapolated to the stop, with its textbook standard
/// error: scatter about the line, as if the samples' errors were independent (prediction interval; any statistics
/// textbook).
pub(crate) fn ordinary_line(board: &Board, record: &Record) -> Claim {
    let line = Line::through(board, record);
    let (_, _, stop) = ends(record);
    let x = seconds(board, record, stop);
    let u = (line.variance * (1.0 + 1.0 / line.n + (x - line.x_mean).powi(2) / line.xx)).sqrt();
    claim(board, f64::from(stop.counts) - line.at(x), u)
}

/// The slope of that line with its textbook standard error, V/s.
pub(crate) fn ordinary_drift(board: &Board, record: &Record) -> Claim {
    let line = Line::through(board, record);
    let lsb_v = board.converter.lsb_v;
    Claim { value: line.slope * lsb_v, u: (line.variance / line.xx).sqrt() * lsb_v }
}

/// The slope from the first to the last sample of the opening zero, extrapolated from the last to the stop, with the
/// readout noise of the three samples.
pub(crate) fn two_points(board: &Board, record: &Record) -> Claim {
    let (first, start, stop) = ends(record);
    let (zero_s, run_s) = (seconds(board, record, start), seconds(board, record, stop) - seconds(board, record, start));
    let share = run_s / zero_s;
    let drifted = f64::from(start.counts - first.counts) * share;
    let variance = readout_var(board) * (1.0 + (1.0 + share).powi(2) + share * share);
    claim(board, f64::from(stop.counts - start.counts) - drifted, variance.sqrt())
}

/// That slope with the readout noise of the two samples, V/s.
pub(crate) fn two_point_drift(board: &Board, record: &Record) -> Claim {
    let (first, start, _) = ends(record);
    let zero_s = seconds(board, record, start);
    let lsb_v = board.converter.lsb_v;
    let slope = f64::from(start.counts - first.counts) / zero_s;
    Claim { value: slope * lsb_v, u: (2.0 * readout_var(board)).sqrt() / zero_s * lsb_v }
}

/// Last reading of the run less last reading of the zero, with the readout noise of both.
pub(crate) fn uncorrected(board: &Board, record: &Record) -> Claim {
    let (_, start, stop) = ends(record);
    claim(board, f64::from(stop.counts - start.counts), (2.0 * readout_var(board)).sqrt())
}

fn zero(record: &Record) -> impl Iterator<Item = &Sample> {
    record.samples.iter().take(record.opening_end + 1).filter(|s| s.mode == Mode::Zero)
}

/// First and last sample of the opening zero, last sample of the run.
fn ends(record: &Record) -> (&Sample, &Sample, &Sample) {
    match (zero(record).next(), record.samples.get(record.opening_end), record.samples.get(record.run_end)) {
        (Some(first), Some(start), Some(stop)) => (first, start, stop),
        _ => panic!("no zero, or no run"),
    }
}

/// From the first sample of the opening zero.
fn seconds(board: &Board, record: &Record, sample: &Sample) -> f64 {
    f64::from(sample.tick.wrapping_sub(ends(record).0.tick)) / board.converter.tick_hz
}

fn readout_var(board: &Board) -> f64 {
    board.noise.readout_counts.powi(2) + 1.0 / 12.0
}

fn claim(board: &Board, movement: f64, u: f64) -> Claim {
    Claim { value: movement * board.sign() * board.input_per_count(), u: u * board.input_per_count() }
}
