//! Boards of all kinds that a set-up accepts.

use brimline::{
    Charge, Circuit, Converter, Flux, Integral, Linearity, Noise, Policy, Setup, SoakageBranch, TemperatureLaw,
};

use crate::draw::Draw;

/// Tables that fit any converter from 12 bits up; static, as a set-up keeps them.
static TABLES: [Linearity; 3] = [
    Linearity::new(&[(0, 0.0), (2048, 1.7), (4096, 0.0)]),
    Linearity::new(&[(-100_000, 4.0), (0, -3.5), (30_000, 2.25), (100_000, -6.0)]),
    Linearity::new(&[(7, 16.0), (8, -16.0), (3000, 11.0)]),
];

/// A quantity as a bare number in its SI unit.
pub trait Plain: Integral {
    fn plain(self) -> f64;
    /// What an input integral of one unit is called.
    fn wrap(board: Setup<Self>) -> AnySetup
    where
        Self: Sized;
}

impl Plain for Charge {
    fn plain(self) -> f64 {
        self.as_coulombs()
    }
    fn wrap(board: Setup<Self>) -> AnySetup {
        AnySetup::Charge(board)
    }
}

impl Plain for Flux {
    fn plain(self) -> f64 {
        self.as_volt_seconds()
    }
    fn wrap(board: Setup<Self>) -> AnySetup {
        AnySetup::Flux(board)
    }
}

pub enum AnySetup {
    Charge(Setup<Charge>),
    Flux(Setup<Flux>),
}

/// The four parts of a set-up before they are judged.
#[derive(Clone, Copy, Debug)]
pub struct Parts {
    pub circuit: Circuit,
    pub converter: Converter,
    pub noise: Noise,
    pub policy: Policy,
}

impl Parts {
    pub fn setup<Q: Plain>(&self) -> Option<Setup<Q>> {
        Setup::try_new(self.circuit, self.converter, self.noise, self.policy).ok()
    }

    /// As a set-up of the kind that the input resistor makes it.
    pub fn any_setup(&self) -> Option<AnySetup> {
        match self.circuit.input_resistance_ohm {
            None => self.setup().map(Charge::wrap),
            Some(_) => self.setup().map(Flux::wrap),
        }
    }

    /// Input that moves the output by one count, without sign.
    pub fn input_per_count(&self) -> f64 {
        self.converter.lsb_v / self.circuit.gain().abs()
    }

    /// The same board with the other sign of the input.
    pub fn mirrored(mut self) -> Self {
        self.circuit.inverting = !self.circuit.inverting;
        self
    }
}

/// A board that is meant to be accepted, with figures from all over what boards have.
pub fn parts(draw: &mut Draw) -> Parts {
    let span_v = draw.pick(&[5.0, 2.5, 10.0, 20.0]);
    let bits = draw.pick(&[16_u32, 12, 18, 24, 8, 30]);
    let signed = draw.flag(64);
    let codes = 1_i32 << bits.min(29);
    let lsb_v = span_v / f64::from(codes);
    let converter = Converter {
        code_zero_v: if signed { 0.0 } else { -0.5 * span_v },
        lsb_v,
        code_min: if signed { -codes / 2 } else { 0 },
        code_max: if signed { codes / 2 - 1 } else { codes - 1 },
        tick_hz: draw.pick(&[1e6, 1000.0, 32_768.0, 84e6, 4e9, 1.0]),
        code_zero_u_v: draw.maybe(32, 1e-6, 1e-3).unwrap_or(0.0),
        lsb_u_rel: draw.maybe(32, 1e-6, 1e-2).unwrap_or(0.0),
        linearity: draw.flag(48).then(|| &TABLES[usize::from(draw.byte()) % TABLES.len()]),
        linearity_u_counts: draw.maybe(32, 0.01, 10.0).unwrap_or(0.0),
    };
    let circuit = circuit(draw, span_v, &converter);
    let input_per_count = lsb_v / circuit.gain().abs();
    let noise = Noise {
        readout_counts: draw.pick(&[1.0, 0.0, 0.3, 0.6, 5.0]),
        input_density: input_per_count * draw.maybe(128, 1e-3, 1e3).unwrap_or(0.0),
        offset_wander: input_per_count * draw.maybe(64, 1e-4, 10.0).unwrap_or(0.0),
        input_flicker: input_per_count * draw.maybe(48, 1e-3, 10.0).unwrap_or(0.0),
    };
    let policy = policy(draw, &converter, input_per_count);
    Parts { circuit, converter, noise, policy }
}

