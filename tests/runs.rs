//! What a run's total is made of, through resets, holds and awkward orders of modes.

mod script;

use brimline::{Charge, Circuit, Converter, Mode, Policy, Reading, Setup, Temperature, Trust};
use script::{CIRCUIT, CONVERTER, NOISE, POLICY, SETUP, STEP, Script, coulombs};

/// The better estimate is good and within 3 of its uncertainties of the truth, and the uncertainty is no larger than
/// `counts`.
#[track_caller]
fn assert_total(script: &Script<'_>, truth_counts: f64, counts: f64) {
    let reading = script.reading();
    let integral = reading.latest().integral;
    let error = integral.value.as_coulombs() - coulombs(truth_counts);
    let u = integral.u.as_coulombs();
    assert!(error.abs() <= 3.0 * u, "off by {error:e}, u {u:e}");
    assert!(u <= counts * script::COULOMBS_PER_COUNT, "u {u:e}");
    assert_eq!(reading.trust, Trust::Good, "{:?}", script.notices);
}

#[test]
fn resets_are_carried_over_and_their_dead_time_is_interpolated() {
    let mut script = Script::new(&SETUP);
    script.reset(5, 0.0).zero(300).integrate(500, 20_000.0);
    for _ in 0..4 {
        script.reset(2, 0.0).integrate(400, 20_000.0);
    }
    // 5 s and four times 4 s, and four dead times of 20 ms.
    let truth = 20_000.0 * (5.0 + 16.0 + 0.08);
    assert_total(&script, truth, 6.0);
    let reading = script.reading();
    let interpolated = reading.interpolated.as_coulombs();
    // The lines' slopes hold the drift as well: it is taken off over the whole duration.
    assert!((interpolated - coulombs((20_000.0 + 20.0) * 0.08)).abs() < 5e-12, "{interpolated:e}");
    assert!(
        (reading.measured.as_coulombs() + interpolated - reading.at_stop.integral.value.as_coulombs()).abs() < 1e-15
    );
    assert_eq!(reading.resets, 4);
    assert!((reading.elapsed_s - 21.08).abs() < 1e-9);
    script.zero(300);
    assert_total(&script, truth, 5.0);
}

#[test]
fn an_input_that_changes_during_dead_time_widens_the_uncertainty() {
    let total = |after: f64| {
        let mut script = Script::new(&SETUP);
        script.zero(300).integrate(200, 20_000.0).reset(50, 0.0).integrate(200, after);
        script.reading().at_stop
    };
    let steady = total(20_000.0);
    let changed = total(30_000.0);
    // Half a second in which the input went from one to the other: a rectangle of 5000 counts full width.
    let expected = 5000.0 / 12.0_f64.sqrt() * script::COULOMBS_PER_COUNT;
    let widened = changed.budget.dead_time.as_coulombs();
    assert!(steady.budget.dead_time.as_coulombs() < 0.1 * expected);
    assert!((widened / expected - 1.0).abs() < 0.01, "{widened:e} {expected:e}");
}

#[test]
fn segments_shorter_than_the_fits_are_carried_over_too() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(20, 20_000.0);
    for samples in [3, 9, 17, 20, 33] {
        script.reset(1, 0.0).integrate(samples, 20_000.0);
    }
    assert_total(&script, 20_000.0 * (1.02 + 0.05), 25.0);
}

#[test]
fn what_the_level_does_in_a_hold_is_not_input() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(300, 2000.0).hold(2000, -35.0).integrate(300, 3000.0);
    assert_total(&script, 6_000.0 + 9_000.0, 5.0);
    assert_eq!(script.reading().interpolated, Charge::from_coulombs(0.0));
    assert!((script.reading().elapsed_s - 26.0).abs() < 1e-9);
}

#[test]
fn a_run_that_ends_in_a_reset_or_a_hold_keeps_its_total_and_still_gains_from_the_zero() {
    for hold in [false, true] {
        let mut script = Script::new(&SETUP);
        script.zero(100).integrate(1000, 2000.0);
        if hold {
            script.hold(50, 11.0)
        } else {
            script.reset(3, 0.0)
        };
        assert_total(&script, 20_000.0, 30.0);
        let at_stop = script.reading().at_stop.integral.u;
        script.zero(400);
        assert_total(&script, 20_000.0, 6.0);
        let closed = script.reading().closed.expect("closed").integral.u;
        assert!(closed.as_coulombs() < 0.5 * at_stop.as_coulombs(), "{closed:?} {at_stop:?}");
    }
}

#[test]
fn a_run_that_starts_after_a_reset_or_a_hold_finds_its_own_baseline() {
    for hold in [false, true] {
        let mut script = Script::new(&SETUP);
        script.zero(300);
        if hold {
            script.hold(100, 40.0)
        } else {
            script.reset(3, 500.0)
        };
        script.integrate(300, 2000.0);
        assert_total(&script, 6_000.0, 5.0);
    }
}

