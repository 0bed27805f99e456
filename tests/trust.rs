//! States in which a wrong reading must not be called good, and harmless ones that must.

mod script;

use brimline::{Circuit, Converter, Event, Mode, Policy, Reason, Setup, Trust};
use script::{CIRCUIT, CONVERTER, NOISE, POLICY, SETUP, STEP, Script, coulombs};

/// Good only if the latest estimate is within 5 of its uncertainties.
#[track_caller]
fn assert_not_wrongly_good(script: &Script<'_>, truth_counts: f64) {
    let reading = script.reading();
    let integral = reading.latest().integral;
    let error = integral.value.as_coulombs() - coulombs(truth_counts);
    let wrong = error.abs() > 5.0 * integral.u.as_coulombs();
    assert!(!wrong || reading.trust != Trust::Good, "off by {error:e}, {reading:?}");
}

#[test]
fn a_reset_that_no_sample_shows_between_run_and_zero() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(500, 10_000.0);
    script.level = 0.0;
    script.zero(300);
    assert_not_wrongly_good(&script, 50_000.0);
    assert!(script.reading().reasons.contains(Reason::Jump));
}

#[test]
fn a_reset_that_no_sample_shows_between_zero_and_run() {
    let mut script = Script::new(&SETUP);
    script.level = 45_000.0;
    script.zero(300);
    script.level = 0.0;
    script.integrate(500, 2000.0);
    assert_not_wrongly_good(&script, 10_000.0);
}

#[test]
fn without_a_worst_case_input_a_jump_by_a_quarter_of_the_range_is_still_seen() {
    let setup = Setup::new(CIRCUIT, CONVERTER, NOISE, Policy { worst_input: None, ..POLICY });
    let mut script = Script::new(&setup);
    script.zero(300).integrate(1000, 12_000.0);
    script.level = 0.0;
    script.integrate(100, 12_000.0);
    assert_not_wrongly_good(&script, 132_000.0);
}

#[test]
fn one_wild_sample_at_the_start_of_the_closing_zero() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(500, 2000.0);
    script.sample_of(Mode::Zero, STEP, 40_000);
    script.zero(300);
    assert_not_wrongly_good(&script, 10_000.0);
}

#[test]
fn a_step_in_the_middle_of_a_zero_is_an_onset_and_stays_in_the_run_that_follows() {
    let mut script = Script::new(&SETUP);
    script.zero(300);
    script.level += 300.0;
    script.zero(300);
    let onset = script.notices.iter().find(|(_, event)| *event == Event::InputInZero).map(|&(tick, _)| tick);
    assert_eq!(onset, Some(301 * STEP));
    script.integrate(500, 2000.0);
    let reading = script.reading();
    let error = reading.at_stop.integral.value.as_coulombs() - coulombs(10_300.0);
    assert!(error.abs() < 3.0 * reading.at_stop.integral.u.as_coulombs(), "{error:e} {reading:?}");
    assert_eq!(reading.trust, Trust::LowerBound);
}

#[test]
fn a_step_in_the_closing_zero_is_left_out_of_the_finished_run() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(500, 2000.0).zero(300);
    script.level += 100.0;
    script.zero(300);
    let reading = script.reading();
    let closed = reading.closed.expect("closed").integral;
    let error = closed.value.as_coulombs() - coulombs(10_000.0);
    assert!(error.abs() < 3.0 * closed.u.as_coulombs(), "{error:e} {closed:?}");
    assert_eq!(reading.trust, Trust::Good);
}

#[test]
fn light_in_the_first_second_of_a_zero_spoils_no_later_run() {
    let mut script = Script::new(&SETUP);
    for _ in 0..100 {
        script.level += 0.8;
        script.zero(1);
    }
    script.zero(2000);
    for _ in 0..3 {
        script.integrate(500, 2000.0).zero(1000);
        assert_not_wrongly_good(&script, 10_000.0);
    }
    assert_eq!(script.reading().trust, Trust::Good, "the last one is");
}

#[test]
fn a_drift_that_changes_between_runs_is_learned_anew() {
    let mut script = Script::new(&SETUP);
    script.zero(1000).integrate(500, 2000.0).zero(1000);
    script.drift = 25.0;
    for _ in 0..4 {
        script.integrate(500, 2000.0).zero(1000);
        assert_not_wrongly_good(&script, 10_000.0);
    }
    assert_eq!(script.reading().trust, Trust::Good, "the last one is");
}

#[test]
fn a_switch_stuck_closed_is_not_good() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(500, 2000.0).reset(2, 0.0);
    for _ in 0..500 {
        script.level = 0.0;
        script.sample(Mode::Integrate, STEP);
    }
    for _ in 0..300 {
        script.level = 0.0;
        script.sample(Mode::Zero, STEP);
    }
    assert_not_wrongly_good(&script, 20_000.0);
}

#[test]
fn a_single_sample_after_a_reset_is_a_guess() {
    let mut script = Script::new(&SETUP);
    script.zero(300).reset(2, 0.0).integrate(1, 5_000.0).zero(300);
    assert_not_wrongly_good(&script, 50.0);
    assert!(script.reading().reasons.contains(Reason::DeadTime));
}

#[test]
fn a_reset_that_lasts_longer_than_a_gap_may_is_a_guess() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(200, 2000.0).reset(102, 0.0).integrate(200, 2000.0);
    assert_eq!(script.reading().trust, Trust::LowerBound);
    assert!(script.reading().reasons.contains(Reason::DeadTime));
}

