//! Level and drift by recursive least squares.

use super::bracket::Bracket;
use super::sum::Sum;
use super::walk::Walk;
use crate::math;

/// What one sample told a [`Trend`]: how far it fell from the prediction and how it was weighed.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Innovation {
    /// Sample minus prediction, counts.
    pub residual: f32,
    /// One over the variance that `residual` was expected to have, 1/counts^2.
    pub precision: f32,
    /// Share of `residual` given to the level.
    pub level_gain: f32,
    /// Share of `residual` given to the rate, 1/s.
    pub rate_gain: f32,
}

/// Residuals this far from the anchor move the anchor by whole counts: `f32` resolves 2^-14 count there.
const ANCHOR_REACH: f32 = 1024.0;

/// Rates and variances end here: 10^10 counts/s, 10^15 counts. Past them nothing is known, and their products stay
/// within `f32`.
const RATE_MAX: f32 = 1e10;
pub(crate) const LEVEL_VARIANCE_MAX: f32 = 1e30;
const RATE_VARIANCE_MAX: f32 = 1e20;

/// The least share of the rate's variance that a sample takes off, and of its own variance that is left to the level: a
/// rate that has been constant for 2^18 samples is taken to be so no longer. `f32` could not add up what more samples
/// than that tell each.
const LEAST_RATE_SHARE: f32 = 1.0 / 262_144.0;
const LEAST_LEVEL_SHARE: f32 = 1.0 / 16_384.0;

/// A level in counts and its rate in counts per second, with their covariance.
///
/// The level is an integer anchor plus a small `f32` residual, so that a 24-bit level loses nothing, nor a baseline
/// that has drifted for a year. The covariance is
/// kept as the factors of `U D U^T` with `U = [1, s; 0, 1]`: the variance of the level *if the rate were known*, the
/// coupling `s` and the variance of the rate. Every step multiplies, divides and adds positive numbers only, so the
/// matrix cannot lose positive definiteness. Method: Bierman 1977, Factorization Methods for Discrete Sequential
/// Estimation (from memory), worked out by hand for two states.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Trend {
    anchor: i64,
    level: f32,
    /// A rate that is known well moves by less than its last bit in each sample.
    rate: Sum,
    /// Variance of the level given the rate.
    level_given_rate: f32,
    /// Change of the level's estimate per change of the rate's, s.
    coupling: f32,
    rate_variance: f32,
}

impl Trend {
    /// Starts at a level known with `level_variance` (counts^2, above 0) and a rate known with `rate_variance`
    /// ((counts/s)^2; 0 holds the rate for good unless it walks).
    pub const fn new(counts: i64, level_variance: f32, rate: f32, rate_variance: f32) -> Self {
        Self {
            anchor: counts,
            level: 0.0,
            rate: Sum::new(rate),
            level_given_rate: level_variance,
            coupling: 0.0,
            rate_variance,
        }
    }

    /// Forgets the level, keeps the rate and its variance: after a reset, or when the input was connected.
    /// The new level is `counts + residual`.
    pub const fn restart(&mut self, counts: i64, residual: f32, level_variance: f32) {
        self.anchor = counts;
        self.level = residual;
        self.level_given_rate = level_variance;
        self.coupling = 0.0;
    }

    /// Lets `dt_s` seconds pass: the level moves by `rate dt_s`, and both walk. Exact for a step of any length.
    pub fn advance(&mut self, dt_s: f32, walk: Walk) {
        self.advance_beside(None, dt_s, walk);
    }

    /// The same beside a constant that has something in common with level and rate.
    pub(crate) fn advance_beside(&mut self, constant: Option<&mut Bracket>, dt_s: f32, walk: Walk) {
        let before = *self;
        self.pass(dt_s, walk);
        if let Some(constant) = constant {
            constant.follow(&before, dt_s, &walk, self);
        }
    }

