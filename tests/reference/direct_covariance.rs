//! The uncertainty of a noise figure the long way: over all pairs of second differences of one trace, one by one.

use core::f64::consts::LN_2;

use nalgebra::{DMatrix, DVector};

const COEFFICIENTS: [f64; 4] = [6.0, 2.0, 4.0 * LN_2, 2.0 / 3.0];

/// Covariance of second differences at lags `k` and `l` whose first samples lie at `t` and `s`, from the generalised
/// covariance of the level, counts and samples.
fn covariance(figures: &[f64; 4], (k, t): (usize, usize), (l, s): (usize, usize)) -> f64 {
    let generalised = |h: f64| {
        let square = if h == 0.0 { 0.0 } else { 0.5 * h * h * h.ln() };
        let readout = if h == 0.0 { 1.0 } else { 0.0 };
        figures[0] * readout - figures[1] * 0.5 * h + figures[2] * square + figures[3] * h * h * h / 12.0
    };
    let weights = [1.0, -2.0, 1.0];
    let pairs = (0..9).map(|pair| (pair / 3, pair % 3));
    pairs.map(|(a, b)| weights[a] * weights[b] * generalised((t + a * k).abs_diff(s + b * l) as f64)).sum()
}

/// Standard uncertainty of figure `noise` by least squares over the octaves of `samples` samples, weighted by one over
/// the variance of each mean square, with the figures in `free` and the others 0.
pub(crate) fn direct_u(figures: &[f64; 4], samples: usize, noise: usize, free: &[usize]) -> f64 {
    let lags: Vec<usize> = (0..).map(|k| 1 << k).take_while(|lag| 2 * lag < samples).collect();
    let starts = |lag: usize| (0..samples - 2 * lag).step_by(lag).map(move |t| (lag, t));
    let covariances = DMatrix::from_fn(lags.len(), lags.len(), |i, j| {
        let (mut sum, mut pairs) = (0.0, 0.0);
        for first in starts(lags[i]) {
            for second in starts(lags[j]) {
                sum += 2.0 * covariance(figures, first, second).powi(2);
                pairs += 1.0;
            }
        }
        sum / pairs
    });
    let design =
        DMatrix::from_fn(lags.len(), free.len(), |i, p| COEFFICIENTS[free[p]] * (lags[i] as f64).powi(free[p] as i32));
    let weights = DMatrix::from_diagonal(&DVector::from_fn(lags.len(), |i, _| 1.0 / covariances[(i, i)]));
    let normal = design.transpose() * &weights * &design;
    let Some(inverse) = normal.try_inverse() else { panic!("figures cannot be told apart") };
    let shares = inverse * design.transpose() * weights;
    let variances = &shares * covariances * shares.transpose();
    let Some(row) = free.iter().position(|p| *p == noise) else { panic!("{noise} is not free") };
    variances[(row, row)].sqrt()
}