#[test]
fn a_guess_at_dead_time_adds_nothing() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(200, 20_000.0).reset(20, 0.0).integrate(1, 0.0).zero(300);
    // The input ended with the switch: 2 s and nothing after.
    let closed = script.reading().closed.expect("closed").integral;
    assert!(closed.value.as_coulombs().abs() < coulombs(40_000.0).abs() + 3.0 * closed.u.as_coulombs(), "{closed:?}");
    assert_eq!(script.reading().trust, Trust::LowerBound);
}

#[test]
fn a_closing_zero_that_begins_at_the_rail_and_is_reset() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(500, 10_000.0);
    script.sample_of(Mode::Zero, STEP, 199_000);
    script.reset(3, 0.0).zero(300);
    assert_not_wrongly_good(&script, 50_000.0);
    let closed = script.reading().closed.expect("the drift closes it").integral;
    let error = closed.value.as_coulombs() - coulombs(50_000.0);
    assert!(error.abs() < 3.0 * closed.u.as_coulombs(), "{error:e} {closed:?}");
}

#[test]
fn a_restarted_counter_is_told_and_then_listened_to_again() {
    let mut script = Script::new(&SETUP);
    script.tick = 1_000_000_000;
    script.zero(300).integrate(500, 2000.0);
    script.tick = 0;
    script.integrate(20, 2000.0);
    assert_eq!(script.reading().trust, Trust::Invalid);
    script.zero(300).integrate(500, 2000.0).zero(300);
    let closed = script.reading().closed.expect("closed").integral;
    let error = closed.value.as_coulombs() - coulombs(10_000.0);
    assert!(error.abs() < 3.0 * closed.u.as_coulombs(), "{error:e} {closed:?}");
    assert_eq!(script.reading().trust, Trust::Good);
}

#[test]
fn a_reset_is_asked_for_even_while_the_counter_stands() {
    let mut script = Script::new(&SETUP);
    script.drift = 0.0;
    script.zero(100).integrate(10, 0.0);
    assert_eq!(script.sample_of(Mode::Integrate, 0, 189_999).request, Some(Mode::Reset));
}

#[test]
fn a_reset_level_beside_a_rail_is_no_reason_to_reset() {
    let circuit = Circuit { rail_low_v: -12.0, rail_high_v: 12.0, reset_level_v: 0.4e-3, ..CIRCUIT };
    let converter = Converter { code_zero_v: 0.0, lsb_v: 76e-6, code_min: 0, code_max: 65_535, ..CONVERTER };
    let setup = Setup::new(circuit, converter, NOISE, POLICY);
    let mut script = Script::new(&setup);
    script.level = 5.0;
    script.drift = 0.0;
    for _ in 0..100 {
        assert_eq!(script.sample(Mode::Integrate, STEP).request, None);
    }
}

#[test]
fn a_bad_start_is_forgiven_by_a_good_zero() {
    let mut script = Script::new(&SETUP);
    for _ in 0..5 {
        script.sample_of(Mode::Zero, STEP, 199_999);
    }
    script.reset(3, 0.0).zero(1000).integrate(500, 2000.0);
    assert_eq!(script.reading().trust, Trust::Good);
}

#[test]
fn a_zero_that_drifts_into_the_rail_does_not_reach_back() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(500, 2000.0).zero(300);
    for _ in 0..5 {
        script.sample_of(Mode::Zero, STEP, 199_999);
    }
    assert_eq!(script.reading().trust, Trust::Good);
}

#[test]
fn a_droop_after_a_reset_is_not_a_reset_that_failed() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(500, 2000.0).reset(3, 0.0).hold(1000, 5_000.0).integrate(200, 2000.0);
    let reasons: Vec<Reason> = script.reading().reasons.iter().collect();
    assert_eq!(reasons, [Reason::DroopOutsideLimits], "{:?}", script.notices);
}

#[test]
fn a_reset_within_a_hold_misses_no_input() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(300, 2000.0).hold(50, 10.0).reset(80, 0.0).hold(10, 10.0).integrate(300, 2000.0);
    let reading = script.reading();
    let error = reading.at_stop.integral.value.as_coulombs() - coulombs(12_000.0);
    assert!(error.abs() < 3.0 * reading.at_stop.integral.u.as_coulombs(), "{error:e}");
    assert!((reading.interpolated.as_coulombs()).abs() < 1e-15);
    assert_eq!((reading.trust, reading.resets), (Trust::Good, 1));
}

#[test]
fn drift_in_dead_time_is_not_interpolated_input() {
    let mut script = Script::new(&SETUP);
    script.drift = 100.0;
    script.zero(500).integrate(200, 0.0).reset(50, 0.0).integrate(200, 0.0);
    let reading = script.reading();
    assert!(reading.interpolated.as_coulombs().abs() < 5e-12, "{reading:?}");
    assert!(reading.measured.as_coulombs().abs() < 10e-12, "{reading:?}");
}

#[test]
fn a_set_up_whose_codes_overflow_is_refused() {
    let converter = Converter { code_zero_v: 1000.0, lsb_v: 1e-7, code_min: 0, ..CONVERTER };
    let circuit = Circuit { rail_low_v: -12.0, rail_high_v: 12.0, ..CIRCUIT };
    assert!(Setup::<brimline::Charge>::try_new(circuit, converter, NOISE, POLICY).is_err());
}
