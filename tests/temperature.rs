//! A board that warms by 12 K in 4 minutes, in the order zero, run, zero, run ...: what the temperature is worth.

use brimline::{
    Channel, Charge, Circuit, Converter, Mode, Noise, Policy, Sample, Setup, Temperature, TemperatureLaw, Trust,
};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};

/// 1 count is 1 pC.
const CIRCUIT: Circuit = Circuit {
    rail_low_v: -100.0,
    rail_high_v: 100.0,
    source_resistance_ohm: 10e6,
    bias_limit_a: 100e-12,
    ..Circuit::DEFAULT
};

fn setup(temperature_law: TemperatureLaw) -> Setup<Charge> {
    Setup::new(
        Circuit { temperature_law, ..CIRCUIT },
        Converter {
            code_zero_v: 0.0,
            lsb_v: 10e-6,
            code_min: -(1 << 23),
            code_max: 1 << 23,
            tick_hz: 1e6,
            ..Converter::DEFAULT
        },
        // The wander is what a careful user would allow for; the warm-up is far more.
        Noise { readout_counts: 1.0, input_density: 0.2e-12, offset_wander: 0.0, ..Noise::NONE },
        Policy::DEFAULT,
    )
}

const OFFSET: TemperatureLaw = TemperatureLaw::Offset { limit_v_per_k: 50e-6 };
const JUNCTION: TemperatureLaw = TemperatureLaw::Junction { doubling_k: 10.0 };

/// The board's temperature, degrees Celsius: 12 K in 4 minutes, most of it early.
fn celsius(t: f64) -> f64 {
    25.0 + 12.0 * (1.0 - (-t / 100.0).exp()) / (1.0 - (-2.4_f64).exp())
}

/// Counts/s at a temperature: an offset that changes by 30 uV/K, or a junction's 40 pA at 25 degrees Celsius.
fn rate(law: TemperatureLaw, celsius: f64) -> f64 {
    match law {
        TemperatureLaw::Junction { .. } => 40.0 * ((celsius - 25.0) / 10.0).exp2(),
        _ => 20.0 + 3.0 * (celsius - 25.0),
    }
}

struct Outcome {
    /// Closed error in counts and over u, for each run.
    errors: Vec<(f64, f64)>,
    good: bool,
}

/// Zeros of 5 s and runs of 25 s without input for 4 minutes, after a zero of 10 s.
fn warm_up(setup: &Setup<Charge>, law: TemperatureLaw, measured: bool, seed: u64) -> Outcome {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let mut channel = Channel::new(setup);
    let (mut level, mut tick, mut t) = (0.0, 0_u32, 0.0);
    let mut outcome = Outcome { errors: Vec::new(), good: true };
    let mut phases = vec![(Mode::Zero, 1000)];
    for _ in 0..8 {
        phases.extend([(Mode::Integrate, 2500), (Mode::Zero, 500)]);
    }
    for (k, &(mode, samples)) in phases.iter().enumerate() {
        for _ in 0..samples {
            t += 0.01;
            let (noise, readout): (f64, f64) = (StandardNormal.sample(&mut rng), StandardNormal.sample(&mut rng));
            level += rate(law, celsius(t)) * 0.01 + 0.2 * (0.005_f64).sqrt() * noise;
            tick = tick.wrapping_add(10_000);
            let temperature = measured.then(|| Temperature::from_millidegrees_celsius((1000.0 * celsius(t)) as i32));
            channel.feed(Sample { tick, counts: (level + readout).round() as i32, mode, temperature });
        }
        if k > 0 && mode == Mode::Zero {
            let reading = channel.reading().expect("a run");
            let closed = reading.closed.expect("closed").integral;
            let counts = closed.value.as_coulombs() / 1e-12;
            outcome.errors.push((counts, closed.value.as_coulombs() / closed.u.as_coulombs()));
            outcome.good &= reading.trust == Trust::Good;
        }
    }
    outcome
}

fn rms(values: impl Iterator<Item = f64>) -> f64 {
    let (mut sum, mut n) = (0.0, 0.0);
    for v in values {
        sum += v * v;
        n += 1.0;
    }
    f64::sqrt(sum / n)
}

#[test]
fn the_error_of_runs_between_zeros_falls_at_least_fivefold() {
    for (name, law) in [("offset", OFFSET), ("junction", JUNCTION)] {
        let setup = setup(law);
        let of = |measured| -> Vec<Outcome> { (0..40).map(|seed| warm_up(&setup, law, measured, seed)).collect() };
        let (with, without) = (of(true), of(false));
        // The coefficient is known from the second closing zero on.
        let late = |outcomes: &[Outcome]| rms(outcomes.iter().flat_map(|o| o.errors.iter().skip(2).map(|e| e.0)));
        let all = |outcomes: &[Outcome]| rms(outcomes.iter().flat_map(|o| o.errors.iter().map(|e| e.0)));
        let scaled = rms(with.iter().flat_map(|o| o.errors.iter().map(|e| e.1)));
        let good = with.iter().filter(|o| o.good).count();
        println!(
            "{name}: rms error {:.1} counts with, {:.1} without; after the second run {:.1} and {:.1}; error/u {scaled:.2}, good {good}/40",
            all(&with),
            all(&without),
            late(&with),
            late(&without)
        );
        assert!(all(&with) * 5.0 < all(&without), "{name}");
        assert!((0.5..1.5).contains(&scaled), "{name}: {scaled}");
        assert!(good >= 38, "{name}: {good}");
    }
}

#[test]
fn without_warming_nothing_changes() {
    let (law, still) = (setup(OFFSET), setup(TemperatureLaw::Unknown));
    let story = |setup: &Setup<Charge>, temperature| {
        let mut channel = Channel::new(setup);
        for k in 1..3000_u32 {
            let mode = if (1000..2000).contains(&k) { Mode::Integrate } else { Mode::Zero };
            let counts = (k / 5 + k * 7919 % 3) as i32;
            channel.feed(Sample { tick: k * 10_000, counts, mode, temperature });
        }
        channel.reading().map(|r| (r.at_stop, r.closed))
    };
    let steady = Some(Temperature::from_millidegrees_celsius(31_000));
    assert_eq!(story(&law, steady), story(&still, steady));
    assert_eq!(story(&law, None), story(&still, None));
}
