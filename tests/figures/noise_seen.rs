//! What the zeros show of the noise, in numbers.

use brimline::{Event, Mode, Noise, Policy, Setup, Trust};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};

use crate::script::{CIRCUIT, CONVERTER, NOISE, POLICY, STEP, Script};
use crate::{assert_near, counts, drift, told};

/// Percentages told as `DriftWander`, in order.
fn wanders(script: &Script<'_>) -> Vec<u16> {
    let of = |&(_, event): &(u32, Event)| if let Event::DriftWander { percent } = event { Some(percent) } else { None };
    script.notices.iter().filter_map(of).collect()
}

/// A walk ten times the readout noise from sample to sample is not taken for noise of the samples.
#[test]
fn a_walk_within_blocks_is_no_readout_noise() {
    let walk = 10.0; // counts per square root of second
    let setup = Setup::new(CIRCUIT, CONVERTER, Noise { input_density: walk * 2.0_f64.sqrt() * 1e-12, ..NOISE }, POLICY);
    let mut script = Script::new(&setup);
    let mut rng = ChaCha8Rng::seed_from_u64(1);
    for _ in 0..20_000 {
        let step: f64 = StandardNormal.sample(&mut rng);
        script.level += walk * 0.1 * step;
        script.zero(1);
    }
    // The script's dither is even over two counts, and is rounded: 1/3 and 1/12.
    let sample = 1.0 / 3.0 + 1.0 / 12.0;
    // Two lines of 16 samples, half a dead time (one sample period) beyond the switching instants: see `runs.rs`.
    script.noisy = false;
    script.drift = 0.0;
    script.level = 0.0;
    script.reset(2, 0.0).integrate(200, 20_000.0).reset(2, 0.0).integrate(200, 20_000.0);
    let line = |lever: f64| 1.0 / 16.0 + lever * lever / 340.0;
    let dead_time = counts(script.reading().at_stop.budget.dead_time).powi(2);
    assert_near(dead_time / (line(7.5 + 1.0) + line(8.5 + 1.0)), sample, 0.1);
}

/// With readout noise 3 times as large as the set-up says, the innovations tell, and the drift is as much less certain.
#[test]
fn figures_that_are_too_small_widen_the_drift_by_what_the_innovations_show() {
    let of = |figure: f64| {
        let setup = Setup::new(CIRCUIT, CONVERTER, Noise { readout_counts: figure, ..NOISE }, POLICY);
        let mut script = Script::new(&setup);
        let mut rng = ChaCha8Rng::seed_from_u64(2);
        for _ in 0..3000 {
            let noise: f64 = StandardNormal.sample(&mut rng);
            script.level += 0.2;
            let code = (script.level + 3.0 * noise).round() as i32;
            script.sample_of(Mode::Zero, STEP, code);
        }
        drift(&script).1
    };
    assert_near(of(1.0), of(3.0), 0.15);
}

/// A hum of 60 Hz has 6 periods in 5 samples at 50 Hz; one sample more would leave a fifth of it in the mean.
#[test]
fn a_block_is_as_near_to_its_length_as_the_samples_allow() {
    let setup = Setup::new(CIRCUIT, CONVERTER, NOISE, Policy { frozen_samples: 0, ..POLICY });
    let mut script = Script::new(&setup);
    let ticks = 19_999;
    let hum = |tick: u32| 30.0 * (std::f64::consts::TAU * 60.0 * f64::from(tick) * 1e-6).sin();
    for k in 0..2000 {
        script.level = 20.0 * f64::from(script.tick + ticks) * 1e-6 + hum(script.tick + ticks);
        script.sample(if k < 1500 { Mode::Zero } else { Mode::Integrate }, ticks);
    }
    let (rate, u) = drift(&script);
    assert!((rate - 20.0).abs() < 3.0 * u && u < 0.05, "{rate} +- {u}");
    let figures = script.notices.iter().filter_map(|&(_, e)| match e {
        Event::NoiseFigures { percent } => Some(percent),
        _ => None,
    });
    assert!(figures.clone().all(|percent| percent < 100), "{:?}", figures.collect::<Vec<_>>());
}

/// A block ends at 65,535 samples, whatever its length: two minutes at 2 kHz in blocks of a minute.
#[test]
fn a_block_holds_no_more_samples_than_it_can_count() {
    let setup = Setup::new(CIRCUIT, CONVERTER, NOISE, Policy { zero_block_s: 60.0, ..POLICY });
    let mut script = Script::new(&setup);
    for _ in 0..300_000 {
        script.level += 20.0 * 500e-6;
        script.sample(Mode::Zero, 500);
    }
    script.integrate(100, 2000.0);
    let integral = script.reading().at_stop.integral;
    let error = -counts(integral.value) - 2000.0;
    assert!(error.abs() < 3.0 * counts(integral.u) && counts(integral.u) < 3.0, "off by {error}, {integral:?}");
    // The dither is even over two counts, and is rounded: what the blocks scatter about their lines is still that.
    assert_near(counts(script.reading().at_stop.budget.readout).powi(2), 1.0 / 3.0 + 1.0 / 12.0, 0.05);
}

