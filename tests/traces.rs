//! Recorded traces with known truth: errors within 3 uncertainties, uncertainties no more pessimistic than an f64
//! reference estimator's, and a failed reset never passed off as good.
//!
//! The traces and the reference's uncertainties come from an independent circuit simulation; see `traces/README.md`.

#[path = "../examples/replay/setup_file.rs"]
mod setup_file;
#[path = "../examples/replay/trace_file.rs"]
mod trace_file;

use std::fs::File;
use std::io::BufReader;
use std::path::PathBuf;

use brimline::{Channel, Integral, Mode, Reading, Reason, Setup, Trust};
use setup_file::AnySetup;
use trace_file::TraceFile;

/// A trace's name and the reference's standard uncertainties at stop and closed, as printed in `traces/README.md`.
struct Case {
    name: &'static str,
    reference_u: [f64; 2],
    /// Reference uncertainties leave out what dead time adds: up to 4 times is allowed where resets occur, else 2.
    most: f64,
}

const CASES: [Case; 5] = [
    Case { name: "hatchery", reference_u: [0.6e-10, 0.5e-10], most: 4.0 },
    Case { name: "dim_lamp", reference_u: [2.6e-12, 1.3e-12], most: 2.0 },
    Case { name: "wandering_offset", reference_u: [1.1e-3, 5.3e-4], most: 2.0 },
    Case { name: "search_coil", reference_u: [1.3e-6, 3.7e-7], most: 2.0 },
    Case { name: "tick_wrap", reference_u: [0.6e-10, 0.5e-10], most: 4.0 },
];

/// A reading as bare SI numbers.
struct Outcome {
    /// Value and standard uncertainty, at stop and closed.
    estimates: [(f64, f64); 2],
    uncorrected: f64,
    start_tick: u32,
    end_tick: u32,
    resets: u32,
    trust: Trust,
    reasons: Vec<Reason>,
    drift: (f64, f64),
}

fn path(folder: &str, file: &str) -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join(folder).join(file)
}

fn replay<Q: Integral>(setup: &Setup<Q>, name: &str, si: impl Fn(Q) -> f64) -> Outcome {
    let file = BufReader::new(File::open(path("tests/traces", &format!("{name}.csv"))).unwrap());
    let codes = setup.converter().code_min..=setup.converter().code_max;
    let mut channel = Channel::new(setup);
    let mut at_stop: Option<Reading<Q>> = None;
    for sample in TraceFile::new(file, name, codes).unwrap() {
        let sample = sample.unwrap();
        if channel.mode() == Some(Mode::Integrate) && sample.mode == Mode::Zero {
            at_stop = channel.reading();
        }
        channel.feed(sample);
    }
    let reading = channel.reading().expect("the trace has a run");
    let drift = channel.drift();
    if let Some(live) = at_stop {
        assert_eq!(live.at_stop, reading.at_stop, "what was known when the run stopped");
    }
    let pair = |e: &brimline::Estimate<Q>| (si(e.integral.value), si(e.integral.u));
    Outcome {
        estimates: [pair(&reading.at_stop), reading.closed.as_ref().map_or((f64::NAN, f64::NAN), pair)],
        uncorrected: si(reading.at_stop.integral.value) + si(reading.drift_removed),
        start_tick: reading.start_tick,
        end_tick: reading.end_tick,
        resets: reading.resets,
        trust: reading.trust,
        reasons: reading.reasons.iter().collect(),
        drift: (drift.value.as_volts_per_second(), drift.u.as_volts_per_second()),
    }
}

fn outcome(name: &str) -> Outcome {
    match setup_file::read(&path("examples/setups", &format!("{name}.toml"))).unwrap().setup {
        AnySetup::Charge(setup) => replay(&setup, name, |q| q.as_coulombs()),
        AnySetup::Flux(setup) => replay(&setup, name, |q| q.as_volt_seconds()),
    }
}

fn truth(name: &str) -> serde_json::Value {
    let text = std::fs::read_to_string(path("tests/traces", &format!("{name}.truth.json"))).unwrap();
    serde_json::from_str::<serde_json::Value>(&text).unwrap()["truth"].take()
}

#[test]
fn every_error_is_within_three_uncertainties_and_no_uncertainty_is_far_from_the_reference() {
    println!("| trace | | error | u | error/u | u / reference u |\n| --- | --- | --- | --- | --- | --- |");
    for case in CASES {
        let outcome = outcome(case.name);
        let integral = truth(case.name)["runs"][0]["integral"].as_f64().unwrap();
        for (stage, ((value, u), reference)) in
            ["at stop", "closed"].iter().zip(outcome.estimates.into_iter().zip(case.reference_u))
        {
            let error = value - integral;
            let (scaled, ratio) = (error / u, u / reference);
            println!("| {} | {stage} | {error:.2e} | {u:.2e} | {scaled:.2} | {ratio:.2} |", case.name);
            assert!(scaled.abs() <= 3.0, "{} {stage}: {error:e}, u {u:e}", case.name);
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
        let integral = truth(name)["runs"][0]["integral"].as_f64().unwrap();
        let (with, without) = (outcome.estimates[1].0 - integral, outcome.uncorrected - integral);
        assert!(without.abs() > gain * with.abs(), "{name}: {without:e} {with:e}");
    }
}

#[test]
fn a_reset_switch_that_fails_is_never_good_and_is_named() {
    let outcome = outcome("stuck_switch");
    assert_eq!(outcome.trust, Trust::Invalid);
    assert!(outcome.reasons.contains(&Reason::ResetNotArrived), "{:?}", outcome.reasons);
}
