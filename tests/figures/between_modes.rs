//! What a change of mode, a silence or a fault leaves behind.

use brimline::{Circuit, Converter, Event, Mode, Noise, Policy, Reason, Sample, Setup, Temperature, Trust};

use crate::script::{CIRCUIT, CONVERTER, NOISE, POLICY, SETUP, STEP, Script};
use crate::{assert_near, counts, drift};

/// A zero in which nothing can be seen, the level being at the rail: the drift wanders on.
#[test]
fn a_drift_wanders_on_through_a_zero_at_the_rail() {
    let wander = 1e-12; // one count per second per root second
    let setup = Setup::new(CIRCUIT, CONVERTER, Noise { offset_wander: wander, ..NOISE }, POLICY);
    let at_rail = |script: &mut Script<'_>| {
        for _ in 0..10_000 {
            script.sample_of(Mode::Zero, STEP, 199_999);
        }
    };
    let seen_again = |script: &mut Script<'_>| {
        script.level = 0.0;
        script.zero(5);
        assert!((drift(script).1 - 10.0).abs() < 0.3, "{:?}", drift(script));
    };
    // After a reset,
    let mut script = Script::new(&setup);
    script.zero(300).integrate(20, 0.0).reset(3, 0.0);
    at_rail(&mut script);
    seen_again(&mut script);
    // straight after a run,
    let mut script = Script::new(&setup);
    script.zero(300).integrate(20, 0.0);
    at_rail(&mut script);
    seen_again(&mut script);
    // and in a zero that a silence ends.
    let mut script = Script::new(&setup);
    script.zero(300);
    at_rail(&mut script);
    script.sample_of(Mode::Zero, 2_000_000, 0);
    seen_again(&mut script);
}

#[test]
fn a_silence_early_in_the_closing_zero_costs_its_level() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(500, 2000.0).zero(3);
    script.level += 5_000.0; // whatever happened meanwhile
    script.sample(Mode::Zero, 5_000_000);
    script.zero(300);
    let reading = script.reading();
    let integral = reading.latest().integral;
    let error = -counts(integral.value) - 10_000.0;
    assert!(error.abs() < 3.0 * counts(integral.u), "off by {error}, {reading:?}");
}

#[test]
fn a_reset_after_a_hold_is_judged_by_the_level_after_it() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(500, 2000.0).hold(10, 0.0).reset(3, 0.0);
    script.level = 50_000.0; // let go half way
    script.integrate(50, 2000.0);
    assert!(script.reading().reasons.contains(Reason::ResetNotArrived));
}

#[test]
fn every_reset_is_judged_afresh() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(100, 2000.0).reset(3, 50_000.0).integrate(50, 2000.0).zero(300);
    script.reset(3, 50_000.0).integrate(20, 2000.0);
    assert_eq!(script.reading().trust, Trust::Invalid);
}

/// Exactly at the limit, and one sample period past it.
#[test]
fn limits_of_time_are_allowed_themselves() {
    for (closed, trust) in [(100, Trust::Good), (101, Trust::LowerBound)] {
        let mut script = Script::new(&SETUP);
        script.zero(300).integrate(200, 2000.0).reset(closed, 0.0).integrate(200, 2000.0);
        assert_eq!(script.reading().trust, trust, "{closed} samples");
    }
    // Two sample periods of settling, and the third sample is judged. In the second set-up half of it is the switch's:
    // ten times 10 kohm and 100 nF.
    for (switch_resistance_ohm, settling_s) in [(0.0, 0.02), (10e3, 0.0105)] {
        let circuit = Circuit { switch_resistance_ohm, ..CIRCUIT };
        let setup = Setup::new(circuit, CONVERTER, NOISE, Policy { settling_s, ..POLICY });
        for (late, faults) in [(2, vec![]), (3, vec![Reason::ResetNotArrived])] {
            let mut script = Script::new(&setup);
            script.zero(300).integrate(200, 2000.0).reset(late, 8_000.0).reset(3, 0.0).integrate(50, 2000.0);
            assert_eq!(script.faults(), faults, "{settling_s} {late} {:?}", script.notices);
        }
    }
}

/// The closing zero shows a drift that the data sheet does not allow, and there was no zero before.
#[test]
fn a_drift_past_the_data_sheet_is_told_while_the_closing_zero_lasts() {
    let mut script = Script::new(&SETUP);
    script.drift = 150.0;
    script.reset(5, 0.0).integrate(300, 2000.0).zero(300);
    assert!(script.reading().reasons.contains(Reason::DriftOutsideLimits), "{:?}", script.reading());
}

#[test]
fn the_temperature_of_an_older_zero_is_not_compared_with() {
    let mut script = Script::new(&SETUP);
    let mut feed = |mode, temperature: Option<i32>| {
        for _ in 0..20 {
            script.tick += STEP;
            let temperature = temperature.map(Temperature::from_millidegrees_celsius);
            script.channel.feed(Sample { tick: script.tick, counts: 0, mode, temperature });
        }
    };
    feed(Mode::Zero, Some(20_000));
    feed(Mode::Integrate, Some(21_000));
    feed(Mode::Zero, None);
    feed(Mode::Integrate, Some(23_000));
    assert_eq!(script.reading().warming_mk, None);
}