    fn pass(&mut self, dt_s: f32, walk: Walk) {
        self.level += self.rate() * dt_s;
        self.recentre();
        let coupling = self.coupling + dt_s;
        if walk.rate <= 0.0 {
            self.coupling = coupling;
            self.level_given_rate = math::lesser(self.level_given_rate + walk.level, LEVEL_VARIANCE_MAX);
            return;
        }
        let share = 1.0 / (self.rate_variance + walk.rate);
        // (s^2 q_rr - 2 s q_lr + q_ll) and (q_ll q_rr - q_lr^2) are not negative for any covariance q.
        let spread = walk.level + coupling * (coupling * walk.rate - 2.0 * walk.cross);
        let determinant = walk.level * walk.rate - walk.cross * walk.cross;
        let gained = (self.rate_variance * spread + determinant) * share;
        self.level_given_rate = math::lesser(self.level_given_rate + gained.max(0.0), LEVEL_VARIANCE_MAX);
        self.coupling = (coupling * self.rate_variance + walk.cross) * share;
        self.rate_variance = math::lesser(self.rate_variance + walk.rate, RATE_VARIANCE_MAX);
    }

    /// Moves the origin of the levels by whole counts; no estimate changes.
    pub(crate) fn move_origin(&mut self, counts: i64) {
        self.anchor = self.anchor.saturating_sub(counts);
    }

    /// Moves level and rate by what is known to have happened; the covariance stays.
    pub fn shift(&mut self, level: f32, rate: f32) {
        self.level += level;
        self.rate.add(rate, RATE_MAX);
        self.recentre();
    }

    /// Adds to the covariance what something with which level and rate are correlated did to them. The sum must be
    /// positive definite but for rounding.
    pub(crate) fn absorb(&mut self, constant: Option<&mut Bracket>, added: Walk) {
        let before = *self;
        self.add(added);
        if let Some(constant) = constant {
            constant.follow(&before, 0.0, &added, self);
        }
    }

    fn add(&mut self, added: Walk) {
        let level = (self.level_variance() + added.level).max(0.0);
        let cross = self.covariance() + added.cross;
        let rate = (self.rate_variance + added.rate).min(RATE_VARIANCE_MAX);
        if rate > 0.0 {
            self.coupling = cross / rate;
            self.level_given_rate = (level - cross * self.coupling).max(level * 1e-6);
            self.rate_variance = rate;
        }
    }

    /// Lets the rate alone walk by `rate_walk`, (counts/s)^2, while the level is held: the switch is closed or the
    /// input open.
    pub fn rest(&mut self, rate_walk: f32) {
        self.rest_beside(None, rate_walk);
    }

    /// The same beside a constant.
    pub(crate) fn rest_beside(&mut self, constant: Option<&mut Bracket>, rate_walk: f32) {
        if rate_walk <= 0.0 {
            return;
        }
        let before = *self;
        let walked = math::lesser(self.rate_variance + rate_walk, RATE_VARIANCE_MAX);
        if walked > 0.0 {
            // The level's own variance and its covariance with the rate stay.
            let kept = self.rate_variance / walked;
            self.level_given_rate += self.coupling * self.coupling * self.rate_variance * (1.0 - kept);
            self.coupling *= kept;
            self.rate_variance = walked;
            if let Some(constant) = constant {
                constant.follow(&before, 0.0, &Walk { rate: rate_walk, ..Walk::default() }, self);
            }
        }
    }

    /// Makes the rate at least as uncertain as `rate_variance` again, and keeps its estimate.
    pub fn doubt_rate(&mut self, rate_variance: f32) {
        self.doubt_rate_beside(None, rate_variance);
    }

    /// The same beside a constant.
    pub(crate) fn doubt_rate_beside(&mut self, constant: Option<&mut Bracket>, rate_variance: f32) {
        let before = *self;
        self.rate_variance = math::greater(self.rate_variance, rate_variance);
        let rate = self.rate_variance - before.rate_variance;
        if let Some(constant) = constant
            && rate > 0.0
        {
            constant.follow(&before, 0.0, &Walk { level: 0.0, cross: self.coupling * rate, rate }, self);
        }
    }

