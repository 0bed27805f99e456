//! What the zeros have shown of the noise.

use super::Zeroing;
use crate::setup::{Derived, QUANTISATION_VAR};

/// What the zeros have shown of the noise, as far as it goes into a run's variance.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Shown {
    /// Variance of a single sample, counts^2.
    pub(crate) sample_var: f32,
    /// Factors on variances that rest on the zeros' level and on their drift; at least 1.
    pub(crate) widening: f32,
    pub(crate) rate_widening: f32,
    /// Added to the variance of a level and of the drift for rounding that no noise dithers, counts^2 and (counts/s)^2.
    pub(crate) rounding: (f32, f32),
}

impl Shown {
    /// The same as if the zeros had borne out the set-up.
    pub(crate) fn not_widened(self) -> Self {
        Self { widening: 1.0, rate_widening: 1.0, ..self }
    }
}

impl Zeroing {
    /// What the zeros have shown of the noise.
    pub(crate) fn shown(&self, derived: &Derived) -> Shown {
        let level = if derived.dithered { 0.0 } else { QUANTISATION_VAR };
        let rate = derived.rate_rounding_var(self.known_ticks());
        Shown {
            sample_var: self.noise.sample_var(),
            widening: self.noise.widening(),
            rate_widening: self.noise.rate_widening(),
            rounding: (level, rate),
        }
    }

    /// Whether the zeros were enough to show noise figures that are wrong.
    pub(crate) fn noise_is_tested(&self) -> bool {
        self.noise.is_tested()
    }

    /// Noise of single samples, stated and observed, in hundredths of a count rms, if the two are clearly different.
    pub(crate) fn readout_centicounts(&self, derived: &Derived) -> Option<(u16, u16)> {
        self.noise.readout_centicounts(derived)
    }

    /// Scatter of the innovations in per cent of the expected, if it is clearly another.
    pub(crate) fn noise_percent(&self) -> Option<u16> {
        self.noise.percent()
    }

    /// Scatter of the zeros' drifts in per cent of the expected, if it is clearly more.
    pub(crate) fn drift_percent(&self) -> Option<u16> {
        self.noise.rate_percent()
    }

    /// Variance of single samples, as the zeros have shown it, counts^2.
    pub(crate) fn sample_var(&self) -> f32 {
        self.noise.sample_var()
    }
}
