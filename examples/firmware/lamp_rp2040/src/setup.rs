//! What the board is. The figures of the noise are a start: the notices tell what yours are.

use brimline::unit::Photodetector;
use brimline::{Charge, Circuit, Converter, Noise, Policy, Setup};

/// Time from sample to sample, counted in microseconds.
pub const PERIOD_US: u32 = 10_000;

pub(crate) const PER_SECOND: u32 = 1_000_000 / PERIOD_US;

/// Conversions that are added up to one sample: they take about half a millisecond.
pub const CONVERSIONS: u16 = 256;

/// The integrator and the chip's own converter.
pub const LAMP: Setup<Charge> = Setup::new(
    Circuit {
        capacitance_f: 470e-9,
        // The photodiode draws its current out of the summing point: light moves the output up.
        inverting: false,
        reset_level_v: 0.4,
        rail_low_v: 0.1,
        rail_high_v: 2.9,
        offset_limit_v: 2e-3,
        bias_limit_a: 100e-12,
        source_resistance_ohm: 5e9,
        gain_u_rel: 0.01,
        ..Circuit::DEFAULT
    },
    Converter {
        code_zero_v: 0.0,
        lsb_v: 3.0 / 4096.0 / CONVERSIONS as f64,
        code_min: 0,
        code_max: 4095 * CONVERSIONS as i32,
        // A ramp that ends where this converter is bent is wrong by up to some 8 of 3400 codes (from memory).
        lsb_u_rel: 0.003,
        tick_hz: 1e6,
        ..Converter::DEFAULT
    },
    // 1.5 codes rms for each conversion (from memory), 16 times that for the sum of 256.
    Noise { readout_counts: 24.0, input_density: 1.5e-12, ..Noise::NONE },
    // The switches move when the sample has been taken and fed; the costliest feed takes 2 ms.
    Policy { worst_input: Some(0.2e-6), latency_s: 3e-3, ..Policy::DEFAULT },
);

/// A photodiode at 253.7 nm behind a hole of 0.36 mm.
pub(crate) const DETECTOR: Photodetector = Photodetector::new(0.13, 0.05, 1e-7, 0.02);
