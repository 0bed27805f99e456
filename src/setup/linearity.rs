//! The converter's integral non-linearity, taken off each code.

use crate::error::{SetupError, check};

const POINTS_MAX: usize = 33;

/// Integral non-linearity of a converter: straight lines through a table of 2 to 33 points `(code, error)`.
///
/// The error is the code given minus the ideal code, in counts, and is taken off: `level = code - error(code)`. A
/// converter whose transitions come at too low a voltage gives codes that are too high: its error is positive. This is
/// the sign of the residual of a transition in IEEE Std 1241 (ideal level minus corrected measured level, in code
/// widths); plots of "actual minus ideal transition" have the other sign. Gain and offset belong in
/// [`Converter`](crate::Converter) and not in the table; what a table holds of them is taken off as well.
///
/// Beyond the first and the last point their errors hold. Errors are rounded to the nearest 2^-16 count, halves away
/// from zero; between points the line is kept within 2^-15 count, and the level never falls where the code rises.
///
/// 528 bytes, best kept in flash. A code costs a search of a fixed number of steps (six halvings of the table), one
/// 64-bit multiplication and a shift; divisions are done when the table is made.
///
/// ```
/// use brimline::Linearity;
///
/// static BOWED: Linearity = Linearity::new(&[(0, 0.0), (32_768, 1.7), (65_535, 0.0)]);
///
/// assert_ne!(BOWED, Linearity::new(&[(0, 0.0), (65_535, 0.0)]));
/// let error = Linearity::try_new(&[(0, 0.0), (0, 1.7)]).unwrap_err();
/// assert_eq!(error.to_string(), "nonlinearity must be given at codes that rise from point to point");
/// ```
// Not `Copy`: half a kilobyte should not land on a small stack unasked.
#[derive(Clone, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Linearity {
    /// Places after the last point repeat it, so that the search needs no length and always takes the same steps.
    knots: [Knot; POINTS_MAX],
}

/// A point of the table, with the line from it to the next point.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
struct Knot {
    code: i32,
    /// Error at `code`, 2^-16 counts.
    error_q16: i32,
    /// Slope of the error from here on, 2^-46 counts per code; 0 at the last point.
    slope_q46: i64,
}

impl Linearity {
    /// Most points a table may have.
    pub const POINTS_MAX: usize = POINTS_MAX;

    /// Takes points `(code, error)`, the error in counts.
    ///
    /// # Errors
    ///
    /// Unless there are 2 to 33 points, at rising codes within -2^29 and 2^29, with errors within -16384 and 16384
    /// counts, and with `code - error` (errors rounded to 2^-16 count) rising from point to point: of a curve that
    /// turns back no level can be told. The parameter is named `nonlinearity`.
    pub const fn try_new(points: &[(i32, f64)]) -> Result<Self, SetupError> {
        check!(points.len() >= 2 && points.len() <= POINTS_MAX, "nonlinearity", "2 to 33 points");
        let mut knot = Knot { code: 0, error_q16: 0, slope_q46: 0 };
        let mut knots = [knot; POINTS_MAX];
        let mut places: &mut [Knot] = &mut knots;
        let mut points = points;
        while let [place, places_after @ ..] = places {
            if let [point, points_after @ ..] = points {
                knot = match Knot::new(*point, points_after.first()) {
                    Ok(knot) => knot,
                    Err(e) => return Err(e),
                };
                points = points_after;
            }
            *place = knot;
            places = places_after;
        }
        Ok(Self { knots })
    }

    /// Takes points `(code, error)`, the error in counts; in a `const` or `static` a bad table fails the build.
    ///
    /// # Panics
    ///
    /// When [`try_new`](Self::try_new) would return an error.
    pub const fn new(points: &[(i32, f64)]) -> Self {
        match Self::try_new(points) {
            Ok(table) => table,
            Err(e) => panic!("{}", e.allowed),
        }
    }

    /// The ideal level at `code`, 2^-16 counts: code minus error. Any code will do.
    #[inline(never)]
    pub(crate) fn linear_q16(&self, code: i32) -> i64 {
        let [first, ..] = &self.knots;
        let not_above = self.knots.partition_point(|knot| knot.code <= code);
        let knot = self.knots.get(not_above.saturating_sub(1)).unwrap_or(first);
        // Below the first point the distance is negative: its error holds.
        let distance = (i64::from(code) - i64::from(knot.code)).max(0);
        // At most 2^61 in magnitude: at most the rise from one point to the next, and beyond the last point none.
        let rise_q46 = distance * knot.slope_q46;
        let rise_q16 = (rise_q46 + (1 << 29)) >> 30;
        (i64::from(code) << 16) - i64::from(knot.error_q16) - rise_q16
    }
}

impl Knot {
    const fn new(point: (i32, f64), next: Option<&(i32, f64)>) -> Result<Self, SetupError> {
        let Some(next) = next else { return Self::level(point) };
        match (Self::level(point), Self::level(*next)) {
            (Ok(knot), Ok(next)) => knot.toward(next),
            (Err(e), _) | (_, Err(e)) => Err(e),
        }
    }