#[test]
fn the_drift_that_was_taken_off_has_its_sign() {
    let mut script = Script::new(&SETUP);
    script.drift = 80.0;
    script.zero(500).integrate(500, 2000.0);
    // What the level did, times the circuit's sign.
    assert_near(counts(script.reading().drift_removed), -80.0 * 5.0, 0.01);
}

/// After a restarted counter, the line before a reset holds nothing from before.
#[test]
fn a_restarted_counter_s_older_samples_are_in_no_line() {
    let mut script = Script::new(&SETUP);
    script.tick = 1_000_000_000;
    script.zero(300).integrate(500, 2000.0);
    script.tick = 0;
    script.integrate(12, 2000.0).reset(10, 0.0).integrate(100, 2000.0);
    assert_near(counts(script.reading().interpolated), -2000.0 * 0.1, 0.05);
    assert_eq!(script.reading().trust, Trust::Invalid);
}

/// A counter out of order now and then, with time between, is no restarted one.
#[test]
fn single_ticks_out_of_order_are_no_restart() {
    let mut script = Script::new(&SETUP);
    script.tick = 1_000_000_000;
    script.zero(300).integrate(100, 0.0);
    for k in 0..6 {
        let tick = script.tick;
        script.tick = 10_000 * k;
        script.sample_of(Mode::Integrate, STEP, 0);
        script.tick = tick;
        script.integrate(5, 0.0);
    }
    assert!(!script.notices.iter().any(|(_, e)| *e == Event::Fault(Reason::Gap)), "{:?}", script.notices);
    assert!((script.reading().elapsed_s - 1.3).abs() < 1e-9, "{}", script.reading().elapsed_s);
}

/// The level after a reset may be 1 % of the usable span away, 3800 counts, and 5 uncertainties of the pedestal.
#[test]
fn a_pedestal_moves_the_level_that_is_expected_after_a_reset() {
    // 100 mV are 10,000 counts; its uncertainty of 10 mV allows for 5000 more.
    let circuit = Circuit { pedestal_v: 0.1, pedestal_u_v: Some(0.01), ..CIRCUIT };
    let setup = Setup::new(circuit, CONVERTER, NOISE, POLICY);
    for (to, faults) in [
        (10_000.0 + 8_700.0, vec![]),
        (10_000.0 + 8_900.0, vec![Reason::ResetNotArrived]),
        (10_000.0 - 8_700.0, vec![]),
        (10_000.0 - 8_900.0, vec![Reason::ResetNotArrived]),
    ] {
        let mut script = Script::new(&setup);
        script.zero(300).integrate(200, 2000.0).reset(3, 0.0);
        script.level = to;
        script.integrate(50, 0.0);
        assert_eq!(script.faults(), faults, "{to}");
    }
    // While the switch is closed the pedestal is not there yet.
    for (to, faults) in [(3_700.0, vec![]), (3_900.0, vec![Reason::ResetNotArrived])] {
        let mut script = Script::new(&setup);
        script.zero(300).integrate(200, 2000.0).reset(3, to);
        script.level = 10_000.0;
        script.integrate(50, 0.0);
        assert_eq!(script.faults(), faults, "{to}");
    }
}

/// The largest step that is no jump: 100 nA and the data sheet's drift (101 counts/s) over the time since the sample
/// before, and 8 standard deviations of a readout of at most 1.29 counts.
#[test]
fn the_largest_step_holds_the_drift_and_the_noise() {
    // Half a minute between samples, so that the drift counts.
    let circuit = Circuit { rail_low_v: -1e3, rail_high_v: 1e3, ..CIRCUIT };
    let converter = Converter { code_min: -(1 << 26), code_max: 1 << 26, ..CONVERTER };
    let setup = Setup::new(circuit, converter, NOISE, Policy { gap_limit_s: 60.0, ..POLICY });
    let reach = (100_000.0 + 101.0) * 30.0 + 8.0 * 1.29;
    // The rate is rounded up to 2^-16 counts for each microsecond.
    for (beyond, faults) in [(-3.0, vec![]), (30e6 / 65_536.0 + 3.0, vec![Reason::Jump])] {
        let mut script = Script::new(&setup);
        script.drift = 0.0;
        script.zero(300);
        script.noisy = false;
        script.integrate(10, 0.0);
        script.sample_of(Mode::Integrate, 30_000_000, (reach + beyond) as i32);
        assert_eq!(script.faults(), faults, "{beyond}");
    }
}

/// A level that the switch kicks by a few counts when it opens the input: no jump, and no noise either. The value at
/// stop and the closed one cannot both be true, and that is told.
#[test]
fn a_closed_value_that_contradicts_the_one_at_stop_is_told() {
    for (kick, told) in [(4.0, false), (12.0, true)] {
        let mut script = Script::new(&SETUP);
        script.zero(1000).integrate(500, 2000.0);
        script.level += kick;
        script.zero(1000);
        let reading = script.reading();
        assert_eq!(reading.reasons.contains(Reason::Inconsistent), told, "{kick}: {reading:?}");
        assert_eq!(reading.trust == Trust::Good, !told);
    }
}
