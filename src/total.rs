//! A run's total, and whether two of them agree.

use crate::math;
use crate::zeroing::Shown;

/// A run's total and the parts of its variance, in counts.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Total {
    /// Movement of the level by the input, 2^-16 counts.
    pub(crate) movement_q16: i64,
    /// Variances, counts^2.
    pub(crate) readout: f32,
    pub(crate) input_noise: f32,
    pub(crate) drift: f32,
    pub(crate) dead_time: f32,
    pub(crate) leak_and_soakage: f32,
}

impl Total {
    pub(crate) fn variance(&self) -> f32 {
        self.readout + self.input_noise + self.drift + self.dead_time + self.leak_and_soakage
    }

    /// Whether a closed total differs from the one at stop by no more than 4 standard deviations: what the closing zero
    /// has added has the variance that it has taken away, but for the last sample, which only the one at stop rests on.
    /// `self` and `plain_var` are as if nothing had been widened; what was gained is, as the zeros have shown since.
    /// `considered` is the variance by which uncertain figures of leak and soakage part the two.
    pub(crate) fn agrees_with(&self, at_stop: &Self, plain_var: f32, considered: f32, shown: &Shown) -> bool {
        let difference = math::counts(self.movement_q16.saturating_sub(at_stop.movement_q16));
        let gained = (plain_var - self.variance()).max(0.0);
        difference * difference <= 16.0 * (gained * shown.rate_widening + 2.0 * shown.sample_var + considered)
    }
}
