//! The droop of the holds, and what it tells of the amplifier together with the drift of the zeros.

use brimline::{
    Channel, Charge, Circuit, Converter, Flux, Measured, Mode, Noise, Policy, Reason, Sample, Setup, Trust, VoltageRate,
};

use crate::script::{CIRCUIT, CONVERTER, NOISE, POLICY, SETUP, STEP, Script};
use crate::{READOUT, assert_near};

/// Droop limit of the board, 100 pA into 100 nF, counts/s.
const LIMIT: f64 = 100.0;

/// Counts/s.
fn droop(script: &Script<'_>) -> (f64, f64) {
    let droop = script.channel.droop();
    (droop.value.as_volts_per_second() * 1e5, droop.u.as_volts_per_second() * 1e5)
}

/// By hand: blocks of ten samples and their mean square distance in time, beside a quarter of what was known before, or
/// what the data sheet allows (rectangular) if that is more.
fn slope_u(holds: &[u32]) -> f64 {
    let prior = 3.0 / (LIMIT * LIMIT);
    let known = holds.iter().fold(prior, |known: f64, &samples| {
        let blocks = f64::from(samples / 10);
        (known / 4.0).max(prior) + blocks * (blocks * blocks - 1.0) / 12.0 * 0.01 / (READOUT / 10.0)
    });
    (1.0 / known).sqrt()
}

fn silent(setup: &Setup<Charge>) -> Script<'_> {
    let mut script = Script::new(setup);
    script.noisy = false;
    script
}

#[test]
fn before_any_hold_the_droop_is_what_the_data_sheet_allows() {
    let (value, u) = droop(&Script::new(&SETUP));
    assert_eq!(value, 0.0);
    assert_near(u, LIMIT / 3.0_f64.sqrt(), 1e-6);
}

#[test]
fn each_hold_adds_its_line_to_what_is_known() {
    let mut script = silent(&SETUP);
    script.reset(5, 0.0).zero(300);
    let mut holds = Vec::new();
    // Samples that do not fill a block any more are lost, and not taken into the next hold.
    for samples in [25, 57, 303] {
        // From another level each time, and with other drifts in between: none of that is droop.
        script.level += 9_000.0;
        script.hold(samples, -40.0).zero(100);
        holds.push(samples);
        let (value, u) = droop(&script);
        assert_near(u, slope_u(&holds), 2e-3);
        assert!((value + 40.0).abs() < 0.2 + 40.0 * 3.0 * u * u / (LIMIT * LIMIT), "{value}");
    }
}

/// Two blocks, one with its samples at the beginning and one at the end: their means are 161 ms apart, not 100.
#[test]
fn blocks_are_as_far_apart_as_their_samples() {
    let mut script = silent(&SETUP);
    script.reset(5, 0.0).zero(300);
    for ticks in [2_000; 9].into_iter().chain([82_000, 60_000]).chain([4_000; 10]) {
        script.level -= 90.0 * f64::from(ticks) * 1e-6;
        script.sample(Mode::Hold, ticks);
    }
    let (value, u) = droop(&script);
    assert!(u < 4.0 && (value + 90.0).abs() < 2.5, "{value} {u}");
}

/// Readings that nothing dithers: no mean is better than its rounding, all blocks after the first may be off by the
/// same, and so may both ends.
#[test]
fn rounding_that_nothing_dithers_is_in_the_droop() {
    let setup: Setup<Charge> = Setup::new(CIRCUIT, CONVERTER, Noise { readout_counts: 0.1, ..NOISE }, POLICY);
    let mut script = silent(&setup);
    script.reset(5, 0.0).zero(300).hold(200, -40.0);
    let weight = |block: u32| 1.0 / ((0.01 + 1.0 / 12.0) * if block == 0 { 1.0 } else { 4.0 });
    let mean = |of: &dyn Fn(u32) -> f64| (0..20).map(|block| weight(block) * of(block)).sum::<f64>();
    let (all, first) = (mean(&|_| 1.0), mean(&|block| f64::from(block) * 0.1));
    let information = mean(&|block| (f64::from(block) * 0.1).powi(2)) - first * first / all + 3.0 / (LIMIT * LIMIT);
    let rounding = 2.0 / 12.0 / (1.9 * 1.9);
    assert_near(droop(&script).1, (1.0 / information + rounding).sqrt(), 2e-3);
}

