//! The analog side: capacitor, input, rails, data-sheet limits.

use super::soakage::{SOAKAGE_BRANCHES, SoakageBranch};
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
    /// Time constant of a leak across the capacitor, s: a feedback resistor times the capacitance, or the insulation's;
    /// `None`: no leak to speak of. 16 to 1.7e13 ticks of the counter. What leaks is put back, so that a run may last
    /// many time constants; a step from sample to sample of more than 16 is a gap, and of more than about one behind a
    /// converter of 24 bits and more. The limit: if the converter's offset has moved by `e` volts since the zero, the
    /// output seems to move by `e / tau` V/s more, which counts as input.
    pub leak_time_constant_s: Option<f64>,
    /// Relative standard uncertainty of `leak_time_constant_s`: 0 to 1.
    pub leak_u_rel: f64,
    /// The dielectric's branches; those that are not there are [`SoakageBranch::NONE`].
    pub soakage: [SoakageBranch; SOAKAGE_BRANCHES],
    /// Relative standard uncertainty of what the branches make of the level, shares and time constants together: 0 to
    /// 1.
    pub soakage_u_rel: f64,
    /// Step of the output when the reset switch opens (charge injection), V, positive upward: within +-1.
    pub pedestal_v: f64,
    /// Standard uncertainty of the pedestal, V: 0 to 1; `None`: not known. Where it is known, the level just after a
    /// reset is known from the closed switch as well as from the samples that follow; and five times it is allowed when
    /// a reset is verified.
    pub pedestal_u_v: Option<f64>,
    /// On-resistance of the reset switch, ohm: 0 to 1e6.
    pub switch_resistance_ohm: f64,
    /// Slew rate of the output while the switch is closed, V/s: above 0 and at most 1e12; `None`: fast enough.
    pub slew_v_per_s: Option<f64>,
    /// How the drift follows the board's temperature. Only used where samples carry a temperature.
    pub temperature_law: TemperatureLaw,
    /// Relative standard uncertainty of the gain (capacitor and input resistor): 0 to 1. The converter's is its own.
    pub gain_u_rel: f64,
}

impl Circuit {
    /// A 100 nF inverting integrator with a current input between +-10 V rails, with an op amp of 1 mV and 100 pA
    /// limits behind a source of 1 Gohm, a switch of 100 ohm of which no more is known, a capacitor that neither leaks
    /// nor soaks, and a gain taken as exact.
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
        leak_time_constant_s: None,
        leak_u_rel: 0.0,
        soakage: [SoakageBranch::NONE; SOAKAGE_BRANCHES],
        soakage_u_rel: 0.0,
        pedestal_v: 0.0,
        pedestal_u_v: None,
        switch_resistance_ohm: 100.0,
        slew_v_per_s: None,
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

    /// How long the reset switch has to stay closed until a level that was `swing_v` away is within `residual_v` of the
    /// reset level, s: `swing / slew + R_on C ln(swing / residual)`, at most 0.1 % too long; 0 if it is already,
    /// infinite for a residual of 0. The swing may have either sign.
    pub const fn settling_time_s(&self, swing_v: f64, residual_v: f64) -> f64 {
        let swing_v = if swing_v < 0.0 { -swing_v } else { swing_v };
        let reachable = residual_v > 0.0;
        if !reachable {
            return f64::INFINITY;
        }
        if swing_v <= residual_v {
            return 0.0;
        }
        let slewing = match self.slew_v_per_s {
            Some(slew) => swing_v / slew,
            None => 0.0,
        };
        slewing + self.switch_resistance_ohm * self.capacitance_f * ln_above(swing_v / residual_v)
    }

    /// Resistance through which the offset voltage drives a current.
    pub(crate) const fn offset_resistance_ohm(&self) -> f64 {
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
        if let Some(u) = self.pedestal_u_v {
            check!(u >= 0.0 && u <= 1.0, "pedestal_u_v", "0 to 1 (volt)");
        }
        check!(self.leak_u_rel >= 0.0 && self.leak_u_rel <= 1.0, "leak_u_rel", "0 to 1");
        check!(self.soakage_u_rel >= 0.0 && self.soakage_u_rel <= 1.0, "soakage_u_rel", "0 to 1");
        check!(
            self.switch_resistance_ohm >= 0.0 && self.switch_resistance_ohm <= 1e6,
            "switch_resistance_ohm",
            "0 to 1e6 (ohm)"
        );
        if let Some(slew) = self.slew_v_per_s {
            check!(slew > 0.0 && slew <= 1e12, "slew_v_per_s", "above 0 and at most 1e12 (volt per second)");
        }
        if let Err(e) = self.temperature_law.validate() {
            return Err(e);
        }
        check!(self.gain_u_rel >= 0.0 && self.gain_u_rel <= 1.0, "gain_u_rel", "0 to 1");
        Ok(())
    }
}

/// The logarithm of a number above 1, at most a thousandth too large.
const fn ln_above(x: f64) -> f64 {
    /// e^(1/1024).
    const STEP: f64 = 1.000_977_039_492_416_5;
    let (mut ln, mut power) = (0.0, 1.0);
    while power < x && ln < 800.0 {
        ln += 1.0 / 1024.0;
        power *= STEP;
    }
    ln
}
