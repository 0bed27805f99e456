//! Noise figures from the second differences of a trace.

use super::octave::{NOISES, Octave, Octaves, overlap};
use crate::math;

/// `4 ln 2`.
const FLICKER: f32 = 2.772_588_7;

/// `E[D^2]` over noise figure and power of the lag.
const COEFFICIENTS: [f32; NOISES] = [6.0, 2.0, FLICKER, 2.0 / 3.0];

/// Weights follow the fit, which follows the weights: the first pass weighs by the data, the others by the fit before.
const PASSES: u32 = 4;

/// Columns of the normal equations have unit length: a pivot this small is what rounding leaves of a column that the
/// others explain.
const PIVOT_MIN: f32 = 1e-5;

/// Of a two-sided 95 % interval.
const Z_95: f32 = 1.96;

/// A noise figure with its uncertainty.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Figure {
    /// Best value, 0 or above.
    pub value: f32,
    /// Standard uncertainty, given that *other* figures found to be 0 are 0; of a figure that is 0 itself, what it
    /// would be if it were free to be negative. Infinite where the octaves do not tell it from the others.
    pub u: f32,
    /// Lower end of the 95 % interval, 0 or above.
    pub low: f32,
    /// Upper end of the 95 % interval: the upper limit of a figure found to be 0.
    ///
    /// The interval holds all values that would have led here within 1.96 of *their* standard uncertainty, whose square
    /// grows in proportion to them, so it reaches further up than down.
    pub high: f32,
}

impl Figure {
    /// The variance, were the figure higher by `d`, is `[0] + 2 d [1] + d^2 [2]`.
    fn new(value: f32, variance: [f32; 3]) -> Self {
        let [constant, linear, square] = variance.map(|v| Z_95 * Z_95 * v);
        let reach = math::sqrt(linear * linear + (1.0 - square) * constant);
        let low = (value - constant / (linear + reach)).max(0.0);
        let high = value + linear + math::sqrt(linear * linear + constant);
        Self { value, u: math::sqrt(variance[0]), low, high }
    }

    fn scaled(self, unit: f32) -> Self {
        let Self { value, u, low, high } = self;
        Self { value: value * unit, u: u * unit, low: low * unit, high: high * unit }
    }
}

/// What a level's noise is made of, from the second differences `D` that [`Octaves`] collected:
/// `E[D^2](tau) = 6 r + 2 q_w tau + 4 ln2 K tau^2 + (2/3) q_d tau^3`.
///
/// ```
/// use brimline::estimate::{NoiseFigures, Octaves};
///
/// // 50 or 54 counts by chance, a variance of 4 counts^2: readout noise and nothing else.
/// let mut zeros = Octaves::<12>::new();
/// let mut state = 1_u32;
/// for _ in 0..20_000 {
///     state = state.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
///     zeros.feed(if state >> 31 == 0 { 50 } else { 54 });
/// }
/// let noise = NoiseFigures::fit(&zeros, 0.01).expect("enough octaves");
/// assert!((noise.readout_var.value - 4.0).abs() < 3.0 * noise.readout_var.u && noise.readout_var.u < 0.1);
/// assert_eq!(noise.level_walk.low, 0.0, "no walk is claimed");
/// ```
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct NoiseFigures {
    /// Variance `r` of the readout, white from sample to sample, counts^2.
    pub readout_var: Figure,
    /// Random walk `q_w` of the level (white noise of the input), counts^2/s.
    pub level_walk: Figure,
    /// Flicker noise `K` of the level's rate, (counts/s)^2: its one-sided power spectral density is `K / f`. The Allan
    /// variance of that is `2 ln2 K` at any lag (IEEE Std 1139-2008, flicker frequency noise with `K = h_-1`), hence
    /// `E[D^2] = 2 tau^2 (2 ln2 K)`.
    pub rate_flicker: Figure,
    /// Random walk `q_d` of the level's rate (wander of the drift), (counts/s)^2/s.
    pub rate_walk: Figure,
    /// Weighted sum of squared residuals of the mean squares. Neighbouring octaves correlate, so this is no exact
    /// chi-squared; far more than the number of octaves means that there is something else, such as hum.
    pub chi_squared: f32,
}

