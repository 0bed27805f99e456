//! What counts as a spike, what as an onset, and what an onset leaves of the zero.

use brimline::{Channel, Charge, Circuit, Converter, Event, Mode, Noise, Policy, Sample, Setup, Trust};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};

use crate::script::{CIRCUIT, CONVERTER, NOISE, POLICY, SETUP, STEP, Script};
use crate::{counts, drift, told};

/// A zero sample so many counts off the level.
fn off(script: &mut Script<'_>, by: f64) {
    script.level += script.drift * 0.01;
    let code = (script.level + by).round() as i32;
    script.sample_of(Mode::Zero, STEP, code);
}

#[test]
fn spikes_are_left_out_one_by_one_and_their_time_counts() {
    let mut script = Script::new(&SETUP);
    script.drift = 90.0;
    script.zero(300).integrate(100, 2000.0).zero(20);
    for _ in 0..100 {
        off(&mut script, 50.0);
        script.zero(3);
    }
    assert_eq!((told(&script, Event::Spike), told(&script, Event::InputInZero)), (100, 0));
    assert_eq!((script.reading().spikes, script.reading().trust), (100, Trust::Good));
    let (rate, u) = drift(&script);
    assert!((rate - 90.0).abs() < 3.0 * u && u < 0.1, "{rate} +- {u}");
}

#[test]
fn three_in_a_row_and_of_one_sign_are_an_onset() {
    let mut script = Script::new(&SETUP);
    script.zero(300);
    for by in [40.0, 40.0, -40.0, 40.0, 40.0, -40.0, -40.0] {
        off(&mut script, by);
    }
    assert_eq!((told(&script, Event::Spike), told(&script, Event::InputInZero)), (7, 0));
    script.zero(1);
    let began = script.tick + STEP;
    off(&mut script, 40.0);
    off(&mut script, 40.0);
    assert_eq!(told(&script, Event::InputInZero), 0);
    off(&mut script, 40.0);
    assert!(script.notices.contains(&(began, Event::InputInZero)), "{:?}", script.notices);
}

/// A sample's standard deviation is 1.04 counts by the set-up.
#[test]
fn a_spike_is_more_than_six_standard_deviations() {
    let mut script = Script::new(&SETUP);
    script.zero(1000);
    off(&mut script, 4.0);
    assert_eq!(told(&script, Event::Spike), 0);
    off(&mut script, 9.0);
    assert_eq!(told(&script, Event::Spike), 1);
}

/// After a silence as long as the zero before it, the level is expected where the line through ten samples goes, and is
/// as uncertain as that is there (Draper & Smith, from memory): `1 + 1/10 + (15 - 0.5)^2 / 82.5` variances for a
/// sample.
#[test]
fn after_a_silence_a_sample_may_be_as_far_off_as_the_drift_is_uncertain() {
    let policy = Policy { zero_block_s: 0.0, ..POLICY };
    let setup = Setup::<Charge>::new(CIRCUIT, CONVERTER, NOISE, policy);
    let variance: f64 = (1.0 + 1.0 / 12.0) * (1.0 + 0.1 + 14.5 * 14.5 / 82.5);
    let limit = 6.0 * variance.sqrt();
    for (beyond, spikes) in [(-0.7, 0), (0.7, 1)] {
        let mut script = Script::new(&setup);
        for _ in 0..10 {
            script.sample_of(Mode::Zero, 10 * STEP, 0);
        }
        script.sample_of(Mode::Zero, 100 * STEP, (limit + beyond).round() as i32);
        assert_eq!(told(&script, Event::Spike), spikes, "{limit} {beyond}");
    }
}

/// About a line through ten samples, a single one 14 counts off leaves over 100 counts^2, where noise leaves 9.
#[test]
fn the_very_first_block_is_left_out_if_a_spike_is_in_it() {
    let mut script = Script::new(&SETUP);
    script.zero(4);
    off(&mut script, 14.0);
    // The first sample of all is the instant at which the block begins.
    script.zero(6);
    assert_eq!(told(&script, Event::Spike), 1);
    script.zero(300).integrate(100, 0.0);
    let value = script.reading().at_stop.integral;
    assert!(value.value.as_coulombs().abs() < 3.0 * value.u.as_coulombs(), "{value:?}");
}

