//! Zero samples averaged in blocks of whole mains periods, before the filter sees them.

use crate::math;

/// One fine step, counts.
pub(crate) fn fine_step(fine_bits: u8) -> f32 {
    1.0 / (1_u32 << fine_bits.min(31)) as f32
}

/// A block being filled.
///
/// A mean over whole periods holds nothing of a hum. Integers only, until the block is full.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Block {
    /// The first sample, 2^-16 counts.
    first_q16: i64,
    count: u16,
    /// Ticks since the block began.
    span: u64,
    /// Sums over the samples: levels above the first in fine steps, instants since the block began in ticks and in
    /// coarse steps, squares and product of levels and coarse instants.
    levels: i64,
    ticks: u64,
    instants: u64,
    level_squares: u64,
    instant_squares: u64,
    products: i64,
}

/// What a block came to.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct BlockMean {
    /// The mean level: whole counts and the rest.
    pub(crate) counts: i64,
    pub(crate) rest: f32,
    /// Ticks from the mean instant of the samples to the latest of them.
    pub(crate) age: u64,
    pub(crate) samples: u16,
    /// Sum of the squared deviations from a straight line, counts^2.
    pub(crate) scatter: f32,
    /// Ticks that the block spans.
    pub(crate) span: u64,
}

impl Block {
    /// Time passes without a usable sample.
    pub(crate) fn skip(&mut self, ticks: u32) {
        self.span = self.span.saturating_add(u64::from(ticks));
    }

    /// Takes a level in 2^-16 counts, `ticks` after the one before. `true` when the block is as close to `length` ticks
    /// as this spacing allows.
    ///
    /// Instants are summed in coarse steps of at most `length / 2^14`, levels in fine steps of `2^-fine_bits` counts,
    /// so that products fit 64 bits and squares of instants 32.
    pub(crate) fn push(&mut self, level_q16: i64, ticks: u32, length: u32, fine_bits: u8) -> bool {
        if self.count == 0 {
            self.first_q16 = level_q16;
        }
        self.skip(ticks);
        let above = level_q16.saturating_sub(self.first_q16) >> (16 - fine_bits);
        let above = above.clamp(i64::from(i32::MIN), i64::from(i32::MAX)) as i32;
        let coarse = (self.span >> coarse_shift(length)).min(0xFFFF) as u32;
        self.count = self.count.saturating_add(1);
        // A block ends at 2^16 samples, so that only squares of levels far from noise can reach the end of their sum.
        self.levels += i64::from(above);
        self.ticks = self.ticks.saturating_add(self.span);
        self.instants += u64::from(coarse);
        let magnitude = u64::from(above.unsigned_abs());
        self.level_squares = self.level_squares.saturating_add(magnitude * magnitude);
        self.instant_squares += u64::from(coarse * coarse);
        self.products += i64::from(above) * i64::from(coarse);
        2 * self.span.min(u64::from(u32::MAX)) + u64::from(ticks) >= 2 * u64::from(length) || self.count == u16::MAX
    }

    /// Empties the block; `None` if no sample is in it.
    pub(crate) fn take(&mut self, fine_bits: u8) -> Option<BlockMean> {
        let block = core::mem::take(self);
        if block.count == 0 {
            return None;
        }
        let share = 1.0 / f32::from(block.count);
        let fine = fine_step(fine_bits);
        let mean = block.levels as f32 * share;
        let (counts, part) = math::whole_and_rest(block.first_q16);
        let instant = block.instants as f32 * share;
        let age = block.span.saturating_sub((block.ticks as f32 * share) as u64);
        let spread = block.instant_squares as f32 - block.instants as f32 * instant;
        let product = block.products as f32 - block.levels as f32 * instant;
        let line = if spread > 0.0 { product * product / spread } else { 0.0 };
        let scatter = (block.level_squares as f32 - block.levels as f32 * mean - line) * fine * fine;
        Some(BlockMean { counts, rest: part + mean * fine, age, samples: block.count, scatter, span: block.span })
    }
}

/// The coarse steps of a block, as a power of two of ticks.
fn coarse_shift(length: u32) -> u32 {
    18_u32.saturating_sub(length.leading_zeros())
}
