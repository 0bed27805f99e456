//! A simulated integrator with known truth, in volts: exact for a steady input, with leak, dielectric, drift, droop,
//! pedestal, rails and a bent converter. It shares no formula with the crate.

use std::fmt;

use brimline::Mode;

use crate::board::Parts;
use crate::draw::Dice;

/// What the figures of the set-up are in truth.
#[derive(Clone, Copy, Debug)]
pub struct Truth {
    /// Offset voltage and bias current as parts of their limits, -1 to 1.
    pub offset: f64,
    pub bias: f64,
    /// The pedestal as so many of its uncertainties off.
    pub pedestal: f64,
}

pub struct Plant {
    parts: Parts,
    truth: Truth,
    level_v: f64,
    /// Voltages of the dielectric's branches.
    branches: [f64; 4],
    /// Rates of the output without input, V/s: with the input connected or held at zero, and open.
    drift: f64,
    droop: f64,
    mode: Mode,
    /// The switch does not close although it should.
    pub stuck_open: bool,
    /// Whether the level has ever been past a rail or an end of the converter.
    pub saturated: bool,
    /// Input integral of the run up to its last integrating sample, and what has come in since.
    pub integral: f64,
    pub runs: u32,
    pending: f64,
    open: bool,
    running: bool,
}

impl Plant {
    pub fn new(parts: &Parts, truth: Truth) -> Self {
        let circuit = &parts.circuit;
        let ohm = circuit.input_resistance_ohm.unwrap_or(circuit.source_resistance_ohm);
        let bias_a = truth.bias * circuit.bias_limit_a;
        let offset_a = truth.offset * circuit.offset_limit_v / ohm;
        Self {
            parts: *parts,
            truth,
            level_v: circuit.reset_level_v,
            branches: [circuit.reset_level_v; 4],
            drift: (offset_a + bias_a) / circuit.capacitance_f,
            droop: bias_a / circuit.capacitance_f,
            mode: Mode::Reset,
            stuck_open: false,
            saturated: false,
            integral: 0.0,
            runs: 0,
            pending: 0.0,
            open: false,
            running: false,
        }
    }

    /// Lets `dt` seconds pass in `mode` with a steady input, which counts only where it is connected, and with the
    /// noise that the set-up states.
    pub fn pass(&mut self, mode: Mode, dt: f64, input: f64, dice: &mut Dice) {
        let circuit = self.parts.circuit;
        if self.mode == Mode::Reset && mode != Mode::Reset && !self.stuck_open {
            self.level_v += circuit.pedestal_v + circuit.pedestal_u_v.map_or(0.0, |u| u * self.truth.pedestal);
        }
        self.mode = mode;
        self.book(mode, dt * input);
        let connected = mode == Mode::Integrate || (mode == Mode::Reset && self.stuck_open && !self.open);
        let rate = circuit.gain() * if connected { input } else { 0.0 }
            + if mode == Mode::Hold { self.droop } else { self.drift };
        if mode == Mode::Reset && !self.stuck_open {
            self.settle(dt);
        } else {
            // Noise that has come in leaks as well.
            let pieces = if self.is_noisy() { (8.0 * dt / self.fastest()).ceil().clamp(1.0, 64.0) } else { 1.0 };
            for _ in 0..pieces as u32 {
                self.drive(dt / pieces, rate);
                self.level_v += self.walk(dt / pieces, dice);
            }
        }
        // A saturated amplifier stands beyond what is still linear.
        let (low, high) = (circuit.rail_low_v, circuit.rail_high_v);
        let beyond = 0.02 * (high - low);
        self.saturated |= self.level_v < low || self.level_v > high;
        self.level_v = self.level_v.clamp(low - beyond, high + beyond);
    }

    /// The run's books: from leaving zero or reset to its last integrating sample, dead time included, holds not.
    fn book(&mut self, mode: Mode, came: f64) {
        match mode {
            Mode::Zero => self.running = false,
            Mode::Integrate if self.running => {
                self.integral += self.pending + came;
                (self.pending, self.open) = (0.0, false);
            }
            Mode::Integrate => {
                (self.integral, self.pending, self.open, self.running) = (came, 0.0, false, true);
                self.runs += 1;
            }
            Mode::Hold => self.open = true,
            Mode::Reset if self.open => {}
            Mode::Reset => self.pending += came,
        }
    }

    fn is_noisy(&self) -> bool {
        self.parts.noise.input_density > 0.0 || self.parts.noise.offset_wander > 0.0
    }

