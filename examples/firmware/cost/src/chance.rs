//! Numbers that look random and are the same on every target.

/// Marsaglia's xorshift of 32 bits (2003, Journal of Statistical Software 8(14); shifts from memory).
#[derive(Clone, Debug)]
pub(crate) struct Chance(u32);

impl Chance {
    /// Seeds in a row give sequences that have nothing in common. The state is never 0, which would stay.
    pub(crate) fn new(seed: u32) -> Self {
        let mut chance = Self(seed.wrapping_mul(0x9e37_79b9).max(1));
        for _ in 0..8 {
            chance.bits();
        }
        chance
    }

    pub(crate) fn bits(&mut self) -> u32 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 17;
        self.0 ^= self.0 << 5;
        self.0
    }

    /// From 0 up to, not including, `end`.
    pub(crate) fn below(&mut self, end: u32) -> u32 {
        ((u64::from(self.bits()) * u64::from(end)) >> 32) as u32
    }

    /// Once in so many times.
    pub(crate) fn once_in(&mut self, times: u32) -> bool {
        self.below(times) == 0
    }

    /// Within `reach` of 0 either way.
    pub(crate) fn within(&mut self, reach: i64) -> i64 {
        let unit = i64::from(self.bits() as i32);
        ((i128::from(reach) * i128::from(unit)) >> 31) as i64
    }

    pub(crate) fn pick<T: Copy>(&mut self, from: &[T]) -> Option<T> {
        from.get(self.below(from.len() as u32) as usize).copied()
    }
}
