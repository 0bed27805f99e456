//! Leak: what has gone through a resistance across the capacitor.

use crate::error::{SetupError, check};
use crate::math;

/// A time constant in integers, so that no sample pays for a division.
///
/// Areas are sums of `(level before + level after) ticks`, twice the integral of the level. A *page* of area is
/// 2^15 counts of leak.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub(crate) struct LeakLaw {
    /// `2^16 tau / tick`.
    page: i64,
    /// Shifts that bring a page to between 2^30 and 2^31, left or right.
    up: u8,
    down: u8,
    /// 2^61 over that.
    reciprocal: u32,
    /// One over the time constant, per tick.
    per_tick: f32,
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
        // `normal` has 31 bits; the compiler cannot know.
        let reciprocal = match (1_u64 << 61).checked_div(normal.cast_unsigned()) {
            Some(reciprocal) => reciprocal as u32,
            None => 0,
        };
        Ok(Self { page, up: up as u8, down: down as u8, reciprocal, per_tick: (1.0 / ticks) as f32 })
    }
}

/// A page in 2^-28 counts, as a power of two.
const PAGE_BENDS: u32 = 15 + 28;

/// The area under the level so far: exact, whatever the steps.
///
/// Between two samples the level bends by what leaks: with a steady input, a step of `a` time constants from `l0` to
/// `l1` has leaked `a (l0 + l1) / 2 + (a / (1 - e^-a) - 1 - a / 2) (l1 - l0)`, a trapezoid and a bend. What is left is
/// the input's own change: `h^2 / (12 tau)` times the change of the input's slope of the level, for samples `h` apart.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(super) struct Leak {
    area: i64,
    pages: i64,
    /// What the bends add, 2^-28 counts.
    bends: i64,
    /// The factor of the bend for steps of so many ticks, 2^-28: samples mostly come at one pace.
    pace: u32,
    bend: u32,
}

impl Leak {
    /// The level went from `from` to `to`, counts above the reset level, in `ticks`.
    pub(super) fn take(&mut self, from: i32, to: i32, ticks: u32, law: &LeakLaw) {
        if ticks != self.pace {
            self.pace = ticks;
            self.bend = (bend(ticks as f32 * law.per_tick) * 268_435_456.0) as u32;
        }
        let rise = i64::from(to) - i64::from(from);
        self.bends = self.bends.saturating_add(rise * i64::from(self.bend));
        let pages = self.bends >> PAGE_BENDS;
        if pages != 0 {
            self.pages = self.pages.saturating_add(pages);
            self.bends -= pages << PAGE_BENDS;
        }
        // At most 2^31 * 2^31 on top of a page, which is below 2^60.
        self.area += (i64::from(from) + i64::from(to)) * i64::from(ticks);
        if self.area.unsigned_abs() >= law.page.unsigned_abs() {
            // A page is never 0.
            self.pages = self.pages.saturating_add(self.area.checked_div(law.page).unwrap_or(0));
            self.area = self.area.checked_rem(law.page).unwrap_or(0);
        }
    }

    /// Forgets whole pages and gives them, counts.
    pub(super) fn rebase(&mut self) -> i64 {
        core::mem::take(&mut self.pages).saturating_mul(1 << 15)
    }

    /// What has leaked, 2^-16 counts: to 2^-14 count of the area.
    pub(super) fn q16(&self, law: &LeakLaw) -> i64 {
        let part = ((self.area << law.up) >> law.down) * i64::from(law.reciprocal);
        self.pages.saturating_mul(1 << 31).saturating_add(part >> 30).saturating_add(self.bends >> 12)
    }
}

/// `a / (1 - e^-a) - 1 - a / 2`: for a short step the series, where the formula is a difference of near equals.
fn bend(a: f32) -> f32 {
    let a = a.min(16.0);
    if a < 0.5 {
        let square = a * a;
        square * (1.0 / 12.0) * (1.0 - square * (1.0 / 60.0) * (1.0 - square * (1.0 / 42.0)))
    } else {
        a / -math::exp_minus_1(-a) - 1.0 - 0.5 * a
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

    /// A level that settles toward an input's, sampled coarsely and unevenly: all that came in is found.
    #[test]
    fn a_bent_level_loses_nothing() {
        for a in [1e-3, 0.03, 0.3, 0.6, 3.0] {
            let (law, mut leak) = (LeakLaw::new(1.0, 1e6).unwrap(), Leak::default());
            let (mut level, mut inflow, full) = (0.0_f64, 0.0_f64, 1e8);
            for step in 0..60 {
                let ticks = (a * 1e6 * f64::from(1 + step % 3)) as u32;
                let t = f64::from(ticks) * 1e-6;
                let next = full + (level - full) * libm::exp(-t);
                leak.take(level as i32, next as i32, ticks, &law);
                (level, inflow) = (next, inflow + full * t);
            }
            let found = level + leak.q16(&law) as f64 / 65536.0;
            assert!((found / inflow - 1.0).abs() < 1e-6, "{a}: {found}, not {inflow}");
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
        assert_eq!((fine.area, fine.pages), (coarse.area, coarse.pages));
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