#[test]
fn a_run_without_any_zero_is_as_uncertain_as_the_data_sheet() {
    let mut script = Script::new(&SETUP);
    script.integrate(300, 2000.0);
    let u = script.reading().at_stop.integral.u.as_coulombs();
    // 101 counts/s rectangular over 3 s.
    assert!((u / (101.0 / 3.0_f64.sqrt() * 3.0e-12) - 1.0).abs() < 0.01, "{u:e}");
    assert_total(&script, 6_000.0, 200.0);
}

#[test]
fn a_reset_within_the_closing_zero_keeps_what_was_learned() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(1000, 2000.0).zero(150);
    let before = script.reading().closed.expect("closed").integral.u.as_coulombs();
    script.reset(3, 0.0).zero(150);
    let after = script.reading().closed.expect("closed").integral.u.as_coulombs();
    assert_total(&script, 20_000.0, 5.0);
    assert!(after < before, "{after:e} {before:e}");
}

#[test]
fn runs_follow_each_other_and_the_drift_is_remembered() {
    let mut script = Script::new(&SETUP);
    script.zero(300);
    let mut last_u = f64::INFINITY;
    for _ in 0..5 {
        script.integrate(1000, -1500.0);
        let u = script.reading().at_stop.integral.u.as_coulombs();
        assert!(u < last_u);
        last_u = u;
        script.zero(300);
        assert_total(&script, -15_000.0, 4.0);
    }
}

#[test]
fn the_value_at_stop_uses_nothing_later() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(500, 2000.0);
    let at_stop = script.reading().at_stop;
    script.zero(300);
    assert_eq!(script.reading().at_stop, at_stop);
    script.drift = 300.0;
    script.zero(300);
    assert_eq!(script.reading().at_stop, at_stop);
}

#[test]
fn polarity_turns_the_sign_and_nothing_else() {
    let upward = Setup::new(Circuit { inverting: false, ..CIRCUIT }, CONVERTER, NOISE, POLICY);
    let total = |setup: &Setup<Charge>| {
        let mut script = Script::new(setup);
        script.zero(300).integrate(500, 2000.0).reset(2, 0.0).integrate(100, 2000.0).zero(100);
        script.reading().closed.expect("closed").integral
    };
    let (down, up) = (total(&SETUP), total(&upward));
    assert_eq!(down.value.as_coulombs(), -up.value.as_coulombs());
    assert_eq!(down.u, up.u);
}

fn story(setup: &Setup<Charge>, tick: u32, origin: i32) -> Reading<Charge> {
    let mut script = Script::new(setup);
    script.tick = tick;
    script.origin = origin;
    script.zero(300).integrate(500, 20_000.0).reset(2, 0.0).integrate(300, 20_000.0).hold(20, 5.0);
    script.integrate(40, 20_000.0).zero(300);
    script.reading()
}

#[test]
fn the_counter_s_origin_changes_no_bit() {
    let reference = story(&SETUP, 0, 0);
    for tick in [1, 2_500_000_000, u32::MAX - 3_000_000, u32::MAX - 11_000_000] {
        let shifted = story(&SETUP, tick, 0);
        assert_eq!((shifted.at_stop, shifted.closed), (reference.at_stop, reference.closed), "{tick}");
    }
}

#[test]
fn the_converter_s_origin_changes_no_bit() {
    let reference = story(&SETUP, 0, 0);
    for origin in [32_768, 8_388_608, -8_388_608, 500_000_000] {
        let converter = Converter {
            code_zero_v: -f64::from(origin) * CONVERTER.lsb_v,
            code_min: CONVERTER.code_min + origin,
            code_max: CONVERTER.code_max + origin,
            ..CONVERTER
        };
        let shifted = story(&Setup::new(CIRCUIT, converter, NOISE, POLICY), 0, origin);
        assert_eq!((shifted.at_stop, shifted.closed), (reference.at_stop, reference.closed), "{origin}");
    }
}

#[test]
fn an_uncertain_gain_adds_in_squares_and_is_told_apart() {
    let setup = Setup::new(Circuit { gain_u_rel: 0.01, ..CIRCUIT }, CONVERTER, NOISE, POLICY);
    let mut script = Script::new(&setup);
    script.zero(300).integrate(500, 2000.0);
    let estimate = script.reading().at_stop;
    let scale = estimate.budget.scale.as_coulombs();
    assert!((scale / 1e-10 - 1.0).abs() < 1e-3, "{scale:e}");
    let b = estimate.budget;
    let sum: f64 = [b.readout, b.input_noise, b.drift, b.dead_time, b.leak_and_soakage, b.scale]
        .iter()
        .map(|q| q.as_coulombs().powi(2))
        .sum();
    assert!((sum.sqrt() / estimate.integral.u.as_coulombs() - 1.0).abs() < 1e-6);
}

