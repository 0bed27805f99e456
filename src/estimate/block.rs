//! Zero samples averaged in blocks of whole mains periods, before the filter sees them.

use crate::math;

/// Bits of a *fine step*, a fraction of a count.
const FINE_BITS: u32 = 8;
const FINE: f32 = 1.0 / (1 << FINE_BITS) as f32;

/// Farthest level above a block's base, fine steps: 2^22 counts.
const END: i32 = 1 << 30;

/// A block being filled.
///
/// A mean over whole periods holds nothing of a hum. Integers only, until the block is full; and of 32 bits wherever
/// they are multiplied, since a small microcontroller takes 40 instructions for a product of 64. So what tells the
/// scatter, deviations from where samples are expected and their instants, is kept within 16 and 15 bits: what grows
/// past that is *coarsened*, the sums so far and all that comes after. The mean is exact.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Block {
    /// Where levels are counted from, whole counts in 2^-16 counts.
    base_q16: i64,
    /// Sums over the samples: fine steps above the base, and ticks since the block began.
    levels: i64,
    ticks: u64,
    /// Sums of squares of deviations and of instants, and of products of the two.
    squares: u64,
    instant_squares: u64,
    products: i64,
    /// Sums of deviations and of instants.
    deviations: i32,
    instants: u32,
    /// Ticks since the block began.
    span: u32,
    count: u16,
    /// Deviations are in `2^coarse` fine steps, instants in `2^coarse_time` ticks.
    coarse: u8,
    coarse_time: u8,
}

/// What a block came to.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct BlockMean {
    /// The mean level: whole counts and the rest.
    pub(crate) counts: i64,
    pub(crate) rest: f32,
    /// Ticks from the mean instant of the samples to the latest of them.
    pub(crate) age: u32,
    pub(crate) samples: u16,
    /// One over `samples`.
    pub(crate) share: f32,
    /// Sum of the squared deviations from a straight line, counts^2, by how much it may be wrong because the sums were
    /// coarsened, and the square of the step that deviations were rounded to.
    pub(crate) scatter: f32,
    pub(crate) blur: f32,
    pub(crate) step_squared: f32,
    /// Ticks that the block spans.
    pub(crate) span: u32,
}

impl Block {
    /// Whether no sample is in it.
    pub(crate) fn is_empty(&self) -> bool {
        self.count == 0
    }

    /// Counts deviations from `base`, whole counts near the levels to come; for an empty block.
    pub(crate) fn start(&mut self, base: i64) {
        self.base_q16 = base.saturating_mul(1 << 16);
    }

    /// A level in 2^-16 counts as fine steps above the base, at most 2^30 of them.
    pub(crate) fn above(&self, level_q16: i64) -> i32 {
        // Levels are far from the ends of 64 bits, the more so differences of levels in one zero.
        let above = level_q16.wrapping_sub(self.base_q16).wrapping_add(1 << (15 - FINE_BITS)) >> (16 - FINE_BITS);
        match i32::try_from(above) {
            Ok(above) if (-END..=END).contains(&above) => above,
            _ if above < 0 => -END,
            _ => END,
        }
    }

    /// Whether a level above the base is one, and not the end of what a block can take.
    pub(crate) fn is_within(&self, above: i32) -> bool {
        above.unsigned_abs() < END.unsigned_abs()
    }

    /// Time passes without a usable sample.
    pub(crate) fn skip(&mut self, ticks: u32) {
        self.span = self.span.saturating_add(ticks);
    }

    /// Takes a level, fine steps [`above`](Self::above) the base and `off` fine steps from where it was expected,
    /// `ticks` after the one before. `true` when the block is as close to `length` ticks as this spacing allows.
    pub(crate) fn push(&mut self, above: i32, off: i32, ticks: u32, length: u32) -> bool {
        self.skip(ticks);
        let (deviation, instant) = self.within_bits(off);
        // A block ends at 2^16 samples: sums of products of 30 bits stay within 46, of deviations within 32.
        self.levels += i64::from(above);
        self.ticks += u64::from(self.span);
        self.deviations += deviation;
        self.instants += instant;
        self.squares += u64::from((deviation * deviation).cast_unsigned());
        self.instant_squares += u64::from(instant * instant);
        self.products += i64::from(deviation * instant.cast_signed());
        self.count = self.count.saturating_add(1);
        self.span.saturating_add(ticks >> 1) >= length || self.count == u16::MAX
    }

