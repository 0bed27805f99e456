//! A wander of the offset that the set-up understates: successive zeros show it, and uncertainties follow.

use brimline::{Channel, Charge, Circuit, Converter, Event, Mode, Noise, Policy, Sample, Setup};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};

/// 1 count is 1 pC; the wander is 0.1 counts/s per root second in truth.
fn setup(wander: f64) -> Setup<Charge> {
    Setup::new(
        Circuit { rail_low_v: -100.0, rail_high_v: 100.0, ..Circuit::DEFAULT },
        Converter {
            code_zero_v: 0.0,
            lsb_v: 10e-6,
            code_min: -(1 << 23),
            code_max: 1 << 23,
            tick_hz: 1e6,
            ..Converter::DEFAULT
        },
        Noise { readout_counts: 1.0, input_density: 0.5e-12, offset_wander: wander * 1e-12, ..Noise::NONE },
        Policy::DEFAULT,
    )
}

/// Whether the closed 95 % interval held the truth, for each of 30 runs of 30 s between zeros of 20 s.
fn cycles(setup: &Setup<Charge>, seed: u64) -> Vec<bool> {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let mut channel = Channel::new(setup);
    let (mut level, mut drift, mut tick) = (0.0, 20.0, 0_u32);
    let mut held = Vec::new();
    for k in 0..61 {
        let (mode, samples) = if k % 2 == 0 { (Mode::Zero, 1000) } else { (Mode::Integrate, 1500) };
        for _ in 0..samples {
            let mut normal = || -> f64 { StandardNormal.sample(&mut rng) };
            drift += 0.1 * (0.02_f64).sqrt() * normal();
            level += drift * 0.02 + 0.5 * (0.01_f64).sqrt() * normal();
            tick = tick.wrapping_add(20_000);
            channel.feed(Sample { tick, counts: (level + normal()).round() as i32, mode, temperature: None });
        }
        if mode == Mode::Zero && k > 0 {
            let reading = channel.reading().expect("a run");
            // A zero is counted when it has ended.
            assert!(!reading.noise_tested || k >= 12, "{k}");
            assert!(reading.noise_tested || k < 24, "{k}");
            let closed = reading.closed.expect("closed").integral;
            held.push(closed.value.as_coulombs().abs() <= 1.96 * closed.u.as_coulombs());
        }
    }
    held
}

#[test]
fn coverage_recovers_from_an_understated_wander_within_a_few_zeros() {
    println!("wander in the set-up   runs 1 to 3   runs 11 to 30");
    for (name, wander, least) in
        [("right", 0.1, 93.0), ("3 times too small", 0.1 / 3.0, 85.0), ("3 times too large", 0.3, 93.0)]
    {
        let setup = setup(wander);
        let held: Vec<_> = (0..60).map(|seed| cycles(&setup, seed)).collect();
        let share = |from: usize, to: usize| {
            let hits: usize = held.iter().map(|h| h.iter().take(to).skip(from).filter(|&&x| x).count()).sum();
            100.0 * hits as f64 / (60 * (to - from)) as f64
        };
        let (early, late) = (share(0, 3), share(10, 30));
        println!("{name:<20} {early:>11.1} % {late:>13.1} %");
        assert!(late >= least, "{name}: {late} %");
    }
}

/// What the set-up says of the readout and what the zeros show, both in the notice; and the reading goes by what they
/// show.
#[test]
fn a_readout_noise_that_is_not_as_stated_is_told_with_both_figures() {
    for (noise, expected) in [(3.0, Some(301)), (1.0, None), (0.5, Some(58))] {
        let mut rng = ChaCha8Rng::seed_from_u64(5);
        let setup = setup(0.0);
        let mut channel = Channel::new(&setup);
        let mut told = None;
        for k in 1..=1001_u32 {
            let mode = if k <= 1000 { Mode::Zero } else { Mode::Integrate };
            let scatter: f64 = StandardNormal.sample(&mut rng);
            let counts = (noise * scatter).round() as i32;
            let step = channel.feed(Sample { tick: k * 10_000, counts, mode, temperature: None });
            for notice in step.notices.iter() {
                if let Event::ReadoutNoise { stated_centicounts, observed_centicounts } = notice.event {
                    told = Some((stated_centicounts, observed_centicounts));
                }
            }
        }
        // One count and its rounding: the root of 1 + 1/12.
        assert_eq!(told.map(|(stated, _)| stated), expected.map(|_| 104), "{noise}");
        if let (Some((_, observed)), Some(expected)) = (told, expected) {
            assert!(observed.abs_diff(expected) <= expected / 10, "{observed} {expected}");
        }
        let readout = channel.reading().expect("a run").at_stop.budget.readout.as_coulombs() / 1e-12;
        assert!((readout / (noise * noise + 1.0 / 12.0_f64).sqrt() - 1.0).abs() < 0.1, "{noise}: {readout}");
    }
}
