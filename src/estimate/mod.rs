//! The numerics, free of any idea of a board: straight lines, level and drift by recursive least squares, and how a
//! closing zero tightens a finished run.
//!
//! Integers carry what is large (levels in counts), `f32` what is small (residuals, variances).

mod after;
mod before;
mod bend;
mod block;
mod bracket;
mod constant;
mod edge;
mod grid;
mod line;
mod moments;
mod noise_fit;
mod octave;
mod onset;
mod running;
mod shared;
mod sum;
#[cfg(test)]
mod textbook;
mod trend;
mod walk;

pub(crate) use after::{After, Hint};
pub(crate) use before::Before;
pub(crate) use block::{Block, BlockMean};
pub(crate) use bracket::{Bracket, movement_q16};
pub(crate) use constant::Constant;
pub(crate) use edge::Nearest;
pub(crate) use grid::Dot;
pub use line::{Line, Point};
pub use noise_fit::{Figure, NoiseFigures};
pub use octave::{Octave, Octaves};
pub(crate) use onset::{Cusum, DEVIATION, cusum_threshold};
pub(crate) use shared::{Taken, Weights};
pub(crate) use sum::Sum;
pub(crate) use trend::LEVEL_VARIANCE_MAX;
pub use trend::{Innovation, Trend};
pub use walk::Walk;
