//! What the circuit around the integrator does, held to closed formulas: switch, capacitor, leak, soakage, converter,
//! droop.
#![allow(clippy::disallowed_methods, reason = "a reference on the host computes in f64; only src must give equal bits")]

mod reference;
mod script;

#[path = "circuit_figures/between_codes.rs"]
mod between_codes;
#[path = "circuit_figures/converting.rs"]
mod converting;
#[path = "circuit_figures/decay.rs"]
mod decay;
#[path = "circuit_figures/drooping.rs"]
mod drooping;
#[path = "circuit_figures/leak_and_soakage.rs"]
mod leak_and_soakage;
#[path = "circuit_figures/left_out.rs"]
mod left_out;
#[path = "circuit_figures/line.rs"]
mod line;
#[path = "circuit_figures/opening.rs"]
mod opening;
#[path = "circuit_figures/settling.rs"]
mod settling;

use brimline::{Charge, Circuit, Policy, Setup};
use script::{CIRCUIT, POLICY, Script};

/// No drift at all: what is left is the circuit's.
const STILL: Circuit = Circuit { offset_limit_v: 0.0, bias_limit_a: 0.0, ..CIRCUIT };
/// Each sample by itself, any jump allowed, no reading too steady.
const PLAIN: Policy = Policy { zero_block_s: 0.0, frozen_samples: 0, worst_input: None, ..POLICY };

/// Variance of a sample of 1 count of noise and of rounding.
const READOUT: f64 = 1.0 + 1.0 / 12.0;

/// A script without noise and drift.
fn quiet(setup: &Setup<Charge>) -> Script<'_> {
    let mut script = Script::new(setup);
    (script.noisy, script.drift) = (false, 0.0);
    script
}

/// Movement of the output in counts.
fn counts(charge: Charge) -> f64 {
    -charge.as_coulombs() / script::COULOMBS_PER_COUNT
}

#[track_caller]
fn assert_near(value: f64, expected: f64, share: f64) {
    assert!((value / expected - 1.0).abs() <= share, "{value:e} instead of {expected:e}");
}
