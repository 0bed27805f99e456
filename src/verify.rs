//! Whether each reset did what it should.

use crate::health::Health;
use crate::level::Terms;
use crate::math;
use crate::setup::Derived;

/// How far a level may lie from where it is thought to be, standard deviations of a sample.
const NEAR: f32 = 6.0;
/// A level whose walk has had the chance to leave that band so many times over, and has not, is held. A Brownian path
/// stays within `+-a` for a time `t` with the probability `4/pi e^(-pi^2 q t / 8 a^2)`: 1e-8 for `q t = 15 a^2`, and
/// here even if the walk is a third of what the set-up says.
const WALKED_BANDS: f32 = 135.0;
/// Samples in which a steady input that has just cancelled a pedestal has moved the level on.
const STEADY_SAMPLES: u8 = 3;
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

/// A level that has yet to leave the reset level.
#[derive(Clone, Copy, Debug)]
struct Leaving {
    settled: Settled,
    /// What the dielectric held when the switch opened, 2^-16 counts.
    soaked_q16: i64,
    /// Ticks and samples since.
    ticks: u64,
    samples: u8,
}

/// What should move a level off the reset level once the switch is open.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Mover {
    /// Drift and its variance.
    pub(crate) rate: f32,
    pub(crate) rate_var: f32,
    /// Variance of one sample.
    pub(crate) sample_var: f32,
    /// What the dielectric holds, 2^-16 counts.
    pub(crate) soaked_q16: i64,
    /// Whether there may be an input that just cancels the drift: then drift tells nothing, and a pedestal only if no
    /// steady input could have hidden it.
    pub(crate) input: bool,
}

/// The present reset, the level after it, and how many in a row have failed.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Verification {
    /// Level when the switch closed, 2^-16 counts, and ticks since.
    from_q16: i64,
    ticks: u64,
    /// The first sample with the switch closed that the amplifier has had time for: level, and ticks after closing;
    /// until the next is compared with it.
    first: Option<(i64, u64)>,
    compared: bool,
    /// Of the samples that should have settled: the first, the sum of all above it, their number, and the latest.
    settled_q16: i64,
    sum_q16: i64,
    samples: u16,
    latest_q16: i64,
    failed: bool,
    leaving: Option<Leaving>,
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
            if self.samples == 0 {
                self.settled_q16 = level_q16;
            }
            self.latest_q16 = level_q16;
            // So many tell the level well enough: from there on sum and number stand.
            if let Some(samples) = self.samples.checked_add(1) {
                self.sum_q16 = self.sum_q16.saturating_add(level_q16 - self.settled_q16);
                self.samples = samples;
            }
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

    /// Two samples that differ by more than noise tell how fast the level settles: what was left at the first is at
    /// least what it has moved by since.
    fn speed(&self, first_q16: i64, ticks: u64, level_q16: i64, derived: &Derived) -> Closed {
        let counts = |q16: i64| math::abs(math::counts(q16));
        let (left, all) = (counts(first_q16 - level_q16), counts(self.from_q16 - level_q16));
        let noise = math::sqrt(2.0 * derived.readout_var);
        if left <= 2.0 * NEAR * noise || all <= left {
            return Closed::Nothing;
        }
        let settling_s = math::seconds(ticks, derived.tick_s) - all * derived.slewing_s;
        let tau_s = settling_s / math::ln(all / left);
        let growth = tau_s * derived.per_switch_tau;
        if growth > SLOW { Closed::Slow((100.0 * growth) as u16) } else { Closed::Nothing }
    }

    /// The switch opens. Gives the reset level if it was seen settled, and in its place.
    pub(crate) fn open(&mut self, terms: Terms, derived: &Derived) -> Option<Settled> {
        let samples = i64::from(self.samples);
        let above_q16 = self.sum_q16.checked_div(samples).filter(|_| !self.failed)?;
        // What still moves by more than noise has not settled, and what it moves by is not known better.
        let moved = math::abs(math::counts(self.latest_q16 - self.settled_q16));
        let unrest = (moved - 4.0 * math::sqrt(derived.readout_var)).max(0.0);
        let var = derived.readout_var / f32::from(self.samples) + unrest * unrest;
        let settled = Settled { level_q16: self.settled_q16.saturating_add(above_q16), var };
        self.leaving = Some(Leaving { settled, soaked_q16: terms.soaked_q16, ticks: 0, samples: 0 });
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

    /// A linear level with the switch open, 2^-16 counts, `step` ticks after the one before: `true` if the level stays
    /// where the closed switch held it although drift, walk or pedestal should have moved it. Only a level that has
    /// left is free.
    pub(crate) fn is_held(&mut self, linear_q16: i64, step: u32, mover: &Mover, derived: &Derived) -> bool {
        let Some(leaving) = self.leaving.as_mut() else { return false };
        leaving.ticks = leaving.ticks.saturating_add(u64::from(step));
        leaving.samples = leaving.samples.saturating_add(1);
        let Leaving { settled, soaked_q16, ticks, samples } = *leaving;
        let band = NEAR * math::sqrt(mover.sample_var + settled.var);
        if math::abs(math::counts(linear_q16.saturating_sub(settled.level_q16))) > band {
            self.leaving = None;
            return false;
        }
        // A leak holds the level back: by drift it moves as far in all of t as without one in at least t / (1 + t /
        // tau), by walk in t / (1 + 2 t / tau). What the dielectric gives back moves it too.
        let t = math::seconds(ticks, derived.tick_s);
        let drifting = t / (1.0 + t * derived.leak_per_s);
        let walking = t / (1.0 + 2.0 * t * derived.leak_per_s);
        let walked = derived.level_walk * walking > WALKED_BANDS * band * band;
        let (pedestal, pedestal_var) = derived.pedestal.unwrap_or((0.0, 0.0));
        if mover.input {
            let doubt = 4.0 * math::sqrt(pedestal_var);
            return walked || (samples >= STEADY_SAMPLES && math::abs(pedestal) - doubt > 8.0 * band);
        }
        let soaked = math::counts(mover.soaked_q16.saturating_sub(soaked_q16));
        let doubt = 4.0 * math::sqrt(pedestal_var + mover.rate_var * drifting * drifting);
        let moved = math::abs(pedestal + mover.rate * drifting - soaked) - doubt;
        walked || moved > 2.0 * band
    }

    /// How many resets in a row have failed.
    pub(crate) fn failures(&self) -> u8 {
        self.failures
    }

    /// Whether so many have failed that the switch is given up.
    pub(crate) fn is_latched(&self) -> bool {
        self.latched
    }

    /// Whether there is nothing to watch and nothing to ask for.
    pub(crate) fn is_idle(&self) -> bool {
        !self.is_watching() && !self.wants_retry()
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
