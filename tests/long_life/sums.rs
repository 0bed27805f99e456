//! Sums that grow for as long as a run does, or a life.

use brimline::{Circuit, Converter, Mode, Noise, Policy, Sample, Setup, Temperature, TemperatureLaw, Trust};

use crate::noise::{Bits, NOISE_VAR};
use crate::script::{CIRCUIT, CONVERTER, COULOMBS_PER_COUNT, NOISE, POLICY, STEP, Script};

/// Resets in a run: each adds its variance, the eight millionth as the first.
#[test]
fn every_reset_adds_its_variance_however_many_there_were() {
    let setup = Setup::new(CIRCUIT, CONVERTER, NOISE, Policy { edge_samples: 2, ..POLICY });
    let mut script = Script::new(&setup);
    (script.drift, script.noisy) = (0.0, false);
    script.zero(1000);
    // As short as a segment can be.
    let mut variance_after = |from: u32, to: u32| {
        for _ in from..to {
            script.sample(Mode::Integrate, STEP);
            script.sample(Mode::Integrate, STEP);
            script.reset(1, 0.0);
        }
        script.notices.clear();
        let u = script.reading().at_stop.budget.dead_time.as_coulombs() / COULOMBS_PER_COUNT;
        u * u / f64::from(to)
    };
    let few = variance_after(0, 1 << 10);
    let end = if cfg!(debug_assertions) { 15 } else { 23 };
    let mut at = 1 << 10;
    for power in 11..=end {
        let many = variance_after(at, 1 << power);
        at = 1 << power;
        assert!((many / few - 1.0).abs() < 0.01, "after 2^{power} resets {many} each, {few} at first");
    }
}

/// A leak, and slow samples: the readout noise of each leaks as much as that of any other, so that the variance grows
/// with the time.
#[test]
fn noise_that_leaks_adds_up_for_as_long_as_the_run_lasts() {
    let circuit = Circuit { leak_time_constant_s: Some(1e6), ..CIRCUIT };
    let policy = Policy { gap_limit_s: 20.0, worst_input: None, frozen_samples: 0, ..POLICY };
    let setup = Setup::new(circuit, CONVERTER, NOISE, policy);
    let mut script = Script::new(&setup);
    script.drift = 0.0;
    script.zero(1000);
    let mut leaked = |days: u32| {
        for _ in 0..days * 8640 {
            script.sample(Mode::Integrate, 10_000_000);
        }
        script.reading().at_stop.budget.leak_and_soakage.as_coulombs().powi(2)
    };
    let early = leaked(20);
    let late = leaked(180);
    assert!((late / early - 10.0).abs() < 0.1, "{} times as much after ten times as long", late / early);
}

/// A leak whose time constant is ten samples long, and a reset every dozen: what the level bends by between samples is
/// booked in every run of a life, not only in the first.
#[test]
fn bends_are_booked_in_every_run() {
    let tau_s = 0.1;
    let circuit = Circuit {
        leak_time_constant_s: Some(tau_s),
        rail_low_v: -530.0,
        rail_high_v: 530.0,
        bias_limit_a: 0.0,
        offset_limit_v: 0.0,
        ..CIRCUIT
    };
    let converter = Converter { lsb_v: 1e-6, code_min: -(1 << 29), code_max: 1 << 29, ..CONVERTER };
    let policy = Policy { worst_input: None, edge_samples: 2, ..POLICY };
    let setup = Setup::new(circuit, converter, Noise::NONE, policy);
    let mut script = Script::new(&setup);
    (script.drift, script.noisy) = (0.0, false);
    let full = 5e8;
    let kept = (-0.01 / tau_s).exp();
    let (mut first, mut last) = (None, 0.0);
    for _ in 0..5 {
        script.reset(2, 0.0).zero(3);
        let cycles = if cfg!(debug_assertions) { 5_000 } else { 50_000 };
        for _ in 0..cycles {
            script.reset(2, 0.0);
            let mut level = 0.0;
            for _ in 0..12 {
                level = full + (level - full) * kept;
                script.sample_of(Mode::Integrate, STEP, level as i32);
            }
        }
        script.notices.clear();
        let per_cycle = script.reading().at_stop.integral.value.as_coulombs() / f64::from(cycles);
        first.get_or_insert(per_cycle);
        last = per_cycle;
        script.reset(2, 0.0).zero(3);
    }
    let Some(first) = first else { panic!("there were runs") };
    assert!((last / first - 1.0).abs() < 1e-6, "{last:e} a cycle in the last run, {first:e} in the first");
}

/// A run in which the board is 30 K warmer than at its zeros, for a hundred days and with a fast counter.
#[test]
fn warmth_counts_for_as_long_as_the_run_lasts() {
    let circuit = Circuit { temperature_law: TemperatureLaw::Offset { limit_v_per_k: 1e-4 }, ..CIRCUIT };
    let converter = Converter { tick_hz: 84e6, ..CONVERTER };
    let policy = Policy { gap_limit_s: 24.0, worst_input: None, frozen_samples: 0, ..POLICY };
    let noise = Noise { readout_counts: NOISE_VAR.sqrt(), ..Noise::NONE };
    let setup = Setup::new(circuit, converter, noise, policy);
    let mut script = Script::new(&setup);
    // 0.02 counts/s for each kelvin.
    let drift = |kelvin: i32| 0.02 * f64::from(kelvin);
    let (mut level, mut bits) = (0.0_f64, Bits::seeded(4));
    let mut sample = |script: &mut Script<'_>, mode, seconds: f64, kelvin: i32, input: f64| {
        level += (drift(kelvin) + input) * seconds;
        script.tick = script.tick.wrapping_add((seconds * 84e6) as u32);
        let noise = bits.noise_q32() as f64 / 4_294_967_296.0;
        let temperature = Some(Temperature::from_millidegrees_celsius(25_000 + 1000 * kelvin));
        let counts = (level + noise).round() as i32;
        script.channel.feed(Sample { tick: script.tick, counts, mode, temperature });
    };
    for k in 0..60_000 {
        // Warmer by 30 K and back, by 1 K in 20 s.
        sample(&mut script, Mode::Zero, 0.1, 30 - (k / 200 % 60 - 30_i32).abs(), 0.0);
    }
    sample(&mut script, Mode::Zero, 0.1, 0, 0.0);
    let days = 100.0;
    let steps = (days * 86_400.0 / 20.0) as u32;
    for _ in 0..steps {
        // The input takes off what the drift adds: the level stands.
        sample(&mut script, Mode::Integrate, 20.0, 30, -drift(30));
    }
    let reading = script.reading();
    let integral = reading.at_stop.integral;
    let counts = integral.value.as_coulombs() / COULOMBS_PER_COUNT;
    let truth = drift(30) * days * 86_400.0;
    let u = integral.u.as_coulombs() / COULOMBS_PER_COUNT;
    assert_eq!(reading.trust, Trust::Good, "{:?}", reading.reasons);
    assert!((counts - truth).abs() < 4.0 * u && u < 0.05 * truth, "{counts} for {truth}, u {u}");
}
