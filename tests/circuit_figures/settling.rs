//! How long a reset takes, and how long the dielectric has to be waited for.

use brimline::{Absorption, Charge, Circuit, Event, Mode, Policy, Reason, Setup};

use crate::script::{CONVERTER, NOISE, STEP};
use crate::{PLAIN, STILL, assert_near, quiet};

/// Seconds until a capacitor that discharges through a resistance, no faster than `slew`, is within `residual_v`: by
/// the midpoint rule, 20,000 steps a time constant.
fn simulated_s(swing_v: f64, residual_v: f64, tau_s: f64, slew: f64) -> f64 {
    let dt = tau_s / 20_000.0;
    let (mut left, mut steps) = (swing_v, 0.0);
    while left > residual_v {
        let half = left - 0.5 * dt * (left / tau_s).min(slew);
        left -= dt * (half / tau_s).min(slew);
        steps += 1.0;
    }
    steps * dt
}

#[test]
fn settling_is_what_a_discharge_takes() {
    for (switch_resistance_ohm, capacitance_f) in [(100.0, 100e-9), (10e3, 1e-6), (5.0, 10e-12)] {
        let circuit = Circuit { switch_resistance_ohm, capacitance_f, slew_v_per_s: None, ..STILL };
        let tau_s = switch_resistance_ohm * capacitance_f;
        for (swing_v, residual_v) in [(3.8, 5e-6), (1.0, 0.999), (10.0, 1e-3), (1e-3, 1e-9)] {
            let simulated = simulated_s(swing_v, residual_v, tau_s, f64::INFINITY);
            let stated = circuit.settling_time_s(swing_v, residual_v);
            // Never too short; the logarithm is at most a thousandth too large.
            let ahead = (stated - simulated) / tau_s;
            assert!((-1e-4..1.1e-3).contains(&ahead), "{swing_v} to {residual_v}: {ahead} time constants");
        }
    }
}

/// By hand: slewing ends where `V/tau` falls to the slew rate, so the sum of both is on the safe side by
/// `tau (1 + ln(swing / (slew tau)))`.
#[test]
fn slewing_comes_on_top() {
    for (slew, tau_s) in [(1_000.0, 1e-3), (50.0, 1e-3), (3e5, 1e-5)] {
        let circuit =
            Circuit { capacitance_f: 1e-6, switch_resistance_ohm: tau_s * 1e6, slew_v_per_s: Some(slew), ..STILL };
        let (swing_v, residual_v) = (3.8, 5e-6);
        let spare = tau_s * (1.0 + (swing_v / (slew * tau_s)).ln());
        let stated = circuit.settling_time_s(swing_v, residual_v);
        assert_near(stated - spare, simulated_s(swing_v, residual_v, tau_s, slew), 1e-3);
        let without = Circuit { slew_v_per_s: None, ..circuit }.settling_time_s(swing_v, residual_v);
        assert_near(stated - without, swing_v / slew, 1e-9);
    }
}

#[test]
fn a_level_that_is_there_already_needs_no_time() {
    let circuit = Circuit { slew_v_per_s: Some(1.0), ..STILL };
    for (swing_v, residual_v) in [(1e-6, 1e-6), (0.0, 1e-6), (-1e-6, 1e-6)] {
        assert_eq!(circuit.settling_time_s(swing_v, residual_v), 0.0, "{swing_v} {residual_v}");
    }
    assert_eq!(circuit.settling_time_s(-1.0, 1e-6), circuit.settling_time_s(1.0, 1e-6), "a swing has a sign");
    for residual_v in [0.0, -1.0, f64::NAN] {
        assert_eq!(circuit.settling_time_s(1.0, residual_v), f64::INFINITY, "{residual_v}");
    }
    assert_eq!(Circuit { switch_resistance_ohm: 0.0, slew_v_per_s: None, ..STILL }.settling_time_s(1.0, 1e-6), 0.0);
    // The whole range of f64 and more.
    let most = Circuit { slew_v_per_s: None, ..STILL }.settling_time_s(1e308, 1e-308);
    assert!((709.0..802.0).contains(&(most / 1e-5)), "{most}");
}

