//! A circuit on the bench: a capacitor with its dielectric and a leak, solved exactly in `f64`, and a converter that
//! looks at it. Nothing of the crate's arithmetic is in it.

use brimline::{Channel, Estimate, Event, Integral, Mode, Reading, Sample, Setup, SoakageBranch};
use nalgebra::{DMatrix, DVector};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};

/// What is done to the capacitor.
#[derive(Clone, Copy)]
pub(crate) enum Drive {
    /// The output moves by so many V/s, whatever has to flow for that.
    Forced(f64),
    /// Input and drift would move the output by so many V/s if the capacitor were ideal.
    Free(f64),
}

/// A capacitor: branches in series of resistor and capacitor across it, and a resistor.
#[derive(Clone, Default)]
pub(crate) struct Network {
    pub(crate) branches: Vec<SoakageBranch>,
    /// Resistance across the capacitor times its capacitance, s.
    pub(crate) leak_s: Option<f64>,
}

impl Network {
    /// The derivative of the state `[output, branches..., 1]` as a matrix: the charges that Kirchhoff's law moves
    /// about.
    pub(crate) fn law(&self, drive: Drive) -> DMatrix<f64> {
        let one = self.branches.len() + 1;
        let mut law = DMatrix::zeros(one + 1, one + 1);
        for (i, branch) in self.branches.iter().enumerate() {
            law[(i + 1, 0)] = 1.0 / branch.time_constant_s;
            law[(i + 1, i + 1)] = -1.0 / branch.time_constant_s;
            if let Drive::Free(_) = drive {
                law[(0, 0)] -= branch.share / branch.time_constant_s;
                law[(0, i + 1)] = branch.share / branch.time_constant_s;
            }
        }
        if let Drive::Free(rate) = drive {
            law[(0, 0)] -= self.leak_s.map_or(0.0, |tau| 1.0 / tau);
            law[(0, one)] = rate;
        }
        if let Drive::Forced(slope) = drive {
            law[(0, one)] = slope;
        }
        law
    }

    /// With all voltages at `volts`: the dielectric is at rest.
    pub(crate) fn at_rest(&self, volts: f64) -> DVector<f64> {
        let mut state = DVector::from_element(self.branches.len() + 2, volts);
        state[self.branches.len() + 1] = 1.0;
        state
    }
}

/// The circuit with a channel that is fed what the converter sees. Time goes on in equal steps.
pub(crate) struct Bench<'s, Q> {
    pub(crate) channel: Channel<'s, Q>,
    pub(crate) network: Network,
    /// Output above the reset level, the branches' voltages, 1.
    pub(crate) state: DVector<f64>,
    /// What the converter's own offset adds to the output, V.
    pub(crate) converter_offset_v: f64,
    pub(crate) tick: u32,
    pub(crate) events: Vec<(u32, Event)>,
    /// The latest codes; the last of them comes last.
    pub(crate) codes: Vec<i32>,
    setup: &'s Setup<Q>,
    step_s: f64,
    rng: ChaCha8Rng,
}

impl<'s, Q: Integral> Bench<'s, Q> {
    pub(crate) fn new(setup: &'s Setup<Q>, network: Network, step_s: f64, seed: u64) -> Self {
        Self {
            channel: Channel::new(setup),
            state: network.at_rest(0.0),
            network,
            converter_offset_v: 0.0,
            tick: 0,
            events: Vec::new(),
            codes: Vec::new(),
            setup,
            step_s,
            rng: ChaCha8Rng::seed_from_u64(seed),
        }
    }

    /// Lets `samples` steps pass, with a sample at the end of each.
    pub(crate) fn play(&mut self, mode: Mode, samples: u32, drive: Drive) -> &mut Self {
        let step = (self.network.law(drive) * self.step_s).exp();
        let converter = self.setup.converter();
        self.codes.clear();
        for _ in 0..samples {
            self.state = &step * &self.state;
            self.tick = self.tick.wrapping_add((self.step_s * converter.tick_hz).round() as u32);
            let normal: f64 = StandardNormal.sample(&mut self.rng);
            let volts = self.setup.circuit().reset_level_v + self.state[0] + self.converter_offset_v;
            let code = (converter.code(volts) + self.setup.noise().readout_counts * normal).round();
            let counts = code.clamp(f64::from(converter.code_min), f64::from(converter.code_max)) as i32;
            self.codes.push(counts);
            let step = self.channel.feed(Sample { tick: self.tick, counts, mode, temperature: None });
            self.events.extend(step.notices.iter().map(|notice| (notice.tick, notice.event)));
        }
        self
    }

    /// The switch closes for `samples` steps: the output is at the reset level at once.
    pub(crate) fn reset(&mut self, samples: u32) -> &mut Self {
        self.state[0] = 0.0;
        self.play(Mode::Reset, samples, Drive::Forced(0.0))
    }

    /// The charge in the capacitor and in its branches, as volts of an ideal capacitor.
    pub(crate) fn stored_v(&self) -> f64 {
        self.state[0]
            + self.network.branches.iter().zip(self.state.iter().skip(1)).map(|(b, u)| b.share * u).sum::<f64>()
    }

    /// Output voltage by the mean of the last codes, above the reset level.
    pub(crate) fn shown_v(&self, codes: usize) -> f64 {
        let latest = &self.codes[self.codes.len() - codes..];
        let mean = latest.iter().map(|&code| f64::from(code)).sum::<f64>() / codes as f64;
        (mean - self.setup.converter().code(self.setup.circuit().reset_level_v)) * self.setup.converter().lsb_v
    }

    pub(crate) fn reading(&self) -> Reading<Q> {
        self.channel.reading().expect("a run has started")
    }
}

/// Value and standard uncertainty as movement of an ideal integrator's output, V.
pub(crate) fn output_v<Q: Integral>(setup: &Setup<Q>, estimate: &Estimate<Q>) -> (f64, f64) {
    let gain = setup.circuit().gain();
    (estimate.integral.value.si_value() * gain, estimate.integral.u.si_value() * gain.abs())
}

/// A set-up that is fine, or why not.
pub(crate) fn valid<Q>(setup: Result<Setup<Q>, brimline::SetupError>) -> Setup<Q> {
    match setup {
        Ok(setup) => setup,
        Err(e) => panic!("{e}"),
    }
}
