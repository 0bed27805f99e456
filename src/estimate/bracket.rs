//! How the zero after a run tightens the finished run.

use super::constant::Constant;
use super::trend::{Innovation, Trend};
use crate::ledger::{to_q16, whole_q16};

/// The movement of the level over a finished run, as the closing zero comes to know it.
///
/// With no input, the level and the *baseline* (the level that there would have been without input) move by the same
/// drift and the same noise: their difference, the run's movement, is a constant, the third state beside level and
/// drift. A better drift pulls the run's baseline along, which is what bracketing a run between two zeros means.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Bracket {
    /// The movement as first known, 2^-16 counts.
    start_q16: i64,
    rest: Constant,
}

impl Bracket {
    /// The run stopped and the level went on without a break: the first zero sample, `counts + rest`, taken when the
    /// baseline is `baseline`, shows where it was. It has the variance `readout_var`.
    pub(crate) fn on_level(counts: i64, rest: f32, readout_var: f32, baseline: &Trend) -> Self {
        Self {
            start_q16: movement_q16(whole_q16(counts).saturating_add(to_q16(rest)), baseline),
            rest: Constant {
                correction: 0.0,
                variance: readout_var + baseline.level_variance(),
                with_level: readout_var,
                with_rate: -baseline.covariance(),
            },
        }
    }

    /// The run stopped before a reset or hold, so the zero's level says nothing about it: only the zero's drift does.
    /// `level_q16` is the last sample of the run, 2^-16 counts, `baseline` the baseline then.
    pub(crate) fn on_rate(level_q16: i64, readout_var: f32, baseline: &Trend) -> Self {
        let mut bracket = Self::on_level(0, 0.0, readout_var, baseline);
        bracket.start_q16 = movement_q16(level_q16, baseline);
        bracket.release_level();
        bracket
    }

    /// Time passes in `Zero`.
    pub(crate) fn advance(&mut self, dt_s: f32) {
        self.rest.advance(dt_s);
    }

    /// The level was lost (a reset during the zero): what the rate says stays.
    pub(crate) fn release_level(&mut self) {
        self.rest.with_level = 0.0;
    }

    /// A zero sample, as weighed by the trend. Gives the share of the residual that the movement takes.
    pub(crate) fn update(&mut self, innovation: &Innovation) -> f32 {
        self.rest.update(innovation)
    }

    /// The run's movement, 2^-16 counts.
    pub(crate) fn movement_q16(&self) -> i64 {
        self.start_q16.saturating_add(to_q16(self.rest.correction))
    }

    /// Its variance, counts^2.
    pub(crate) fn variance(&self) -> f32 {
        self.rest.variance
    }
}

/// How far a level is above the baseline, both in 2^-16 counts.
pub(crate) fn movement_q16(level_q16: i64, baseline: &Trend) -> i64 {
    level_q16.saturating_sub(whole_q16(baseline.anchor())).saturating_sub(to_q16(baseline.residual()))
}
