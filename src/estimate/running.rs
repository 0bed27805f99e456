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
    /// Bits that a sum drops before it is multiplied: of many samples it may be larger.
    dropped_bits: i32,
}

/// Bits of a weight and of its fraction while it is made.
const WEIGHT_BITS: i32 = 13;
const FRACTION_BITS: i32 = 16;
/// Bits that a product drops, so that 16 of them have room in 32 bits.
const PRODUCT_BITS: i32 = 4;

impl Running {
    /// The weights `p(x)` of `dots`; `start` is the weight of what lies nearer than all of them.
    pub(super) fn new(p: &Polynomial, start: f32, dots: &[Dot]) -> Self {
        let end = |dot: Option<&Dot>| dot.map_or(0, |dot| dot.x.unsigned_abs());
        let reach = (u32::BITS - end(dots.first()).max(end(dots.last())).leading_zeros()).cast_signed();
        let [one, x, square] = p.map(math::exponent);
        let largest = one.max(x + reach).max(square + 2 * reach).max(math::exponent(start));
        // Each of a weight's three terms stays below 2^WEIGHT_BITS, and a sum without its dropped bits below 2^14.
        let unit_bits = largest + 1 - WEIGHT_BITS;
        let most = 1_i64 << (WEIGHT_BITS + FRACTION_BITS);
        let whole = |c: f32, bits: i32| math::fixed(c, bits).clamp(-most, most) as i32;
        Self {
            coefficients: p.map(|c| whole(c, FRACTION_BITS - unit_bits)),
            sum: whole(start, -unit_bits),
            unit_bits,
            dropped_bits: dots.len().checked_ilog2().unwrap_or(0).cast_signed() + 2,
        }
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
        (self.sum + (1 << self.dropped_bits >> 1)) >> self.dropped_bits
    }

    /// A sum of products of weights as what it stands for.
    pub(super) fn of_weights(&self, other: &Self, sum: i32) -> f32 {
        math::scaled(sum as f32, self.unit_bits + other.unit_bits + PRODUCT_BITS)
    }

    /// A coarser sum is in two to this power.
    pub(super) fn passed_bits(&self) -> i32 {
        self.unit_bits + self.dropped_bits
    }

    /// A sum of products of coarser sums as what it stands for.
    pub(super) fn of_passed(&self, other: &Self, sum: i32) -> f32 {
        math::scaled(sum as f32, self.passed_bits() + other.passed_bits() + PRODUCT_BITS)
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
            own += step * product(p, p);
            mixed += step * product(p, q);
            others += step * product(q, q);
            self.pass(dot.x);
            other.pass(dot.x);
        }
        [self.of_passed(&self, own), self.of_passed(&other, mixed), other.of_passed(&other, others)]
    }
}

/// Of two weights or of two sums without their dropped bits.
pub(super) fn product(p: i32, q: i32) -> i32 {
    (p * q) >> PRODUCT_BITS
}
