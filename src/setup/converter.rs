//! From output volts to codes, and the counter that stamps the samples.

use crate::error::{SetupError, check};

/// The converter and its time base.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Converter {
    /// Voltage at code 0, V: within +-1e6. Codes may be signed.
    pub code_zero_v: f64,
    /// Volts per code, V: above 0 and at most 1e3.
    pub lsb_v: f64,
    /// Lowest code; the converter gives it also for anything below. -2^30 to 2^30.
    pub code_min: i32,
    /// Highest code; the converter gives it also for anything above. Above `code_min`, at most 2^30.
    pub code_max: i32,
    /// Rate of the free-running 32-bit counter that stamps samples, Hz: 1 to 4e9.
    pub tick_hz: f64,
}

impl Converter {
    /// Output voltage at `code`, V.
    pub const fn volts(&self, code: i32) -> f64 {
        self.code_zero_v + code as f64 * self.lsb_v
    }

    /// The code of a voltage as a fractional number, not limited to the code range.
    pub const fn code(&self, volts: f64) -> f64 {
        (volts - self.code_zero_v) / self.lsb_v
    }

    pub(super) const fn validate(&self) -> Result<(), SetupError> {
        const SPAN: i32 = 1 << 30;
        check!(self.code_zero_v >= -1e6 && self.code_zero_v <= 1e6, "code_zero_v", "within -1e6 and 1e6 (volt)");
        check!(self.lsb_v > 0.0 && self.lsb_v <= 1e3, "lsb_v", "above 0 and at most 1000 (volt)");
        check!(self.code_min >= -SPAN && self.code_min <= SPAN, "code_min", "within -2^30 and 2^30");
        check!(self.code_max > self.code_min && self.code_max <= SPAN, "code_max", "above code_min and at most 2^30");
        check!(self.tick_hz >= 1.0 && self.tick_hz <= 4e9, "tick_hz", "1 to 4e9 (hertz)");
        Ok(())
    }
}