    /// A deviation of at most 2^15 and the present instant, of at most 2^15.
    fn within_bits(&mut self, off: i32) -> (i32, u32) {
        loop {
            let deviation = off.saturating_add(1 << self.coarse >> 1) >> self.coarse;
            let instant = self.span >> self.coarse_time;
            match (i16::try_from(deviation), instant) {
                (Ok(deviation), ..=0x7FFF) => return (i32::from(deviation), instant),
                (Ok(_), _) => self.coarsen_time(),
                _ => self.coarsen(),
            }
        }
    }

    #[cold]
    fn coarsen(&mut self) {
        self.coarse += 1;
        self.deviations >>= 1;
        self.products >>= 1;
        self.squares >>= 2;
    }

    #[cold]
    fn coarsen_time(&mut self) {
        self.coarse_time += 1;
        self.instants >>= 1;
        self.products >>= 1;
        self.instant_squares >>= 2;
    }

    /// Empties the block; `None` if no sample is in it.
    pub(crate) fn take(&mut self) -> Option<BlockMean> {
        let block = core::mem::take(self);
        // The next one has as long to go.
        self.coarse_time = block.coarse_time;
        let count = block.count;
        if count == 0 {
            return None;
        }
        let share = if count == 1 { 1.0 } else { 1.0 / f32::from(count) };
        let (counts, rest) = block.mean(share);
        let step_squared = math::two_to(2 * (i32::from(block.coarse) - FINE_BITS.cast_signed()));
        let one = BlockMean {
            counts,
            rest,
            age: block.span.saturating_sub(u32::try_from(block.ticks).unwrap_or(u32::MAX)),
            samples: count,
            share,
            scatter: 0.0,
            blur: 0.0,
            step_squared,
            span: block.span,
        };
        if count == 1 {
            return Some(one);
        }
        let age = block.span.saturating_sub((math::float_unsigned(block.ticks) * share) as u32);
        let unit = share * step_squared;
        // Each time that the sum of deviations was halved it may have lost a half, which counts twice the sum.
        let blur = if block.coarse == 0 { 0.0 } else { 4.0 * block.deviations.unsigned_abs() as f32 * unit };
        Some(BlockMean { age, scatter: block.scatter() * unit, blur, ..one })
    }

    /// The mean level: whole counts and the rest.
    fn mean(&self, share: f32) -> (i64, f32) {
        let counts = self.base_q16 >> 16;
        if self.count == 1 {
            let rest = (self.levels & ((1 << FINE_BITS) - 1)) as i32;
            return (counts.saturating_add(self.levels >> FINE_BITS), rest as f32 * FINE);
        }
        let per_sample = FINE * share;
        let rest = math::float(self.levels) * per_sample;
        if math::abs(rest) < 8.0 {
            return (counts, rest);
        }
        // Far from the base `f32` would round the mean, and the level that is learned from it: whole counts are taken
        // from the sum first.
        let whole = math::nearest(rest);
        let left = self.levels - (whole << FINE_BITS) * i64::from(self.count);
        (counts.saturating_add(whole), math::float(left) * per_sample)
    }

    /// Sum of the squared deviations from a straight line, times the number of samples.
    fn scatter(&self) -> f32 {
        // Exact: each product is below 2^62.
        let n = i64::from(self.count);
        let (deviations, instants) = (i64::from(self.deviations), i64::from(self.instants));
        let spread = n * self.instant_squares.cast_signed() - instants * instants;
        let product = math::float(n * self.products - deviations * instants);
        let about_mean = math::float(n * self.squares.cast_signed() - deviations * deviations);
        if spread > 0 { about_mean - product * product / math::float(spread) } else { about_mean }
    }
}

#[cfg(test)]
mod tests {
    extern crate std;
    use std::vec::Vec;

    use super::*;

    /// Levels in fine steps at instants in ticks, as a block from `base` makes of them, each deviation as it is.
    fn block(base: i64, samples: &[(u32, i32)]) -> BlockMean {
        let (mut block, mut last) = (Block::default(), 0);
        block.start(base);
        for &(instant, level) in samples {
            let level_q16 = (base << 16) + (i64::from(level) << 8);
            let above = block.above(level_q16);
            assert_eq!(above, level);
            block.push(above, above, instant - last, 1 << 31);
            last = instant;
        }
        block.take().unwrap()
    }