impl NoiseFigures {
    /// Fits the figures to all octaves, weighted by their degrees of freedom, with none below 0. `sample_s` is the
    /// sample period, s, above 0. `None` with fewer than four octaves, if all second differences were 0, or beyond the
    /// range of `f32`.
    ///
    /// Uncertainties come from the covariance of the mean squares, within and between octaves (Gaussian noise). Bounded
    /// work, but tens of thousands of float operations: not for the path of a sample.
    pub fn fit<const N: usize>(octaves: &Octaves<N>, sample_s: f32) -> Option<Self> {
        let found = || (0..N).filter_map(|k| octaves.octave(k));
        let middle = found().nth(found().count() / 2)?;
        let scale = at_least_one_count(&middle);
        let noisy = found().any(|octave| octave.mean_square > 0.0);
        if found().count() < NOISES || !noisy || !sample_s.is_finite() || sample_s <= 0.0 {
            return None;
        }
        // In units of a middle lag and of its mean square, which keeps powers of the lag within reach of `f32`.
        let mut rows = [Row::EMPTY; N];
        let rows = rows.get_mut(..found().count())?;
        for (row, octave) in rows.iter_mut().zip(found()) {
            *row = Row::new(&octave, middle.lag as f32, scale);
        }
        let mut fit = Solution::not_negative(rows)?;
        for _ in 1..PASSES {
            rows.iter_mut().for_each(|row| row.weigh(&fit.theta));
            fit = Solution::not_negative(rows)?;
        }
        rows.iter_mut().for_each(|row| row.weigh(&fit.theta));

        let mut unit = scale;
        let mut figures = [Figure::new(0.0, [f32::INFINITY; 3]); NOISES];
        for ((noise, figure), theta) in figures.iter_mut().enumerate().zip(fit.theta) {
            if let Some(with_it) = Solution::of(rows, fit.free | 1 << noise) {
                *figure = with_it.figure(noise, theta, rows);
            }
            *figure = figure.scaled(unit);
            unit /= middle.lag as f32 * sample_s;
        }
        if figures.iter().any(|figure| !figure.value.is_finite()) {
            return None;
        }
        let [readout_var, level_walk, rate_flicker, rate_walk] = figures;
        Some(Self { readout_var, level_walk, rate_flicker, rate_walk, chi_squared: fit.chi_squared })
    }

    /// `E[D^2]` at a lag of `tau_s` seconds that these figures stand for, counts^2.
    pub fn mean_square_at(&self, tau_s: f32) -> f32 {
        let figures = [self.readout_var, self.level_walk, self.rate_flicker, self.rate_walk];
        dot(&columns(tau_s), &figures.map(|figure| figure.value))
    }
}

/// The mean square, not below that which a single second difference of one count would make.
fn at_least_one_count(octave: &Octave) -> f32 {
    octave.mean_square.max(1.0 / octave.count as f32)
}

/// `E[D^2]` at a lag for each noise figure being 1.
fn columns(lag: f32) -> [f32; NOISES] {
    let mut power = 1.0;
    COEFFICIENTS.map(|coefficient| {
        let column = coefficient * power;
        power *= lag;
        column
    })
}

/// An octave as a line of the fit.
#[derive(Clone, Copy)]
struct Row {
    count: f32,
    mean_square: f32,
    columns: [f32; NOISES],
    /// What each noise adds to the mean square, according to the fit.
    parts: [f32; NOISES],
    /// One over the variance of the mean square.
    weight: f32,
}

impl Row {
    const EMPTY: Self =
        Self { count: 1.0, mean_square: 0.0, columns: [0.0; NOISES], parts: [0.0; NOISES], weight: 0.0 };

    /// Weighed by the data themselves.
    fn new(octave: &Octave, lag: f32, scale: f32) -> Self {
        let expected = at_least_one_count(octave) / scale;
        Self {
            count: octave.count as f32,
            mean_square: octave.mean_square / scale,
            columns: columns(octave.lag as f32 / lag),
            parts: [0.0; NOISES],
            weight: 0.5 * octave.dof() / (expected * expected),
        }
    }

    /// Weighed by a fit.
    fn weigh(&mut self, theta: &[f32; NOISES]) {
        self.parts = self.columns;
        self.parts.iter_mut().zip(theta).for_each(|(part, theta)| *part *= theta);
        self.weight = 1.0 / self.covariance(0, &self.parts, &self.parts);
    }

    /// Covariance of this mean square with the one `apart` octaves above: of Gaussian noise, twice the mean of the
    /// squared covariances of their differences. A bilinear form of what each noise adds to this mean square.
    fn covariance(&self, apart: usize, parts: &[f32; NOISES], again: &[f32; NOISES]) -> f32 {
        let mut squares = 0.0;
        for (p, a) in parts.iter().enumerate() {
            for (q, b) in again.iter().enumerate() {
                squares += a * b * overlap(apart, p, q);
            }
        }
        if apart == 0 {
            // A single difference has no neighbour to share samples with.
            let alone = parts.iter().sum::<f32>() * again.iter().sum::<f32>();
            squares -= (squares - alone) / self.count;
        }
        2.0 * squares / self.count
    }
}

