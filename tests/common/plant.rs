//! A simulated integrator channel in f64 with known truth. It shares no formula with the crate: it works in volts and
//! amperes (or volts), sample by sample, from what the board's data sheet says.

use brimline::{Mode, Sample};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;

use super::board::Board;

pub(crate) mod bench;
pub(crate) mod network;
pub(crate) mod series;

/// The true input, in input units (A or V): a steady part with a ripple, between two instants.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Input {
    pub(crate) steady: f64,
    /// Amplitude of the ripple relative to the steady part.
    pub(crate) ripple: f64,
    pub(crate) ripple_hz: f64,
    /// Phase of the ripple at time 0, rad.
    pub(crate) phase: f64,
    /// When the input begins and ends, s from power-up.
    pub(crate) from_s: f64,
    pub(crate) to_s: f64,
}

impl Input {
    pub(crate) const fn steady(steady: f64) -> Self {
        Self { steady, ripple: 0.0, ripple_hz: 1.0, phase: 0.0, from_s: 0.0, to_s: f64::INFINITY }
    }

    fn integral(&self, from_s: f64, to_s: f64) -> f64 {
        let (from_s, to_s) = (from_s.max(self.from_s), to_s.min(self.to_s));
        if to_s <= from_s {
            return 0.0;
        }
        let omega = core::f64::consts::TAU * self.ripple_hz;
        let cosines = (omega * from_s + self.phase).cos() - (omega * to_s + self.phase).cos();
        self.steady * (to_s - from_s + self.ripple / omega * cosines)
    }
}

/// When samples are taken.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Sampling {
    pub(crate) hz: f64,
    /// Largest departure from the even grid, as a share of the period, below 0.5. The tick tells the true time.
    pub(crate) jitter: f64,
    /// Probability that a sample is lost. The last one of a mode never is: the switches move on it.
    pub(crate) lost: f64,
}

impl Sampling {
    pub(crate) const fn even(hz: f64) -> Self {
        Self { hz, jitter: 0.0, lost: 0.0 }
    }
}

/// When a run resets.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Resets {
    /// Distance from the reset level at which the switch closes, V.
    pub(crate) at_v: f64,
    /// How long it stays closed, sample periods.
    pub(crate) periods: u32,
}

/// What goes wrong around a measurement; by default nothing.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Trouble {
    pub(crate) hum: Option<Hum>,
    /// Input that gets in whatever the switches say, `Reset` excepted.
    pub(crate) stray: Option<Input>,
    /// An instant, s from power-up, at which the drift changes, and by how much, counts/s.
    pub(crate) drift_change: Option<(f64, f64)>,
}

/// Mains hum on the readings.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Hum {
    pub(crate) peak_v: f64,
    pub(crate) hz: f64,
    /// At power-up, rad.
    pub(crate) phase: f64,
}

/// A finished trace with its truth.
#[derive(Clone, Debug)]
pub(crate) struct Record {
    pub(crate) samples: Vec<Sample>,
    /// Index of the last sample of the opening zero, and of the run.
    pub(crate) opening_end: usize,
    pub(crate) run_end: usize,
    /// True integral of the input over the run, dead time included, C or V s.
    pub(crate) integral: f64,
    /// True drift of the output, V/s, at the last sample of the opening and of the closing zero.
    pub(crate) drift_opening: f64,
    pub(crate) drift_closing: f64,
    pub(crate) resets: u32,
    /// True integral of the stray input over the whole record, C or V s.
    pub(crate) stray: f64,
}

/// Durations of a simple measurement, s.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Timing {
    pub(crate) opening_s: f64,
    pub(crate) run_s: f64,
    pub(crate) closing_s: f64,
}

pub(crate) struct Plant {
    board: Board,
    input: Input,
    sampling: Sampling,
    rng: ChaCha8Rng,
    /// Output volts per unit of input and second, with the board's true gain.
    gain: f64,
    level_v: f64,
    /// Input-referred offset, input units.
    offset: f64,
    mode: Mode,
    first_tick: u32,
    /// Sample periods and ticks since power-up.
    periods: u64,
    ticks: u64,
    samples: Vec<Sample>,
    integral: f64,
    resets: u32,
    trouble: Trouble,
    stray_integral: f64,
}

impl Plant {
    pub(crate) fn new(board: &Board, input: Input, sampling: Sampling, seed: u64) -> Self {
        let mut rng = ChaCha8Rng::seed_from_u64(seed);
        let circuit = &board.circuit;
        let offset_v = circuit.offset_limit_v * rng.random_range(-1.0..=1.0);
        let bias_a = circuit.bias_limit_a * rng.random_range(-1.0..=1.0);
        let (ohm, offset) = match circuit.input_resistance_ohm {
            None => (1.0, offset_v / circuit.source_resistance_ohm + bias_a),
            Some(ohm) => (ohm, offset_v + bias_a * ohm),
        };
        let scale = 1.0 + circuit.gain_u_rel * rng.sample::<f64, _>(StandardNormal);
        Self {
            board: *board,
            input,
            sampling,
            gain: board.sign() * scale / (ohm * circuit.capacitance_f),
            level_v: circuit.reset_level_v,
            offset,
            mode: Mode::Reset,
            first_tick: rng.random(),
            rng,
            periods: 0,
            ticks: 0,
            samples: Vec::new(),
            integral: 0.0,
            resets: 0,
            trouble: Trouble::default(),
            stray_integral: 0.0,
        }
    }