/// What leaks in a hold is put back, and as uncertain as the time constant.
#[test]
fn an_uncertain_leak_makes_the_droop_uncertain() {
    for leak_u_rel in [0.0, 0.01, 0.2] {
        let circuit = Circuit { leak_time_constant_s: Some(100.0), leak_u_rel, ..CIRCUIT };
        let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, POLICY);
        let mut script = silent(&setup);
        script.reset(5, 0.0).zero(300);
        script.level = 50_000.0;
        // The step up is the first of the hold's, and no droop.
        for _ in 0..300 {
            script.sample(Mode::Hold, STEP);
            script.level *= (-0.01_f64 / 100.0).exp();
        }
        let (value, u) = droop(&script);
        // From the end of the first block to the middle of the last, about: 50,000 / 100 s.
        let expected = (slope_u(&[300]).powi(2) + (leak_u_rel * 500.0 * (-0.015_f64).exp()).powi(2)).sqrt();
        assert!(value.abs() < 1.0, "{value}");
        assert_near(u, expected, 0.02);
    }
}

/// One block is a level and no slope.
#[test]
fn a_hold_of_one_block_tells_nothing() {
    let mut script = silent(&SETUP);
    script.reset(5, 0.0).zero(300).hold(19, -40.0);
    assert_near(droop(&script).1, LIMIT / 3.0_f64.sqrt(), 1e-6);
    assert!(script.channel.offset_and_bias().is_none());
    script.hold(1, -40.0);
    assert_near(droop(&script).1, slope_u(&[20]), 2e-3);
    assert!(script.channel.offset_and_bias().is_some());
}

/// A hold at a rail droops nowhere; it is left out, and so is the level before it.
#[test]
fn a_hold_at_a_rail_tells_nothing() {
    let mut script = silent(&SETUP);
    script.reset(5, 0.0).zero(300).hold(100, -40.0);
    let before = droop(&script);
    script.level = 190_050.0;
    script.hold(100, 0.0);
    script.level = 180_000.0;
    script.hold(19, 0.0);
    assert_eq!(droop(&script), before);
}

#[test]
fn zero_and_hold_together_tell_offset_and_bias() {
    // 0.4 mV through 1 Gohm and 30 pA, into 100 nF: 4 and 300 uV/s.
    for (inverting, input_sign) in [(true, -1.0), (false, 1.0)] {
        let circuit = Circuit { inverting, source_resistance_ohm: 10e6, ..CIRCUIT };
        let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, POLICY);
        let (offset_v, bias_a) = (0.4e-3, -30e-12);
        let per_input = input_sign / 100e-9 * 1e5; // counts/s per A
        let mut script = silent(&setup);
        script.drift = (offset_v / 10e6 + bias_a) * per_input;
        script.reset(5, 0.0);
        assert!(script.channel.offset_and_bias().is_none());
        script.zero(3_000);
        assert!(script.channel.offset_and_bias().is_none(), "a zero alone does not tell them apart");
        script.hold(1_000, bias_a * per_input);
        let (offset, bias) = script.channel.offset_and_bias().expect("one of each");
        assert!((offset.value.as_volts() - offset_v).abs() < offset.u.as_volts(), "{offset:?}");
        assert!((bias.value.as_amperes() - bias_a).abs() < bias.u.as_amperes(), "{bias:?}");
        let u = |rate: Measured<VoltageRate>| rate.u.as_volts_per_second();
        let (drift_u, droop_u) = (u(script.channel.drift()), u(script.channel.droop()));
        assert_near(bias.u.as_amperes(), droop_u * 100e-9, 1e-6);
        assert_near(offset.u.as_volts(), (drift_u.powi(2) + droop_u.powi(2)).sqrt() * 10e6 * 100e-9, 1e-6);
        assert!(offset.u.as_volts() < 0.01e-3 && bias.u.as_amperes() < 0.02e-12, "{offset:?} {bias:?}");
    }
    // A hold alone does not tell either.
    let mut script = silent(&SETUP);
    script.hold(300, 10.0);
    assert!(script.channel.offset_and_bias().is_none());
}

/// A zero and then a hold of 3 s each, at a level of 50,000 counts that leaks with 100 s: uncertainties of offset,
/// bias, drift and droop, all as V/s of the output.
fn leaking(leak_u_rel: f64, code_zero_u_v: f64) -> [f64; 4] {
    let circuit = Circuit { leak_time_constant_s: Some(100.0), leak_u_rel, ..CIRCUIT };
    let converter = Converter { code_zero_u_v, ..CONVERTER };
    let setup: Setup<Charge> = Setup::new(circuit, converter, NOISE, POLICY);
    let mut script = silent(&setup);
    script.reset(5, 0.0);
    script.level = 50_000.0;
    for j in 0..600 {
        script.sample(if j < 300 { Mode::Zero } else { Mode::Hold }, STEP);
        script.level *= (-0.01_f64 / 100.0).exp();
    }
    let (offset, bias) = script.channel.offset_and_bias().expect("one of each");
    let rate_u = |rate: Measured<VoltageRate>| rate.u.as_volts_per_second();
    let (drift, droop) = (rate_u(script.channel.drift()), rate_u(script.channel.droop()));
    // 1 Gohm and 100 nF.
    [offset.u.as_volts() / 100.0, bias.u.as_amperes() / 100e-9, drift, droop]
}