    /// Takes a sample of the level with `variance` (counts^2, above 0).
    ///
    /// A sample that is not far off becomes the new anchor, so that the residual stays as small as the noise: `f32`
    /// then loses nothing of a slow drift, however far the level has gone.
    ///
    /// The sample is `counts + rest`: a mean of several is not whole.
    pub fn update(&mut self, counts: i64, rest: f32, variance: f32) -> Innovation {
        self.update_beside(None, counts, rest, variance).0
    }

    /// The same beside a constant. Gives also the share of the residual that the constant takes.
    pub(crate) fn update_beside(
        &mut self,
        constant: Option<&mut Bracket>,
        counts: i64,
        rest: f32,
        variance: f32,
    ) -> (Innovation, f32) {
        let residual = math::float(counts.saturating_sub(self.anchor)) - self.level + rest;
        let shared = self.coupling * self.rate_variance;
        let from_rate = math::lesser(self.coupling * shared, LEVEL_VARIANCE_MAX);
        let given_rate = self.level_given_rate + variance;
        let precision = 1.0 / (given_rate + from_rate);
        let kept = variance / given_rate;
        let rate_gain = shared * precision;

        let level_gain = (self.level_given_rate + from_rate) * precision;

        let taken = constant.map_or(0.0, |constant| constant.update(self, given_rate, precision, residual));
        if math::abs(residual) < ANCHOR_REACH {
            self.anchor = counts;
            self.level = rest - residual * (variance * precision);
        } else {
            self.level += level_gain * residual;
            self.recentre();
        }
        self.rate.add(rate_gain * residual, RATE_MAX);
        self.level_given_rate = math::greater(self.level_given_rate * kept, variance * LEAST_LEVEL_SHARE);
        self.coupling *= kept;
        let share = from_rate * precision;
        if share > 0.5 {
            self.rate_variance *= given_rate * precision;
        } else if share > LEAST_RATE_SHARE {
            // Of a small share a factor near 1 would keep but a few bits.
            self.rate_variance -= self.rate_variance * share;
        }
        (Innovation { residual, precision, level_gain, rate_gain }, taken)
    }

    /// The level's whole part, counts.
    pub const fn anchor(&self) -> i64 {
        self.anchor
    }

    /// What the level is above its whole part, counts; not limited to one count.
    pub const fn residual(&self) -> f32 {
        self.level
    }

    /// The rate, counts/s.
    pub const fn rate(&self) -> f32 {
        self.rate.value()
    }

    /// Variance of the level if the rate were known, counts^2.
    pub(super) const fn level_given_rate(&self) -> f32 {
        self.level_given_rate
    }

    /// Change of the level's estimate per change of the rate's, s.
    pub(super) const fn coupling(&self) -> f32 {
        self.coupling
    }

    /// Variance of the level, counts^2; at most 1e30.
    pub fn level_variance(&self) -> f32 {
        math::lesser(self.level_given_rate + self.coupling * self.coupling * self.rate_variance, LEVEL_VARIANCE_MAX)
    }

    /// Covariance of level and rate, counts^2/s.
    pub fn covariance(&self) -> f32 {
        self.coupling * self.rate_variance
    }

    /// Variance of the rate, (counts/s)^2.
    pub const fn rate_variance(&self) -> f32 {
        self.rate_variance
    }

    /// Moves whole counts from the residual to the anchor; exact, so it changes no estimate.
    fn recentre(&mut self) {
        if math::abs(self.level) > ANCHOR_REACH {
            let whole = math::nearest(self.level);
            self.level -= whole as f32;
            self.anchor = self.anchor.saturating_add(whole);
        }
    }
}
