//! A simulated channel whose capacitor leaks and soaks, whose holds droop by the bias current alone and whose reset
//! switch injects charge: any sequence of modes, with known truth. Like [`Plant`](super::Plant) it shares no formula
//! with the crate.

use brimline::{Mode, Sample};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;

use super::Input;
use super::network::{Network, Parts};
use crate::common::board::Board;

/// Steps of the network to a sample: noise and input are constant within one.
const STEPS: u32 = 4;

/// How the true circuit differs from what the board's set-up says, and how samples are lost.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Flaws {
    /// Of the conductance of the leak, relative.
    pub(crate) leak: f64,
    /// Of all shares of the dielectric, and of its time constants, relative.
    pub(crate) shares: f64,
    pub(crate) time_constants: f64,
    /// Of the pedestal, V: the same at every reset, and the rms of what is new at each.
    pub(crate) pedestal_v: f64,
    pub(crate) pedestal_scatter_v: f64,
    /// Error of the converter's zero, V.
    pub(crate) converter_v: f64,
    /// Probability that a sample is lost; the last of a mode never is.
    pub(crate) lost: f64,
}

/// A mode and how long it is kept, s.
pub(crate) type Stay = (Mode, f64);

/// A finished trace with its truth. All drifts are those of the effective level, V/s.
#[derive(Clone, Debug)]
pub(crate) struct Play {
    pub(crate) samples: Vec<Sample>,
    /// Index of the last sample of the zero before the run, and of the run.
    pub(crate) opening_end: usize,
    pub(crate) run_end: usize,
    /// True integral of the input over the run, dead time included, C.
    pub(crate) integral: f64,
    pub(crate) drift_opening: f64,
    pub(crate) drift_closing: f64,
    /// In the holds.
    pub(crate) droop: f64,
    /// At the end.
    pub(crate) offset_v: f64,
    pub(crate) bias_a: f64,
}

pub(crate) struct Bench {
    board: Board,
    input: Input,
    flaws: Flaws,
    rng: ChaCha8Rng,
    network: Network,
    step_s: f64,
    sample_ticks: u32,
    /// Output volts per coulomb.
    gain: f64,
    /// The amplifier's, and what the offset has wandered by, as the current that it drives through the source.
    offset_v: f64,
    bias_a: f64,
    wandered_a: f64,
    mode: Mode,
    steps: u64,
    tick: u32,
    samples: Vec<Sample>,
    /// Whether the run has begun, and whether a hold has opened the input since it was last connected.
    running: bool,
    opened: bool,
    integral: f64,
}

impl Bench {
    /// A current input; `hz` divides the counter's rate.
    pub(crate) fn new(board: &Board, input: Input, hz: f64, flaws: &Flaws, seed: u64) -> Self {
        let mut rng = ChaCha8Rng::seed_from_u64(seed);
        let circuit = &board.circuit;
        let step_s = 1.0 / (hz * f64::from(STEPS));
        let branches = circuit
            .soakage
            .map(|branch| (branch.share * (1.0 + flaws.shares), branch.time_constant_s * (1.0 + flaws.time_constants)));
        let parts = Parts { leak_s: circuit.leak_time_constant_s.map(|tau| tau / (1.0 + flaws.leak)), branches };
        let scale = 1.0 + circuit.gain_u_rel * rng.sample::<f64, _>(StandardNormal);
        Self {
            board: *board,
            input,
            flaws: *flaws,
            network: Network::new(&parts, step_s),
            step_s,
            sample_ticks: (board.converter.tick_hz / hz).round() as u32,
            gain: board.sign() * scale / circuit.capacitance_f,
            offset_v: circuit.offset_limit_v * rng.random_range(-1.0..=1.0),
            bias_a: circuit.bias_limit_a * rng.random_range(-1.0..=1.0),
            wandered_a: 0.0,
            mode: Mode::Reset,
            steps: 0,
            tick: rng.random(),
            rng,
            samples: Vec::new(),
            running: false,
            opened: false,
            integral: 0.0,
        }
    }

