//! How a curved input bends the level beside a switching instant, and what neither line nor bend explains.

use super::moments::Moments;
use super::running::Polynomial;

/// A bend that noise could hardly have made is taken off: a parabola instead of a line.
const CORRECTED_BEND: f32 = 4.0;
/// A bend that noise may have made is left in and charged in full. Taking it off as well would make errors of just
/// those lines on which noise had played its tricks, and state them too small.
const CHARGED_BEND: f32 = 3.0;

/// Noise in the units of a grid: readout variance of a sample, walk from sample to sample on average, and the variance
/// of the bend where it is known.
#[derive(Clone, Copy, Debug)]
pub(super) struct GridNoise {
    pub(super) readout: f32,
    pub(super) walk: f32,
    pub(super) bend: Option<f32>,
}

/// What the samples show of a curved input: the part of a parabola that no line holds, `x^2 - skew x - mean square`.
#[derive(Clone, Copy, Debug)]
pub(super) struct Bend {
    /// How much of it there is, and the sum of its squares over the samples, which may be 0.
    pub(super) amount: f32,
    pub(super) power: f32,
    pub(super) skew: f32,
    pub(super) mean_square: f32,
    /// How much of it is taken off, 0 to 1, and the variance of what is left in.
    pub(super) taken_off: f32,
    pub(super) left_in: f32,
    /// The square of what stands out, as `Moments::scatter`.
    standing_out: f32,
}

impl Bend {
    /// `None` with fewer than four samples, or where noise may well have made what there is of it. `walked`: what the
    /// walk from sample to sample makes of the product with a polynomial.
    ///
    /// With a prior variance `b` of the bend and a variance `v` of what the samples show, `b/(b + v)` is taken off and
    /// `b v^2/(b + v)^2` left in. Without a prior, see [`CORRECTED_BEND`] and [`CHARGED_BEND`].
    pub(super) fn of(m: &Moments, noise: &GridNoise, walked: impl FnOnce(&Polynomial) -> f32) -> Option<Self> {
        if m.count < 4 {
            return None;
        }
        let (spread, power, product) = (m.spread as f32, m.power as f32, m.product as f32);
        let shown = product * product;
        let mut variance = noise.readout * spread * power;
        if noise.bend.is_none() && shown <= CHARGED_BEND * CHARGED_BEND * variance {
            return None;
        }
        let per_spread = 1.0 / spread;
        let squares = m.squares as f32;
        let (skew, mean_square) = ((m.count * m.cubes) as f32 * per_spread, squares * squares * per_spread);
        let mut bend = Self {
            amount: 0.0,
            power: power * per_spread,
            skew,
            mean_square,
            taken_off: 0.0,
            left_in: noise.bend.unwrap_or(0.0),
            standing_out: 0.0,
        };
        if m.power <= 0 {
            return noise.bend.map(|_| bend);
        }
        if noise.walk > 0.0 {
            variance += noise.walk * walked(&[-mean_square, -skew, 1.0]) * spread * spread;
        }
        let stands_out = |deviations: f32| shown > deviations * deviations * variance;
        bend.amount = product / power;
        if stands_out(CHARGED_BEND) {
            bend.standing_out = shown / power;
        }
        (bend.taken_off, bend.left_in) = match noise.bend {
            Some(prior) => {
                let share = prior / (prior + variance / (power * power));
                (share, prior * (1.0 - share) * (1.0 - share))
            }
            None if stands_out(CORRECTED_BEND) => (1.0, 0.0),
            None if stands_out(CHARGED_BEND) => (0.0, bend.amount * bend.amount),
            None => return None,
        };
        Some(bend)
    }

    /// The parabola at `x`, and how it changes from there away from the samples.
    pub(super) fn at(&self, x: f32) -> [f32; 2] {
        [x * (x - self.skew) - self.mean_square, self.skew - 2.0 * x]
    }

    /// Takes the bend off in the weights of the level and of its change, in which the parabola would have been `at`.
    pub(super) fn add_to(&self, weights: &mut [Polynomial; 2], at: [f32; 2]) {
        let share = self.taken_off / self.power;
        for ([one, x, square], at) in weights.iter_mut().zip(at) {
            let share = share * at;
            *one -= share * self.mean_square;
            *x -= share * self.skew;
            *square += share;
        }
    }
}

/// Factor on the variances where the samples scatter about their curve by clearly more than their noise: hum, or an
/// input that does more than curve. It is `chi^2` over its expectation, once it lies 3 standard deviations above (Birge
/// ratio). The random walk adds `walk (n + 2)(n - 2) / (15 (n - 1))` to the expectation `n - 2`, where `walk` is what
/// it gains over the window in readout variances.
pub(super) fn unexplained(m: &Moments, bend: Option<&Bend>, noise: &GridNoise) -> f32 {
    let n = m.count;
    let degrees = (n - 2) as f32;
    let expected = (degrees * noise.readout + (n * n - 4) as f32 * (1.0 / 15.0) * noise.walk) * m.spread as f32;
    let scatter = m.scatter as f32 - bend.map_or(0.0, |bend| bend.standing_out);
    let excess = scatter - expected;
    // With up to 16 samples, 3 standard deviations are more than the expectation.
    if excess > expected && excess * excess * degrees > 18.0 * expected * expected { scatter / expected } else { 1.0 }
}
