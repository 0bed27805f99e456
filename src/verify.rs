//! Whether each reset did what it should.

use crate::health::Health;
use crate::math;
use crate::setup::Derived;

/// How far a level may lie from where it is thought to be, standard deviations of a sample.
const NEAR: f32 = 6.0;
/// A level whose walk has had the chance to leave that band so many times over, and has not, is held. A Brownian path stays
/// within `+-a` for a time `t` with the probability `4/pi e^(-pi^2 q t / 8 a^2)`: 1e-8 for `q t = 15 a^2`, and here even if
/// the walk is a third of what the set-up says.
const WALKED_BANDS: f32 = 135.0;
/// Growth of the settling time constant over the set-up's `R_on C` that is worth a word, as a factor.
const SLOW: f32 = 2.0;

/// What a sample with the switch closed showed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Closed {
    Nothing,
    /// The level settles with so many per cent of the set-up's `R_on C`.
    Slow(u16),
    /// The level should have settled and is not where it should be.
    NotArrived,
}

/// The reset level as the samples with the switch closed showed it.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Settled {
    /// Linear level, 2^-16 counts.
    pub(crate) level_q16: i64,
    /// Its variance, counts^2.
    pub(crate) var: f32,
}

/// What should move a level off the reset level once the switch is open.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Mover {
    /// Drift and its variance.
    pub(crate) rate: f32,
    pub(crate) rate_var: f32,
    /// Variance of one sample.
    pub(crate) sample_var: f32,
    /// Whether an input that just cancels the drift has to be thought of.
    pub(crate) input: bool,
}

/// The present reset, the level after it, and how many in a row have failed.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Verification {
    /// Level when the switch closed, 2^-16 counts, and ticks since.
    from_q16: i64,
    ticks: u64,
    /// The first sample with the switch closed that the amplifier has had time for: level, and ticks after closing; until
    /// the next is compared with it.
    first: Option<(i64, u64)>,
    compared: bool,
    sum_q16: i64,
    samples: u16,
    failed: bool,
    /// The level to leave once the switch is open, and for how long it has not been left.
    leaving: Option<(Settled, u64)>,
    failures: u8,
    latched: bool,
}

impl Verification {
    /// The switch closes on a level, 2^-16 counts.
    pub(crate) fn close(&mut self, from_q16: i64) {
        let failures = if self.failed { self.failures } else { 0 };
        *self = Self { from_q16, failures, latched: self.latched, ..Self::default() };
    }

    /// A sample with the switch closed: linear level, 2^-16 counts, `ticks` after the one before.
    pub(crate) fn take_closed(&mut self, level_q16: i64, ticks: u32, derived: &Derived) -> Closed {
        self.ticks = self.ticks.saturating_add(u64::from(ticks));
        if self.ticks > u64::from(derived.settling_ticks) {
            self.sum_q16 = self.sum_q16.saturating_add(level_q16);
            self.samples = self.samples.saturating_add(1);
            if !self.failed && Health::outside((level_q16 + 0x8000) >> 16, derived.reset_window) {
                return Closed::NotArrived;
            }
        }
        match self.first.take() {
            Some((first_q16, ticks)) => self.speed(first_q16, ticks, level_q16, derived),
            None if !self.compared && self.ticks >= u64::from(derived.follow_ticks) => {
                self.compared = true;
                self.first = Some((level_q16, self.ticks));
                Closed::Nothing
            }
            None => Closed::Nothing,
        }
    }

    /// Two samples that differ by more than noise tell how fast the level settles: what was left at the first is at least
    /// what it has moved by since.
    fn speed(&self, first_q16: i64, ticks: u64, level_q16: i64, derived: &Derived) -> Closed {
        let counts = |q16: i64| math::abs(q16 as f32 * (1.0 / 65536.0));
        let (left, all) = (counts(first_q16 - level_q16), counts(self.from_q16 - level_q16));
        let noise = math::sqrt(2.0 * derived.readout_var);
        if left <= 2.0 * NEAR * noise || all <= left {
            return Closed::Nothing;
        }
        let tau_s = math::seconds(ticks, derived.tick_s) / math::ln(all / left);
        let growth = tau_s * derived.per_switch_tau;
        if growth > SLOW { Closed::Slow((100.0 * growth) as u16) } else { Closed::Nothing }
    }

    /// The switch opens. Gives the reset level if it was seen settled, and in its place.
    pub(crate) fn open(&mut self, derived: &Derived) -> Option<Settled> {
        let samples = i64::from(self.samples);
        let level_q16 = self.sum_q16.checked_div(samples).filter(|_| !self.failed)?;
        let settled = Settled { level_q16, var: derived.readout_var / f32::from(self.samples) };
        self.leaving = Some((settled, 0));
        Some(settled)
    }

    /// The level was found out of place, in this reset or just after it; `true` the first time.
    pub(crate) fn fail(&mut self, derived: &Derived) -> bool {
        let first = !core::mem::replace(&mut self.failed, true);
        if first {
            self.failures = self.failures.saturating_add(1);
            self.latched |= self.failures >= derived.reset_attempts;
        }
        self.leaving = None;
        first
    }

    /// Whether the level has yet to leave the reset level.
    pub(crate) fn is_watching(&self) -> bool {
        self.leaving.is_some()
    }

    /// A sample with the switch open: `true` if the level stays where the closed switch held it although drift, walk or
    /// pedestal should have moved it. Only a level that has left is free.
    pub(crate) fn is_held(&mut self, level_q16: i64, ticks: u32, mover: &Mover, derived: &Derived) -> bool {
        let Some((settled, passed)) = self.leaving.as_mut() else { return false };
        *passed = passed.saturating_add(u64::from(ticks));
        let t = math::seconds(*passed, derived.tick_s);
        let deviation = math::sqrt(mover.sample_var + settled.var);
        let off = math::abs(level_q16.saturating_sub(settled.level_q16) as f32 * (1.0 / 65536.0));
        if off > NEAR * deviation {
            self.leaving = None;
            return false;
        }
        let (pedestal, pedestal_var) = derived.pedestal.unwrap_or((0.0, 0.0));
        // A leak holds the level back: it moves as far in all of t as it would without one in at least t / (1 + t / tau).
        let t = t / (1.0 + t * derived.leak_per_s);
        let doubt = 4.0 * math::sqrt(pedestal_var + mover.rate_var * t * t);
        let moved = math::abs(pedestal + mover.rate * t) - doubt;
        let reach = if mover.input { 8.0 } else { 2.0 } * NEAR * deviation;
        let band = NEAR * deviation;
        moved > reach || 0.5 * derived.level_walk * t > WALKED_BANDS * band * band
    }

    /// How many resets in a row have failed.
    pub(crate) fn failures(&self) -> u8 {
        self.failures
    }

    /// Whether so many have failed that the switch is given up.
    pub(crate) fn is_latched(&self) -> bool {
        self.latched
    }

    /// Whether another reset should be tried.
    pub(crate) fn wants_retry(&self) -> bool {
        self.failed && !self.latched
    }

    /// The switch was seen to.
    pub(crate) fn release(&mut self) {
        *self = Self::default();
    }
}
