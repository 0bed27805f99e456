//! How the zero after a run tightens the finished run.

use super::trend::{Innovation, Trend};
use crate::ledger::{to_q16, whole_q16};

/// The movement of the level over a finished run, as the closing zero comes to know it.
///
/// With no input, the level and the *baseline* (the level that there would have been without input) move by the same
/// drift and the same noise: their difference, the run's movement, is a constant. It is the third state beside level
/// and drift; being constant it needs no time update but the cross-covariance's, and a sample moves it by its
/// covariance with the level. (Fixed-point smoothing: Anderson & Moore 1979, Optimal Filtering, section 7.2, from
/// memory.) A better drift pulls the run's baseline along, which is what bracketing a run between two zeros means.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Bracket {
    /// Whole part of the movement, 2^-16 counts; the rest is in `correction`.
    start_q16: i64,
    correction: f32,
    variance: f32,
    with_level: f32,
    with_rate: f32,
}

impl Bracket {
    /// The run stopped and the level went on without a break: the first zero sample, `counts + rest`, taken when the
    /// baseline is `baseline`, shows where it was. It has the variance `readout_var`.
    pub(crate) fn on_level(counts: i32, rest: f32, readout_var: f32, baseline: &Trend) -> Self {
        Self {
            start_q16: movement_q16(counts, baseline).saturating_add(to_q16(rest)),
            correction: 0.0,
            variance: readout_var + baseline.level_variance(),
            with_level: readout_var,
            with_rate: -baseline.covariance(),
        }
    }

    /// The run stopped before a reset or hold, so the zero's level says nothing about it: only the zero's drift does.
    /// `counts` is the last sample of the run, `baseline` the baseline then.
    pub(crate) fn on_rate(counts: i32, readout_var: f32, baseline: &Trend) -> Self {
        Self { with_level: 0.0, ..Self::on_level(counts, 0.0, readout_var, baseline) }
    }

    /// Time passes in `Zero`.
    pub(crate) fn advance(&mut self, dt_s: f32) {
        self.with_level += dt_s * self.with_rate;
    }

    /// The level was lost (a reset during the zero): what the rate says stays.
    pub(crate) fn release_level(&mut self) {
        self.with_level = 0.0;
    }

    /// A zero sample, as weighed by the trend.
    pub(crate) fn update(&mut self, innovation: &Innovation) {
        let gain = self.with_level * innovation.precision;
        self.correction += gain * innovation.residual;
        let variance = self.variance - gain * self.with_level;
        // Rounding may take away more than there is: then nothing was learned.
        if variance > 0.0 {
            self.variance = variance;
        }
        self.with_rate -= innovation.rate_gain * self.with_level;
        self.with_level -= innovation.level_gain * self.with_level;
    }

    /// The run's movement, 2^-16 counts.
    pub(crate) fn movement_q16(&self) -> i64 {
        self.start_q16.saturating_add(to_q16(self.correction))
    }

    /// Its variance, counts^2.
    pub(crate) fn variance(&self) -> f32 {
        self.variance
    }
}

/// How far `counts` is above the baseline, 2^-16 counts.
pub(crate) fn movement_q16(counts: i32, baseline: &Trend) -> i64 {
    whole_q16(i64::from(counts).saturating_sub(baseline.anchor())).saturating_sub(to_q16(baseline.residual()))
}
