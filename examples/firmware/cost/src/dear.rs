//! Boards made to be dear: everything that a set-up can describe at once. Their figures are invented.

use brimline::{Charge, Circuit, Converter, Flux, Linearity, Noise, Policy, Setup, SoakageBranch, TemperatureLaw};

/// Arches of 3 counts between steps of 2048 codes.
static BENT: Linearity = Linearity::new(&points());

const fn points() -> [(i32, f64); Linearity::POINTS_MAX] {
    let mut points = [(0, 0.0); Linearity::POINTS_MAX];
    let mut left: &mut [(i32, f64)] = &mut points;
    let mut i = 0;
    while let [point, after @ ..] = left {
        *point = (2048 * i, if i % 2 == 0 { 0.0 } else { 3.0 });
        i += 1;
        left = after;
    }
    points
}

const CIRCUIT: Circuit = Circuit {
    capacitance_f: 100e-9,
    leak_time_constant_s: Some(3.7),
    leak_u_rel: 0.05,
    soakage: [
        SoakageBranch { share: 0.002, time_constant_s: 0.05 },
        SoakageBranch { share: 0.003, time_constant_s: 0.9 },
        SoakageBranch { share: 0.004, time_constant_s: 13.0 },
        SoakageBranch { share: 0.005, time_constant_s: 210.0 },
    ],
    soakage_u_rel: 0.1,
    pedestal_v: 1.3e-3,
    pedestal_u_v: Some(50e-6),
    switch_resistance_ohm: 90.0,
    slew_v_per_s: Some(1e6),
    temperature_law: TemperatureLaw::Junction { doubling_k: 9.0 },
    gain_u_rel: 0.01,
    ..Circuit::DEFAULT
};

const CONVERTER: Converter = Converter {
    code_zero_u_v: 1e-3,
    lsb_u_rel: 1e-3,
    linearity: Some(&BENT),
    linearity_u_counts: 0.3,
    ..Converter::DEFAULT
};

/// One charge amplifier with blocks in its zeros, one without.
pub(crate) static BLOCKED: Setup<Charge> = charge(Policy::DEFAULT.zero_block_s);
/// See [`BLOCKED`].
pub(crate) static UNBLOCKED: Setup<Charge> = charge(0.0);

const fn charge(zero_block_s: f64) -> Setup<Charge> {
    Setup::new(
        CIRCUIT,
        CONVERTER,
        Noise { readout_counts: 1.0, input_density: 2e-13, offset_wander: 3e-14, input_flicker: 1e-13 },
        Policy { zero_block_s, worst_input: Some(0.2e-6), input_slew: Some(1e-6), ..Policy::DEFAULT },
    )
}

/// A fluxmeter whose counter's rate is no round number.
pub(crate) static FLUXMETER: Setup<Flux> = flux(Policy::DEFAULT.zero_block_s);
/// The same without blocks.
pub(crate) static FLUXMETER_UNBLOCKED: Setup<Flux> = flux(0.0);

const fn flux(zero_block_s: f64) -> Setup<Flux> {
    Setup::new(
        Circuit {
            input_resistance_ohm: Some(68e3),
            inverting: false,
            temperature_law: TemperatureLaw::Offset { limit_v_per_k: 5e-6 },
            ..CIRCUIT
        },
        Converter { tick_hz: 32_768.0, ..CONVERTER },
        Noise { readout_counts: 1.0, input_density: 200e-9, offset_wander: 50e-9, input_flicker: 100e-9 },
        Policy { zero_block_s, ..Policy::DEFAULT },
    )
}
