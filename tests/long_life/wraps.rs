//! What comes round again with the 32-bit counter.

use brimline::{Circuit, Converter, Mode, Policy, Setup, Trust};

use crate::script::{CIRCUIT, CONVERTER, NOISE, POLICY, SETUP, STEP, Script, coulombs};

/// The line after a reset knows its samples by their ticks. 2^32 ticks later a sample has the same, and is no part of
/// it: what the run's last sample is not known to stays what it is.
#[test]
fn a_sample_that_comes_a_whole_turn_after_a_reset_is_not_one_of_those_after_it() {
    let half_second = 500_000;
    let mut script = Script::new(&SETUP);
    script.drift = 0.0;
    script.zero(1000).integrate(20, 100.0).reset(2, 0.0);
    let mut readout_at = |samples: u32, until: u32| {
        for _ in samples..until {
            script.sample(Mode::Integrate, half_second);
        }
        script.reading().at_stop.budget.readout.as_coulombs()
    };
    let before = readout_at(0, 8_500);
    let mut farthest = 0.0_f64;
    for samples in 8_501..8_620 {
        farthest = farthest.max((readout_at(samples - 1, samples) / before - 1.0).abs());
    }
    assert!(farthest < 1e-3, "the readout's share of u changes by {farthest}");
    assert_eq!(script.reading().trust, Trust::Good, "{:?}", script.faults());
}

/// A fast counter and slow samples: the window beside a reset is longer than a turn of the counter.
#[test]
fn a_line_longer_than_a_turn_of_the_counter_is_straight() {
    let converter = Converter { tick_hz: 1e9, ..CONVERTER };
    let policy = Policy { gap_limit_s: 2.0, ..POLICY };
    let setup = Setup::new(Circuit { bias_limit_a: 1e-12, ..CIRCUIT }, converter, NOISE, policy);
    let mut script = Script::new(&setup);
    let (half_second, slope) = (500_000_000, 1_000.0);
    let mut moved = 0.0;
    for _ in 0..200 {
        script.sample(Mode::Zero, half_second);
    }
    for _ in 0..5 {
        for _ in 0..40 {
            script.level += 0.5 * slope;
            moved += 0.5 * slope;
            script.sample(Mode::Integrate, half_second);
        }
        script.level = 0.0;
        moved += 2.0 * 0.5 * slope;
        script.sample(Mode::Reset, half_second);
        script.sample(Mode::Reset, half_second);
    }
    for _ in 0..40 {
        script.level += 0.5 * slope;
        moved += 0.5 * slope;
        script.sample(Mode::Integrate, half_second);
    }
    let reading = script.reading();
    let integral = reading.at_stop.integral;
    let (error, u) = (integral.value.as_coulombs() - coulombs(moved), integral.u.as_coulombs());
    assert_eq!(reading.trust, Trust::Good, "{:?}", script.faults());
    assert!(error.abs() < 4.0 * u && u < 100e-12, "{error:e} for {u:e}");
}

/// Steps as long as the counter can tell, for 20 years: in a zero, a hold and a run. Times are exact.
#[test]
fn twenty_years_in_the_longest_steps_are_timed_exactly() {
    let longest = 0x7FFF_FFFF;
    let policy = Policy { gap_limit_s: 2147.4, worst_input: None, frozen_samples: 0, ..POLICY };
    let setup = Setup::new(CIRCUIT, CONVERTER, NOISE, policy);
    let mut script = Script::new(&setup);
    let steps = 300_000_u64;
    for _ in 0..steps {
        script.sample(Mode::Zero, longest);
    }
    script.sample(Mode::Integrate, STEP);
    for _ in 0..steps {
        script.sample(Mode::Hold, longest);
    }
    for _ in 0..10 {
        script.sample(Mode::Integrate, STEP);
    }
    let reading = script.reading();
    let held = steps * u64::from(longest);
    assert_eq!(reading.held_s, held as f64 / 1e6);
    assert_eq!(reading.elapsed_s, (held + 11 * u64::from(STEP)) as f64 / 1e6);
    for _ in 0..steps {
        script.sample(Mode::Integrate, longest - 1_000_000);
    }
    let driven = held + 11 * u64::from(STEP) + steps * u64::from(longest - 1_000_000);
    assert_eq!(script.reading().elapsed_s, driven as f64 / 1e6);
    assert!(script.reading().at_stop.integral.u.as_coulombs().is_finite());
}
