//! How the zero after a run tightens the finished run.

use super::trend::Trend;
use super::walk::Walk;
use crate::math::{self, to_q16, whole_q16};
use crate::setup::QUANTISATION_VAR;

/// The movement of the level over a finished run, as the closing zero comes to know it.
///
/// With no input, the level and the *baseline* (the level that there would have been without input) move by the same
/// drift and the same noise: their difference, the run's movement, is a constant, the third state beside level and
/// drift. A better drift pulls the run's baseline along, which is what bracketing a run between two zeros means.
///
/// Its covariance continues the trend's factors `U D U^T` by a row, so that a zero may tell a millionfold more than was
/// known before: nothing large is subtracted from anything large. (Bierman 1977, as for the trend.)
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Bracket {
    /// The movement as first known, 2^-16 counts, and what the samples have added to it, counts.
    start_q16: i64,
    correction: f32,
    /// Variance if level and rate were known, counts^2.
    own: f32,
    /// Change of the estimate per change of the level's if the rate were known, and per change of the rate's, s.
    per_level: f32,
    per_rate: f32,
}

impl Bracket {
    /// The run stopped and the level went on without a break: the first zero sample, `counts + rest`, taken when the
    /// baseline is `baseline`, shows where it was. The level is to be [held](Self::hold_level) once the trend has
    /// started from that sample.
    pub(crate) fn on_level(counts: i64, rest: f32, baseline: &Trend) -> Self {
        Self {
            start_q16: movement_q16(whole_q16(counts).saturating_add(to_q16(rest)), baseline),
            correction: 0.0,
            own: baseline.level_given_rate(),
            per_level: 0.0,
            per_rate: -baseline.coupling(),
        }
    }

    /// The run stopped before a reset or hold, so the zero's level says nothing about it: only the zero's drift does.
    /// `level_q16` is the last sample of the run, 2^-16 counts, `baseline` the baseline then.
    pub(crate) fn on_rate(level_q16: i64, readout_var: f32, baseline: &Trend) -> Self {
        let start_q16 = movement_q16(level_q16, baseline);
        // A last sample that has served as the first one as well still is a whole count.
        let own = math::greater(math::not_negative(baseline.level_given_rate() + readout_var), QUANTISATION_VAR);
        Self { start_q16, own, ..Self::on_level(0, 0.0, baseline) }
    }

    /// The trend has started from the sample with which the run's movement was found: an error of its level is one of
    /// the movement.
    pub(crate) fn hold_level(&mut self) {
        self.per_level = 1.0;
    }

    /// The level of `zero` is lost (a reset during the zero): what the rate says stays.
    pub(crate) fn release_level(&mut self, zero: &Trend) {
        self.own += self.per_level * self.per_level * zero.level_given_rate();
        self.per_level = 0.0;
    }

    /// Level and rate went on from `before` to `after` in `dt_s` seconds and walked: what they have in common with the
    /// movement stays.
    pub(super) fn follow(&mut self, before: &Trend, dt_s: f32, walk: &Walk, after: &Trend) {
        let (mut per_rate, mut lost, mut sheared) = (self.per_rate, 0.0, 0.0);
        if walk.rate != 0.0 && after.rate_variance() > 0.0 {
            let share = 1.0 / after.rate_variance();
            let with_rate = self.per_rate * before.rate_variance();
            per_rate = with_rate * share;
            lost = self.per_rate * per_rate * walk.rate;
            sheared = with_rate * ((before.coupling() + dt_s) * walk.rate - walk.cross) * share;
        }
        let with_level = self.per_level * before.level_given_rate() + sheared;
        if after.level_given_rate() > 0.0 {
            let per_level = with_level / after.level_given_rate();
            lost += self.per_level * self.per_level * before.level_given_rate() - per_level * with_level;
            self.per_level = per_level;
        }
        self.per_rate = per_rate;
        self.own += math::not_negative(lost);
    }

    /// A zero sample, as `zero` weighs it: before it takes it, with the variance `given_rate` of the residual if the
    /// rate were known. Gives the share of the residual that the movement takes.
    pub(super) fn update(&mut self, zero: &Trend, given_rate: f32, precision: f32, residual: f32) -> f32 {
        let with_level = self.per_level * zero.level_given_rate();
        let gain = (with_level + self.per_rate * zero.covariance()) * precision;
        self.correction += gain * residual;
        self.per_rate -= zero.coupling() * with_level / given_rate;
        gain
    }

    /// The run's movement, 2^-16 counts.
    pub(crate) fn movement_q16(&self) -> i64 {
        self.start_q16.saturating_add(to_q16(self.correction))
    }

    /// Its variance, counts^2, beside the level and rate of `zero`.
    pub(crate) fn variance(&self, zero: &Trend) -> f32 {
        self.own
            + self.per_level * self.per_level * zero.level_given_rate()
            + self.per_rate * self.per_rate * zero.rate_variance()
    }
}

/// How far a level is above the baseline, both in 2^-16 counts.
pub(crate) fn movement_q16(level_q16: i64, baseline: &Trend) -> i64 {
    level_q16.saturating_sub(whole_q16(baseline.anchor())).saturating_sub(to_q16(baseline.residual()))
}
