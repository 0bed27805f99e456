//! Any samples in any order: no panic, no NaN, no negative uncertainty, and a total that is only good when it should
//! be.

mod script;

use brimline::{Channel, Charge, Converter, Mode, Reading, Reason, Sample, Setup, Trust};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use script::{CIRCUIT, CONVERTER, NOISE, POLICY, SETUP, Script};

const MODES: [Mode; 4] = [Mode::Zero, Mode::Integrate, Mode::Hold, Mode::Reset];

fn assert_sound(reading: &Reading<Charge>) {
    for estimate in [Some(&reading.at_stop), reading.closed.as_ref()].into_iter().flatten() {
        let (value, u) = (estimate.integral.value.as_coulombs(), estimate.integral.u.as_coulombs());
        assert!(value.is_finite() && u.is_finite() && u > 0.0, "{reading:?}");
        let b = &estimate.budget;
        for part in [b.readout, b.input_noise, b.drift, b.dead_time, b.leak_and_soakage, b.scale] {
            assert!(part.as_coulombs() >= 0.0 && part.as_coulombs() <= u * 1.000_001, "{reading:?}");
        }
    }
    assert_eq!(reading.trust == Trust::Good, reading.reasons.is_empty());
}

/// Random walks through modes, with sizes of steps and codes drawn from `codes` and `ticks`.
fn wander(
    setup: &Setup<Charge>,
    seed: u64,
    samples: u32,
    codes: impl Fn(&mut ChaCha8Rng) -> i32,
    ticks: impl Fn(&mut ChaCha8Rng) -> u32,
) {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let mut channel = Channel::new(setup);
    let (mut tick, mut mode) = (rng.random::<u32>(), Mode::Zero);
    for _ in 0..samples {
        tick = tick.wrapping_add(ticks(&mut rng));
        if rng.random_range(0..6) == 0 {
            mode = MODES[rng.random_range(0..4)];
        }
        let step = channel.feed(Sample { tick, counts: codes(&mut rng), mode, temperature: None });
        assert!(step.notices.iter().count() <= 12);
        if let Some(reading) = channel.reading() {
            assert_sound(&reading);
        }
        assert!(channel.drift().u.as_volts_per_second() >= 0.0);
    }
}

#[test]
fn any_codes_at_any_times_in_any_order() {
    for seed in 0..200 {
        wander(&SETUP, seed, 500, |rng| rng.random(), |rng| rng.random());
    }
}

#[test]
fn plausible_codes_in_any_order() {
    for seed in 0..200 {
        wander(&SETUP, seed, 500, |rng| rng.random_range(-50..50), |rng| rng.random_range(0..30_000));
    }
}

#[test]
fn extreme_codes_and_steps() {
    let extremes = [i32::MIN, i32::MIN + 1, -1, 0, 1, i32::MAX - 1, i32::MAX];
    let steps = [0, 1, 2, 0x7FFF_FFFF, 0x8000_0000, u32::MAX];
    let pick = |rng: &mut ChaCha8Rng| extremes[rng.random_range(0..extremes.len())];
    for seed in 0..200 {
        wander(&SETUP, seed, 300, pick, |rng| steps[rng.random_range(0..steps.len())]);
    }
}

#[test]
fn the_extremes_of_a_set_up() {
    let converter = Converter { code_min: -(1 << 29), code_max: 1 << 29, ..CONVERTER };
    let boards = [(1e-15, 0.0, 0.0), (1e-15, 1e-12, 1e-9), (1.0, 1.0, 1.0), (1e-9, 1e-3, 1e-13)];
    for ((capacitance_f, limit, noise), leaks) in boards.into_iter().flat_map(|board| [(board, false), (board, true)]) {
        let circuit = brimline::Circuit { capacitance_f, offset_limit_v: limit, bias_limit_a: 0.0, ..CIRCUIT };
        let figures =
            brimline::Noise { readout_counts: 0.0, input_density: noise, offset_wander: noise, input_flicker: noise };
        let policy = brimline::Policy { worst_input: None, ..POLICY };
        let branch = brimline::SoakageBranch { share: 0.4, time_constant_s: 3.0 };
        let soakage = [branch, branch, brimline::SoakageBranch::NONE, brimline::SoakageBranch::NONE];
        let circuit = match leaks {
            true => brimline::Circuit {
                leak_time_constant_s: Some(1e4),
                soakage,
                leak_u_rel: 0.1,
                pedestal_u_v: Some(1e-4),
                ..circuit
            },
            false => circuit,
        };
        let Ok(setup) = Setup::try_new(circuit, converter, figures, policy) else { continue };
        for seed in 0..50 {
            wander(
                &setup,
                seed,
                300,
                |rng| rng.random_range(-190_000..190_000),
                |rng| rng.random_range(1..2_000_000_000),
            );
        }
    }
}

