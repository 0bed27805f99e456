//! A capacitor with all that hangs on it: a leak and the dielectric's branches, as coupled differential equations.

use nalgebra::{SMatrix, SVector};

const BRANCHES: usize = 4;
/// Voltage of the capacitor, voltages of the branches, and the current over the capacitance, which a step holds
/// constant.
const STATES: usize = BRANCHES + 2;

/// The true parts, not what a data sheet says of them.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Parts {
    pub(crate) leak_s: Option<f64>,
    /// Capacitance over the main one, and time constant, s.
    pub(crate) branches: [(f64, f64); BRANCHES],
}

/// The network's voltages, V; stepped exactly, whatever the length of the step, by the matrix exponential.
#[derive(Clone, Debug)]
pub(crate) struct Network {
    step: SMatrix<f64, STATES, STATES>,
    /// The same with the capacitor held at a voltage.
    held: SMatrix<f64, STATES, STATES>,
    state: SVector<f64, STATES>,
}

impl Network {
    /// At rest at 0 V, to be stepped by `step_s` seconds.
    pub(crate) fn new(parts: &Parts, step_s: f64) -> Self {
        let mut rates = SMatrix::<f64, STATES, STATES>::zeros();
        let mut held_rates = rates;
        for (row, &(share, time_constant_s)) in (1..).zip(&parts.branches) {
            // The branch's resistor carries (v - u) / R, which comes off the main capacitor: k / tau of it in V/s.
            for rates in [&mut rates, &mut held_rates] {
                rates[(row, 0)] = 1.0 / time_constant_s;
                rates[(row, row)] = -1.0 / time_constant_s;
            }
            rates[(0, 0)] -= share / time_constant_s;
            rates[(0, row)] = share / time_constant_s;
        }
        rates[(0, 0)] -= parts.leak_s.map_or(0.0, f64::recip);
        rates[(0, STATES - 1)] = 1.0;
        Self { step: (rates * step_s).exp(), held: (held_rates * step_s).exp(), state: SVector::zeros() }
    }

    /// Voltage of the capacitor.
    pub(crate) fn volts(&self) -> f64 {
        self.state[0]
    }

    /// A step with a mean current over the capacitance, V/s.
    pub(crate) fn drive(&mut self, volts_per_s: f64) {
        self.state[STATES - 1] = volts_per_s;
        self.state = self.step * self.state;
    }

    /// A step with the capacitor shorted: only the branches move.
    pub(crate) fn short(&mut self) {
        self.state[0] = 0.0;
        self.state = self.held * self.state;
    }

    /// Charge put on the capacitor at once.
    pub(crate) fn kick(&mut self, volts: f64) {
        self.state[0] += volts;
    }
}
