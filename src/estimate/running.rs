//! What a random walk makes of weighted samples: it moves all samples beyond a step together, so what a line sees of
//! the step is the sum of their weights.

use super::grid::Dot;
use crate::math;

/// Coefficients of a polynomial in the distance from the middle of the samples.
pub(super) type Polynomial = [f32; 3];

/// Weights in whole numbers, to be summed sample by sample: variances need no more than a few digits.
#[derive(Clone, Copy, Debug)]
pub(super) struct Running {
    /// Of 1, `x` and `x^2`, in `2^(unit_bits - FRACTION_BITS)`.
    coefficients: [i32; 3],
    /// The sum up to here, in `2^unit_bits`.
    sum: i32,
    unit_bits: i32,
}

/// Bits of a weight, of its fraction while it is made, and those that are dropped before sums are multiplied.
const WEIGHT_BITS: i32 = 11;
const FRACTION_BITS: i32 = 18;
const DROPPED_BITS: i32 = 5;

impl Running {
    /// The weights `p(x)` of `dots`; `start` is the weight of what lies nearer than all of them.
    pub(super) fn new(p: &Polynomial, start: f32, dots: &[Dot]) -> Self {
        let end = |dot: Option<&Dot>| dot.map_or(0, |dot| dot.x.unsigned_abs());
        let reach = (u32::BITS - end(dots.first()).max(end(dots.last())).leading_zeros()).cast_signed();
        let [one, x, square] = p.map(exponent);
        let largest = one.max(x + reach).max(square + 2 * reach).max(exponent(start)).max(LEAST);
        // Each term stays below 2^WEIGHT_BITS, so a sum over 16 samples below 2^17.
        let unit_bits = largest + 1 - WEIGHT_BITS;
        let most = 1 << (WEIGHT_BITS + FRACTION_BITS);
        let to_fraction = math::power_of_two(FRACTION_BITS - unit_bits);
        let coefficients = p.map(|c| ((c * to_fraction) as i32).clamp(-most, most));
        Self { coefficients, sum: (start * math::power_of_two(-unit_bits)) as i32, unit_bits }
    }

    /// The weight at `x`, which the sum then holds.
    pub(super) fn pass(&mut self, x: i32) -> i32 {
        let [a, b, c] = self.coefficients;
        let weight = (a + x * (b + x * c) + (1 << FRACTION_BITS >> 1)) >> FRACTION_BITS;
        self.sum += weight;
        weight
    }

    /// The sum of the weights so far, coarser.
    pub(super) fn passed(&self) -> i32 {
        (self.sum + (1 << DROPPED_BITS >> 1)) >> DROPPED_BITS
    }

    /// What a weight and a coarser sum have to be multiplied by.
    pub(super) fn weight_unit(&self) -> f32 {
        math::power_of_two(self.unit_bits)
    }

    pub(super) fn passed_unit(&self) -> f32 {
        math::power_of_two(self.unit_bits + DROPPED_BITS)
    }

    /// Sums over the steps between samples, a unit of distance each, of the products of two running sums: of the first
    /// with itself, of both, of the second with itself.
    pub(super) fn products(mut self, mut other: Self, dots: &[Dot]) -> [f32; 3] {
        let (mut own, mut mixed, mut others) = (0_i32, 0_i32, 0_i32);
        let mut near = dots.first().map_or(0, |dot| dot.x);
        for dot in dots {
            let step = dot.x - near;
            near = dot.x;
            let (p, q) = (self.passed(), other.passed());
            own += step * p * p;
            mixed += step * p * q;
            others += step * q * q;
            self.pass(dot.x);
            other.pass(dot.x);
        }
        let (p, q) = (self.passed_unit(), other.passed_unit());
        [own as f32 * (p * p), mixed as f32 * (p * q), others as f32 * (q * q)]
    }
}

/// Smaller weights than `2^LEAST` are none.
const LEAST: i32 = -40;

/// The power of two that a number's magnitude begins with.
fn exponent(x: f32) -> i32 {
    (x.to_bits() >> 23 & 0xFF).cast_signed() - 127
}
