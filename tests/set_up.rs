//! A board that cannot be true is refused by name.

mod script;

use brimline::{Charge, Circuit, Converter, Flux, Noise, Policy, Setup, SoakageBranch};
use script::{CIRCUIT, CONVERTER, NOISE, POLICY};

fn refused(circuit: Circuit, converter: Converter, noise: Noise, policy: Policy) -> &'static str {
    Setup::<Charge>::try_new(circuit, converter, noise, policy).map_or_else(|e| e.parameter, |_| "accepted")
}

/// A branch in the last place, where it must not be overlooked.
fn branch(share: f64, time_constant_s: f64) -> [SoakageBranch; 4] {
    let mut branches = [SoakageBranch::NONE; 4];
    branches[3] = SoakageBranch { share, time_constant_s };
    branches
}

/// Each value goes into its field and is refused under that field's name.
macro_rules! refuses {
    ($($part:ident . $field:ident : [$($value:expr),+ $(,)?])+) => {
        $($(
            let mut set = (CIRCUIT, CONVERTER, NOISE, POLICY);
            refuses!(@ set $part).$field = $value;
            assert_eq!(refused(set.0, set.1, set.2, set.3), stringify!($field), "{:?}", $value);
        )+)+
    };
    (@ $set:ident circuit) => { $set.0 };
    (@ $set:ident converter) => { $set.1 };
    (@ $set:ident noise) => { $set.2 };
    (@ $set:ident policy) => { $set.3 };
}

#[test]
fn each_parameter_is_refused_by_name() {
    let nan = f64::NAN;
    let infinite = f64::INFINITY;
    assert_eq!(refused(CIRCUIT, CONVERTER, NOISE, POLICY), "accepted");
    refuses! {
        circuit.capacitance_f: [0.0, -1e-9, 1.1, nan, infinite]
        circuit.input_resistance_ohm: [Some(1e4)]
        circuit.reset_level_v: [-1.95, 1.95, nan]
        circuit.rail_low_v: [-1001.0, nan]
        circuit.rail_high_v: [-1.9, -2.0, 1001.0, nan]
        circuit.offset_limit_v: [-1e-9, 1.1, nan]
        circuit.bias_limit_a: [-1e-12, 1.1, nan]
        circuit.source_resistance_ohm: [0.0, -1.0, 2e18, nan]
        circuit.pedestal_v: [1.1, -1.1, nan]
        circuit.pedestal_u_v: [Some(-1e-6), Some(1.1), Some(nan)]
        circuit.leak_time_constant_s: [Some(0.0), Some(-1.0), Some(nan), Some(infinite), Some(15e-6), Some(1.71e7)]
        circuit.leak_u_rel: [-0.1, 1.1, nan]
        circuit.soakage: [
            branch(-1e-9, 1.0),
            branch(0.51, 1.0),
            branch(nan, 1.0),
            branch(0.01, 0.0),
            branch(0.01, -1.0),
            branch(0.01, 0.9e-6),
            branch(0.01, 1.1e9),
            branch(0.01, nan),
        ]
        circuit.soakage_u_rel: [-0.1, 1.1, nan]
        circuit.slew_v_per_s: [Some(0.0), Some(-1.0), Some(1.1e12), Some(nan), Some(infinite)]
        circuit.switch_resistance_ohm: [-1.0, 2e6, nan]
        circuit.gain_u_rel: [-0.1, 1.1, nan]
        converter.code_zero_v: [2e6, nan]
        converter.lsb_v: [0.0, -1e-6, 1001.0, nan]
        converter.code_min: [i32::MIN, i32::MAX]
        converter.code_max: [-200_000, i32::MAX]
        converter.code_zero_u_v: [-1e-9, 1.1e6, nan, infinite]
        converter.linearity_u_counts: [-0.1, 2e4, nan]
        converter.lsb_u_rel: [-0.1, 1.1, nan]
        converter.tick_hz: [0.5, 5e9, nan]
        noise.readout_counts: [-0.1, 2e6, nan]
        noise.input_density: [-1e-15, 1.1, nan, 1e-3]
        noise.input_flicker: [-1e-15, 1.1, nan, 1e-3]
        noise.offset_wander: [-1e-15, 1.1, nan, 1e-3]
        policy.edge_samples: [0, 1, 17]
        policy.gap_limit_s: [0.0, -1.0, 2147.5, nan]
        policy.worst_input: [Some(0.0), Some(-1.0), Some(nan), Some(1e6)]
        policy.input_slew: [Some(-1.0), Some(2e6), Some(nan), Some(1.0)]
        policy.latency_s: [-1.0, 4000.0, nan]
        policy.guard_sigma: [-1.0, 101.0, nan]
        policy.settling_s: [-1.0, 4000.0, nan]
        policy.reset_attempts: [0]
        policy.arrival_tolerance_v: [Some(0.0), Some(nan), Some(2000.0)]
    }
}