    /// A point whose error holds from there on.
    const fn level((code, error): (i32, f64)) -> Result<Self, SetupError> {
        const SPAN: i32 = 1 << 29;
        check!(code >= -SPAN && code <= SPAN, "nonlinearity", "given at codes within -2^29 and 2^29");
        check!(
            error >= -16_384.0 && error <= 16_384.0,
            "nonlinearity",
            "within -16384 and 16384 (count) at each point"
        );
        let half = if error < 0.0 { -0.5 } else { 0.5 };
        Ok(Self { code, error_q16: (error * 65_536.0 + half) as i32, slope_q46: 0 })
    }

    /// The same point with the line to the `next`.
    const fn toward(self, next: Self) -> Result<Self, SetupError> {
        let run = next.code as i64 - self.code as i64;
        check!(run > 0, "nonlinearity", "given at codes that rise from point to point");
        let rise_q16 = next.error_q16 as i64 - self.error_q16 as i64;
        check!(rise_q16 < run << 16, "nonlinearity", "such that code minus error rises from point to point");
        Ok(Self { slope_q46: (rise_q16 << 30) / run, ..self })
    }
}

#[cfg(test)]
mod tests {
    extern crate std;

    use std::vec;
    use std::vec::Vec;

    use super::*;

    /// Knuth's 64-bit linear congruential generator (constants from memory), upper bits.
    struct Random(u64);

    impl Random {
        /// From 0 up to 1.
        fn unit(&mut self) -> f64 {
            self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            (self.0 >> 11) as f64 / (1_u64 << 53) as f64
        }

        fn between(&mut self, low: f64, high: f64) -> f64 {
            low + (high - low) * self.unit()
        }

        /// From 1 to 2^bits, each doubling as often as any other.
        fn up_to_bits(&mut self, bits: f64) -> f64 {
            let whole = self.between(0.0, bits) as u32;
            self.between(1.0, 2.0) * (1_u64 << whole) as f64
        }

        /// A legal table: runs of 1 code up to the whole span, and every third rise as steep as a code can bear.
        fn table(&mut self) -> Vec<(i32, f64)> {
            let (start, end) = (-(1 << 29), 1 << 29);
            let count = self.between(2.0, 34.0) as usize;
            let top = self.up_to_bits(14.0);
            let first = if self.unit() < 0.5 { start } else { self.between(-1e6, 1e6) as i32 };
            let mut points = vec![(first, self.between(-top, top))];
            while points.len() < count.max(2) {
                let (code, error) = points[points.len() - 1];
                let left = f64::from(end) - f64::from(code) - 40.0;
                let run = self.up_to_bits(30.0).min(left).max(1.0) as i32;
                let steepest = top.min(error + f64::from(run) - 1.0 / 16_384.0);
                let rise_to = if self.unit() < 0.33 { steepest } else { self.between(-top, steepest) };
                points.push((code + run, rise_to));
            }
            points
        }
    }

    /// Straight lines in f64, worked out anew from the points.
    fn oracle(points: &[(i32, f64)], code: i32) -> f64 {
        let x = f64::from(code);
        let Some(after) = points.iter().position(|point| code < point.0) else { return x - points[points.len() - 1].1 };
        let Some(before) = after.checked_sub(1) else { return x - points[0].1 };
        let [(start, from), (end, to)] = [points[before], points[after]].map(|(code, error)| (f64::from(code), error));
        x - (from + (to - from) * ((x - start) / (end - start)))
    }

    /// Codes at, beside and between the points, and beyond them.
    fn codes(points: &[(i32, f64)], random: &mut Random) -> Vec<i32> {
        let mut codes = vec![i32::MIN, i32::MAX, 0];
        for pair in points.windows(2) {
            let (a, b) = (pair[0].0, pair[1].0);
            codes.extend([a - 1, a, a + 1, b - 1, b, b + 1]);
            codes.extend((0..4).map(|_| random.between(f64::from(a), f64::from(b)) as i32));
        }
        codes
    }

    #[test]
    fn lines_agree_with_f64_and_points_are_exact() {
        let mut random = Random(1);
        let mut worst = 0.0_f64;
        for _ in 0..4000 {
            let points = random.table();
            let table = Linearity::try_new(&points).unwrap_or_else(|e| panic!("{e}: {points:?}"));
            let length = f64::from(points[points.len() - 1].0) - f64::from(points[0].0);
            for code in codes(&points, &mut random) {
                let apart = (table.linear_q16(code) as f64 / 65_536.0 - oracle(&points, code)).abs();
                // Half a unit each for the points and the result; the cut-off slope loses one unit over 2^30 codes.
                worst = worst.max(apart);
                assert!(apart <= (1.0 + length / 1_073_741_824.0) / 65_536.0, "{code}: {apart} in {points:?}");
            }
            for &(code, error) in &points {
                let apart = (i64::from(code) << 16) as f64 - error * 65_536.0 - table.linear_q16(code) as f64;
                assert!(apart.abs() <= 0.5, "{code} in {points:?}");
            }
        }
        assert!(worst > 1.0 / 65_536.0, "tables that never came near the bound: {worst}");
    }

