//! Near the end of every count, and past it.

use brimline::{Circuit, Converter, Mode, Noise, Policy, Reason, Setup, Trust};

use crate::script::{CIRCUIT, CONVERTER, COULOMBS_PER_COUNT, NOISE, POLICY, SETUP, STEP, Script};

/// A converter of 30 bits, which comes to the end of a run's books soonest.
const WIDE: Converter = Converter { lsb_v: 1e-6, code_min: -(1 << 29), code_max: 1 << 29, ..CONVERTER };

/// A run carries over half a billion counts at each reset. Up to 2^46 counts its total holds; from there on it must say
/// that it does not.
#[test]
fn a_total_past_the_end_of_the_books_says_so() {
    let circuit = Circuit { rail_low_v: -530.0, rail_high_v: 530.0, bias_limit_a: 0.0, offset_limit_v: 0.0, ..CIRCUIT };
    let policy = Policy { worst_input: None, edge_samples: 2, ..POLICY };
    let setup = Setup::new(circuit, WIDE, Noise::NONE, policy);
    let mut script = Script::new(&setup);
    (script.drift, script.noisy) = (0.0, false);
    script.zero(20);
    let (step, mut moved, mut level) = (100_000_000_i64, 0_i64, 0_i32);
    let mut checked = false;
    while moved < 1 << 48 {
        for input in [step, step, step, step, step, 0, 0] {
            level += input as i32;
            moved += input;
            script.sample_of(Mode::Integrate, STEP, level);
        }
        level = 0;
        for mode in [Mode::Reset, Mode::Reset, Mode::Integrate, Mode::Integrate] {
            script.sample_of(mode, STEP, level);
        }
        script.notices.clear();
        if moved > 1 << 45 && !checked {
            checked = true;
            let reading = script.reading();
            // A count is 10^-13 C, which binary numbers do not hold exactly.
            let off = reading.at_stop.integral.value.as_coulombs() / (-1e-13 * moved as f64) - 1.0;
            assert!(off.abs() < 1e-15, "{off:e}");
            assert_eq!(reading.trust, Trust::Good, "{reading:?}");
        }
    }
    let reading = script.reading();
    assert!(reading.reasons.contains(Reason::OutOfRange), "{moved} counts: {reading:?}");
}

/// More spikes than their count can hold: it stands at its end.
#[test]
fn spikes_are_counted_up_to_65535() {
    let mut script = Script::new(&SETUP);
    script.drift = 0.0;
    script.zero(1000).integrate(100, 0.0).zero(1000);
    for _ in 0..70_000 {
        script.sample_of(Mode::Zero, STEP, 10_000);
        for _ in 0..2 {
            script.sample(Mode::Zero, STEP);
        }
        script.notices.clear();
    }
    assert_eq!(script.reading().spikes, u16::MAX);
    assert_eq!(script.reading().trust, Trust::Good);
}

/// The switch is closed for more samples than 16 bits can count, as it is in a device that rests closed. The level that
/// it settles at stays what it is: a switch that does not open again is found.
#[test]
fn a_switch_that_was_closed_for_days_is_still_found_stuck() {
    let circuit = Circuit { pedestal_v: 1e-3, pedestal_u_v: Some(10e-6), ..CIRCUIT };
    for samples in [1_000, 1_000_000] {
        let setup = Setup::new(circuit, CONVERTER, NOISE, Policy { worst_input: None, ..POLICY });
        let mut script = Script::new(&setup);
        script.drift = 0.0;
        script.zero(1000);
        closed(&mut script, samples);
        for k in 0..20 {
            script.sample_of(Mode::Integrate, STEP, k % 3 - 1);
        }
        let reasons = script.reading().reasons;
        assert!(reasons.contains(Reason::SwitchStuckClosed), "after {samples} samples: {reasons:?}");
    }
}

/// The switch is closed; all samples but the first, which is 1 count high, are 0 on the average.
fn closed(script: &mut Script<'_>, samples: i32) {
    script.sample_of(Mode::Reset, STEP, 1);
    for k in 0..samples {
        script.sample_of(Mode::Reset, STEP, k % 3 - 1);
    }
}

/// A healthy switch that was closed as long: what is known of the reset level pulls the total after it no farther than
/// after a short reset.
#[test]
fn a_switch_that_was_closed_for_days_pulls_no_total() {
    let circuit = Circuit { pedestal_v: 0.0, pedestal_u_v: Some(1e-9), ..CIRCUIT };
    let setup = Setup::new(circuit, CONVERTER, NOISE, POLICY);
    let run_after = |samples| {
        let mut script = Script::new(&setup);
        script.drift = 0.0;
        script.zero(2000);
        closed(&mut script, samples);
        // Straight into a run: the baseline is what the line after the reset says.
        script.integrate(1000, 100.0);
        assert_eq!(script.reading().trust, Trust::Good);
        script.reading().at_stop.integral.value.as_coulombs() / COULOMBS_PER_COUNT
    };
    let (short, long) = (run_after(30_000), run_after(120_000));
    assert!((long - short).abs() < 0.01, "{long} counts, {short} after a short reset");
}