/// A leak that is wrong is wrong in both: what tells the offset is their difference. What leaks at the reset level,
/// where the amplifier's and the converter's offsets put it, droops like a bias.
#[test]
fn a_leak_is_in_drift_and_droop_alike_and_in_the_bias() {
    let [offset, _, drift, droop] = leaking(0.0, 0.0);
    assert_near(offset, drift.hypot(droop), 1e-4);
    let [offset, _, drift, droop] = leaking(0.2, 0.0);
    // A fifth of 500 counts/s.
    assert_near(drift, 1e-3, 0.05);
    assert_near(droop, 1e-3, 0.05);
    assert!(offset < 0.1 * drift.hypot(droop), "{offset} {drift} {droop}");
    for code_zero_u_v in [0.0, 1e-3] {
        let [_, bias, _, droop] = leaking(0.0, code_zero_u_v);
        // The offset of up to 1 mV is rectangular.
        let leaked = (1e-6 / 3.0 + code_zero_u_v * code_zero_u_v).sqrt() / 100.0;
        assert_near(bias, droop.hypot(leaked), 1e-4);
    }
}

/// A voltage input: the offset stands at its own resistor.
#[test]
fn a_voltage_input_refers_the_offset_to_its_resistor() {
    let circuit = Circuit { input_resistance_ohm: Some(1e6), ..CIRCUIT };
    let policy = Policy { worst_input: None, ..POLICY };
    let setup = Setup::<Flux>::new(circuit, CONVERTER, NOISE, policy);
    let mut channel = Channel::new(&setup);
    let (mut tick, mut level) = (0, 0.0);
    // 0.2 mV over 1 Mohm and 50 pA into 100 nF, inverting: 2 and 0.5 mV/s down.
    for (mode, rate) in [(Mode::Zero, -250.0), (Mode::Hold, -50.0)] {
        for _ in 0..1_000 {
            tick += STEP;
            level += rate * 0.01;
            channel.feed(Sample { tick, counts: f64::round(level) as i32, mode, temperature: None });
        }
    }
    let (offset, bias) = channel.offset_and_bias().expect("one of each");
    assert_near(offset.value.as_volts(), 0.2e-3, 1e-3);
    assert_near(bias.value.as_amperes(), 50e-12, 1e-3);
}

/// Outside by more than four of its uncertainties, told once when the hold ends, and by either sign.
#[test]
fn a_droop_outside_the_bias_limit_is_told() {
    // So noisy that rounding is nothing beside it.
    // An offset that is allowed as much drift again is none of the droop's.
    let circuit = Circuit { source_resistance_ohm: 10e6, ..CIRCUIT };
    let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, Noise { readout_counts: 20.0, ..NOISE }, POLICY);
    let u = slope_u(&[100]) * (400.0 / READOUT).sqrt();
    for sign in [1.0, -1.0] {
        for (excess, told) in
            [(0.97, false), (1.0 + 3.0 * u / LIMIT, false), (1.0 + 6.0 * u / LIMIT, true), (3.0, true)]
        {
            let mut script = silent(&setup);
            script.reset(5, 0.0).zero(300).integrate(100, 2_000.0).hold(100, sign * excess * LIMIT);
            assert!(script.faults().is_empty(), "not before it ends");
            script.integrate(100, 2_000.0);
            let faults = if told { vec![Reason::DroopOutsideLimits] } else { vec![] };
            assert_eq!(script.faults(), faults, "{sign} {excess}");
            assert_eq!(script.reading().trust, if told { Trust::Invalid } else { Trust::Good });
        }
    }
}

/// Where the bias is held at 0 nothing is told.
#[test]
fn without_a_bias_limit_nothing_is_told() {
    let policy = Policy { frozen_samples: 0, ..POLICY };
    let setup: Setup<Charge> = Setup::new(Circuit { bias_limit_a: 0.0, ..CIRCUIT }, CONVERTER, NOISE, policy);
    let mut script = silent(&setup);
    script.drift = 0.0;
    script.reset(5, 0.0).zero(300).integrate(100, 2_000.0).hold(100, 500.0).integrate(10, 0.0);
    assert_eq!(script.faults(), []);
}
