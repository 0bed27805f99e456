//! A constant that is learned through what the level and its rate have in common with it.

use super::trend::Innovation;

/// A constant beside the two states of a [`Trend`](super::Trend): it needs no time update but its covariances', and a
/// sample of the level moves it by its covariance with the level. (Fixed-point smoothing: Anderson & Moore 1979,
/// Optimal Filtering, section 7.2, from memory.)
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(crate) struct Constant {
    /// What the samples have added to its estimate.
    pub(crate) correction: f32,
    pub(crate) variance: f32,
    /// Covariance with the level and with the rate.
    pub(crate) with_level: f32,
    pub(crate) with_rate: f32,
}

impl Constant {
    /// Time passes.
    pub(crate) fn advance(&mut self, dt_s: f32) {
        self.with_level += dt_s * self.with_rate;
    }

    /// A sample of the level, as weighed by the trend. Gives the share of the residual that the constant takes.
    pub(crate) fn update(&mut self, innovation: &Innovation) -> f32 {
        let gain = self.with_level * innovation.precision;
        self.correction += gain * innovation.residual;
        let variance = self.variance - gain * self.with_level;
        // Rounding may take away more than there is: then nothing was learned.
        if variance > 0.0 {
            self.variance = variance;
        }
        self.with_rate -= innovation.rate_gain * self.with_level;
        self.with_level -= innovation.level_gain * self.with_level;
        gain
    }
}