    /// Mean, mean age and sum of squares about the line, in `f64` from the definitions.
    fn exactly(samples: &[(u32, i32)]) -> (f64, f64, f64) {
        let n = samples.len() as f64;
        let points = || samples.iter().map(|&(t, y)| (f64::from(t), f64::from(y) / 256.0));
        let (t_mean, y_mean) = points().fold((0.0, 0.0), |(a, b), (t, y)| (a + t / n, b + y / n));
        let tt: f64 = points().map(|(t, _)| (t - t_mean) * (t - t_mean)).sum();
        let ty: f64 = points().map(|(t, y)| (t - t_mean) * (y - y_mean)).sum();
        let scatter = points().map(|(t, y)| y - y_mean - ty / tt * (t - t_mean)).map(|off| off * off).sum();
        (y_mean, f64::from(samples.last().unwrap().0) - t_mean, scatter)
    }

    /// Uneven instants and a level that steps about by `noise` on a drift, both fine steps.
    fn uneven(n: i32, pace: u32, drift: i32, noise: i32) -> Vec<(u32, i32)> {
        let jitter = |i: i32, k: i32| (i * i * 7 + i * k) % 11 - 5;
        let instant = |i: i32| i.cast_unsigned() * pace + (jitter(i, 3) + 5).cast_unsigned() * pace / 20;
        (1..=n).map(|i| (instant(i), i * drift + jitter(i, 5) * noise)).collect()
    }

    fn check(samples: &[(u32, i32)], tolerance: f64) {
        for base in [0, -1 << 40, 12_345_678_901] {
            let got = block(base, samples);
            let (mean, age, scatter) = exactly(samples);
            let level = (got.counts - base) as f64 + f64::from(got.rest);
            assert!((level - mean).abs() < 1e-3, "{level}, not {mean}");
            assert!((f64::from(got.age) - age).abs() <= 1.0 + 1e-6 * f64::from(got.span), "{}, not {age}", got.age);
            let off = (f64::from(got.scatter) - scatter).abs() - f64::from(got.blur);
            assert!(off < tolerance * scatter, "{}, not {scatter}, blur {}", got.scatter, got.blur);
        }
    }

    #[test]
    fn small_deviations_are_summed_without_loss() {
        for (n, pace) in [(4, 40), (16, 100), (100, 250)] {
            check(&uneven(n, pace, 20, 100), 1e-4);
        }
    }

    #[test]
    fn only_sums_that_were_coarsened_are_blurred() {
        let blur = |samples: &[(u32, i32)]| block(0, samples).blur;
        assert!(blur(&uneven(100, 1000, 20, 100)) <= 0.0 && blur(&uneven(1000, 84_000, 3, 300)) <= 0.0);
        // A steep drift, and one far sample.
        assert!(blur(&uneven(100, 1000, 51_200, 25_000)) > 1.0);
        let mut spiked = uneven(16, 100, 2, 100);
        spiked[15].1 = 1 << 24;
        let got = block(0, &spiked);
        assert!(got.blur > 0.0 && got.blur < 1e-3 * got.scatter, "{got:?}");
    }

    #[test]
    fn many_ticks_are_coarsened_and_the_scatter_stays() {
        check(&uneven(16, 100_000_000, 20, 100), 1e-3);
        check(&uneven(1000, 84_000, 3, 300), 1e-3);
    }

    #[test]
    fn far_levels_are_coarsened_and_the_mean_stays_exact() {
        // Up to 390 counts off with a noise of some counts, then up to 20,000 counts with 100.
        check(&uneven(100, 1000, 1000, 500), 0.02);
        check(&uneven(100, 1000, 51_200, 25_000), 0.02);
    }

    #[test]
    fn longest_and_farthest_block_overflows_nothing() {
        let mut block = Block::default();
        for i in 0..65_534_u32 {
            let level = if i % 2 == 0 { i64::MAX >> 1 } else { i64::MIN >> 1 };
            let above = block.above(level);
            assert_eq!(above.unsigned_abs(), 1 << 30);
            assert!(!block.push(above, if i % 3 == 0 { i32::MAX } else { i32::MIN }, 65_000, u32::MAX));
        }
        assert!(block.push(0, 0, 1, u32::MAX));
        assert!(block.take().unwrap().scatter > 0.0);
        assert!(block.take().is_none());
    }
}
