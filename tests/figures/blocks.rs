//! Blocks of a zero at their limits: steep drifts, spikes, walks that are stated too large.

use brimline::{Channel, Charge, Circuit, Converter, Event, Mode, Noise, Policy, Sample, Setup, Trust};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

const QUIET: Noise = Noise { readout_counts: 1.0, ..Noise::NONE };

/// Near enough to normal noise of one standard deviation.
fn normal(rng: &mut ChaCha8Rng) -> f64 {
    (0..4).map(|_| rng.random::<f64>() - 0.5).sum::<f64>() * 3.0_f64.sqrt()
}

/// A drift within the data sheet's limit that moves the level by more than 2^22 counts in a block.
#[test]
fn a_block_that_drifts_past_its_range_tells_no_wrong_drift() {
    let circuit = Circuit {
        capacitance_f: 1e-10,
        source_resistance_ohm: 1e8,
        offset_limit_v: 0.01,
        rail_low_v: -2.5,
        rail_high_v: 2.5,
        inverting: false,
        ..Circuit::DEFAULT
    };
    let lsb_v = 5.0 / f64::from(1 << 28);
    let converter =
        Converter { code_zero_v: 0.0, lsb_v, code_min: -(1 << 27), code_max: (1 << 27) - 1, ..Converter::DEFAULT };
    let setup: Setup<Charge> = Setup::new(circuit, converter, QUIET, Policy::DEFAULT);
    let mut channel = Channel::new(&setup);
    // Offset and bias together may drift by 2 V/s; here by 1.98 V/s, 1.06e7 counts in a block.
    let per_sample = -1.98 / lsb_v * 2e-3;
    for k in 1..=374 {
        let mode = if k < 374 { Mode::Zero } else { Mode::Integrate };
        let counts = (per_sample * f64::from(k) + f64::from(k % 3) - 1.0).round() as i32;
        channel.feed(Sample { tick: 2000 * k as u32, counts, mode, temperature: None });
    }
    let reading = channel.reading().expect("a run");
    let integral = reading.at_stop.integral;
    let off = integral.value.as_coulombs() / integral.u.as_coulombs();
    assert!(reading.trust != Trust::Good || off.abs() < 8.0, "off by {off} u: {reading:?}");
}

/// A steep drift that no zero has told yet: the first blocks are coarsened, and must not tell a noise that is not
/// there.
#[test]
fn a_coarsened_block_tells_the_noise_or_nothing() {
    let circuit = Circuit {
        capacitance_f: 1e-6,
        bias_limit_a: 1e-9,
        rail_low_v: -5.0,
        rail_high_v: 5.0,
        inverting: false,
        ..Circuit::DEFAULT
    };
    let lsb_v = 10.0 / f64::from(1 << 29);
    let converter = Converter {
        code_zero_v: -5.0,
        lsb_v,
        code_min: 0,
        code_max: (1 << 29) - 1,
        tick_hz: 4e9,
        ..Converter::DEFAULT
    };
    let policy = Policy { zero_block_s: 0.5, gap_limit_s: 0.5, ..Policy::DEFAULT };
    let noise = Noise { readout_counts: 5.0, ..Noise::NONE };
    let setup: Setup<Charge> = Setup::new(circuit, converter, noise, policy);
    for seed in 1..100 {
        let (slope, mut rng) = (-2.5 * seed as f64, ChaCha8Rng::seed_from_u64(seed));
        let mut channel = Channel::new(&setup);
        let mut seen = None;
        for k in 1..=400_u32 {
            let counts = f64::from(1 << 28) + slope * f64::from(k) + 5.0 * normal(&mut rng);
            let mode = if k < 400 { Mode::Zero } else { Mode::Integrate };
            let tick = 14_663_297_u32.wrapping_mul(k);
            let step = channel.feed(Sample { tick, counts: counts.round() as i32, mode, temperature: None });
            seen = seen.or(step.notices.iter().find(|notice| matches!(notice.event, Event::ReadoutNoise { .. })));
        }
        assert_eq!(seen, None, "5 counts of noise at {slope} counts a sample");
    }
}

