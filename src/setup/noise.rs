//! How the readings scatter and how the drift wanders.

use crate::error::{SetupError, check};

/// The channel's noise figures; input units are A for a current input, V for a voltage input.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Noise {
    /// Noise of one sample before the converter rounds it, rms counts: 0 to 1e6. The variance of the rounding itself,
    /// 1/12 count^2 (IEEE Std 1241, ideal quantiser), is added by the crate.
    pub readout_counts: f64,
    /// White noise of the input, one-sided density, input units per sqrt(Hz): 0 or more. Integrated, it is a random
    /// walk whose variance after T seconds is `density^2 T / 2`.
    pub input_density: f64,
    /// Random walk of the input-referred offset, input units per sqrt(s): 0 or more. Integrated over T seconds it
    /// gives a variance of `wander^2 T^3 / 3`.
    pub offset_wander: f64,
    /// Flicker (1/f) noise of the input: one-sided density at 1 Hz, input units per sqrt(Hz), 0 or more. Its square
    /// over the frequency is the density. It makes the error of a run grow with its length, whatever the zero.
    pub input_flicker: f64,
}

impl Noise {
    /// No noise but the converter's rounding. Start from this: `Noise { readout_counts: 0.9, ..Noise::NONE }`.
    pub const NONE: Self = Self { readout_counts: 0.0, input_density: 0.0, offset_wander: 0.0, input_flicker: 0.0 };

    pub(super) const fn validate(&self) -> Result<(), SetupError> {
        check!(self.readout_counts >= 0.0 && self.readout_counts <= 1e6, "readout_counts", "0 to 1e6 (rms counts)");
        check!(
            self.input_density >= 0.0 && self.input_density <= 1.0,
            "input_density",
            "0 to 1 (input units per square root of hertz)"
        );
        check!(
            self.offset_wander >= 0.0 && self.offset_wander <= 1.0,
            "offset_wander",
            "0 to 1 (input units per square root of second)"
        );
        check!(
            self.input_flicker >= 0.0 && self.input_flicker <= 1.0,
            "input_flicker",
            "0 to 1 (input units per square root of hertz at 1 Hz)"
        );
        Ok(())
    }
}
