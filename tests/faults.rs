//! Nothing that can spoil a reading passes silently, and nothing harmless is blamed.

mod script;

use brimline::{Circuit, Event, Mode, Noise, Policy, Reason, Setup, Trust};
use script::{CIRCUIT, CONVERTER, NOISE, POLICY, SETUP, STEP, Script, coulombs};

/// A clean run: 3 s of zero, 5 s at 2000 counts/s.
fn clean() -> Script<'static> {
    let mut script = Script::new(&SETUP);
    script.reset(5, 0.0).zero(300).integrate(500, 2000.0);
    script
}

#[track_caller]
fn assert_reason(script: &Script<'_>, reason: Reason, trust: Trust) {
    let reading = script.reading();
    assert!(reading.reasons.contains(reason), "{:?}", reading.reasons);
    assert_eq!(reading.trust, trust);
    assert_eq!(script.faults().iter().filter(|&&r| r == reason).count(), 1, "stated once: {:?}", script.notices);
}

#[test]
fn a_clean_run_is_good() {
    let mut script = clean();
    script.zero(300);
    let reading = script.reading();
    assert_eq!((reading.trust, script.faults()), (Trust::Good, vec![]));
    let closed = reading.closed.expect("closed").integral;
    let error = closed.value.as_coulombs() - coulombs(10_000.0);
    assert!(error.abs() < 3.0 * closed.u.as_coulombs(), "{error:e} {closed:?}");
}

#[test]
fn a_level_at_a_rail_makes_a_lower_bound() {
    let mut script = clean();
    script.integrate(1_980, 9_000.0);
    assert!(script.level > 188_000.0 && script.reading().trust == Trust::Good);
    script.integrate(30, 9_000.0);
    assert!(script.level > 190_000.0);
    script.integrate(50, -9_000.0);
    assert_reason(&script, Reason::AtRail, Trust::LowerBound);
}

#[test]
fn a_converter_at_its_end_code_makes_a_lower_bound() {
    let wide = Circuit { rail_low_v: -12.0, rail_high_v: 12.0, ..CIRCUIT };
    let setup = Setup::new(wide, CONVERTER, NOISE, Policy { worst_input: None, ..POLICY });
    for end in [-200_000, 199_999] {
        let mut script = Script::new(&setup);
        script.zero(100).integrate(10, 0.0);
        assert_eq!(script.reading().trust, Trust::Good);
        for part in [0.4, 0.8, 1.0] {
            script.sample_of(Mode::Integrate, STEP, (part * f64::from(end)) as i32);
        }
        assert_reason(&script, Reason::AtRail, Trust::LowerBound);
    }
}

#[test]
fn the_first_code_inside_the_end_code_is_good() {
    let wide = Circuit { rail_low_v: -12.0, rail_high_v: 12.0, ..CIRCUIT };
    let setup = Setup::new(wide, CONVERTER, NOISE, Policy { worst_input: None, ..POLICY });
    let mut script = Script::new(&setup);
    script.zero(100).integrate(10, 0.0);
    for code in [80_000, 160_000, 199_998] {
        script.sample_of(Mode::Integrate, STEP, code);
    }
    assert_eq!(script.reading().trust, Trust::Good);
}

#[test]
fn a_gap_in_a_run_makes_a_lower_bound() {
    let mut script = clean();
    script.sample(Mode::Integrate, 1_000_001);
    assert_reason(&script, Reason::Gap, Trust::LowerBound);
}

#[test]
fn a_gap_at_the_very_end_of_a_run_makes_a_lower_bound() {
    let mut script = clean();
    script.level += script.drift;
    script.sample(Mode::Zero, 1_000_001);
    script.zero(100);
    assert_reason(&script, Reason::Gap, Trust::LowerBound);
}

#[test]
fn a_silence_within_the_limit_is_good() {
    let mut script = clean();
    script.sample(Mode::Integrate, 1_000_000);
    assert_eq!(script.reading().trust, Trust::Good);
}

#[test]
fn a_gap_within_a_zero_costs_the_level_but_not_the_trust() {
    let mut script = Script::new(&SETUP);
    script.zero(300);
    script.level += 5_000.0; // whatever happened meanwhile
    script.sample(Mode::Zero, 5_000_000);
    script.zero(300).integrate(500, 2000.0);
    let reading = script.reading();
    let error = reading.at_stop.integral.value.as_coulombs() - coulombs(10_000.0);
    assert_eq!(reading.trust, Trust::Good);
    assert!(error.abs() < 3.0 * reading.at_stop.integral.u.as_coulombs(), "{error:e} {reading:?}");
}

#[test]
fn a_reset_that_no_sample_shows_is_a_jump() {
    let mut script = clean();
    script.level = 0.0;
    script.integrate(10, 2000.0);
    assert_reason(&script, Reason::Jump, Trust::Invalid);
}

#[test]
fn the_worst_case_input_is_no_jump() {
    let mut script = clean();
    // 100 nA and the full drift of the data sheet.
    script.integrate(50, -100_000.0 - 1.01e3);
    assert_eq!(script.faults(), vec![]);
}

