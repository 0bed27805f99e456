//! An integrator with a reset switch that can fail, in volts and seconds: exact solutions between samples, a resistance
//! that discharges the capacitor while the switch is closed, and whatever the fault says.

use brimline::{Channel, Charge, Event, Mode, Reading, Reason, Sample, Setup, Step};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;

/// What is wrong with the switch. Resets are counted from 1; the first is the one at power-up.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Fault {
    None,
    /// Stays open in the resets `from` to `to`.
    StaysOpen {
        from: u32,
        to: u32,
    },
    /// From reset `from` on it takes the output no more than half way.
    HalfWay {
        from: u32,
    },
    /// Its resistance is so many times what it was, from reset to reset.
    Grows {
        by: f64,
    },
    /// Stays closed after reset `from`.
    SticksClosed {
        from: u32,
    },
    /// Its open resistance discharges the capacitor with this time constant, s.
    Leaks {
        time_constant_s: f64,
    },
}

pub struct Bench<'s> {
    pub channel: Channel<'s, Charge>,
    setup: &'s Setup<Charge>,
    pub fault: Fault,
    /// Output with its part above the reset level, V, and what the dielectric's branches hold of it.
    above_v: f64,
    soaked_v: [f64; 4],
    /// Where the closed switch takes the output, above the reset level, V.
    closed_v: f64,
    /// What moves the output, V/s: drift in all modes but `Hold`, droop there, and the input while it is connected.
    pub drift: f64,
    pub droop: f64,
    pub input: f64,
    /// Random walks of output and drift, V and V/s per square root of second.
    pub walk: f64,
    pub wander: f64,
    /// The true pedestal, V.
    pub pedestal_v: f64,
    /// Which codes the converter is wrong at, and by how much.
    pub bow: fn(f64) -> f64,
    /// Time between samples, s.
    pub period_s: f64,
    pub resets: u32,
    mode: Mode,
    tick: u32,
    rng: ChaCha8Rng,
    pub notices: Vec<Event>,
    pub last_step: Step,
}

impl<'s> Bench<'s> {
    pub fn new(setup: &'s Setup<Charge>, fault: Fault, seed: u64) -> Self {
        let mut rng = ChaCha8Rng::seed_from_u64(seed);
        let circuit = setup.circuit();
        let limit = circuit.drift_limit_v_per_s();
        let noise = setup.noise();
        Self {
            channel: Channel::new(setup),
            setup,
            fault,
            above_v: 0.0,
            soaked_v: [0.0; 4],
            closed_v: 0.0,
            drift: 0.4 * limit,
            droop: 0.4 * circuit.bias_limit_a / circuit.capacitance_f,
            input: 0.0,
            // One-sided density: the walk's variance in a second is half its square.
            walk: noise.input_density * core::f64::consts::FRAC_1_SQRT_2 / circuit.capacitance_f,
            wander: noise.offset_wander / circuit.capacitance_f,
            pedestal_v: circuit.pedestal_v,
            bow: |_| 0.0,
            period_s: 0.01,
            resets: 0,
            mode: Mode::Zero,
            tick: rng.random(),
            rng,
            notices: Vec::new(),
            last_step: Step::default(),
        }
    }

    pub fn normal(&mut self) -> f64 {
        self.rng.sample(StandardNormal)
    }

    pub fn uniform(&mut self, from: f64, to: f64) -> f64 {
        self.rng.random_range(from..to)
    }

    /// Puts the output so many counts above the reset level.
    pub fn set_level(&mut self, counts: f64) {
        self.above_v = counts * self.lsb_v();
    }

    pub fn lsb_v(&self) -> f64 {
        self.setup.converter().lsb_v
    }

    fn closes(&self) -> bool {
        match self.fault {
            Fault::StaysOpen { from, to } => !(from..=to).contains(&self.resets),
            _ => true,
        }
    }

    fn is_stuck(&self) -> bool {
        matches!(self.fault, Fault::SticksClosed { from } if self.resets >= from)
    }

    fn switch_over(&mut self, mode: Mode) {
        if mode == Mode::Reset {
            self.resets += 1;
            self.closed_v = match self.fault {
                Fault::HalfWay { from } if self.resets >= from => 0.5 * self.above_v,
                _ => 0.0,
            };
        } else if self.mode == Mode::Reset && self.closes() && !self.is_stuck() {
            // Charge injection, and the noise of the resistance that the opening switch leaves on the capacitor.
            let ktc_v = (1.380_649e-23 * 300.0 / self.setup.circuit().capacitance_f).sqrt();
            self.above_v += self.pedestal_v + ktc_v * self.normal();
        }
        self.mode = mode;
    }

