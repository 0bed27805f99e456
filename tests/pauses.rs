//! What a pause between zero and run changes, and what it does not.
#![allow(clippy::disallowed_methods, reason = "a reference on the host computes in f64; only src must give equal bits")]

mod script;

use brimline::{Charge, Circuit, Mode, Noise, Sample, Setup, Temperature, TemperatureLaw, Trust};
use script::{CIRCUIT, CONVERTER, NOISE, POLICY, STEP, Script};

fn counts(charge: Charge) -> f64 {
    charge.as_coulombs() / script::COULOMBS_PER_COUNT
}

/// The board warms by 2 K while the input is open, while the switch is closed, or from one sample of a zero to the
/// next; the drift rises by 3 counts/s for each kelvin. The run after it is 10 K warmer and lasts 4 s.
#[test]
fn a_step_of_the_temperature_tells_what_warming_does() {
    let temperature_law = TemperatureLaw::Offset { limit_v_per_k: 50e-6 };
    let circuit = Circuit { temperature_law, source_resistance_ohm: 10e6, ..CIRCUIT };
    let setup = Setup::new(circuit, CONVERTER, NOISE, POLICY);
    let mut wrong = Vec::new();
    for between in [Mode::Integrate, Mode::Hold, Mode::Reset, Mode::Zero] {
        let mut script = Script::new(&setup);
        for (mode, samples, kelvin) in
            [(Mode::Zero, 500, 0), (between, 10, 2), (Mode::Zero, 500, 2), (Mode::Integrate, 400, 12)]
        {
            for _ in 0..samples {
                script.level = if mode == Mode::Reset { 0.0 } else { script.level + 0.2 + 0.03 * f64::from(kelvin) };
                script.tick += STEP;
                // Half a count either way, in turn.
                let dither = if (script.tick / STEP).is_multiple_of(2) { 0.4 } else { -0.4 };
                let temperature = Some(Temperature::from_millidegrees_celsius(25_000 + 1000 * kelvin));
                let counts = (script.level + dither).round() as i32;
                script.channel.feed(Sample { tick: script.tick, counts, mode, temperature });
            }
        }
        let reading = script.reading();
        let (error, u) = (counts(reading.at_stop.integral.value), counts(reading.at_stop.integral.u));
        if reading.trust == Trust::Good && (error.abs() > 3.0 * u || u > 3.0) {
            wrong.push(format!("{between:?}: off by {error:.1} counts, u {u:.1}"));
        }
    }
    assert!(wrong.is_empty(), "{wrong:#?}");
}

/// A pause does not make the drift of the zero before it any better known: rounding that nothing dithers is in it
/// still.
#[test]
fn the_rounding_of_a_zero_is_in_its_drift_after_a_reset_too() {
    let setup = Setup::new(CIRCUIT, CONVERTER, Noise { readout_counts: 0.1, ..NOISE }, POLICY);
    let drift_part = |reset: u32| {
        let mut script = Script::new(&setup);
        (script.noisy, script.drift) = (false, 0.0);
        script.zero(300).reset(reset, 0.0).integrate(6000, 0.0);
        counts(script.reading().at_stop.budget.drift)
    };
    let (straight, paused) = (drift_part(0), drift_part(3));
    assert!((paused / straight - 1.0).abs() < 0.05, "{paused} after a reset, {straight} without");
}

/// Nor does a closing zero that has just begun make it any worse: closed is never much less certain than at stop.
#[test]
fn the_rounding_of_a_zero_that_has_just_begun_does_not_count_for_the_run() {
    let setup = Setup::new(CIRCUIT, CONVERTER, Noise { readout_counts: 0.1, ..NOISE }, POLICY);
    let mut script = Script::new(&setup);
    (script.noisy, script.drift) = (false, 0.0);
    script.zero(300).integrate(6000, 0.0);
    let at_stop = counts(script.reading().at_stop.integral.u);
    for blocks in 1..20 {
        script.zero(10);
        let closed = counts(script.reading().closed.expect("closed").integral.u);
        assert!(closed < 1.1 * at_stop, "{closed} after {blocks} blocks, {at_stop} at stop");
    }
}

/// A zero's age counts for the flicker of the run after it, whether or not the switch was closed for a moment in
/// between.
#[test]
fn a_reset_before_a_run_does_not_make_the_zero_forgotten() {
    let setup = Setup::new(CIRCUIT, CONVERTER, Noise { input_flicker: 1e-12, ..NOISE }, POLICY);
    let drift_part = |reset: u32| {
        let mut script = Script::new(&setup);
        script.zero(1000).reset(reset, 0.0).integrate(1000, 0.0);
        counts(script.reading().at_stop.budget.drift)
    };
    let (straight, paused) = (drift_part(0), drift_part(3));
    assert!(paused < 1.1 * straight, "{paused} after a reset, {straight} without");
}
