//! What the zeros show of the noise, beside what the set-up says.

use crate::estimate::{BlockMean, DEVIATION};
use crate::math;
use crate::setup::{Derived, QUANTISATION_VAR};

/// Degrees of freedom that the set-up's readout noise is worth against the blocks' scatter, and the most that these are
/// given, so that a change is followed.
const SETUP_FREEDOM: u16 = 16;
const MOST_FREEDOM: u16 = 4096;
/// Innovations in a sum; the sums that the set-up's figures are worth, and the most that the observed ones are given.
const SUMMED: u8 = 16;
const SETUP_SUMS: f32 = 8.0;
const MOST_SUMS: f32 = 64.0;
/// Zeros that the set-up's wander is worth against the observed one, the most that these are given, and the most that a
/// single zero may surprise, as a ratio of variances.
const SETUP_ZEROS: f32 = 4.0;
const MOST_ZEROS: f32 = 32.0;
const MOST_SURPRISE: f32 = 25.0;
/// Scatter of a block over that of the others, as a ratio of variances.
const TORN_RATIO: f32 = 9.0;
/// Innovations that the set-up's figures are worth against the observed ones, and the most that these are given.
const SETUP_INNOVATIONS: u16 = 16;
const MOST_INNOVATIONS: u16 = 512;

/// The noise as observed.
#[derive(Clone, Copy, Debug)]
pub(super) struct NoiseSeen {
    /// Variance of single samples as the blocks show it, and the degrees of freedom it rests on.
    sample_var: f32,
    freedom: u16,
    /// Mean square of the innovations over what was expected, and the number of them that it rests on.
    dispersion: f32,
    innovations: u16,
    /// The same for sums of so many innovations in a row; and the sum being made.
    slow_dispersion: f32,
    sums: f32,
    sum: i32,
    summed: u8,
    /// The same for the drift that each zero found over what the zeros before it said, and the number of zeros.
    rate_dispersion: f32,
    zeros: f32,
    /// Whether there was any block yet.
    seen: bool,
}

impl NoiseSeen {
    pub(super) fn new(derived: &Derived) -> Self {
        Self {
            sample_var: derived.readout_var,
            freedom: SETUP_FREEDOM,
            dispersion: 1.0,
            innovations: SETUP_INNOVATIONS,
            slow_dispersion: 1.0,
            sums: SETUP_SUMS,
            sum: 0,
            summed: 0,
            rate_dispersion: 1.0,
            zeros: SETUP_ZEROS,
            seen: false,
        }
    }

    /// Variance of a single sample, hum included, counts^2.
    pub(super) fn sample_var(&self) -> f32 {
        self.sample_var
    }

    /// The same, no less than what the set-up states.
    pub(super) fn sample_var_stated(&self, derived: &Derived) -> f32 {
        math::greater(self.sample_var, derived.readout_var)
    }

    /// Noise of single samples, stated and observed, in hundredths of a count rms, if the two are clearly different.
    pub(super) fn readout_centicounts(&self, derived: &Derived) -> Option<(u16, u16)> {
        let (stated, observed) = (derived.readout_var, self.sample_var);
        // 1.44 is 1.2 squared; with 250 degrees of freedom a variance is known to 9 per cent.
        let differs = observed > 1.44 * stated || 1.44 * observed < stated;
        let centicounts = |variance| (100.0 * math::sqrt(variance)) as u16;
        (self.freedom >= 250 && differs).then(|| (centicounts(stated), centicounts(observed)))
    }

    /// Whether a block has shown how single samples scatter.
    pub(super) fn has_scatter(&self) -> bool {
        self.freedom > SETUP_FREEDOM
    }

    /// Mean square of the innovations over the expected one, where it is more.
    pub(super) fn dispersion(&self) -> f32 {
        self.dispersion.max(1.0)
    }

    /// Factor on variances that rest on the zeros: the dispersion, if it is clearly not 1.
    pub(super) fn widening(&self) -> f32 {
        if self.percent().is_some() { self.dispersion() } else { 1.0 }
    }

    /// Factor on variances that rest on the drift: what the drifts of successive zeros differ by over what the walks of
    /// the set-up allow, or sums of innovations over what they should be. It only widens.
    pub(super) fn rate_widening(&self) -> f32 {
        let rate = if self.rate_percent().is_some() { self.rate_dispersion } else { 1.0 };
        let off = self.slow_dispersion - 1.0;
        let slow = if off > 0.0 && off * off * self.sums > 32.0 { self.slow_dispersion } else { 1.0 };
        rate.max(slow).max(self.widening())
    }

    /// Scatter of the zeros' drifts in per cent of the expected, if it is clearly more: the mean square is 5 of its
    /// standard deviations, `sqrt(2 / n)`, above 1.
    pub(super) fn rate_percent(&self) -> Option<u16> {
        let off = self.rate_dispersion - 1.0;
        let clear = off > 0.0 && off * off * self.zeros > 50.0;
        clear.then(|| (100.0 * math::sqrt(self.rate_dispersion)) as u16)
    }

    /// Whether there was enough of zeros for noise figures that are wrong by a factor of 3 to have shown: 64 blocks for
    /// the readout and the walk, 6 zeros that said something of the drift for the wander. Simulated; see
    /// `tests/adaptation.rs`.
    pub(super) fn is_tested(&self) -> bool {
        self.innovations >= SETUP_INNOVATIONS + 64 && self.zeros >= SETUP_ZEROS + 6.0
    }

    /// Takes how far the drift that a zero found lies off the one expected, squared, over the variance of that.
    pub(super) fn take_rate(&mut self, square: f32) {
        self.rate_dispersion += (square.min(MOST_SURPRISE) - self.rate_dispersion) / (self.zeros + 1.0);
        self.zeros = (self.zeros + 1.0).min(MOST_ZEROS);
    }

