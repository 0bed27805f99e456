//! Leak: what has gone through a resistance across the capacitor.

use crate::error::{SetupError, check};

/// A time constant in integers, so that no sample pays for a division.
///
/// Areas are sums of `(level before + level after) ticks`, twice the integral of the level. A *page* of area is
/// 2^15 counts of leak.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub(crate) struct LeakLaw {
    /// `2^16 tau / tick`.
    page: i64,
    /// Shifts that bring a page to between 2^30 and 2^31, left or right.
    up: u8,
    down: u8,
    /// 2^61 over that.
    reciprocal: u32,
}

impl LeakLaw {
    pub(crate) const fn new(time_constant_s: f64, tick_hz: f64) -> Result<Self, SetupError> {
        let ticks = time_constant_s * tick_hz;
        check!(
            time_constant_s > 0.0 && ticks >= 16.0 && ticks <= 1.7e13,
            "leak_time_constant_s",
            "above 0 (second), and 16 to 1.7e13 ticks of the counter"
        );
        let page = (ticks * 65536.0) as i64;
        let bits = 64 - page.leading_zeros();
        let (up, down) = if bits < 31 { (31 - bits, 0) } else { (0, bits - 31) };
        let normal = (page << up) >> down;
        let reciprocal = ((1_u64 << 61) / normal.cast_unsigned()) as u32;
        Ok(Self { page, up: up as u8, down: down as u8, reciprocal })
    }
}

/// The area under the level so far: exact, whatever the steps.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(super) struct Leak {
    area: i64,
    pages: i64,
}

impl Leak {
    /// The level went from `from` to `to`, counts above the reset level, in `ticks`: a trapezoid.
    pub(super) fn take(&mut self, from: i32, to: i32, ticks: u32, law: &LeakLaw) {
        // At most 2^31 * 2^31 on top of a page, which is below 2^60.
        self.area += (i64::from(from) + i64::from(to)) * i64::from(ticks);
        if self.area.unsigned_abs() >= law.page.unsigned_abs() {
            // A page is never 0.
            self.pages = self.pages.saturating_add(self.area.checked_div(law.page).unwrap_or(0));
            self.area = self.area.checked_rem(law.page).unwrap_or(0);
        }
    }

    /// What has leaked, 2^-16 counts: to 2^-14 count of the area.
    pub(super) fn q16(&self, law: &LeakLaw) -> i64 {
        let part = ((self.area << law.up) >> law.down) * i64::from(law.reciprocal);
        self.pages.saturating_mul(1 << 31).saturating_add(part >> 30)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_level_that_stands_leaks_its_own_height_in_every_time_constant() {
        for (time_constant_s, tick_hz, ticks) in [(1.0, 1e6, 4_000_u32), (0.1, 32_768.0, 7), (1e5, 84e6, 840_000)] {
            let law = LeakLaw::new(time_constant_s, tick_hz).unwrap();
            for height in [1, -30_000, 1 << 28] {
                let mut leak = Leak::default();
                let steps = 1000;
                for _ in 0..steps {
                    leak.take(height, height, ticks, &law);
                }
                let taus = f64::from(ticks) * f64::from(steps) / (time_constant_s * tick_hz);
                let expected = f64::from(height) * taus;
                let got = leak.q16(&law) as f64 / 65536.0;
                let allowed = 1.0 / 16384.0 + expected.abs() * 1e-8;
                assert!((got - expected).abs() < allowed, "{height} for {taus} tau: {got}, not {expected}");
            }
        }
    }

    #[test]
    fn unequal_steps_add_up_to_the_whole() {
        let law = LeakLaw::new(1.0, 1e6).unwrap();
        let (mut fine, mut coarse) = (Leak::default(), Leak::default());
        // A ramp of 3 counts per tick: a trapezoid is exact on it.
        let mut tick = 0;
        for step in [1, 999, 17, 4_000, 2_983, 12_000] {
            fine.take(3 * tick, 3 * (tick + step), step.cast_unsigned(), &law);
            tick += step;
        }
        coarse.take(0, 3 * tick, tick.cast_unsigned(), &law);
        assert_eq!(fine, coarse);
    }

    #[test]
    fn the_longest_and_highest_step_overflows_nothing() {
        let law = LeakLaw::new(1.7e7, 1e6).unwrap();
        let mut leak = Leak::default();
        for _ in 0..1000 {
            leak.take(1 << 30, 1 << 30, 0x7FFF_FFFF, &law);
        }
        let expected = f64::from(1 << 30) * 1000.0 * f64::from(0x7FFF_FFFF) / 1.7e13;
        assert!((leak.q16(&law) as f64 / 65536.0 / expected - 1.0).abs() < 1e-8);
    }
}
