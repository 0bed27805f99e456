//! Variances as quadratic forms of the weights' coefficients.

use super::grid::Dot;

/// Coefficients of a polynomial in the distance from the middle.
pub(super) type Polynomial = [f32; 3];

/// Sums that turn two polynomials into what they have in common: `sum(p(x) q(x))` over samples, or the same of what the
/// polynomials have come to at each step between samples.
#[derive(Clone, Copy, Debug)]
pub(super) struct Form {
    /// Of 1 with 1, 1 with `x`, `x` with `x`; then of `x^2` with 1, `x` and `x^2`.
    sums: [f32; 6],
    curved: bool,
}

impl Form {
    /// What is to be multiplied by a polynomial's coefficients to make its product with `p`.
    pub(super) fn with(&self, p: &Polynomial) -> Polynomial {
        let [one, x, xx, square, cube, fourth] = self.sums;
        let [a, b, c] = *p;
        let line = [one * a + x * b, x * a + xx * b, 0.0];
        if !self.curved {
            return line;
        }
        [line[0] + square * c, line[1] + cube * c, square * a + cube * b + fourth * c]
    }

    /// The product of two polynomials.
    pub(super) fn of(&self, p: &Polynomial, q: &Polynomial) -> f32 {
        dot(&self.with(p), q, self.curved)
    }

    /// Products over the samples themselves.
    pub(super) fn of_samples(dots: &[Dot], curved: bool) -> (Polynomial, Self) {
        let mut sums = [0_i32; 4];
        let mut fourths = 0_u64;
        for &Dot { x, .. } in dots {
            let square = x * x;
            sums = [sums[0] + 1, sums[1] + x, sums[2] + square, sums[3] + square * x];
            fourths += u64::from(square.cast_unsigned() * square.cast_unsigned());
        }
        let [one, x, square, cube] = sums.map(|sum| sum as f32);
        ([one, x, square], Self { sums: [one, x, square, square, cube, fourths as f32], curved })
    }

    /// Products over the steps between samples, a unit of distance each, of sums over the samples nearer than the step;
    /// and those sums themselves.
    ///
    /// A random walk moves all samples beyond a step: what a line sees of it is the sum of their weights.
    pub(super) fn of_steps(dots: &[Dot], curved: bool) -> (Polynomial, Self) {
        let (mut one, mut x, mut squares) = (0_i32, 0_i32, 0_i32);
        let (mut passed, mut sums) = ([0_i32; 3], [0_i32; 6]);
        let mut near = dots.first().map_or(0, |dot| dot.x);
        for dot in dots {
            let step = dot.x - near;
            near = dot.x;
            let (step_one, step_x) = (step * one, step * x);
            passed[0] += step_one;
            passed[1] += step_x;
            sums[0] += step_one * one;
            sums[1] += step_one * x;
            sums[2] += step_x * x;
            if curved {
                // At most 230,400: coarser, so that its square has room.
                let square = squares >> SQUARE_BITS;
                passed[2] += step * square;
                sums[3] += step_one * square;
                sums[4] += step_x * square;
                sums[5] += step * square * square;
                squares += dot.x * dot.x;
            }
            one += 1;
            x += dot.x;
        }
        let ([one, x, square], [a, b, c, d, e, f]) = (passed, sums);
        let mut passed = [one as f32, x as f32, 0.0];
        let mut sums = [a as f32, b as f32, c as f32, 0.0, 0.0, 0.0];
        if curved {
            let scale = (1 << SQUARE_BITS) as f32;
            passed[2] = square as f32 * scale;
            sums[3] = d as f32 * scale;
            sums[4] = e as f32 * scale;
            sums[5] = f as f32 * scale * scale;
        }
        (passed, Self { sums, curved })
    }
}

const SQUARE_BITS: u32 = 7;

/// Sum of the products of two polynomials' coefficients.
pub(super) fn dot(p: &Polynomial, q: &Polynomial, curved: bool) -> f32 {
    let line = p[0] * q[0] + p[1] * q[1];
    if curved { line + p[2] * q[2] } else { line }
}
