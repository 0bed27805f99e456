//! What moves the output without input: the drift of the zeros, the droop of the holds, and what both say of the
//! amplifier.

use super::Channel;
use crate::health::Health;
use crate::math;
use crate::quantity::{Current, Integral, Measured, Voltage, VoltageRate};
use crate::zeroing::{square_distance, squares};

impl<Q: Integral> Channel<'_, Q> {
    /// The drift of the output and its standard uncertainty, as of the latest zero.
    pub fn drift(&self) -> Measured<VoltageRate> {
        let lsb_v = self.setup.converter().lsb_v;
        let trend = &self.zeroing.trend;
        let shown = self.zeroing.shown(self.setup.derived());
        let figures = squares(self.zeroing.considered.rate());
        let variance = trend.rate_variance() * shown.rate_widening + shown.rounding.1 + figures;
        measured(trend.rate(), variance, lsb_v)
    }

    /// The droop of the output while the input is open, and its standard uncertainty, as of the latest hold; before
    /// any, what the data sheet allows.
    pub fn droop(&self) -> Measured<VoltageRate> {
        let lsb_v = self.setup.converter().lsb_v;
        let (rate, variance) = self.droop.rate(self.setup.derived());
        measured(rate, variance, lsb_v)
    }

    /// The amplifier's offset voltage and bias current, referred to the input and with its sign, told apart by zeros
    /// and holds: the drift of a zero is both, the droop of a hold is the bias alone. `None` before there was one of
    /// each.
    ///
    /// `bias = droop / (+-1/C)`, `offset = (drift - droop) R / (+-1/C)`, minus where the circuit inverts; `R` is the
    /// input resistance, or that of the source at a current input. What the open input switch leaks in a hold counts as
    /// bias.
    pub fn offset_and_bias(&self) -> Option<(Measured<Voltage>, Measured<Current>)> {
        if !self.droop.is_known() || self.zeroing.known_ticks() == 0 {
            return None;
        }
        let circuit = self.setup.circuit();
        let (drift, droop) = (self.drift(), self.droop());
        let volts_per_second = |rate: VoltageRate| rate.as_volts_per_second();
        let capacitance_f = circuit.capacitance_f;
        let signed = if circuit.inverting { -capacitance_f } else { capacitance_f };
        let resistance = circuit.offset_resistance_ohm();
        // A leak at the reset level droops as a bias would.
        let leaking_u = match circuit.leak_time_constant_s {
            Some(time_constant_s) => {
                let offset_var = circuit.offset_limit_v * circuit.offset_limit_v / 3.0;
                let zero_u = self.setup.converter().code_zero_u_v;
                math::sqrt_f64(offset_var + zero_u * zero_u) / time_constant_s
            }
            None => 0.0,
        };
        let (drift_u, droop_u) = (volts_per_second(drift.u), volts_per_second(droop.u));
        // Uncertain figures of leak and soakage move both alike, which their difference does not see.
        let (of_drift, of_droop) = (self.zeroing.considered.rate(), self.droop.doubts(self.setup.derived()));
        let lsb_v = self.setup.converter().lsb_v;
        let volts_squared = |square: f32| f64::from(square) * lsb_v * lsb_v;
        let without = |u: f64, figures| (u * u - volts_squared(squares(figures))).max(0.0);
        let figures = volts_squared(square_distance(of_drift, of_droop));
        let u = math::sqrt_f64(without(drift_u, of_drift) + without(droop_u, of_droop) + figures);
        let apart = volts_per_second(drift.value) - volts_per_second(droop.value);
        let gain_var = f64::from(self.setup.derived().gain_var_rel);
        let with_gain = |u: f64, value: f64| math::sqrt_f64(u * u + gain_var * value * value);
        let bias_u = math::sqrt_f64(droop_u * droop_u + leaking_u * leaking_u);
        Some((
            Measured::new(
                Voltage::from_volts(apart * resistance * signed),
                Voltage::from_volts(with_gain(u, apart) * resistance * capacitance_f),
            ),
            Measured::new(
                Current::from_amperes(volts_per_second(droop.value) * signed),
                Current::from_amperes(with_gain(bias_u, volts_per_second(droop.value)) * capacitance_f),
            ),
        ))
    }

    pub(super) fn drift_outside_limits(&self) -> bool {
        let (trend, derived) = (&self.zeroing.trend, self.setup.derived());
        let figures = squares(self.zeroing.considered.rate());
        Health::rate_outside(trend.rate(), trend.rate_variance() + figures, derived.rate_limit)
    }

    pub(super) fn droop_outside_limits(&self) -> bool {
        let derived = self.setup.derived();
        let (rate, variance) = self.droop.rate(derived);
        Health::rate_outside(rate, variance, derived.droop_limit)
    }
}

fn measured(rate: f32, variance: f32, lsb_v: f64) -> Measured<VoltageRate> {
    let volts = |counts: f32| VoltageRate::from_volts_per_second(f64::from(counts) * lsb_v);
    Measured::new(volts(rate), volts(math::sqrt(variance)))
}
