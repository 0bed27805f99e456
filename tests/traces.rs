//! Recorded traces with known truth: errors within 3 uncertainties, uncertainties no more pessimistic than an f64
//! reference estimator's, and a failed reset never passed off as good.
//!
//! The traces and the reference's uncertainties come from an independent circuit simulation; see `traces/README.md`.

mod recording;

use brimline::{Reason, Trust};
use recording::{Correction, Outcome, Recording};

/// A trace's name and the reference's standard uncertainties at stop and closed, as printed in `traces/README.md`.
struct Case {
    name: &'static str,
    reference_u: [f64; 2],
    /// Reference uncertainties leave out what dead time adds: up to 4 times is allowed where resets occur, else 2.
    most: f64,
    /// The correction that the trace is about.
    about: Correction,
}

const CASES: [Case; 8] = [
    Case { name: "hatchery", reference_u: [0.6e-10, 0.5e-10], most: 4.0, about: Correction::Drift },
    Case { name: "dim_lamp", reference_u: [2.6e-12, 1.3e-12], most: 2.0, about: Correction::Drift },
    Case { name: "wandering_offset", reference_u: [1.1e-3, 5.3e-4], most: 2.0, about: Correction::Drift },
    Case { name: "search_coil", reference_u: [1.3e-6, 3.7e-7], most: 2.0, about: Correction::Drift },
    Case { name: "leaky", reference_u: [1.2e-6, 0.9e-6], most: 2.0, about: Correction::Key("leak_time_constant_s") },
    Case { name: "soakage", reference_u: [0.4e-10, 0.3e-10], most: 2.0, about: Correction::Key("soakage") },
    Case { name: "held", reference_u: [2.5e-5, 2.1e-5], most: 2.0, about: Correction::Hold },
    Case { name: "tick_wrap", reference_u: [0.6e-10, 0.5e-10], most: 4.0, about: Correction::Drift },
];

fn recording(name: &str) -> Recording {
    Recording::new(&format!("tests/traces/{name}.csv"), &format!("examples/setups/{name}.toml"))
}

fn outcome(name: &str) -> Outcome {
    recording(name).outcome()
}

fn truth(name: &str) -> serde_json::Value {
    recording(name).truth()
}

#[test]
fn every_error_is_within_three_uncertainties_and_no_uncertainty_is_far_from_the_reference() {
    println!("| trace | | error | u | error/u | u / reference u | error without its correction |");
    println!("| --- | --- | --- | --- | --- | --- | --- |");
    for case in CASES {
        let outcome = outcome(case.name);
        let integral = recording(case.name).true_integral();
        let without = recording(case.name).value_without(case.about) - integral;
        for (stage, ((value, u), reference)) in
            ["at stop", "closed"].iter().zip(outcome.estimates.into_iter().zip(case.reference_u))
        {
            let error = value - integral;
            let (scaled, ratio) = (error / u, u / reference);
            let worse = format!("{without:.2e} ({:.0} u)", (without / u).abs());
            println!("| {} | {stage} | {error:.2e} | {u:.2e} | {scaled:.2} | {ratio:.2} | {worse} |", case.name);
            assert!(scaled.abs() <= 3.0, "{} {stage}: {error:e}, u {u:e}", case.name);
            assert!(without.abs() > 3.0 * u, "{} {stage}: {:?} makes no difference", case.name, case.about);
            assert!(ratio >= 0.5 && ratio <= case.most, "{} {stage}: {u:e} against {reference:e}", case.name);
        }
        assert_eq!(outcome.trust, Trust::Good, "{}", case.name);
    }
}

#[test]
fn runs_and_resets_are_where_they_were() {
    for case in CASES {
        let (outcome, truth) = (outcome(case.name), truth(case.name));
        // Ticks are stamped with up to 0.2 ms of jitter in one trace, and the truth counts on past 2^32.
        for (tick, key) in [(outcome.start_tick, "start_tick"), (outcome.end_tick, "end_tick")] {
            let expected = truth["runs"][0][key].as_u64().unwrap() as u32;
            assert!(tick.wrapping_sub(expected).cast_signed().abs() <= 200, "{} {key} {tick} {expected}", case.name);
        }
        assert_eq!(outcome.resets as usize, truth["resets"].as_array().unwrap().len(), "{}", case.name);
    }
}

#[test]
fn the_drift_is_found() {
    for case in CASES.iter().filter(|case| case.name != "wandering_offset") {
        let (found, u) = outcome(case.name).drift;
        let expected = truth(case.name)["final_drift_v_per_s"].as_f64().unwrap();
        assert!((found - expected).abs() <= 3.0 * u, "{}: {found:e} {expected:e} {u:e}", case.name);
        assert!(u < 0.1 * expected.abs(), "{}: {u:e}", case.name);
    }
}

#[test]
fn correction_gains_where_drift_matters() {
    for (name, gain) in [("dim_lamp", 1000.0), ("wandering_offset", 25.0), ("search_coil", 100.0)] {
        let outcome = outcome(name);
        let integral = recording(name).true_integral();
        let (with, without) = (outcome.estimates[1].0 - integral, outcome.uncorrected - integral);
        assert!(without.abs() > gain * with.abs(), "{name}: {without:e} {with:e}");
    }
}

/// A reset needs no waiting time: what the dielectric gives back is taken off, twentyfold and more.
#[test]
fn soakage_is_taken_off_twentyfold() {
    let soakage = recording("soakage");
    let (value, u) = soakage.outcome().estimates[1];
    let error = (value - soakage.true_integral()).abs();
    let without = (soakage.value_without(Correction::Key("soakage")) - soakage.true_integral()).abs();
    assert!(without > 20.0 * error && without > 20.0 * u, "{without:e} {error:e} {u:e}");
}

/// The plant of `held` has an offset of 600 uV and a bias of 120 pA (`held.truth.json`).
#[test]
fn zeros_and_holds_tell_offset_from_bias() {
    let [offset, bias] = outcome("held").amplifier.expect("there is a hold");
    for ((value, u), expected, most) in [(offset, 600e-6, 1e-6), (bias, 120e-12, 1e-12)] {
        assert!((value - expected).abs() <= 3.0 * u && u < most, "{value:e} +- {u:e}, not {expected:e}");
    }
    assert_eq!(outcome("hatchery").amplifier, None, "without a hold nobody can tell");
}

#[test]
fn a_reset_switch_that_fails_is_never_good_and_is_named() {
    let outcome = outcome("stuck_switch");
    assert_eq!(outcome.trust, Trust::Invalid);
    assert!(outcome.reasons.contains(&Reason::ResetNotArrived), "{:?}", outcome.reasons);
}
