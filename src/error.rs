//! What a set-up can be refused for.

use core::fmt;

/// A value of a set-up that cannot be true, or that the crate cannot work with.
///
/// Small and `Copy`; it names the parameter and says what is allowed, so that the message can be shown as it is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
#[non_exhaustive]
pub struct SetupError {
    /// The field's name, for example `capacitance_f`.
    pub parameter: &'static str,
    /// What the field may hold, for example `above 0 and at most 1 (farad)`.
    pub allowed: &'static str,
}

impl SetupError {
    pub(crate) const fn new(parameter: &'static str, allowed: &'static str) -> Self {
        Self { parameter, allowed }
    }
}

/// Returns a [`SetupError`] from a `const fn` unless the condition holds; NaN fails every comparison.
macro_rules! check {
    ($condition:expr, $parameter:literal, $allowed:literal) => {
        let holds: bool = $condition;
        if !holds {
            return Err($crate::error::SetupError::new($parameter, $allowed));
        }
    };
}
pub(crate) use check;

impl fmt::Display for SetupError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{} must be {}", self.parameter, self.allowed)
    }
}

impl core::error::Error for SetupError {}
