//! Input that begins while there should be none.

/// Standard deviations in 2^-12: the fixed point of [`Cusum`].
pub(crate) const DEVIATION: i32 = 1 << 12;

/// Two-sided cumulative sums of normalised innovations (Page 1954, Biometrika 41; from memory), with a reference value
/// of half a standard deviation: the test for a shift of one. In integers: sums of floats cost a microcontroller
/// without a floating-point unit ten times as much.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Cusum {
    up: i32,
    down: i32,
}

impl Cusum {
    /// Takes an innovation in 2^-12 standard deviations; `true` when either sum has passed `threshold`.
    pub(crate) fn take(&mut self, innovation: i32, threshold: i32) -> bool {
        self.up = self.up.saturating_add(innovation).saturating_sub(DEVIATION / 2).max(0);
        self.down = self.down.saturating_sub(innovation).saturating_sub(DEVIATION / 2).max(0);
        self.up > threshold || self.down > threshold
    }

    /// Whether nothing at all has gathered.
    pub(crate) fn is_quiet(&self) -> bool {
        self.up == 0 && self.down == 0
    }
}

/// The threshold, in 2^-12 standard deviations, at which both sums together give a false alarm once in `innovations` on
/// the average: Siegmund's approximation `N = e^b - b - 1` with `b = threshold + 1.166` (Siegmund 1985, Sequential
/// Analysis; from memory).
pub(crate) const fn cusum_threshold(innovations: f64) -> i32 {
    /// e^(1/32).
    const STEP: f64 = 1.031_743_407_499_102_7;
    let (mut b, mut power) = (1.166, 3.209_134_390_577_966);
    while b < 64.0 && power - b - 1.0 < innovations {
        b += 1.0 / 32.0;
        power *= STEP;
    }
    ((b - 1.166) * DEVIATION as f64) as i32
}