#[test]
fn frozen_readings_make_a_run_invalid() {
    let mut script = clean();
    for _ in 0..70 {
        script.sample_of(Mode::Integrate, STEP, 10_100);
    }
    assert_reason(&script, Reason::Frozen, Trust::Invalid);
}

#[test]
fn a_channel_too_quiet_to_dither_is_not_frozen() {
    let setup = Setup::new(CIRCUIT, CONVERTER, Noise { readout_counts: 0.1, ..NOISE }, POLICY);
    let mut script = Script::new(&setup);
    script.noisy = false;
    script.drift = 0.0;
    script.zero(300).integrate(300, 0.0);
    assert_eq!(script.reading().trust, Trust::Good);
}

#[test]
fn a_drift_past_the_data_sheet_makes_the_next_run_invalid() {
    let mut script = Script::new(&SETUP);
    // The limit is (1 mV / 1 Gohm + 100 pA) / 100 nF = 1.01 mV/s = 101 counts/s.
    script.drift = 150.0;
    script.reset(5, 0.0).zero(300).integrate(10, 2000.0);
    assert_reason(&script, Reason::DriftOutsideLimits, Trust::Invalid);
}

#[test]
fn a_drift_just_within_the_data_sheet_is_good() {
    let mut script = Script::new(&SETUP);
    script.drift = 100.0;
    script.reset(5, 0.0).zero(300).integrate(10, 2000.0);
    assert_eq!(script.reading().trust, Trust::Good);
}

#[test]
fn a_closing_zero_that_contradicts_the_drift_takes_the_trust_from_the_run() {
    let mut script = clean();
    script.drift = 23.0;
    script.zero(900);
    assert_reason(&script, Reason::InputInZero, Trust::LowerBound);
}

#[test]
fn a_reset_whose_level_stays_away_makes_a_run_invalid() {
    let mut script = clean();
    script.reset(3, 50_000.0).integrate(50, 2000.0);
    assert_reason(&script, Reason::ResetNotArrived, Trust::Invalid);
}

#[test]
fn a_reset_is_judged_again_by_the_level_after_it() {
    let mut script = clean();
    script.reset(3, 0.0);
    script.level = 50_000.0; // let go half way
    script.integrate(50, 2000.0);
    assert_reason(&script, Reason::ResetNotArrived, Trust::Invalid);
}

#[test]
fn a_level_still_settling_is_not_judged() {
    let slow = Setup::new(CIRCUIT, CONVERTER, NOISE, Policy { settling_s: 0.025, ..POLICY });
    let mut script = Script::new(&slow);
    script.zero(300).integrate(500, 2000.0).reset(2, 8_000.0).reset(1, 0.0).integrate(50, 2000.0);
    assert_eq!(script.faults(), vec![]);
}

#[test]
fn a_dead_time_with_no_line_beside_it_makes_a_lower_bound() {
    let mut script = clean();
    script.reset(2, 0.0).integrate(1, 2000.0).reset(2, 0.0).integrate(50, 2000.0);
    assert_reason(&script, Reason::DeadTime, Trust::LowerBound);
}

#[test]
fn a_counter_that_stands_still_makes_a_run_invalid_and_its_sample_is_not_used() {
    let mut script = clean();
    let before = script.reading().at_stop;
    script.sample_of(Mode::Integrate, 0, 100_000);
    assert_eq!(script.reading().at_stop, before);
    assert_reason(&script, Reason::ClockStalled, Trust::Invalid);
}

#[test]
fn a_fault_of_one_run_does_not_follow_into_the_next() {
    let mut script = clean();
    script.sample(Mode::Integrate, 2_000_000);
    script.zero(300).integrate(100, 2000.0);
    assert_eq!(script.reading().trust, Trust::Good);
}

#[test]
fn a_fault_in_a_zero_concerns_the_run_it_opens_and_no_later_one() {
    let mut script = Script::new(&SETUP);
    script.zero(100);
    for _ in 0..70 {
        script.sample_of(Mode::Zero, STEP, 20);
    }
    script.zero(300).integrate(100, 2000.0);
    assert!(script.reading().reasons.contains(Reason::Frozen));
    script.zero(300).integrate(100, 2000.0);
    assert_eq!(script.reading().trust, Trust::Good);
}

#[test]
fn a_fault_after_a_closed_run_does_not_reach_back() {
    let mut script = clean();
    script.zero(300).reset(3, 50_000.0);
    assert_eq!(script.reading().trust, Trust::Good);
    script.integrate(20, 2000.0);
    assert_eq!(script.reading().trust, Trust::Invalid);
}

#[test]
fn what_happens_is_told_with_its_tick() {
    let mut script = Script::new(&SETUP);
    script.reset(5, 0.0).zero(100).integrate(50, 2000.0).reset(2, 0.0).integrate(50, 2000.0).zero(10);
    assert_eq!(
        script.notices,
        vec![
            (105 * STEP, Event::RunStarted),
            (155 * STEP, Event::ResetClosed),
            (157 * STEP, Event::ResetOpened),
            (207 * STEP, Event::RunStopped),
        ]
    );
}
