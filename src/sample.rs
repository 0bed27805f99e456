//! What goes into a channel and what comes out of each step.

use crate::notices::Notices;
use crate::quantity::Temperature;

/// What the switches connect.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub enum Mode {
    /// The input is held at a known zero, with its source impedance in place.
    Zero,
    /// The input is connected.
    Integrate,
    /// The input is open.
    Hold,
    /// The switch across the capacitor is closed.
    Reset,
}

/// One reading of the converter.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Sample {
    /// Free-running counter when the sample was taken; wraps.
    pub tick: u32,
    /// Raw converter code.
    pub counts: i32,
    /// The mode that was in force since the sample before: the switches move right after a sample.
    pub mode: Mode,
    /// Board temperature, if it is measured: a reading tells how far the board has warmed since its zero.
    pub temperature: Option<Temperature>,
}

/// What a sample led to.
#[derive(Clone, Debug, Default)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Step {
    /// The mode that the channel asks for; `None`: no wish.
    pub request: Option<Mode>,
    /// What happened.
    pub notices: Notices,
}
