//! How far level and rate may walk.

use crate::math;

/// How far level and rate may have walked over a step: the process noise, as variances.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Walk {
    /// Variance added to the level, counts^2.
    pub level: f32,
    /// Covariance added between level and rate, counts^2/s.
    pub cross: f32,
    /// Variance added to the rate, (counts/s)^2.
    pub rate: f32,
}

impl Walk {
    /// The walk over `dt_s` seconds of a level driven by white noise (`level_walk`, counts^2/s) and of a rate driven by
    /// white noise (`rate_walk`, (counts/s)^2/s), which the level integrates:
    /// `[q_w t + q_d t^3/3, q_d t^2/2, q_d t]`.
    pub fn over(dt_s: f32, level_walk: f32, rate_walk: f32) -> Self {
        if rate_walk <= 0.0 {
            return Self { level: level_walk * dt_s, ..Self::default() };
        }
        let rate = rate_walk * dt_s;
        let half = rate * dt_s * 0.5;
        Self { level: level_walk * dt_s + half * dt_s * (2.0 / 3.0), cross: half, rate }
    }

    /// A step of the rate by flicker noise, `flicker` in (counts/s)^2, between a zero of `zero_s` seconds and a run of
    /// `run_s` seconds, and what it did to the level over the run.
    ///
    /// The mean rates over the two differ with the variance `K (1 + p)/p [(1 + p) ln(1 + p) - p ln p]`, `p = run /
    /// zero`: for equal lengths `4 ln2 K`, twice the Allan variance of flicker frequency noise (IEEE Std 1139-2008). It
    /// grows only as the logarithm of `p`, so the error of the run grows as its length.
    pub fn of_flicker(flicker: f32, zero_s: f32, run_s: f32) -> Self {
        if flicker <= 0.0 || run_s <= 0.0 {
            return Self::default();
        }
        let p = run_s / zero_s.max(run_s * 1e-6);
        let q = p + 1.0;
        let rate = flicker * (q / p) * (q * math::ln(q) - p * math::ln(p));
        Self { level: rate * run_s * run_s, cross: rate * run_s, rate }
    }
}