/// The same with values at the ends of what is allowed.
macro_rules! accepts {
    ($($part:ident . $field:ident : [$($value:expr),+ $(,)?])+) => {
        $($(
            let mut set = (CIRCUIT, CONVERTER, NOISE, POLICY);
            refuses!(@ set $part).$field = $value;
            assert_eq!(refused(set.0, set.1, set.2, set.3), "accepted", "{} {:?}", stringify!($field), $value);
        )+)+
    };
}

#[test]
fn the_ends_of_each_range_are_accepted() {
    accepts! {
        circuit.leak_time_constant_s: [None::<f64>, Some(16e-6), Some(1.69e7)]
        circuit.leak_u_rel: [0.0, 1.0]
        circuit.soakage: [branch(0.0, 1.0), branch(0.0, f64::NAN), branch(0.5, 1e-6), branch(0.5, 0.99e9)]
        circuit.soakage_u_rel: [0.0, 1.0]
        circuit.slew_v_per_s: [None::<f64>, Some(10.0), Some(1e12)]
        circuit.switch_resistance_ohm: [0.0, 7e5]
        converter.code_zero_u_v: [0.0, 1.0]
        converter.lsb_u_rel: [0.0, 1.0]
        policy.reset_attempts: [1, 255]
    }
}

/// An offset that a short leak turns into more drift than numbers hold is refused as the offset's.
#[test]
fn a_leak_so_fast_that_the_offset_is_drift_without_limit_is_refused() {
    let circuit = Circuit { offset_limit_v: 0.5, leak_time_constant_s: Some(16e-6), ..CIRCUIT };
    assert_eq!(refused(circuit, CONVERTER, NOISE, POLICY), "offset_limit_v");
    let noise = Noise { readout_counts: 0.0, ..NOISE };
    let unsure = Converter { code_zero_u_v: 0.5, ..CONVERTER };
    let circuit = Circuit { offset_limit_v: 0.0, ..circuit };
    assert_eq!(refused(circuit, unsure, noise, POLICY), "offset_limit_v");
    assert_eq!(refused(circuit, CONVERTER, noise, POLICY), "accepted");
}

#[test]
fn what_is_measured_must_fit_the_input() {
    let flux = Setup::<Flux>::try_new(CIRCUIT, CONVERTER, NOISE, Policy { worst_input: None, ..POLICY });
    assert_eq!(flux.map(|_| ()).map_err(|e| e.parameter), Err("input_resistance_ohm"));
    let through = Circuit { input_resistance_ohm: Some(22e3), ..CIRCUIT };
    assert!(Setup::<Flux>::try_new(through, CONVERTER, NOISE, Policy { worst_input: None, ..POLICY }).is_ok());
    for resistance in [0.0, -1.0, 1e16, f64::NAN] {
        let bad = Circuit { input_resistance_ohm: Some(resistance), ..CIRCUIT };
        let refusal = Setup::<Flux>::try_new(bad, CONVERTER, NOISE, POLICY).map(|_| ());
        assert_eq!(refusal.map_err(|e| e.parameter), Err("input_resistance_ohm"));
    }
}

#[test]
fn the_message_says_what_is_allowed() {
    let error =
        Setup::<Charge>::try_new(Circuit { capacitance_f: 0.0, ..CIRCUIT }, CONVERTER, NOISE, POLICY).unwrap_err();
    assert_eq!(error.to_string(), "capacitance_f must be above 0 and at most 1 (farad)");
}

#[test]
fn rails_that_leave_no_codes_are_refused() {
    let narrow = Circuit { rail_low_v: -20e-6, rail_high_v: 20e-6, ..CIRCUIT };
    assert_eq!(refused(narrow, CONVERTER, NOISE, POLICY), "rail_high_v");
}

/// A reset that has to last longer than the longest dead time would spoil every run.
#[test]
fn a_reset_longer_than_the_longest_gap_is_refused() {
    let slow = Circuit { switch_resistance_ohm: 1e6, ..CIRCUIT };
    assert_eq!(refused(slow, CONVERTER, NOISE, POLICY), "gap_limit_s");
    assert_eq!(refused(slow, CONVERTER, NOISE, Policy { gap_limit_s: 2.0, ..POLICY }), "accepted");
}