    /// Lets time pass in the present mode.
    fn pass(&mut self, dt: f64) {
        let circuit = *self.setup.circuit();
        let slope = match self.mode {
            Mode::Zero => self.drift,
            Mode::Integrate => self.drift + self.input,
            // During a reset the input is left open as well.
            Mode::Hold | Mode::Reset => self.droop,
        };
        let closed = (self.mode == Mode::Reset && self.closes()) || self.is_stuck();
        if closed {
            let grown = match self.fault {
                Fault::Grows { by } => by.powi(self.resets as i32 - 1),
                _ => 1.0,
            };
            let tau = circuit.switch_resistance_ohm * grown * circuit.capacitance_f;
            let to = self.closed_v + slope * tau;
            self.above_v = discharged(self.above_v - to, tau, circuit.slew_v_per_s, dt) + to;
        } else {
            let leak = match self.fault {
                Fault::Leaks { time_constant_s } => Some(time_constant_s),
                _ => circuit.leak_time_constant_s,
            };
            self.above_v = match leak {
                Some(tau) => slope * tau + (self.above_v - slope * tau) * (-dt / tau).exp(),
                None => self.above_v + slope * dt,
            };
            self.above_v += self.walk * dt.sqrt() * self.normal();
        }
        self.drift += self.wander * dt.sqrt() * self.normal();
        self.soak(closed, dt);
    }

    /// The dielectric follows the output; while the switch is open it takes its charge from it.
    fn soak(&mut self, closed: bool, dt: f64) {
        for (held, branch) in self.soaked_v.iter_mut().zip(self.setup.circuit().soakage) {
            let taken = (self.above_v - *held) * -(-dt / branch.time_constant_s).exp_m1();
            *held += taken;
            if !closed {
                self.above_v -= branch.share * taken;
            }
        }
    }

    pub fn sample(&mut self, mode: Mode) -> Step {
        if mode != self.mode {
            self.switch_over(mode);
        }
        self.pass(self.period_s);
        let converter = self.setup.converter();
        self.tick = self.tick.wrapping_add((self.period_s * converter.tick_hz).round() as u32);
        let exact = converter.code(self.setup.circuit().reset_level_v + self.above_v);
        let code = exact + (self.bow)(exact) + self.setup.noise().readout_counts * self.normal();
        let counts = (code.round() as i32).clamp(converter.code_min, converter.code_max);
        let step = self.channel.feed(Sample { tick: self.tick, counts, mode, temperature: None });
        self.notices.extend(step.notices.iter().map(|notice| notice.event));
        self.last_step = step.clone();
        step
    }

    pub fn stay(&mut self, mode: Mode, samples: u32) -> &mut Self {
        for _ in 0..samples {
            self.sample(mode);
        }
        self
    }

    pub fn zero(&mut self, samples: u32) -> &mut Self {
        self.stay(Mode::Zero, samples)
    }

    pub fn hold(&mut self, samples: u32) -> &mut Self {
        self.stay(Mode::Hold, samples)
    }

    pub fn reset(&mut self, samples: u32) -> &mut Self {
        self.stay(Mode::Reset, samples)
    }

    /// The input moves the output by so many counts per second, whatever the channel asks for.
    pub fn integrate(&mut self, samples: u32, counts_per_s: f64) -> &mut Self {
        self.input = counts_per_s * self.lsb_v();
        self.stay(Mode::Integrate, samples)
    }

    /// The same, with a reset of five samples whenever one is asked for.
    pub fn obey(&mut self, samples: u32, counts_per_s: f64) -> &mut Self {
        self.input = counts_per_s * self.lsb_v();
        for _ in 0..samples {
            if self.sample(Mode::Integrate).request == Some(Mode::Reset) {
                self.reset(5);
            }
        }
        self
    }

    pub fn reading(&self) -> Reading<Charge> {
        self.channel.reading().expect("a run has started")
    }

    /// How often something was told.
    pub fn told(&self, event: Event) -> usize {
        self.notices.iter().filter(|&&told| told == event).count()
    }

    pub fn faults(&self) -> Vec<Reason> {
        let reason = |event: &Event| if let Event::Fault(reason) = *event { Some(reason) } else { None };
        self.notices.iter().filter_map(reason).collect()
    }
}

/// What is left of a voltage after `dt` across a resistance, when the amplifier slews no faster than `slew`.
fn discharged(from_v: f64, tau: f64, slew: Option<f64>, dt: f64) -> f64 {
    let (mut left, mut dt) = (from_v.abs(), dt);
    if let Some(slew) = slew {
        let slewing_s = ((left - slew * tau) / slew).clamp(0.0, dt);
        left -= slew * slewing_s;
        dt -= slewing_s;
    }
    if tau > 0.0 { left * (-dt / tau).exp() * from_v.signum() } else { 0.0 }
}
