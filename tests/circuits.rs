//! Circuits that a simulator which knows nothing of the crate has integrated: errors within 3 uncertainties,
//! uncertainties within a factor of 2 of an f64 reference's, and out of bounds once a correction is switched off.
//!
//! How the traces were made: `circuits/README.md`. The reference: `common/recorded.rs`.

mod common;
mod recording;

use brimline::{Integral, Setup, Trust};
use common::recorded::{Attained, Figures, attained};
use recording::setup_file::AnySetup;
use recording::{Correction, Outcome, Recording};

/// A circuit and the corrections that it is about.
const CIRCUITS: [(&str, &[Correction]); 7] = [
    ("lamp", &[Correction::Drift]),
    ("coil", &[LEAK]),
    ("soak", &[SOAKAGE]),
    ("pause", &[Correction::Hold]),
    ("bath", &[LEAK]),
    ("bow", &[NONLINEARITY]),
    ("board", &[LEAK, SOAKAGE, NONLINEARITY, Correction::Hold, Correction::Drift]),
];

const LEAK: Correction = Correction::Key("leak_time_constant_s");
const SOAKAGE: Correction = Correction::Key("soakage");
const NONLINEARITY: Correction = Correction::Key("nonlinearity");

fn circuit(name: &str) -> Recording {
    Recording::new(&format!("tests/circuits/{name}.csv"), &format!("tests/circuits/{name}.toml"))
}

/// What the reference attains, which takes its figures from the set-up and the table from the simulated converter.
fn reference(recording: &Recording) -> Attained {
    let table = &recording.known()["plant"]["nonlinearity"];
    let points = table.as_array().map_or(&[] as &[serde_json::Value], Vec::as_slice);
    let number = |value: &serde_json::Value| value.as_f64().unwrap();
    let nonlinearity = points.iter().map(|point| (number(&point[0]), number(&point[1]))).collect();
    let figures = match recording.setup(None) {
        AnySetup::Charge(setup) => figures(&setup, nonlinearity),
        AnySetup::Flux(setup) => figures(&setup, nonlinearity),
    };
    attained(&figures, &recording.samples())
}

fn figures<Q: Integral>(setup: &Setup<Q>, nonlinearity: Vec<(f64, f64)>) -> Figures {
    let (circuit, converter, noise) = (setup.circuit(), setup.converter(), setup.noise());
    let input_per_count = converter.lsb_v / circuit.gain();
    let drift_limit = circuit.drift_limit_v_per_s() / converter.lsb_v;
    Figures {
        input_per_count,
        readout_var: noise.readout_counts.powi(2) + 1.0 / 12.0,
        level_walk: 0.5 * (noise.input_density / input_per_count).powi(2),
        rate_walk: (noise.offset_wander / input_per_count).powi(2),
        rate_prior_var: drift_limit * drift_limit / 3.0,
        reset_counts: converter.code(circuit.reset_level_v),
        leak_tau_s: circuit.leak_time_constant_s,
        soakage: circuit.soakage.iter().filter(|b| b.share > 0.0).map(|b| (b.share, b.time_constant_s)).collect(),
        nonlinearity,
        tick_hz: converter.tick_hz,
        edge_samples: usize::from(setup.policy().edge_samples),
    }
}

fn off(correction: Correction) -> &'static str {
    match correction {
        Correction::Drift => "drift",
        Correction::Key("leak_time_constant_s") => "leak",
        Correction::Key(key) => key,
        Correction::Hold => "hold",
    }
}

#[test]
fn every_error_is_within_three_uncertainties_and_without_a_correction_it_is_not() {
    println!("| circuit | | error | u | error/u | u / reference u | error/u without |");
    println!("| --- | --- | --- | --- | --- | --- | --- |");
    for (name, corrections) in CIRCUITS {
        let recording = circuit(name);
        let (outcome, truth, reference) = (recording.outcome(), recording.true_integral(), reference(&recording));
        assert_eq!(outcome.trust, Trust::Good, "{name}: {:?}", outcome.reasons);
        let closed = reference.closed.expect("there is a closing zero");
        let (_, closed_u) = outcome.estimates[1];
        let mut without = Vec::new();
        for &correction in corrections {
            let error = (recording.value_without(correction) - truth) / closed_u;
            assert!(error.abs() > 3.0, "{name}: {correction:?} makes no difference: {error} u");
            without.push(format!("{} {error:.0}", off(correction)));
        }
        for ((stage, (value, u)), best) in
            ["at stop", "closed"].iter().zip(outcome.estimates).zip([reference.at_stop, closed])
        {
            let (error, ratio) = ((value - truth) / u, u / best.u);
            let without = without.join(", ");
            println!("| {name} | {stage} | {:.2e} | {u:.2e} | {error:.2} | {ratio:.2} | {without} |", value - truth);
            assert!(error.abs() <= 3.0, "{name} {stage}: {value:e} +- {u:e}, not {truth:e}");
            assert!((0.5..=2.0).contains(&ratio), "{name} {stage}: u {u:e}, the reference {:e}", best.u);
        }
    }
}

#[test]
fn nothing_is_out_of_order_in_a_circuit_that_works() {
    for (name, _) in CIRCUITS {
        let Outcome { resets, events, .. } = circuit(name).outcome();
        let truth = circuit(name).truth();
        assert_eq!(resets as usize, truth["resets"].as_array().unwrap().len(), "{name}");
        for event in events {
            let text = format!("{event:?}");
            assert!(
                text.starts_with("Run") || text.starts_with("ResetClosed") || text.starts_with("ResetOpened"),
                "{name}: {text}"
            );
        }
    }
}
