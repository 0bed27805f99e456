//! The boards that the traces were recorded on, worked out at compile time. Figures as in `examples/setups`.

use brimline::{Charge, Circuit, Converter, Flux, Noise, Policy, Setup, SoakageBranch};

const CIRCUIT: Circuit =
    Circuit { rail_low_v: -12.0, rail_high_v: 12.0, offset_limit_v: 2e-3, bias_limit_a: 100e-12, ..Circuit::DEFAULT };

const CONVERTER: Converter = Converter { code_zero_v: -2.5, lsb_v: 5.0 / 65536.0, ..Converter::DEFAULT };

pub(crate) static HATCHERY: Setup<Charge> = hatchery(Policy::DEFAULT.zero_block_s);

/// The same board with other blocks: at 100 samples a second of 16 samples, and none.
pub(crate) static HATCHERY_BLOCKS_OF_16: Setup<Charge> = hatchery(0.16);
pub(crate) static HATCHERY_UNBLOCKED: Setup<Charge> = hatchery(0.0);

const fn hatchery(zero_block_s: f64) -> Setup<Charge> {
    Setup::new(
        Circuit {
            capacitance_f: 470e-9,
            source_resistance_ohm: 5e9,
            pedestal_v: -0.8e-3,
            pedestal_u_v: Some(40e-6),
            ..CIRCUIT
        },
        CONVERTER,
        Noise { readout_counts: 0.9, input_density: 1.5e-12, offset_wander: 0.0, ..Noise::NONE },
        Policy { zero_block_s, worst_input: Some(0.2e-6), ..Policy::DEFAULT },
    )
}

pub(crate) static DIM_LAMP: Setup<Charge> = Setup::new(
    Circuit { capacitance_f: 22e-9, source_resistance_ohm: 20e9, ..CIRCUIT },
    CONVERTER,
    Noise { readout_counts: 1.1, input_density: 8e-14, offset_wander: 0.0, ..Noise::NONE },
    Policy { worst_input: Some(1e-9), ..Policy::DEFAULT },
);

pub(crate) static WANDERING_OFFSET: Setup<Flux> = Setup::new(
    Circuit { capacitance_f: 220e-9, input_resistance_ohm: Some(47e3), ..CIRCUIT },
    CONVERTER,
    Noise { readout_counts: 1.0, input_density: 1.5e-6, offset_wander: 6e-6, ..Noise::NONE },
    Policy::DEFAULT,
);

pub(crate) static SEARCH_COIL: Setup<Flux> = Setup::new(
    Circuit {
        capacitance_f: 1e-6,
        input_resistance_ohm: Some(22e3),
        offset_limit_v: 25e-6,
        bias_limit_a: 10e-12,
        ..CIRCUIT
    },
    Converter {
        code_zero_v: -5.0,
        lsb_v: 10.0 / 262144.0,
        code_min: 0,
        code_max: 262143,
        tick_hz: 1e6,
        ..Converter::DEFAULT
    },
    Noise { readout_counts: 1.4, input_density: 40e-9, offset_wander: 0.0, ..Noise::NONE },
    Policy { worst_input: Some(0.05), ..Policy::DEFAULT },
);

pub(crate) static LEAKY: Setup<Flux> = Setup::new(
    Circuit {
        capacitance_f: 100e-9,
        input_resistance_ohm: Some(68e3),
        offset_limit_v: 1e-3,
        leak_time_constant_s: Some(1.0),
        ..CIRCUIT
    },
    CONVERTER,
    Noise { readout_counts: 1.0, input_density: 200e-9, offset_wander: 0.0, ..Noise::NONE },
    Policy { worst_input: Some(0.05), ..Policy::DEFAULT },
);

pub(crate) static SOAKAGE: Setup<Charge> = Setup::new(
    Circuit {
        capacitance_f: 220e-9,
        source_resistance_ohm: 1e9,
        offset_limit_v: 1e-3,
        bias_limit_a: 50e-12,
        soakage: [
            SoakageBranch { share: 0.0008, time_constant_s: 0.08 },
            SoakageBranch { share: 0.0018, time_constant_s: 1.1 },
            SoakageBranch::NONE,
            SoakageBranch::NONE,
        ],
        soakage_u_rel: 0.01,
        ..CIRCUIT
    },
    CONVERTER,
    Noise { readout_counts: 1.0, input_density: 0.1e-12, offset_wander: 0.0, ..Noise::NONE },
    Policy { worst_input: Some(0.2e-6), ..Policy::DEFAULT },
);

pub(crate) static HELD: Setup<Flux> = Setup::new(
    Circuit { capacitance_f: 220e-9, input_resistance_ohm: Some(470e3), bias_limit_a: 500e-12, ..CIRCUIT },
    CONVERTER,
    Noise { readout_counts: 1.0, input_density: 1e-6, offset_wander: 0.0, ..Noise::NONE },
    Policy { worst_input: Some(0.2), ..Policy::DEFAULT },
);
