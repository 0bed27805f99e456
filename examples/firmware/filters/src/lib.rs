//! The same two states, level and drift, in the same model, filtered by the crate's `Trend` and by what else a firmware
//! would use.
#![no_std]

mod covariance;
mod library;
mod matrices;
mod trend;

/// Time between samples, s.
pub const DT: f32 = 0.01;
/// Variance of a sample, counts^2: 0.9 counts rms and rounding.
const READOUT: f32 = 0.81 + 1.0 / 12.0;
/// How far the level walks between samples, counts^2.
const LEVEL_WALK: f32 = 1e-4 * DT;
/// How far the drift walks, (counts/s)^2: hardly.
const RATE_WALK: f32 = 1e-9 * DT;
/// Variance of the drift before the first sample, (counts/s)^2.
const RATE_PRIOR: f32 = 100.0;

/// One update: takes a sample, gives the drift in counts/s.
pub type Update<'f> = dyn FnMut(i32) -> f32 + 'f;

/// Who wants to see the filters.
pub trait Visit {
    /// A filter that has taken its first sample, and the bytes that it keeps.
    fn filter(&mut self, name: &str, bytes: usize, update: &mut Update<'_>);
}

/// Shows every filter, each started with the sample `first`.
pub fn visit_all(first: i32, visitor: &mut impl Visit) {
    trend::visit(first, visitor);
    covariance::visit_f32(first, visitor);
    matrices::visit(first, visitor);
    library::visit(first, visitor);
    covariance::visit_f64(first, visitor);
}