    /// Shortest time constant of leak and dielectric.
    fn fastest(&self) -> f64 {
        let circuit = &self.parts.circuit;
        let branches = circuit.soakage.iter().filter(|branch| branch.share > 0.0).map(|branch| branch.time_constant_s);
        branches.fold(circuit.leak_time_constant_s.unwrap_or(f64::INFINITY), f64::min)
    }

    /// White noise at the input, integrated, of which half the one-sided density counts; and the offset's wander.
    fn walk(&mut self, dt: f64, dice: &mut Dice) -> f64 {
        let (gain, noise) = (self.parts.circuit.gain(), self.parts.noise);
        let mut step = |density: f64| if density > 0.0 { gain * density * dt.sqrt() * dice.normal() } else { 0.0 };
        self.drift += step(noise.offset_wander);
        step(noise.input_density * 0.5_f64.sqrt())
    }

    fn settle(&mut self, dt: f64) {
        let circuit = self.parts.circuit;
        let tau = circuit.switch_resistance_ohm * circuit.capacitance_f;
        let left = if tau > 0.0 { (-dt / tau).exp() } else { 0.0 };
        let target = circuit.reset_level_v;
        self.level_v = target + (self.level_v - target) * left;
        for (voltage, branch) in self.branches.iter_mut().zip(circuit.soakage) {
            *voltage = target + (*voltage - target) * (-dt / branch.time_constant_s).exp();
        }
    }

    fn drive(&mut self, dt: f64, rate: f64) {
        let circuit = self.parts.circuit;
        let soaks = circuit.soakage.iter().any(|branch| branch.share > 0.0);
        match (soaks, circuit.leak_time_constant_s) {
            (false, None) => self.level_v += rate * dt,
            (false, Some(tau)) => {
                let end = circuit.reset_level_v + rate * tau;
                self.level_v = end + (self.level_v - end) * (-dt / tau).exp();
            }
            (true, leak) => self.soak(dt, rate, leak),
        }
    }

    /// `dv = rate - (v - v0)/tau - sum share du`, `du = (v - u)/tau_i`: Runge-Kutta of fourth order, in steps of a
    /// twelfth of the fastest time constant.
    fn soak(&mut self, dt: f64, rate: f64, leak: Option<f64>) {
        let circuit = self.parts.circuit;
        let steps = (12.0 * dt / self.fastest()).ceil().clamp(1.0, 5000.0);
        let h = dt / steps;
        let slope = |state: [f64; 5]| {
            let [v, u @ ..] = state;
            let mut slopes = [0.0; 5];
            slopes[0] = rate - leak.map_or(0.0, |tau| (v - circuit.reset_level_v) / tau);
            for ((voltage, branch), index) in u.iter().zip(circuit.soakage).zip(1..) {
                if branch.share > 0.0 {
                    slopes[index] = (v - voltage) / branch.time_constant_s;
                    slopes[0] -= branch.share * slopes[index];
                }
            }
            slopes
        };
        let ahead = |state: [f64; 5], slopes: [f64; 5], h: f64| {
            let mut state = state;
            state.iter_mut().zip(slopes).for_each(|(x, slope)| *x += h * slope);
            state
        };
        let [a, b, c, d] = self.branches;
        let mut state = [self.level_v, a, b, c, d];
        for _ in 0..steps as u32 {
            let k1 = slope(state);
            let k2 = slope(ahead(state, k1, 0.5 * h));
            let k3 = slope(ahead(state, k2, 0.5 * h));
            let k4 = slope(ahead(state, k3, h));
            for (index, x) in state.iter_mut().enumerate() {
                *x += h / 6.0 * (k1[index] + 2.0 * k2[index] + 2.0 * k3[index] + k4[index]);
            }
        }
        [self.level_v, self.branches[0], self.branches[1], self.branches[2], self.branches[3]] = state;
    }

    /// What the converter gives.
    pub fn code(&mut self, dice: &mut Dice) -> i32 {
        let converter = &self.parts.converter;
        let noise = self.parts.noise.readout_counts * dice.normal();
        let code = (converter.code(self.level_v) + noise).round() as i32;
        self.saturated |= code <= converter.code_min || code >= converter.code_max;
        code.clamp(converter.code_min, converter.code_max)
    }
}

impl fmt::Debug for Plant {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{:.3} counts", self.parts.converter.code(self.level_v))
    }
}