#[test]
fn the_shortest_on_time_is_settling_slewing_and_the_logarithm_of_twice_the_codes() {
    for (settling_s, slew, ohm) in
        [(1e-3, None, 100.0), (0.0, Some(1e3), 100.0), (25e-3, Some(20.0), 50e3), (1e-3, None, 0.0)]
    {
        let circuit = Circuit { switch_resistance_ohm: ohm, slew_v_per_s: slew, ..STILL };
        let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, Policy { settling_s, ..PLAIN });
        let tau_s = ohm * 100e-9;
        // -1.9 V to 1.9 V in codes of 10 uV.
        let expected = settling_s + slew.map_or(0.0, |slew| 3.8 / slew) + tau_s * (2.0 * 380_000.0_f64).ln();
        let ahead = setup.min_on_time_s() - expected;
        // Rounding of the rails to codes may take one or two.
        let code_s = 2e-5 * slew.map_or(0.0, |slew| 1.0 / slew) + 1e-5 * tau_s;
        assert!((-code_s..1.1e-3 * tau_s + 1e-12).contains(&ahead), "{} for {expected}", setup.min_on_time_s());
    }
}

/// A level is judged from the first sample after that time, and not before.
#[test]
fn arrival_is_judged_once_the_shortest_on_time_has_passed() {
    for (settling_s, slew, ohm) in
        [(0.035, None, 100.0), (1e-3, Some(100.0), 100.0), (0.0, None, 50e3), (0.04, None, 0.0)]
    {
        let circuit = Circuit { switch_resistance_ohm: ohm, slew_v_per_s: slew, ..STILL };
        let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, Policy { settling_s, ..PLAIN });
        let mut script = quiet(&setup);
        script.zero(10).integrate(100, 50_000.0);
        let mut samples = 1;
        while script.sample(Mode::Reset, STEP).notices.iter().all(|n| n.event != Event::Fault(Reason::ResetNotArrived))
        {
            samples += 1;
        }
        // A sample at the very end of the time is not judged.
        assert_eq!(samples, (setup.min_on_time_s() / 0.01 + 1e-6).floor() as i32 + 1, "{}", setup.min_on_time_s());
    }
}

/// A level that has not moved at all by the first sample and then goes is no discharge: nothing is told of it.
#[test]
fn a_switch_that_closes_late_is_not_taken_for_a_slow_one() {
    let circuit = Circuit { switch_resistance_ohm: 50e3, ..STILL };
    let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, PLAIN);
    let mut script = quiet(&setup);
    script.zero(10).integrate(100, 50_000.0).reset(1, 50_000.0).reset(20, 0.0);
    assert!(
        script.notices.iter().all(|(_, event)| !matches!(event, Event::SettlingSlow { .. })),
        "{:?}",
        script.notices
    );
}

/// Branches of equal shares, four to a decade of time constants over twelve decades, charged for long and then reset:
/// each gives back `share V0 (1 - e^(-t/tau))`. That is a constant part in each decade of time.
#[test]
fn creep_after_a_reset_is_that_of_branches_in_every_decade() {
    let (share, step_v) = (2.5e-4, 2.0);
    let absorption = Absorption { per_decade: 4.0 * share };
    for after_s in [0.1, 1.0, 20.0, 900.0] {
        let creep = (-24..=24).map(|k| 10.0_f64.powf(f64::from(k) / 4.0)).map(|tau| {
            // V/s of one branch.
            share * step_v * (-after_s / tau).exp() / tau
        });
        let creep: f64 = creep.sum();
        let rate = absorption.rate_v_per_s(step_v, after_s);
        assert_near(rate, creep, 0.01);
        assert_near(absorption.wait_s(step_v, rate), after_s, 1e-12);
        assert_near(absorption.wait_s(-step_v, rate), after_s, 1e-12);
        // `V0 D / (ln 10 t)`.
        assert_near(rate * after_s * 10.0_f64.ln(), step_v * 1e-3, 1e-12);
    }
    assert_eq!(absorption.rate_v_per_s(1.0, 0.0), f64::INFINITY);
    assert_eq!(Absorption { per_decade: 0.0 }.wait_s(1.0, 1e-6), 0.0);
}