/// Zeros whose drifts lie apart by a known step: the surprise of each is the step squared over what the zero took from
/// the drift's variance, which starts at 1 with the worth of 4 zeros.
#[test]
fn the_wander_that_zeros_show_is_their_steps_over_what_they_learned() {
    let setup = Setup::new(CIRCUIT, CONVERTER, Noise { offset_wander: 0.01e-12, ..NOISE }, POLICY);
    let mut script = Script::new(&setup);
    let (mut dispersion, mut zeros) = (1.0, 4.0);
    // Fewer than 16 blocks in each zero but the first: no sums of innovations widen anything.
    let mut samples = 3000;
    while wanders(&script).is_empty() {
        // The first block finds the level and says nothing of the drift.
        script.zero(10);
        let (before, prior_u) = drift(&script);
        script.zero(samples);
        let (after, posterior_u) = drift(&script);
        let surprise = (after - before).powi(2) / (prior_u * prior_u - posterior_u * posterior_u);
        assert!(surprise < 25.0 && zeros < 10.0, "{surprise} after {zeros}");
        dispersion += (surprise - dispersion) / (zeros + 1.0);
        zeros += 1.0;
        script.integrate(1, 0.0).hold(40_000, 0.0);
        samples = 140;
        script.drift = if script.drift == 20.0 { 21.0 } else { 20.0 };
    }
    assert_near(f64::from(wanders(&script)[0]), 100.0 * f64::sqrt(dispersion), 0.01);
}

/// After 130 steady zeros, 20 restless ones are enough to tell: a surprise of several variances in each.
#[test]
fn many_steady_zeros_do_not_outweigh_a_change() {
    let setup = Setup::new(CIRCUIT, CONVERTER, Noise { offset_wander: 0.01e-12, ..NOISE }, POLICY);
    let mut script = Script::new(&setup);
    for k in 0..150 {
        script.drift = if k >= 130 && k % 2 == 0 { 21.1 } else { 20.0 };
        script.zero(150).integrate(1, 0.0).hold(20_000, 0.0);
        assert!(k >= 130 || wanders(&script).is_empty());
    }
    assert!(wanders(&script).last().is_some_and(|&percent| percent > 150), "{:?}", wanders(&script));
}

/// An input that begins soon after the zero has its level is found before it has done harm.
#[test]
fn an_onset_is_not_taken_for_noise() {
    let setup = Setup::new(CIRCUIT, CONVERTER, NOISE, POLICY);
    let mut script = Script::new(&setup);
    script.zero(300).integrate(500, 2000.0).zero(40);
    script.drift += 20.0;
    script.zero(300);
    assert_eq!(told(&script, Event::InputInZero), 1);
    let (found, _) = script.notices.iter().find(|(_, e)| matches!(e, Event::Fault(_))).copied().expect("told");
    assert!(found / STEP - 840 <= 100, "found after {} samples", found / STEP - 840);
    assert_ne!(script.reading().trust, Trust::Good);
}

/// 64 blocks and 6 zeros that said something of the drift: until then the figures of the set-up are not borne out.
#[test]
fn noise_is_tested_once_there_were_blocks_and_zeros_enough() {
    let setup = Setup::new(CIRCUIT, CONVERTER, Noise { offset_wander: 0.1e-12, ..NOISE }, POLICY);
    // In 91 samples there are 8 blocks after the first, which finds the level.
    for (samples, after) in [(300, 6), (91, 8)] {
        let mut script = Script::new(&setup);
        let mut zeros = 0;
        while zeros < 20 && !script.channel.reading().is_some_and(|reading| reading.noise_tested) {
            script.zero(samples).integrate(1, 0.0);
            // A pause that makes the drift uncertain, so that the next zero has something to say.
            script.hold(10_000, 0.0).zero(1).integrate(1, 0.0);
            zeros += 1;
        }
        assert_eq!(zeros, after, "zeros of {samples} samples");
    }
}

/// A level that wanders by less than half a block's noise, but for seconds on end: single innovations do not show it,
/// sums of them do, and the drift is less certain for it.
#[test]
fn what_only_sums_of_innovations_show_widens_the_drift() {
    let of = |wander: f64| {
        let setup = Setup::new(CIRCUIT, CONVERTER, NOISE, POLICY);
        let mut script = Script::new(&setup);
        for k in 0..18 {
            script.level += if k % 2 == 0 { wander } else { -wander };
            script.zero(320);
        }
        assert_eq!(told(&script, Event::InputInZero), 0);
        drift(&script).1
    };
    let (still, wandering) = (of(0.0), of(0.3));
    assert!(wandering > 1.3 * still, "{wandering} and {still}");
}
