//! Sums in `f32` that lose nothing.

use crate::math;

/// A sum of many small numbers: what rounding leaves of one is added with the next, so that the ten millionth counts as
/// the first.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub(crate) struct Sum {
    value: f32,
    rest: f32,
}

impl Sum {
    pub(crate) const fn new(value: f32) -> Self {
        Self { value, rest: 0.0 }
    }

    /// Adds a number; the sum ends at `most` either way, past which nothing is known, and so it does where the number
    /// is none.
    pub(crate) fn add(&mut self, x: f32, most: f32) {
        let x = x + self.rest;
        let sum = math::within(self.value + x, most);
        // Exact once the sum is larger than what is added (Dekker 1971, Numerische Mathematik 18, from memory).
        let rest = x - (sum - self.value);
        self.rest = if math::abs(sum) < most { rest } else { 0.0 };
        self.value = sum;
    }

    pub(crate) const fn value(self) -> f32 {
        self.value
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ten_million_small_numbers_count_as_the_first() {
        let (mut sum, mut plain) = (Sum::new(3.0), 3.0_f32);
        for _ in 0..10_000_000 {
            sum.add(1e-7, 1e30);
            plain += 1e-7;
        }
        assert!((f64::from(sum.value()) - 4.0).abs() < 3e-7, "{sum:?}");
        assert_eq!(plain, 3.0);
    }

    #[test]
    fn it_ends_where_it_is_told_to() {
        for (x, end) in [(1e30, 5.0), (-1e30, -5.0), (f32::INFINITY, 5.0), (6.0, 5.0)] {
            let mut sum = Sum::new(1.0);
            sum.add(x, 5.0);
            assert_eq!(sum, Sum::new(end));
            sum.add(-end, 5.0);
            assert_eq!(sum.value(), 0.0);
        }
        let mut sum = Sum::new(1.0);
        sum.add(f32::NAN, 5.0);
        assert_eq!(sum.value().abs(), 5.0);
    }
}
