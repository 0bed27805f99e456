//! From output volts to codes, and the counter that stamps the samples.

use super::linearity::Linearity;
use crate::error::{SetupError, check};

/// The converter and its time base. Start from [`Converter::DEFAULT`].
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Converter {
    /// Voltage at code 0, V: within +-1e6. Codes may be signed.
    pub code_zero_v: f64,
    /// Volts per code, V: above 0 and at most 1e3.
    pub lsb_v: f64,
    /// Lowest code; the converter gives it also for anything below. -2^29 to 2^29.
    pub code_min: i32,
    /// Highest code; the converter gives it also for anything above. Above `code_min`, at most 2^29.
    pub code_max: i32,
    /// Rate of the free-running 32-bit counter that stamps samples, Hz: 1 to 4e9.
    pub tick_hz: f64,
    /// Standard uncertainty of `code_zero_v`, V: 0 to 1e6. It moves all levels alike and leaves totals alone; five
    /// times it is allowed when a reset is verified.
    pub code_zero_u_v: f64,
    /// Relative standard uncertainty of `lsb_v`: 0 to 1.
    pub lsb_u_rel: f64,
    /// Integral non-linearity; `None`: no table.
    pub linearity: Option<&'static Linearity>,
    /// What non-linearity the table leaves, or all of it without one, rms counts: 0 to 1e4. It counts once for each
    /// level between which a run is measured: two, and two more for each reset or hold.
    pub linearity_u_counts: f64,
}

impl Converter {
    /// Sixteen bits over +-2.5 V, stamped at 1 MHz, straight and exact.
    pub const DEFAULT: Self = Self {
        code_zero_v: -2.5,
        lsb_v: 5.0 / 65536.0,
        code_min: 0,
        code_max: 65535,
        tick_hz: 1e6,
        code_zero_u_v: 0.0,
        lsb_u_rel: 0.0,
        linearity: None,
        linearity_u_counts: 0.0,
    };

    /// Output voltage at `code`, V.
    pub const fn volts(&self, code: i32) -> f64 {
        self.code_zero_v + code as f64 * self.lsb_v
    }

    /// The code of a voltage as a fractional number, not limited to the code range.
    pub const fn code(&self, volts: f64) -> f64 {
        (volts - self.code_zero_v) / self.lsb_v
    }

    pub(super) const fn validate(&self) -> Result<(), SetupError> {
        const SPAN: i32 = 1 << 29;
        check!(self.code_zero_v >= -1e6 && self.code_zero_v <= 1e6, "code_zero_v", "within -1e6 and 1e6 (volt)");
        check!(self.lsb_v > 0.0 && self.lsb_v <= 1e3, "lsb_v", "above 0 and at most 1000 (volt)");
        check!(self.code_min >= -SPAN && self.code_min <= SPAN, "code_min", "within -2^29 and 2^29");
        check!(self.code_max > self.code_min && self.code_max <= SPAN, "code_max", "above code_min and at most 2^29");
        check!(self.code_zero_u_v >= 0.0 && self.code_zero_u_v <= 1e6, "code_zero_u_v", "0 to 1e6 (volt)");
        check!(self.linearity_u_counts >= 0.0 && self.linearity_u_counts <= 1e4, "linearity_u_counts", "0 to 1e4");
        check!(self.lsb_u_rel >= 0.0 && self.lsb_u_rel <= 1.0, "lsb_u_rel", "0 to 1");
        check!(self.tick_hz >= 1.0 && self.tick_hz <= 4e9, "tick_hz", "1 to 4e9 (hertz)");
        Ok(())
    }
}