    /// Scatter of the innovations in per cent of the expected, if it is clearly another: the mean square is 4 of its
    /// standard deviations, `sqrt(2 / n)`, from 1.
    pub(super) fn percent(&self) -> Option<u16> {
        let off = self.dispersion - 1.0;
        let enough = self.innovations >= 2 * SETUP_INNOVATIONS;
        (enough && off * off * f32::from(self.innovations) > 32.0).then(|| (100.0 * math::sqrt(self.dispersion)) as u16)
    }

    /// Whether a block scatters so much more than expected that a spike must be in it: its mean is of no use. Before
    /// any block has shown the scatter this may be hum as well: then only the first is left out.
    pub(super) fn is_torn(&mut self, mean: &BlockMean) -> bool {
        let told = f32::from(mean.samples.saturating_sub(2));
        let expected = told * math::greater(self.sample_var, mean.step_squared);
        let scattered = mean.samples >= 4 && mean.scatter - mean.blur > TORN_RATIO * expected;
        let first = !core::mem::replace(&mut self.seen, true);
        scattered && (first || self.has_scatter())
    }

    /// Takes a block: what is left of it when a line and the walk are taken off is the noise of single samples.
    pub(super) fn take_block(&mut self, mean: &BlockMean, derived: &Derived) {
        // Steps as coarse as the noise do not show it: so steep a drift is known after a block or two.
        let told = mean.samples.saturating_sub(2);
        if told < 2 || mean.step_squared > self.sample_var * (1.0 / 16.0) {
            return;
        }
        if mean.blur > self.sample_var * f32::from(told) * (1.0 / 16.0) {
            return;
        }
        // About the line through n evenly spaced samples a walk leaves q h (n^2 - 4) / 15; the spacing h is span / n.
        let spacings = f32::from(mean.samples) - 4.0 * mean.share;
        let walked = derived.scatter_walk * mean.span as f32 * spacings;
        let freedom = self.freedom.saturating_add(told);
        let surprise = mean.scatter - walked - f32::from(told) * self.sample_var;
        let sample_var = self.sample_var + surprise / f32::from(freedom);
        self.sample_var = if sample_var > QUANTISATION_VAR { sample_var } else { QUANTISATION_VAR };
        self.freedom = freedom.min(MOST_FREEDOM);
    }

    /// One standard deviation of an innovation, the dispersion included, as a factor on its residual.
    pub(super) fn per_deviation(&self, precision: f32) -> f32 {
        let precision = if self.dispersion > 1.0 { precision / self.dispersion } else { precision };
        precision * math::about_inverse_sqrt(precision)
    }

    /// Takes an innovation in 2^-12 standard deviations, the dispersion included; a large one counts as 3, so that an
    /// onset is not taken for noise.
    pub(super) fn take_innovation(&mut self, deviation: i32) {
        let deviation = deviation.clamp(-3 * DEVIATION, 3 * DEVIATION);
        let square = (deviation * deviation) as f32 * (1.0 / (DEVIATION * DEVIATION) as f32);
        let square = if self.dispersion > 1.0 { square * self.dispersion } else { square };
        self.dispersion += (square - self.dispersion) / f32::from(self.innovations + 1);
        self.innovations = (self.innovations + 1).min(MOST_INNOVATIONS);
        // Walks that are understated show in sums of innovations, which should be as independent as single ones.
        self.sum += deviation;
        self.summed += 1;
        if self.summed >= SUMMED {
            let sum = self.sum as f32 * (1.0 / DEVIATION as f32);
            let square = sum * sum * (1.0 / SUMMED as f32);
            self.slow_dispersion += (square.min(MOST_SURPRISE) - self.slow_dispersion) / (self.sums + 1.0);
            self.sums = (self.sums + 1.0).min(MOST_SUMS);
            self.drop_sum();
        }
    }

    /// A sum must not reach over a break in the zero.
    pub(super) fn drop_sum(&mut self) {
        self.sum = 0;
        self.summed = 0;
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::{Charge, Circuit, Converter, Noise, Policy, Setup};

    #[test]
    fn deviations_rounded_as_coarsely_as_the_noise_tell_nothing_of_it() {
        let circuit = Circuit { capacitance_f: 470e-9, rail_low_v: -12.0, rail_high_v: 12.0, ..Circuit::DEFAULT };
        let converter = Converter { code_zero_v: -2.5, lsb_v: 5.0 / 65536.0, ..Converter::DEFAULT };
        let noise = Noise { readout_counts: 0.9, ..Noise::NONE };
        let setup: Setup<Charge> = Setup::new(circuit, converter, noise, Policy::DEFAULT);
        let stated = NoiseSeen::new(setup.derived());
        let after = |step_squared| {
            let block = BlockMean {
                counts: 0,
                rest: 0.0,
                age: 50,
                samples: 16,
                share: 1.0 / 16.0,
                scatter: 56.0,
                blur: 0.0,
                step_squared,
                span: 100,
            };
            let mut seen = stated;
            seen.take_block(&block, setup.derived());
            (seen.sample_var, seen.has_scatter())
        };
        assert_eq!(after(1.0), (stated.sample_var, false));
        let (sample_var, has_scatter) = after(1.0 / 65536.0);
        // 16 degrees of freedom of the set-up's, 14 with 4 counts^2 each.
        let expected = (16.0 * stated.sample_var + 56.0) / 30.0;
        assert!(has_scatter && (sample_var / expected - 1.0).abs() < 1e-3, "{sample_var}, not {expected}");
    }
}