/// A zero of one good sample and two end codes: the baseline was seen two samples before the run starts.
#[test]
fn a_block_of_one_sample_is_as_old_as_that_sample() {
    let circuit = Circuit {
        capacitance_f: 1e-9,
        rail_low_v: -2.4,
        rail_high_v: 2.4,
        bias_limit_a: 1e-9,
        inverting: false,
        ..Circuit::DEFAULT
    };
    let converter = Converter { tick_hz: 1000.0, ..Converter::DEFAULT };
    let setup: Setup<Charge> = Setup::new(circuit, converter, QUIET, Policy::DEFAULT);
    let mut channel = Channel::new(&setup);
    let mut feed = |k: u32, counts, mode| channel.feed(Sample { tick: 20 * k, counts, mode, temperature: None });
    // 0.8 V/s of the 1 V/s that the bias current may cause, samples 20 ms apart.
    let code = |k: u32| (32_768.0 + 0.8 * 0.02 / converter.lsb_v * f64::from(k)).round() as i32;
    for k in 0..5 {
        feed(k, 32_768, Mode::Reset);
    }
    for (k, counts, mode) in
        [(5, code(0), Mode::Zero), (6, 65_535, Mode::Zero), (7, 65_535, Mode::Zero), (8, code(3), Mode::Integrate)]
    {
        feed(k, counts, mode);
    }
    let reading = channel.reading().expect("a run");
    let (value, u) = (reading.at_stop.integral.value.as_coulombs(), reading.at_stop.integral.u.as_coulombs());
    // Three samples' drift is not known: 3 * 0.02 s * 1 V/s / sqrt(3) / C.
    assert!(u > 0.9 * 0.06 / 3.0_f64.sqrt() * 1e-9, "u {u:e}: {reading:?}");
    assert!(reading.trust != Trust::Good || value.abs() < 2.0 * u, "{value:e} for u {u:e}");
}

/// Drifts of up to 400 counts in each tick of a slow counter, within the data sheet's limit: no spike, no onset.
#[test]
fn a_drift_of_many_counts_in_a_tick_is_followed() {
    let circuit = Circuit { bias_limit_a: 1e-6, ..Circuit::DEFAULT };
    let converter = Converter {
        code_zero_v: 0.0,
        lsb_v: 20.0 / f64::from(1 << 24),
        code_min: -(1 << 23),
        code_max: (1 << 23) - 1,
        tick_hz: 1000.0,
        ..Converter::DEFAULT
    };
    let noise = Noise { readout_counts: 3.0, ..Noise::NONE };
    let setup: Setup<Charge> = Setup::new(circuit, converter, noise, Policy::DEFAULT);
    for per_tick in [-400, -130, 120, 127, 128, 130, 400] {
        let (mut channel, mut rng) = (Channel::new(&setup), ChaCha8Rng::seed_from_u64(1));
        for k in 0..1_000 {
            let counts = f64::from(per_tick * (10 * k - 5_000)) + 3.0 * normal(&mut rng);
            let sample =
                Sample { tick: 10 * k as u32, counts: counts.round() as i32, mode: Mode::Zero, temperature: None };
            let step = channel.feed(sample);
            assert!(step.notices.is_empty(), "{per_tick} counts a tick: {:?}", step.notices);
        }
    }
}

/// 24 bits and a leak of 0.1 s: in a window of samples more leaks than the converter is wide. A healthy switch is
/// healthy.
#[test]
fn what_leaks_beside_a_reset_fits_the_levels_that_are_kept() {
    let circuit = Circuit { leak_time_constant_s: Some(0.1), inverting: false, bias_limit_a: 0.0, ..Circuit::DEFAULT };
    let converter = Converter {
        code_zero_v: 0.0,
        lsb_v: 20.0 / f64::from(1 << 24),
        code_min: -(1 << 23),
        code_max: (1 << 23) - 1,
        ..Converter::DEFAULT
    };
    let setup: Setup<Charge> = Setup::new(circuit, converter, QUIET, Policy::DEFAULT);
    let full = 8.0 / converter.lsb_v;
    for step_s in [0.005, 0.015, 0.02, 0.05] {
        let kept = (-step_s / 0.1_f64).exp();
        let (mut channel, mut tick, mut level) = (Channel::new(&setup), 0, 0.0);
        let mut feed = |mode, samples: u32| {
            for _ in 0..samples {
                tick += (1e6 * step_s) as u32;
                level = if mode == Mode::Integrate { full + (level - full) * kept } else { 0.0 };
                let counts = (level + f64::from(tick / 5_000 % 3) - 1.0).round() as i32;
                channel.feed(Sample { tick, counts, mode, temperature: None });
            }
        };
        feed(Mode::Zero, 400);
        for _ in 0..4 {
            feed(Mode::Integrate, 40);
            feed(Mode::Reset, 4);
        }
        feed(Mode::Integrate, 40);
        let reading = channel.reading().expect("a run");
        assert!(!reading.reasons.contains(brimline::Reason::ResetNotArrived), "{step_s} s: {reading:?}");
    }
}