/// A day at 100 samples/s with a reset every hundred seconds: the total is exact in integers, and the uncertainty is
/// that of the drift over the day and of so many resets, and nothing else.
#[test]
fn a_long_run_adds_up() {
    let mut script = Script::new(&SETUP);
    script.drift = 1.0;
    script.zero(1000);
    let drift_u = script.channel.drift().u.as_volts_per_second() / 10e-6;
    let resets = if cfg!(debug_assertions) { 86 } else { 864 };
    script.integrate(10_000, 1_500.0).reset(2, 0.0).integrate(10_000, 1_500.0);
    let one_reset = script.reading().at_stop.budget.dead_time.as_coulombs();
    for _ in 1..resets {
        script.reset(2, 0.0).integrate(10_000, 1_500.0);
    }
    let reading = script.reading();
    let truth = script::coulombs(1_500.0 * (100.0 * f64::from(resets + 1) + 0.02 * f64::from(resets)));
    let integral = reading.at_stop.integral;
    let error = integral.value.as_coulombs() - truth;
    assert_eq!(reading.trust, Trust::Good, "{:?}", script.faults());
    assert!(error.abs() < 3.0 * integral.u.as_coulombs(), "{error:e} {integral:?}");
    let drift = drift_u * reading.elapsed_s * script::COULOMBS_PER_COUNT;
    assert!((reading.at_stop.budget.drift.as_coulombs() / drift - 1.0).abs() < 0.01, "{reading:?} {drift:e}");
    let dead_time = one_reset * f64::from(resets).sqrt();
    assert!(
        (reading.at_stop.budget.dead_time.as_coulombs() / dead_time - 1.0).abs() < 0.05,
        "{reading:?} {dead_time:e}"
    );
}

/// Half a year of integrating without a zero: the baseline drifts past any 32-bit count.
#[test]
fn a_baseline_may_drift_past_32_bits() {
    let setup = Setup::new(
        brimline::Circuit { bias_limit_a: 100e-9, ..CIRCUIT },
        CONVERTER,
        NOISE,
        brimline::Policy { gap_limit_s: 2000.0, worst_input: None, frozen_samples: 0, ..POLICY },
    );
    let mut script = Script::new(&setup);
    script.drift = 400.0;
    script.noisy = false;
    script.zero(300);
    script.drift = 0.0; // the drift is cancelled by an input of the opposite sign
    let hours = 24 * 180;
    for _ in 0..2 * hours {
        script.sample(Mode::Integrate, 1_800_000_000);
    }
    let reading = script.reading();
    let truth = script::coulombs(-400.0 * f64::from(hours) * 3600.0);
    let (value, u) = (reading.at_stop.integral.value.as_coulombs(), reading.at_stop.integral.u.as_coulombs());
    assert!(reading.drift_removed.as_coulombs().abs() > 2e-3, "more than 2^31 counts");
    assert!((value - truth).abs() < 3.0 * u && u < 1e-3 * truth.abs(), "{value:e} {truth:e} {u:e}");
    assert!(!reading.reasons.contains(Reason::Gap));
}

/// A step back by one tick is 2^32 - 1 ticks to a counter that wraps, and time that nobody saw to a channel: after a gap,
/// and on a board where the worst input reaches a rail from every code within one sample.
#[test]
fn a_counter_that_steps_back_by_one_tick_is_stalled_where_nothing_is_calm() {
    let circuit = brimline::Circuit { rail_low_v: -2.4, rail_high_v: 2.4, ..CIRCUIT };
    let converter = Converter {
        code_zero_v: -2.5,
        lsb_v: 5.0 / 65536.0,
        code_min: 0,
        code_max: 65535,
        tick_hz: 1000.0,
        ..Converter::DEFAULT
    };
    for (worst_input, gap) in [(Some(2.9e-5), 0), (None, 2000)] {
        let setup: Setup<Charge> =
            Setup::new(circuit, converter, NOISE, brimline::Policy { worst_input, ..brimline::Policy::DEFAULT });
        let mut channel = Channel::new(&setup);
        let mut tick = 0_u32;
        let mut feed = |mode, step| {
            tick = tick.wrapping_add(step);
            channel.feed(Sample { tick, counts: 32_768 + (tick % 3) as i32, mode, temperature: None });
        };
        for mode in [Mode::Zero, Mode::Integrate] {
            (0..50).for_each(|_| feed(mode, 10));
        }
        if gap > 0 {
            feed(Mode::Integrate, gap);
        }
        feed(Mode::Integrate, u32::MAX);
        let reading = channel.reading().expect("a run");
        assert!(reading.reasons.contains(Reason::ClockStalled), "{reading:?}");
        assert_eq!(reading.elapsed_s, 0.5 + f64::from(gap) / 1000.0);
    }
}
