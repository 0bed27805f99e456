//! How the drift may depend on the board's temperature.

use crate::error::{SetupError, check};

/// What the drift follows when the board warms. The coefficient is learned from zeros at different temperatures; until
/// then it is what the data sheet allows.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum TemperatureLaw {
    /// Nothing that is known.
    Unknown,
    /// The offset voltage changes in proportion to the temperature.
    Offset {
        /// Data-sheet limit of the coefficient's magnitude, V/K: above 0 and at most 1.
        limit_v_per_k: f64,
    },
    /// The bias current is a junction's leakage: it doubles every so many kelvin, and at 25 degrees Celsius is within
    /// `bias_limit_a`.
    Junction {
        /// Kelvin for a doubling: 5 to 20; about 10 is usual.
        doubling_k: f64,
    },
}

impl TemperatureLaw {
    pub(super) const fn validate(&self) -> Result<(), SetupError> {
        match *self {
            Self::Unknown => {}
            Self::Offset { limit_v_per_k } => {
                check!(
                    limit_v_per_k > 0.0 && limit_v_per_k <= 1.0,
                    "offset_tempco_v_per_k",
                    "above 0 and at most 1 (volt per kelvin)"
                );
            }
            Self::Junction { doubling_k } => {
                check!(doubling_k >= 5.0 && doubling_k <= 20.0, "bias_doubling_k", "5 to 20 (kelvin)");
            }
        }
        Ok(())
    }
}