fn circuit(draw: &mut Draw, span_v: f64, converter: &Converter) -> Circuit {
    let tick_s = 1.0 / converter.tick_hz;
    let mut soakage = [SoakageBranch::NONE; 4];
    if draw.flag(64) {
        for branch in soakage.iter_mut().take(usize::from(draw.byte() % 4) + 1) {
            *branch = SoakageBranch {
                share: draw.decades(1e-5, 0.5),
                time_constant_s: draw.decades(1e-2, 1e4).max(2.0 * tick_s),
            };
        }
    }
    let rail = 0.5 * span_v * draw.pick(&[0.96, 0.5, 1.0, 2.0]);
    Circuit {
        capacitance_f: draw.pick(&[100e-9, 1e-9, 1e-6, 100e-12]),
        input_resistance_ohm: draw.flag(96).then(|| draw.decades(1e3, 1e8)),
        inverting: !draw.flag(128),
        reset_level_v: rail.min(0.45 * span_v) * draw.pick(&[0.0, 0.0, 0.9, -0.9, 0.3]),
        rail_low_v: -rail,
        rail_high_v: rail,
        offset_limit_v: draw.pick(&[1e-3, 0.0, 25e-6, 1e-2]),
        bias_limit_a: draw.pick(&[100e-12, 0.0, 1e-9, 10e-15]),
        source_resistance_ohm: draw.decades(1e6, 1e12),
        leak_time_constant_s: draw.flag(80).then(|| draw.decades(0.1, 1e4).max(20.0 * tick_s)),
        leak_u_rel: draw.maybe(48, 1e-4, 1.0).unwrap_or(0.0),
        soakage,
        soakage_u_rel: draw.maybe(48, 1e-3, 1.0).unwrap_or(0.0),
        pedestal_v: draw.linear(-1e-2, 1e-2) * f64::from(draw.byte() & 1),
        pedestal_u_v: draw.maybe(96, 1e-6, 1e-2),
        switch_resistance_ohm: draw.pick(&[100.0, 0.0, 1e4]),
        slew_v_per_s: draw.maybe(48, 1e3, 1e7),
        temperature_law: match draw.byte() % 8 {
            6 => TemperatureLaw::Offset { limit_v_per_k: draw.decades(1e-8, 1e-4) },
            7 => TemperatureLaw::Junction { doubling_k: draw.linear(5.0, 20.0) },
            _ => TemperatureLaw::Unknown,
        },
        gain_u_rel: draw.maybe(32, 1e-6, 1e-2).unwrap_or(0.0),
    }
}

fn policy(draw: &mut Draw, converter: &Converter, input_per_count: f64) -> Policy {
    let longest_s = 2_147_483_000.0 / converter.tick_hz;
    let settling_s = draw.pick(&[1e-3, 0.0, 5e-2]);
    Policy {
        zero_block_s: draw.pick(&[0.1_f64, 0.0, 0.16, 0.5, 1.0]).min(longest_s),
        false_alarm_s: draw.pick(&[1e7, 1.0, 1e4, 1e12]),
        edge_samples: draw.pick(&[16, 2, 3, 5, 8]),
        gap_limit_s: draw.pick(&[1.0_f64, 0.2, 3600.0]).min(longest_s),
        frozen_samples: draw.pick(&[64, 0, 2, 300]),
        worst_input: draw.maybe(160, 1.0, 1e6).map(|counts_per_s| counts_per_s * input_per_count),
        input_slew: draw.maybe(64, 1.0, 1e6).map(|counts_per_s2| counts_per_s2 * input_per_count),
        latency_s: draw.pick(&[0.0, 1e-2, 1.0]),
        guard_sigma: draw.pick(&[4.0, 0.0, 10.0]),
        settling_s,
        reset_attempts: draw.pick(&[3, 1, 2, 255]),
        arrival_tolerance_v: draw.maybe(48, 1e-4, 1.0),
    }
}
