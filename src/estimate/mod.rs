//! The numerics, free of any idea of a board: straight lines, level and drift by recursive least squares, and how a
//! closing zero tightens a finished run.
//!
//! Integers carry what is large (levels in counts), `f32` what is small (residuals, variances).

mod bracket;
mod edge;
mod line;
mod trend;

pub(crate) use bracket::{Bracket, movement_q16};
pub(crate) use edge::{Edge, Side};
pub use line::{Line, Point};
pub(crate) use trend::LEVEL_VARIANCE_MAX;
pub use trend::{Innovation, Trend, Walk};
