//! What the board is. The figures of the noise are a start: the notices tell what yours are.

use brimline::{Circuit, Converter, Flux, Noise, Policy, Setup};

/// Rate of the counter that stamps the samples: the core's cycle counter.
pub const TICK_HZ: u32 = 96_000_000;

pub(crate) const PER_SECOND: u32 = 1000;

/// Time from sample to sample.
pub const PERIOD_TICKS: u32 = TICK_HZ / PER_SECOND;

/// Conversions that are added up to one sample: they take about a tenth of a millisecond.
pub const CONVERSIONS: u16 = 16;

/// The integrator and the chip's own converter.
pub const COIL: Setup<Flux> = Setup::new(
    Circuit {
        capacitance_f: 1e-6,
        input_resistance_ohm: Some(22e3),
        // Half the supply, so that flux of either sign has room.
        reset_level_v: 1.65,
        rail_low_v: 0.1,
        rail_high_v: 3.2,
        offset_limit_v: 25e-6,
        bias_limit_a: 10e-12,
        gain_u_rel: 0.01,
        ..Circuit::DEFAULT
    },
    Converter {
        code_zero_v: 0.0,
        lsb_v: 3.3 / 4096.0 / CONVERSIONS as f64,
        code_min: 0,
        code_max: 4095 * CONVERSIONS as i32,
        // The supply, which is the converter's reference; its bend adds some 3 of 4095 codes (from memory).
        lsb_u_rel: 0.01,
        tick_hz: TICK_HZ as f64,
        ..Converter::DEFAULT
    },
    // One code rms for each conversion (from memory), four times that for the sum of 16.
    Noise { readout_counts: 4.0, input_density: 40e-9, ..Noise::NONE },
    // The coil pulled as fast as a hand can; the switches move when the sample has been fed, within half a millisecond.
    Policy { worst_input: Some(0.05), latency_s: 0.5e-3, ..Policy::DEFAULT },
);
