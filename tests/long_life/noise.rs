//! Noise and wander for billions of samples: a few integer operations each, the same in every run.

/// A generator of 64 even bits: a counter, mixed (Steele, Lea and Flood 2014, "Fast splittable pseudorandom number
/// generators", from memory).
#[derive(Clone, Copy, Debug)]
pub(crate) struct Bits(u64);

/// Variance of [`Bits::noise_q32`], counts^2: four even numbers, each 2 counts wide.
pub(crate) const NOISE_VAR: f64 = 4.0 * 4.0 / 12.0;

impl Bits {
    pub(crate) fn seeded(seed: u64) -> Self {
        Self(seed.wrapping_mul(0x9E37_79B9_7F4A_7C15))
    }

    pub(crate) fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    }

    /// Nearly normal, within 4 counts, 2^-32 counts.
    pub(crate) fn noise_q32(&mut self) -> i64 {
        let bits = self.next();
        let sum = (bits & 0xFFFF) + (bits >> 16 & 0xFFFF) + (bits >> 32 & 0xFFFF) + (bits >> 48);
        (sum.cast_signed() - 2 * 0xFFFF) << 17
    }

    /// `size` with either sign.
    pub(crate) fn either(&mut self, size: i64) -> i64 {
        if self.next() >> 63 == 0 { size } else { -size }
    }

    /// 0 to `below - 1`.
    pub(crate) fn below(&mut self, below: u64) -> i64 {
        (self.next() % below).cast_signed()
    }
}

/// Nearest whole count.
pub(crate) fn code(level_q32: i64) -> i32 {
    ((level_q32 + (1 << 31)) >> 32) as i32
}
