//! How a curved input bends the level beside a switching instant.

use super::edge::{EdgeNoise, Weights};
use super::line::{Line, Point};
use crate::math;

/// A bend that noise could hardly have made is taken off: a parabola instead of a line.
const CORRECTED_BEND: f32 = 4.0;
/// A bend that noise may have made is left in and charged in full. Taking it off as well would make errors of just
/// those lines on which noise had played its tricks, and state them too small.
const CHARGED_BEND: f32 = 3.0;

/// What the samples show of a curved input: the part of a parabola that no line holds,
/// `amount (u^2 - skew u - mean square)`.
#[derive(Clone, Copy, Debug)]
pub(super) struct Bend {
    pub(super) amount: f32,
    /// Variance of `amount` from readout noise and walk.
    variance: f32,
    /// Sum of the squares of the polynomial over the samples.
    power: f32,
    skew: f32,
    mean_square: f32,
    /// The polynomial at the instant, and its change with the extrapolation `d`.
    pub(super) at_instant: f32,
    pub(super) per_second: f32,
}

impl Bend {
    /// `None` with fewer than four samples, or where the line is exact.
    pub(super) fn of(line: &Line, points: impl Iterator<Item = Point> + Clone, noise: EdgeNoise) -> Option<Self> {
        let (mut squares, mut cubes) = (0.0_f32, 0.0_f32);
        for p in points.clone() {
            let u = p.x - line.centre;
            squares += u * u;
            cubes += u * u * u;
        }
        let (skew, mean_square) = (cubes / squares, squares / f32::from(line.points));
        let polynomial = |x: f32| {
            let u = x - line.centre;
            u * (u - skew) - mean_square
        };
        let (mut power, mut product, mut nearer, mut walked, mut near) = (0.0_f32, 0.0_f32, 0.0_f32, 0.0_f32, 0.0_f32);
        for p in points {
            walked += (p.x - near) * nearer * nearer;
            near = p.x;
            let value = polynomial(p.x);
            power += value * value;
            product += value * (p.y - line.at(p.x));
            nearer += value;
        }
        if line.points < 4 || power <= 0.0 {
            return None;
        }
        Some(Self {
            amount: product / power,
            variance: (noise.readout_var + noise.level_walk * walked / power) / power,
            power,
            skew,
            mean_square,
            at_instant: polynomial(0.0),
            per_second: 2.0 * line.centre + skew,
        })
    }

    /// Whether it stands out of the noise by more than so many standard deviations.
    fn stands_out(&self, deviations: f32) -> bool {
        self.amount * self.amount > deviations * deviations * self.variance
    }

    /// How much of the bend to take off, 0 to 1, and the variance of what is left in, (counts/s^2)^2.
    ///
    /// With a prior variance `b` of the bend and a variance `v` of what the samples show, `b/(b + v)` is taken off and
    /// `b v^2/(b + v)^2` left in. Without a prior, see [`CORRECTED_BEND`] and [`CHARGED_BEND`].
    pub(super) fn share_to_take_off(&self, bend_var: Option<f32>) -> (f32, f32) {
        match bend_var {
            Some(prior) => {
                let share = prior / (prior + self.variance);
                (share, prior * (1.0 - share) * (1.0 - share))
            }
            None if self.stands_out(CORRECTED_BEND) => (1.0, 0.0),
            None if self.stands_out(CHARGED_BEND) => (0.0, self.amount * self.amount),
            None => (0.0, 0.0),
        }
    }

    pub(super) fn add_to(&self, weights: &mut Weights, taken_off: f32) {
        let share = taken_off / self.power;
        for (coefficients, reach) in
            [(&mut weights.at_instant, self.at_instant), (&mut weights.per_second, self.per_second)]
        {
            coefficients[0] -= reach * share * self.mean_square;
            coefficients[1] -= reach * share * self.skew;
            coefficients[2] += reach * share;
        }
    }
}

/// Factor on the variances where the samples scatter about their curve by clearly more than their noise: hum, or an
/// input that does more than curve. It is `chi^2` over its expectation, once it lies 3 standard deviations above (Birge
/// ratio). The random walk adds `walk (n + 2)(n - 2) / (15 (n - 1))` to the expectation `n - 2`, where `walk` is what
/// it gains over the window in readout variances.
pub(super) fn unexplained(
    line: &Line,
    bend: Option<Bend>,
    points: impl Iterator<Item = Point> + Clone,
    noise: EdgeNoise,
) -> f32 {
    let n = f32::from(line.points);
    let span = points.clone().last().map_or(0.0, |p| p.x) - points.clone().next().map_or(0.0, |p| p.x);
    let walk = noise.level_walk * span / noise.readout_var;
    let curved = bend
        .filter(|bend| bend.stands_out(CHARGED_BEND))
        .map_or(0.0, |b| b.amount * b.amount * b.power / noise.readout_var);
    let chi_squared = line.chi_squared - curved;
    let expected = (n - 2.0) * (1.0 + walk * (n + 2.0) / (15.0 * (n - 1.0)));
    let scatter = expected * math::sqrt(2.0 / (n - 2.0));
    if n > 2.0 && chi_squared > expected + 3.0 * scatter { chi_squared / expected } else { 1.0 }
}
