//! Numbers out of a fuzzer's bytes. Where the bytes end all draws are zero, so that every input is a whole case.

use arbitrary::Unstructured;

pub struct Draw<'a>(Unstructured<'a>);

impl<'a> Draw<'a> {
    pub fn new(bytes: &'a [u8]) -> Self {
        Self(Unstructured::new(bytes))
    }

    pub fn is_empty(&self) -> bool {
        self.0.is_empty()
    }

    pub fn byte(&mut self) -> u8 {
        self.0.arbitrary().unwrap_or(0)
    }

    pub fn word(&mut self) -> u16 {
        self.0.arbitrary().unwrap_or(0)
    }

    pub fn long(&mut self) -> u32 {
        self.0.arbitrary().unwrap_or(0)
    }

    pub fn bits(&mut self) -> u64 {
        self.0.arbitrary().unwrap_or(0)
    }

    /// True for `of_256` bytes of 256, and not where the bytes have ended.
    pub fn flag(&mut self, of_256: u16) -> bool {
        u16::from(self.byte()) + of_256 > 255
    }

    pub fn pick<T: Copy>(&mut self, from: &[T]) -> T {
        from[usize::from(self.byte()) % from.len()]
    }

    /// From 0 to 1.
    pub fn unit(&mut self) -> f64 {
        f64::from(self.word()) / 65535.0
    }

    pub fn linear(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.unit()
    }

    /// As often in each decade as in any other.
    pub fn decades(&mut self, low: f64, high: f64) -> f64 {
        low * (high / low).powf(self.unit())
    }

    /// Nothing for the bytes' end, otherwise as [`Self::decades`].
    pub fn maybe(&mut self, of_256: u16, low: f64, high: f64) -> Option<f64> {
        self.flag(of_256).then(|| self.decades(low, high))
    }

    /// 1 to `most`, small ones more often.
    pub fn count(&mut self, most: u32) -> u32 {
        let byte = u32::from(self.byte());
        1 + (most - 1) * byte * byte / 65025
    }

    /// Any number there is, and those at the edges of arithmetic more often.
    pub fn any_number(&mut self) -> f64 {
        const EDGES: [f64; 16] = [
            0.0,
            -0.0,
            1.0,
            -1.0,
            f64::NAN,
            f64::INFINITY,
            f64::NEG_INFINITY,
            f64::MAX,
            f64::MIN,
            f64::MIN_POSITIVE,
            5e-324,
            f64::EPSILON,
            1e-30,
            1e30,
            2_147_483_648.0,
            536_870_912.0,
        ];
        match self.byte() % 4 {
            0 => self.pick(&EDGES),
            1 => f64::from_bits(self.bits()),
            2 => self.decades(1e-20, 1e20),
            _ => -self.decades(1e-20, 1e20),
        }
    }
}

/// Noise that is the same in every run of a case.
pub struct Dice(u64);

impl Dice {
    pub fn new(seed: u64) -> Self {
        Self(seed ^ 0x9E37_79B9_7F4A_7C15)
    }

    /// From -1 to 1, evenly. Knuth's 64-bit linear congruential generator (constants from memory), upper bits.
    pub fn even(&mut self) -> f64 {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 11) as f64 / (1_u64 << 52) as f64 - 1.0
    }

    /// As good as normal, with a standard deviation of 1, and never beyond 3.5.
    pub fn normal(&mut self) -> f64 {
        (self.even() + self.even() + self.even() + self.even()) * (3.0_f64.sqrt() / 2.0)
    }
}
