//! The analog side: capacitor, input, rails, data-sheet limits.

use super::temperature::TemperatureLaw;
use crate::error::{SetupError, check};

/// The integrator's circuit, in SI units.
///
/// Start from [`Circuit::DEFAULT`] and replace what differs:
/// `Circuit { capacitance_f: 470e-9, ..Circuit::DEFAULT }`.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Circuit {
    /// Integrating capacitance, F: above 0 and at most 1.
    pub capacitance_f: f64,
    /// Input resistance, ohm: above 0 and at most 1e15; `None` for a current input.
    pub input_resistance_ohm: Option<f64>,
    /// `true`: a positive input moves the output down (one op amp); `false`: up.
    pub inverting: bool,
    /// Output voltage while the reset switch is closed, V: within the rails.
    pub reset_level_v: f64,
    /// Lowest output voltage that is still linear, V.
    pub rail_low_v: f64,
    /// Highest output voltage that is still linear, V: above `rail_low_v`.
    pub rail_high_v: f64,
    /// Data-sheet limit of the offset voltage's magnitude, V: 0 to 1.
    pub offset_limit_v: f64,
    /// Data-sheet limit of the bias current's magnitude, A: 0 to 1.
    pub bias_limit_a: f64,
    /// Resistance of the source at a current input, ohm: the offset voltage drives current through it. Above 0.
    /// A voltage input uses its input resistance instead.
    pub source_resistance_ohm: f64,
    /// Step of the output when the reset switch opens (charge injection), V: within +-1.
    pub pedestal_v: f64,
    /// Standard uncertainty of the pedestal, V: 0 to 1. Five times it is allowed when a reset is verified.
    pub pedestal_u_v: f64,
    /// On-resistance of the reset switch, ohm: 0 to 1e6.
    pub switch_resistance_ohm: f64,
    /// How the drift follows the board's temperature. Only used where samples carry a temperature.
    pub temperature_law: TemperatureLaw,
    /// Relative standard uncertainty of the whole gain (capacitor, resistor, converter reference): 0 to 1.
    pub gain_u_rel: f64,
}

impl Circuit {
    /// A 100 nF inverting integrator with a current input between +-10 V rails, with an op amp of 1 mV and 100 pA
    /// limits behind a source of 1 Gohm, a switch of 100 ohm that injects nothing, and a gain taken as exact.
    pub const DEFAULT: Self = Self {
        capacitance_f: 100e-9,
        input_resistance_ohm: None,
        inverting: true,
        reset_level_v: 0.0,
        rail_low_v: -10.0,
        rail_high_v: 10.0,
        offset_limit_v: 1e-3,
        bias_limit_a: 100e-12,
        source_resistance_ohm: 1e9,
        pedestal_v: 0.0,
        pedestal_u_v: 0.0,
        switch_resistance_ohm: 100.0,
        temperature_law: TemperatureLaw::Unknown,
        gain_u_rel: 0.0,
    };

    /// Output slope per unit of input, V/s per A or per V: `-1/C` or `-1/(R C)`, positive if not inverting.
    pub const fn gain(&self) -> f64 {
        let magnitude = match self.input_resistance_ohm {
            None => 1.0 / self.capacitance_f,
            Some(r) => 1.0 / (r * self.capacitance_f),
        };
        if self.inverting { -magnitude } else { magnitude }
    }

    /// Largest drift that offset voltage and bias current within their limits can cause, V/s:
    /// `(offset / R + bias) / C`, with the input or source resistance for `R`.
    pub const fn drift_limit_v_per_s(&self) -> f64 {
        (self.offset_limit_v / self.offset_resistance_ohm() + self.bias_limit_a) / self.capacitance_f
    }

    /// Resistance through which the offset voltage drives a current.
    pub(super) const fn offset_resistance_ohm(&self) -> f64 {
        match self.input_resistance_ohm {
            None => self.source_resistance_ohm,
            Some(r) => r,
        }
    }

    pub(super) const fn validate(&self, voltage_input: bool) -> Result<(), SetupError> {
        check!(self.capacitance_f > 0.0 && self.capacitance_f <= 1.0, "capacitance_f", "above 0 and at most 1 (farad)");
        match self.input_resistance_ohm {
            Some(r) => {
                check!(
                    voltage_input,
                    "input_resistance_ohm",
                    "absent for a setup that measures charge (current input)"
                );
                check!(r > 0.0 && r <= 1e15, "input_resistance_ohm", "above 0 and at most 1e15 (ohm)");
            }
            None => {
                check!(!voltage_input, "input_resistance_ohm", "given for a setup that measures flux (voltage input)");
            }
        }
        check!(self.rail_low_v >= -1e3 && self.rail_low_v <= 1e3, "rail_low_v", "within -1000 and 1000 (volt)");
        check!(
            self.rail_high_v > self.rail_low_v && self.rail_high_v <= 1e3,
            "rail_high_v",
            "above rail_low_v and at most 1000 (volt)"
        );
        check!(
            self.reset_level_v >= self.rail_low_v && self.reset_level_v <= self.rail_high_v,
            "reset_level_v",
            "within rail_low_v and rail_high_v (volt)"
        );
        check!(self.offset_limit_v >= 0.0 && self.offset_limit_v <= 1.0, "offset_limit_v", "0 to 1 (volt)");
        check!(self.bias_limit_a >= 0.0 && self.bias_limit_a <= 1.0, "bias_limit_a", "0 to 1 (ampere)");
        check!(
            self.source_resistance_ohm > 0.0 && self.source_resistance_ohm <= 1e18,
            "source_resistance_ohm",
            "above 0 and at most 1e18 (ohm)"
        );
        check!(self.pedestal_v >= -1.0 && self.pedestal_v <= 1.0, "pedestal_v", "within -1 and 1 (volt)");
        check!(self.pedestal_u_v >= 0.0 && self.pedestal_u_v <= 1.0, "pedestal_u_v", "0 to 1 (volt)");
        check!(
            self.switch_resistance_ohm >= 0.0 && self.switch_resistance_ohm <= 1e6,
            "switch_resistance_ohm",
            "0 to 1e6 (ohm)"
        );
        if let Err(e) = self.temperature_law.validate() {
            return Err(e);
        }
        check!(self.gain_u_rel >= 0.0 && self.gain_u_rel <= 1.0, "gain_u_rel", "0 to 1");
        Ok(())
    }
}
