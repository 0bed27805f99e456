//! A reset switch that fails, in every way that the simulated one knows: what is told, what is asked for, and that a
//! healthy one is never blamed.

#[path = "switch_faults/arrival.rs"]
mod arrival;
#[path = "switch_faults/bench.rs"]
mod bench;
#[path = "switch_faults/healthy.rs"]
mod healthy;
#[path = "switch_faults/leaking.rs"]
mod leaking;
#[path = "switch_faults/retries.rs"]
mod retries;
#[path = "switch_faults/settling.rs"]
mod settling;
#[path = "switch_faults/stuck.rs"]
mod stuck;

use bench::{Bench, Fault};
use brimline::{Charge, Circuit, Converter, Noise, Policy, Setup};

/// 100 nF, 10 uV per code, 1 MHz counter: 1 count is 1 pC. The switch has 1 kohm: a time constant of 0.1 ms.
const CIRCUIT: Circuit = Circuit {
    capacitance_f: 100e-9,
    rail_low_v: -1.9,
    rail_high_v: 1.9,
    switch_resistance_ohm: 1e3,
    ..Circuit::DEFAULT
};
const CONVERTER: Converter =
    Converter { code_zero_v: 0.0, lsb_v: 10e-6, code_min: -200_000, code_max: 199_999, ..Converter::DEFAULT };
const NOISE: Noise = Noise { readout_counts: 1.0, ..Noise::NONE };
const POLICY: Policy = Policy { worst_input: Some(100e-9), ..Policy::DEFAULT };
const SETUP: Setup<Charge> = Setup::new(CIRCUIT, CONVERTER, NOISE, POLICY);

/// A bench after power-up and an opening zero of 3 s.
fn opened<'s>(setup: &'s Setup<Charge>, fault: Fault, seed: u64) -> Bench<'s> {
    let mut bench = Bench::new(setup, fault, seed);
    bench.reset(5).zero(300);
    bench
}