    pub(crate) fn with(mut self, trouble: Trouble) -> Self {
        self.trouble = trouble;
        self
    }

    /// Power-up reset, opening zero, run, closing zero.
    pub(crate) fn measure(mut self, timing: &Timing, resets: Option<&Resets>) -> Record {
        self.dwell(Mode::Reset, 5);
        self.dwell(Mode::Zero, self.periods_in(timing.opening_s));
        let (opening_end, drift_opening) = (self.samples.len() - 1, self.drift());
        self.run(self.periods_in(timing.run_s), resets);
        let run_end = self.samples.len() - 1;
        self.dwell(Mode::Zero, self.periods_in(timing.closing_s));
        Record {
            opening_end,
            run_end,
            drift_opening,
            drift_closing: self.drift(),
            samples: self.samples,
            integral: self.integral,
            resets: self.resets,
            stray: self.stray_integral,
        }
    }

    fn periods_in(&self, seconds: f64) -> u32 {
        (seconds * self.sampling.hz).round() as u32
    }

    fn drift(&self) -> f64 {
        self.gain * self.offset
    }

    fn run(&mut self, periods: u32, resets: Option<&Resets>) {
        let Some(resets) = resets else {
            return self.dwell(Mode::Integrate, periods);
        };
        let end = self.periods + u64::from(periods);
        while self.periods < end {
            self.dwell(Mode::Integrate, 1);
            if (self.level_v - self.board.circuit.reset_level_v).abs() >= resets.at_v {
                self.resets += 1;
                self.integral += self.dead_integral(resets.periods);
                self.dwell(Mode::Reset, resets.periods);
            }
        }
        assert!(self.mode == Mode::Integrate, "a run that ends within a reset is another test");
    }

    /// What the input does while the switch is closed belongs to the run.
    fn dead_integral(&mut self, periods: u32) -> f64 {
        let last = self.tick_of(self.periods + u64::from(periods));
        assert!(self.sampling.jitter == 0.0, "the end of the dead time is known beforehand only on an even grid");
        self.input.integral(self.seconds(self.ticks), self.seconds(last))
    }

    /// Stays in a mode for a number of sample periods.
    fn dwell(&mut self, mode: Mode, periods: u32) {
        for left in (0..periods).rev() {
            self.periods += 1;
            if left > 0 && self.rng.random_bool(self.sampling.lost) {
                continue;
            }
            let ticks = self.tick_of(self.periods);
            self.pass(mode, ticks);
            self.take(mode);
        }
    }

    fn tick_of(&mut self, periods: u64) -> u64 {
        let jitter = self.sampling.jitter * self.rng.random_range(-1.0..=1.0);
        ((periods as f64 + jitter) / self.sampling.hz * self.board.converter.tick_hz).round() as u64
    }

    fn seconds(&self, ticks: u64) -> f64 {
        ticks as f64 / self.board.converter.tick_hz
    }

    /// Lets the time up to `ticks` pass in `mode`: exact in distribution for a step of any length.
    fn pass(&mut self, mode: Mode, ticks: u64) {
        let (from_s, to_s) = (self.seconds(self.ticks), self.seconds(ticks));
        let dt = to_s - from_s;
        let (density, wander) = (self.board.noise.input_density, self.board.noise.offset_wander);
        let circuit = self.board.circuit;
        if self.mode == Mode::Reset && mode != Mode::Reset {
            self.level_v += circuit.pedestal_v + circuit.pedestal_u_v.unwrap_or(0.0) * self.normal();
        }
        // A Brownian path's end, and its mean given the end.
        let wandered = wander * dt.sqrt() * self.normal();
        let mean_offset = self.offset + 0.5 * wandered + wander * (dt / 12.0).sqrt() * self.normal();
        let noise = density * (0.5 * dt).sqrt() * self.normal();
        self.offset += wandered;
        let signal = if mode == Mode::Integrate { self.input.integral(from_s, to_s) } else { 0.0 };
        self.integral += signal;
        let stray =
            self.trouble.stray.filter(|_| mode != Mode::Reset).map_or(0.0, |stray| stray.integral(from_s, to_s));
        self.stray_integral += stray;
        self.level_v = match mode {
            Mode::Reset => circuit.reset_level_v,
            _ => self.level_v + self.gain * (signal + stray + noise + mean_offset * dt),
        };
        if let Some((_, counts_per_s)) = self.trouble.drift_change.filter(|&(at_s, _)| from_s < at_s && at_s <= to_s) {
            self.offset += counts_per_s * self.board.converter.lsb_v / self.gain;
        }
        self.mode = mode;
        self.ticks = ticks;
    }

    fn take(&mut self, mode: Mode) {
        let converter = self.board.converter;
        let hum_v = self.trouble.hum.map_or(0.0, |hum| {
            hum.peak_v * (core::f64::consts::TAU * hum.hz * self.seconds(self.ticks) + hum.phase).sin()
        });
        let exact = (self.level_v + hum_v - converter.code_zero_v) / converter.lsb_v;
        let noisy = exact + self.board.noise.readout_counts * self.normal();
        let counts = (noisy.round() as i32).clamp(converter.code_min, converter.code_max);
        let tick = self.first_tick.wrapping_add(self.ticks as u32);
        self.samples.push(Sample { tick, counts, mode, temperature: None });
    }

    fn normal(&mut self) -> f64 {
        self.rng.sample(StandardNormal)
    }
}