    /// The whole script; in it one run, from the first `Integrate` to the last.
    pub(crate) fn play(mut self, script: &[Stay]) -> Play {
        let (mut opening_end, mut run_end) = (0, 0);
        let (mut drift_opening, mut integral) = (0.0, 0.0);
        for &(mode, seconds) in script {
            if mode == Mode::Integrate && !self.running {
                self.running = true;
                (opening_end, drift_opening) = (self.samples.len().saturating_sub(1), self.drift());
            }
            let periods = (seconds / self.step_s / f64::from(STEPS)).round() as u32;
            for left in (0..periods).rev() {
                self.period(mode);
                if left == 0 || self.flaws.lost == 0.0 || !self.rng.random_bool(self.flaws.lost) {
                    self.take(mode);
                }
            }
            if mode == Mode::Integrate {
                (run_end, integral) = (self.samples.len() - 1, self.integral);
            }
        }
        Play {
            opening_end,
            run_end,
            integral,
            drift_opening,
            drift_closing: self.drift(),
            droop: self.gain * self.bias_a + self.leaking_offset(),
            offset_v: self.offset_v + self.wandered_a * self.board.circuit.source_resistance_ohm,
            bias_a: self.bias_a,
            samples: self.samples,
        }
    }

    /// With the switch closed the output shows the amplifier's offset, and the converter's zero on top of it.
    fn zero_v(&self) -> f64 {
        self.offset_v + self.flaws.converter_v
    }

    /// Nothing leaks where the output shows that; by the set-up, it does.
    fn leaking_offset(&self) -> f64 {
        self.board.circuit.leak_time_constant_s.map_or(0.0, |tau| self.zero_v() / tau)
    }

    fn drift(&self) -> f64 {
        self.gain * (self.through_source() + self.bias_a) + self.leaking_offset()
    }

    /// The offset's current while the input is connected.
    fn through_source(&self) -> f64 {
        self.offset_v / self.board.circuit.source_resistance_ohm + self.wandered_a
    }

    fn period(&mut self, mode: Mode) {
        if self.mode == Mode::Reset && mode != Mode::Reset {
            let scatter = self.flaws.pedestal_scatter_v;
            let pedestal_v = self.board.circuit.pedestal_v + self.flaws.pedestal_v;
            let new = if scatter > 0.0 { scatter * self.normal() } else { 0.0 };
            self.network.kick(pedestal_v + new);
        }
        self.opened = match mode {
            Mode::Integrate => false,
            Mode::Hold => true,
            _ => self.opened,
        };
        for _ in 0..STEPS {
            self.step(mode);
        }
        self.mode = mode;
        self.tick = self.tick.wrapping_add(self.sample_ticks);
    }

    fn step(&mut self, mode: Mode) {
        let from_s = self.steps as f64 * self.step_s;
        self.steps += 1;
        let noise = self.board.noise;
        let before_a = self.through_source();
        if noise.offset_wander > 0.0 {
            self.wandered_a += noise.offset_wander * self.step_s.sqrt() * self.normal();
        }
        let charge = self.input.integral(from_s, from_s + self.step_s);
        let counts = mode == Mode::Integrate || (mode == Mode::Reset && !self.opened);
        if self.running && counts {
            self.integral += charge;
        }
        if mode == Mode::Reset {
            return self.network.short();
        }
        let white = if noise.input_density > 0.0 {
            noise.input_density / (2.0 * self.step_s).sqrt() * self.normal()
        } else {
            0.0
        };
        // With the input open none flows.
        let offset_a = if mode == Mode::Hold { 0.0 } else { 0.5 * (before_a + self.through_source()) };
        let signal = if mode == Mode::Integrate { charge / self.step_s } else { 0.0 };
        self.network.drive(self.gain * (signal + offset_a + self.bias_a + white));
    }

    fn take(&mut self, mode: Mode) {
        let converter = self.board.converter;
        let volts = self.board.circuit.reset_level_v + self.zero_v() + self.network.volts();
        let readout = self.board.noise.readout_counts * self.normal();
        let noisy = (volts - converter.code_zero_v) / converter.lsb_v + readout;
        let counts = (noisy.round() as i32).clamp(converter.code_min, converter.code_max);
        self.samples.push(Sample { tick: self.tick, counts, mode, temperature: None });
    }

    fn normal(&mut self) -> f64 {
        self.rng.sample(StandardNormal)
    }
}