/// An input that grows slowly is found by the sums: what the zero said before stands, to the last bit, and the run
/// after it holds all that came in.
#[test]
fn an_onset_takes_back_what_the_zero_learned_since() {
    let mut script = Script::new(&SETUP);
    script.drift = 90.0;
    script.zero(300).integrate(500, 2000.0).zero(300);
    let (mut readings, mut came_in) = (vec![(script.tick, script.reading().closed)], 0.0);
    for _ in 0..200 {
        script.level += 0.06;
        came_in += 0.06;
        script.zero(1);
        readings.push((script.tick, script.reading().closed));
    }
    let since = script.notices.iter().find(|(_, event)| *event == Event::InputInZero).expect("found").0;
    let then = readings.iter().find(|(tick, _)| *tick == since).expect("since the input began").1;
    let last = script.reading();
    assert_eq!(last.closed, then);
    assert!(readings.iter().any(|(_, closed)| *closed != then), "something was taken back");
    assert_eq!(last.trust, Trust::Good);
    script.integrate(200, 2000.0);
    let integral = script.reading().at_stop.integral;
    let (error, u) = (-counts(integral.value) - 4000.0 - came_in, counts(integral.u));
    assert!(error.abs() < 4.0 * u && u < 3.0, "off by {error}, u {u}");
}

/// Zeros with nothing but noise: how long it takes to a false alarm on the average.
///
/// The policy promises a mean time (Siegmund's approximation); a dispersion that is at least 1 makes them a little
/// rarer.
#[test]
fn false_alarms_come_about_as_often_as_the_policy_says() {
    const ALARMS: u64 = 400;
    let policy = Policy { false_alarm_s: 20.0, ..POLICY };
    let setup = Setup::<Charge>::new(CIRCUIT, CONVERTER, NOISE, policy);
    let mut rng = ChaCha8Rng::seed_from_u64(0);
    let mut samples = 0_u64;
    for _ in 0..ALARMS {
        let mut channel = Channel::new(&setup);
        let mut tick = 0_u32;
        loop {
            tick += STEP;
            samples += 1;
            let noise: f64 = StandardNormal.sample(&mut rng);
            let sample = Sample { tick, counts: noise.round() as i32, mode: Mode::Zero, temperature: None };
            if channel.feed(sample).notices.iter().any(|n| n.event == Event::InputInZero) {
                break;
            }
        }
    }
    let found = samples as f64 * 0.01 / ALARMS as f64;
    assert!((16.0..30.0).contains(&found), "{found} s");
}

/// Switched on with the input on: an onset in the very first blocks is not learned as a drift that no later zero
/// forgets.
#[test]
fn an_onset_in_the_first_zero_of_all_is_forgotten() {
    let circuit = Circuit { offset_limit_v: 1e-3, source_resistance_ohm: 1e7, bias_limit_a: 1e-9, ..CIRCUIT };
    let converter =
        Converter { lsb_v: 20.0 / f64::from(1 << 24), code_min: -(1 << 23), code_max: (1 << 23) - 1, ..CONVERTER };
    let noise = Noise { readout_counts: 2.0, input_density: 1e-13, ..Noise::NONE };
    let setup = Setup::new(circuit, converter, noise, Policy { worst_input: None, ..POLICY });
    for slope in [100_000.0, 300_000.0] {
        let mut script = Script::new(&setup);
        let mut go = |mode, slope: f64| {
            for k in 0..1000 {
                script.level = if mode == Mode::Reset { 0.0 } else { script.level + slope * 1e-3 };
                let counts = (script.level + f64::from(k * k % 7 - 3) * 0.5).round() as i32;
                script.sample_of(mode, 1000, counts);
            }
            script.channel.drift()
        };
        let first = go(Mode::Zero, slope);
        assert!(first.value.as_volts_per_second().abs() < 4.0 * first.u.as_volts_per_second(), "{slope}: {first:?}");
        go(Mode::Reset, 0.0);
        go(Mode::Zero, 0.0);
        go(Mode::Integrate, 100.0);
        let reading = script.reading();
        assert_eq!(reading.trust, Trust::Good, "{slope}: {:?}", reading.reasons);
    }
}
