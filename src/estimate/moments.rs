//! What a line and a parabola through samples on a grid are made of.

use super::grid::Dot;

/// Determinants of the normal equations, exact. With `n` samples, each stands for a sum of squares or products of what
/// the polynomials of lower degree have left, times `spread`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Moments {
    pub(super) count: i32,
    /// Sums of `x^2` and `x^3`; that of `x` is 0.
    pub(super) squares: i32,
    pub(super) cubes: i32,
    /// Sums of `y` and `x y`.
    pub(super) heights: i32,
    pub(super) tilts: i32,
    /// `n sum(x^2)`.
    pub(super) spread: i32,
    /// Of the parabola `x^2 - skew x - mean square`: its square, and its product with `y`.
    pub(super) power: i64,
    pub(super) product: i64,
    /// Of `y` about its line: the square.
    pub(super) scatter: i64,
}

impl Moments {
    /// With `|x|` up to 226 and `|y|` up to 2^18 at 16 samples, no sum of products needs more than 32 bits but that of
    /// `x^4`: a level is taken in two parts.
    pub(super) fn of(dots: &[Dot]) -> Self {
        let (mut squares, mut cubes, mut fourths) = (0_i32, 0_i32, 0_u64);
        let (mut heights, mut tilts) = (0_i32, 0_i32);
        let (mut bends, mut fine_bends) = (0_i32, 0_i32);
        let (mut high, mut mixed, mut low) = (0_i32, 0_i32, 0_i32);
        for &Dot { x, y } in dots {
            let square = x * x;
            squares += square;
            cubes += square * x;
            fourths += u64::from(square.cast_unsigned() * square.cast_unsigned());
            heights += y;
            tilts += x * y;
            let (upper, lower) = (y >> PART_BITS, y & ((1 << PART_BITS) - 1));
            bends += square * upper;
            fine_bends += square * lower;
            high += upper * upper;
            mixed += upper * lower;
            low += lower * lower;
        }
        let joined = |upper: i64, lower: i32| (upper << PART_BITS) + i64::from(lower);
        let bends = joined(i64::from(bends), fine_bends);
        let levels = joined(joined(i64::from(high), 2 * mixed), low);

        let count = dots.len() as i32;
        let [n, xx, xxx, y, xy] = [count, squares, cubes, heights, tilts].map(i64::from);
        Self {
            count,
            squares,
            cubes,
            heights,
            tilts,
            spread: count * squares,
            power: xx * (n * fourths.cast_signed() - xx * xx) - n * (xxx * xxx),
            product: xx * (n * bends - xx * y) - n * (xxx * xy),
            scatter: xx * (n * levels - y * y) - n * (xy * xy),
        }
    }
}

const PART_BITS: u32 = 9;
