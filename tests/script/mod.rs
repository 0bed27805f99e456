//! A scripted integrator in exact arithmetic with a little repeatable noise: each test says what happens, step by step.
#![allow(dead_code, reason = "each test file uses its own part")]

use brimline::{Channel, Charge, Circuit, Converter, Event, Mode, Noise, Policy, Reading, Reason, Sample, Setup, Step};

/// 100 nF, 10 uV per code, -2 V to 2 V, 1 MHz counter: 1 count is 1 pC.
pub const CIRCUIT: Circuit = Circuit {
    capacitance_f: 100e-9,
    rail_low_v: -1.9,
    rail_high_v: 1.9,
    source_resistance_ohm: 1e9,
    ..Circuit::DEFAULT
};
pub const CONVERTER: Converter = Converter {
    code_zero_v: 0.0,
    lsb_v: 10e-6,
    code_min: -200_000,
    code_max: 199_999,
    tick_hz: 1e6,
    ..Converter::DEFAULT
};
pub const NOISE: Noise = Noise { readout_counts: 1.0, ..Noise::NONE };
pub const POLICY: Policy = Policy { worst_input: Some(100e-9), ..Policy::DEFAULT };
pub const SETUP: Setup<Charge> = Setup::new(CIRCUIT, CONVERTER, NOISE, POLICY);

/// Coulombs per count of [`SETUP`].
pub const COULOMBS_PER_COUNT: f64 = 1e-12;

/// The integrator, its samples so far and what the channel said to them.
pub struct Script<'s> {
    pub channel: Channel<'s, Charge>,
    pub tick: u32,
    /// Output, counts.
    pub level: f64,
    /// Drift of the output, counts/s.
    pub drift: f64,
    /// Counts added to every code: a converter with another zero.
    pub origin: i32,
    /// Whether readings dither by a count or so.
    pub noisy: bool,
    pub notices: Vec<(u32, Event)>,
    pub last_step: Step,
    seed: u32,
}

/// 100 samples per second.
pub const STEP: u32 = 10_000;

impl<'s> Script<'s> {
    pub fn new(setup: &'s Setup<Charge>) -> Self {
        Self {
            channel: Channel::new(setup),
            tick: 0,
            level: 0.0,
            drift: 20.0,
            origin: 0,
            noisy: true,
            notices: Vec::new(),
            last_step: Step::default(),
            seed: 1,
        }
    }

    /// Uniform between -1 and 1, the same in every run of the test.
    fn dither(&mut self) -> f64 {
        self.seed = self.seed.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
        if self.noisy { f64::from(self.seed >> 8) / f64::from(1 << 23) - 1.0 } else { 0.0 }
    }

    /// One sample, `ticks` after the one before, of the level as it is.
    pub fn sample(&mut self, mode: Mode, ticks: u32) -> Step {
        let counts = (self.level + self.dither()).round().clamp(-200_000.0, 199_999.0) as i32 + self.origin;
        self.sample_of(mode, ticks, counts)
    }

    /// One sample of a given code.
    pub fn sample_of(&mut self, mode: Mode, ticks: u32, counts: i32) -> Step {
        self.tick = self.tick.wrapping_add(ticks);
        let step = self.channel.feed(Sample { tick: self.tick, counts, mode, temperature: None });
        self.notices.extend(step.notices.iter().map(|n| (n.tick, n.event)));
        self.last_step = step.clone();
        step
    }

    pub fn zero(&mut self, samples: u32) -> &mut Self {
        for _ in 0..samples {
            self.level += self.drift * 0.01;
            self.sample(Mode::Zero, STEP);
        }
        self
    }

    /// `counts_per_s`: what the input moves the level by.
    pub fn integrate(&mut self, samples: u32, counts_per_s: f64) -> &mut Self {
        for _ in 0..samples {
            self.level += (self.drift + counts_per_s) * 0.01;
            self.sample(Mode::Integrate, STEP);
        }
        self
    }

    /// The input is open and the level droops.
    pub fn hold(&mut self, samples: u32, droop: f64) -> &mut Self {
        for _ in 0..samples {
            self.level += droop * 0.01;
            self.sample(Mode::Hold, STEP);
        }
        self
    }

    /// The switch closes and the level goes to `to`.
    pub fn reset(&mut self, samples: u32, to: f64) -> &mut Self {
        for _ in 0..samples {
            self.level = to;
            self.sample(Mode::Reset, STEP);
        }
        self
    }

    pub fn reading(&self) -> Reading<Charge> {
        self.channel.reading().expect("a run has started")
    }

    pub fn faults(&self) -> Vec<Reason> {
        self.notices
            .iter()
            .filter_map(|&(_, event)| if let Event::Fault(reason) = event { Some(reason) } else { None })
            .collect()
    }
}

/// The integral that a movement of the level by the input means; the circuit inverts.
pub fn coulombs(counts: f64) -> f64 {
    -counts * COULOMBS_PER_COUNT
}