#[test]
fn a_reading_tells_how_far_the_board_has_warmed() {
    let mut script = Script::new(&SETUP);
    let mut feed = |mode, millidegrees, count| {
        for _ in 0..count {
            script.tick += STEP;
            let temperature = Some(Temperature::from_millidegrees_celsius(millidegrees));
            script.channel.feed(brimline::Sample { tick: script.tick, counts: 0, mode, temperature });
        }
    };
    feed(Mode::Zero, 20_000, 20);
    feed(Mode::Integrate, 21_000, 10);
    feed(Mode::Integrate, 23_500, 1);
    assert_eq!(script.reading().warming_mk, Some(3_500));
}

/// Two lines of 16 samples, read out half a dead time (one sample period) beyond the switching instants, which lie on
/// the last sample before and one period ahead of the first sample after. Variance of a line at a point: Draper &
/// Smith, Applied Regression Analysis (from memory); see `reference/estimation_limits.toml`.
#[test]
fn a_reset_costs_what_the_two_lines_cost() {
    // Without blocks, the readings that lack the noise of the set-up do not show that.
    let setup = Setup::new(CIRCUIT, CONVERTER, NOISE, Policy { zero_block_s: 0.0, frozen_samples: 0, ..POLICY });
    let mut script = Script::new(&setup);
    script.noisy = false;
    script.drift = 0.0;
    script.zero(300).integrate(200, 20_000.0).reset(2, 0.0).integrate(200, 20_000.0);
    let readout_var = 1.0 + 1.0 / 12.0;
    let line = |lever: f64| 1.0 / 16.0 + lever * lever / 340.0;
    let expected = (readout_var * (line(7.5 + 1.0) + line(8.5 + 1.0))).sqrt() * script::COULOMBS_PER_COUNT;
    let dead_time = script.reading().at_stop.budget.dead_time.as_coulombs();
    assert!((dead_time / expected - 1.0).abs() < 1e-4, "{dead_time:e} {expected:e}");
}

#[test]
fn the_first_sample_after_a_reset_is_read_with_the_slope_from_before() {
    let mut script = Script::new(&SETUP);
    script.zero(300).integrate(200, 20_000.0).reset(2, 0.0).integrate(1, 20_000.0);
    let reading = script.reading();
    let value = reading.at_stop.integral.value.as_coulombs();
    // The dead time itself is not counted: nothing but the sample before it says that there was input.
    assert!((value - coulombs(20_000.0 * 2.01)).abs() < 6e-12, "{value:e}");
    assert_eq!(reading.trust, Trust::LowerBound);
    // Two more samples make a line, and a good reading.
    script.integrate(2, 20_000.0);
    assert_eq!(script.reading().trust, Trust::Good);
}

#[test]
fn the_baseline_drifts_on_while_the_switch_is_closed() {
    let setup = Setup::new(CIRCUIT, CONVERTER, NOISE, Policy { gap_limit_s: 10.0, ..POLICY });
    let mut script = Script::new(&setup);
    script.drift = 100.0;
    script.zero(500).integrate(200, 2_000.0).reset(500, 0.0).integrate(200, 2_000.0);
    assert_total(&script, 2_000.0 * 9.0, 40.0);
}

#[test]
fn after_a_reset_in_the_closing_zero_the_level_tells_nothing_more() {
    let mut script = Script::new(&SETUP);
    script.zero(3000).integrate(100, 2000.0).zero(2).reset(3, 0.0).zero(3000);
    // The level at stop rests on two samples: their mean has half a readout variance.
    let u = script.reading().closed.expect("closed").integral.u.as_coulombs();
    assert!(u > (1.083_f64 / 2.0).sqrt() * script::COULOMBS_PER_COUNT, "{u:e}");
}

/// Wander of the offset in every pause: the drift is as much less certain as the pause was long.
#[test]
fn a_drift_wanders_through_pauses() {
    let wander = 1e-12; // A per root second: one count per second per root second
    let setup = Setup::new(CIRCUIT, CONVERTER, brimline::Noise { offset_wander: wander, ..NOISE }, POLICY);
    let drift_u = |script: &Script<'_>| script.channel.drift().u.as_volts_per_second() / CONVERTER.lsb_v;
    for hold in [true, false] {
        let pause = |script: &mut Script<'_>, samples| {
            if hold {
                script.hold(samples, 0.0)
            } else {
                script.reset(samples, 0.0)
            };
        };
        let mut script = Script::new(&setup);
        script.zero(300).integrate(20, 2000.0);
        pause(&mut script, 10_000);
        script.integrate(20, 2000.0);
        assert!((drift_u(&script) - 10.0).abs() < 0.5, "in a run: {}", drift_u(&script));
        pause(&mut script, 10_000);
        script.zero(10);
        assert!((drift_u(&script) - 200.0_f64.sqrt()).abs() < 0.5, "at its end: {}", drift_u(&script));
    }
}