    #[test]
    fn the_level_never_falls_where_the_code_rises() {
        let mut random = Random(2);
        for _ in 0..4000 {
            let points = random.table();
            let table = Linearity::new(&points);
            for code in codes(&points, &mut random).into_iter().filter(|code| *code < i32::MAX) {
                assert!(table.linear_q16(code + 1) >= table.linear_q16(code), "{code} in {points:?}");
            }
        }
    }

    #[test]
    fn extreme_tables_hold_their_ends_and_do_not_overflow() {
        let (low, high) = (-(1 << 29), 1 << 29);
        let shift = |code: i32, error: i64| (i64::from(code) - error) << 16;
        for (at_low, at_high) in [(-16_384, 16_384), (16_384, -16_384)] {
            let table = Linearity::new(&[(low, at_low as f64), (high, at_high as f64)]);
            for code in [i32::MIN, low - 1, low] {
                assert_eq!(table.linear_q16(code), shift(code, at_low));
            }
            for code in [high, high + 1, i32::MAX] {
                assert_eq!(table.linear_q16(code), shift(code, at_high));
            }
            assert_eq!(table.linear_q16(0), 0);
        }
        let leap = Linearity::new(&[(7, 16_384.0), (8, -16_384.0)]);
        for (code, error) in [(7, 16_384), (8, -16_384), (i32::MAX, -16_384)] {
            assert_eq!(leap.linear_q16(code), shift(code, error));
        }
        assert_eq!(size_of::<Linearity>(), 528);
    }

    /// IEEE Std 1241 (from memory): residual of a transition = ideal level - measured level, here in code widths.
    #[test]
    fn residuals_of_transitions_straighten_a_bent_converter() {
        let residual = |k: i32| 3.0 * (f64::from(k) / 2048.0) * (1.0 - f64::from(k) / 4096.0) * 2.0;
        let transitions: Vec<f64> = (1..4096).map(|k| f64::from(k) - 0.5 - residual(k)).collect();
        let points: Vec<_> = (0..33).map(|i| (128 * i, residual(128 * i))).collect();
        let table = Linearity::new(&points);
        for level in (10..40_800).map(|tenth| f64::from(tenth) / 10.0) {
            let code = transitions.partition_point(|transition| *transition <= level) as i32;
            let apart = (table.linear_q16(code) as f64 / 65_536.0 - level).abs();
            assert!(apart < 0.52, "{code}: {apart}");
        }
    }

    #[test]
    fn bad_tables_are_refused() {
        let refusal =
            |points: &[(i32, f64)]| Linearity::try_new(points).map(|_| ()).map_err(|e| (e.parameter, e.allowed));
        let refused = |allowed: &'static str| Err(("nonlinearity", allowed));
        let row = |count: i32| (0..count).map(|i| (i, 0.0)).collect::<Vec<_>>();
        for count in [0, 1, 34, 100] {
            assert_eq!(refusal(&row(count)), refused("2 to 33 points"));
        }
        assert_eq!([2, 33].map(|count| refusal(&row(count))), [Ok(()); 2]);
        let (low, high) = (-(1 << 29), 1 << 29);
        for (from, to) in [(low - 1, 0), (0, high + 1), (i32::MIN, i32::MAX), (0, i32::MIN)] {
            assert_eq!(refusal(&[(from, 0.0), (to, 0.0)]), refused("given at codes within -2^29 and 2^29"));
        }
        for (from, to) in [(5, 5), (5, 4), (high, low)] {
            let expected = refused("given at codes that rise from point to point");
            assert_eq!(refusal(&[(from, 0.0), (to, 0.0)]), expected);
        }
        for error in [16_384.001, -16_384.001, f64::INFINITY, f64::NEG_INFINITY, f64::NAN, f64::MAX] {
            let expected = refused("within -16384 and 16384 (count) at each point");
            assert_eq!(refusal(&[(0, error), (100_000, 0.0)]), expected);
            assert_eq!(refusal(&[(0, 0.0), (1, 0.0), (100_000, error)]), expected);
        }
        for rise in [10.0, 10.000_001, 9.999_999, 11.0, 16_384.0] {
            let expected = refused("such that code minus error rises from point to point");
            assert_eq!(refusal(&[(0, 0.0), (10, rise)]), expected);
            assert_eq!(refusal(&[(0, -rise), (10, 0.0), (20, 0.0)]), expected);
        }
        assert_eq!(refusal(&[(0, 0.0), (10, 9.9999)]), Ok(()));
        assert_eq!(refusal(&[(0, 16_384.0), (1, -16_384.0)]), Ok(()));
    }
}
