//! A board that cannot be true is refused by name.

mod script;

use brimline::{Charge, Circuit, Converter, Flux, Noise, Policy, Setup};
use script::{CIRCUIT, CONVERTER, NOISE, POLICY};

fn refused(circuit: Circuit, converter: Converter, noise: Noise, policy: Policy) -> &'static str {
    Setup::<Charge>::try_new(circuit, converter, noise, policy).map_or_else(|e| e.parameter, |_| "accepted")
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
        circuit.switch_resistance_ohm: [-1.0, 2e6, nan]
        circuit.gain_u_rel: [-0.1, 1.1, nan]
        converter.code_zero_v: [2e6, nan]
        converter.lsb_v: [0.0, -1e-6, 1001.0, nan]
        converter.code_min: [i32::MIN, i32::MAX]
        converter.code_max: [-200_000, i32::MAX]
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
        policy.arrival_tolerance_v: [Some(0.0), Some(nan), Some(2000.0)]
    }
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