/// Weighted least squares with some of the figures free and the others 0.
struct Solution {
    /// A bit for each figure.
    free: u8,
    theta: [f32; NOISES],
    /// Inverse of the normal equations' matrix; 0 for what is not free.
    inverse: [[f32; NOISES]; NOISES],
    chi_squared: f32,
}

impl Solution {
    /// The best of those with no figure below 0, by trying all.
    fn not_negative(rows: &[Row]) -> Option<Self> {
        let mut best: Option<Self> = None;
        for free in 1..1_u8 << NOISES {
            if let Some(next) = Self::of(rows, free)
                && next.theta.iter().all(|theta| *theta >= 0.0)
                && best.as_ref().is_none_or(|best| next.chi_squared < best.chi_squared)
            {
                best = Some(next);
            }
        }
        best
    }

    /// `None` if the octaves do not tell the free figures apart.
    fn of(rows: &[Row], free: u8) -> Option<Self> {
        let mut lengths = [0.0; NOISES];
        let mut inverse = [[0.0; NOISES]; NOISES];
        let mut right = [0.0; NOISES];
        for row in rows {
            for (p, (a, length)) in row.columns.iter().zip(&mut lengths).enumerate() {
                *length += row.weight * a * a;
                if let (Some(line), Some(right)) = (inverse.get_mut(p), right.get_mut(p)) {
                    line.iter_mut().zip(row.columns).for_each(|(sum, b)| *sum += row.weight * a * b);
                    *right += row.weight * a * row.mean_square;
                }
            }
        }
        // Columns of unit length; those that are not free become columns of the identity for a while.
        let lengths = lengths.map(math::sqrt);
        let scale = |matrix: &mut [[f32; NOISES]; NOISES], fixed: f32| {
            for (p, (line, a)) in matrix.iter_mut().zip(lengths).enumerate() {
                for (q, (sum, b)) in line.iter_mut().zip(lengths).enumerate() {
                    let both_free = free >> p & free >> q & 1 == 1;
                    *sum = if both_free { *sum / a / b } else { fixed * f32::from(u8::from(p == q)) };
                }
            }
        };
        scale(&mut inverse, 1.0);
        for p in 0..NOISES {
            eliminate(&mut inverse, p)?;
        }
        scale(&mut inverse, 0.0);
        let theta = inverse.map(|line| dot(&line, &right));
        let residual = |row: &Row| row.mean_square - dot(&row.columns, &theta);
        let chi_squared = rows.iter().map(|row| row.weight * residual(row) * residual(row)).sum();
        Some(Self { free, theta, inverse, chi_squared })
    }

    /// One figure with its uncertainty: what it takes from each octave, and how these vary together.
    fn figure(&self, noise: usize, theta: f32, rows: &[Row]) -> Figure {
        let line = self.inverse.get(noise).copied().unwrap_or_default();
        let share = |row: &Row| row.weight * dot(&line, &row.columns);
        let mut variance = [0.0; 3];
        for (k, row) in rows.iter().enumerate() {
            let mut only = row.columns;
            only.iter_mut().enumerate().filter(|(p, _)| *p != noise).for_each(|(_, part)| *part = 0.0);
            for (apart, other) in rows.iter().skip(k).enumerate() {
                let shares = share(row) * share(other) * if apart == 0 { 1.0 } else { 2.0 };
                for (sum, (a, b)) in
                    variance.iter_mut().zip([(&row.parts, &row.parts), (&row.parts, &only), (&only, &only)])
                {
                    *sum += shares * row.covariance(apart, a, b);
                }
            }
        }
        Figure::new(theta, variance)
    }
}

/// One step of inverting a matrix in place (Gauss-Jordan); `None` where too little is left of a column.
fn eliminate(matrix: &mut [[f32; NOISES]; NOISES], p: usize) -> Option<()> {
    let mut line = *matrix.get(p)?;
    let pivot = core::mem::replace(line.get_mut(p)?, 1.0);
    if pivot.is_nan() || pivot <= PIVOT_MIN {
        return None;
    }
    line = line.map(|value| value / pivot);
    for (i, other) in matrix.iter_mut().enumerate() {
        if i == p {
            *other = line;
        } else {
            let factor = core::mem::replace(other.get_mut(p)?, 0.0);
            other.iter_mut().zip(line).for_each(|(value, a)| *value -= factor * a);
        }
    }
    Some(())
}

fn dot(a: &[f32; NOISES], b: &[f32; NOISES]) -> f32 {
    a.iter().zip(b).fold(0.0, |sum, (a, b)| sum + a * b)
}
