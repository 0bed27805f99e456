//! Zero samples averaged in blocks of whole mains periods, before the filter sees them.

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
    /// Sums of the samples' levels above the first in fine steps, of their instants since the block began (in ticks, and coarse), and of the
    /// squares and the product of levels and coarse instants.
    sum: i64,
    ticks: u64,
    coarse: i64,
    squares: i64,
    coarse_squares: i64,
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

    /// Takes a level in 2^-16 counts, `ticks` after the one before. `true` when the block is as close to `length` ticks as this spacing
    /// allows.
    ///
    /// Instants are squared in units of `length / 2^16`, levels in fine steps of `2^-fine_bits` counts, so that the sums fit.
    pub(crate) fn push(&mut self, level_q16: i64, ticks: u32, length: u32, fine_bits: u8) -> bool {
        if self.count == 0 {
            self.first_q16 = level_q16;
        }
        self.skip(ticks);
        let above = level_q16.saturating_sub(self.first_q16) >> (16 - fine_bits);
        let coarse = (self.span >> (16 - length.leading_zeros().min(16))).min(1 << 20).cast_signed();
        self.count = self.count.saturating_add(1);
        self.sum = self.sum.saturating_add(above);
        self.ticks = self.ticks.saturating_add(self.span);
        self.coarse = self.coarse.saturating_add(coarse);
        self.squares = self.squares.saturating_add(above.saturating_mul(above));
        self.coarse_squares = self.coarse_squares.saturating_add(coarse * coarse);
        self.products = self.products.saturating_add(above.saturating_mul(coarse));
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
        let mean = block.sum as f32 * share;
        let (counts, part) = (block.first_q16 >> 16, (block.first_q16 & 0xFFFF) as f32 * (1.0 / 65536.0));
        let instant = block.coarse as f32 * share;
        let age = block.span.saturating_sub((block.ticks as f32 * share) as u64);
        let spread = block.coarse_squares as f32 - block.coarse as f32 * instant;
        let product = block.products as f32 - block.sum as f32 * instant;
        let line = if spread > 0.0 { product * product / spread } else { 0.0 };
        let scatter = (block.squares as f32 - block.sum as f32 * mean - line) * fine * fine;
        Some(BlockMean { counts, rest: part + mean * fine, age, samples: block.count, scatter, span: block.span })
    }
}
