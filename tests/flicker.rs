//! Flicker noise of the input: the error of a run grows with its length, and `u` with it.

use brimline::{Channel, Charge, Circuit, Converter, Mode, Noise, Policy, Sample, Setup, Trust};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};

/// 1 count is 1 pC; flicker of 1 count/s per root hertz at 1 Hz.
const FLICKER: f64 = 1.0;
const SETUP: Setup<Charge> = Setup::new(
    Circuit { rail_low_v: -100.0, rail_high_v: 100.0, ..Circuit::DEFAULT },
    Converter {
        code_zero_v: 0.0,
        lsb_v: 10e-6,
        code_min: -(1 << 23),
        code_max: 1 << 23,
        tick_hz: 1e6,
        ..Converter::DEFAULT
    },
    Noise { readout_counts: 1.0, input_density: 0.3e-12, input_flicker: FLICKER * 1e-12, ..Noise::NONE },
    Policy::DEFAULT,
);

/// A rate with the one-sided density `FLICKER^2 / f` between about 1 mHz and 20 Hz: a relaxation for each octave, with
/// the variance `FLICKER^2 ln 2` that an octave of such noise holds.
struct Flicker {
    states: [f64; 16],
}

impl Flicker {
    fn new(rng: &mut ChaCha8Rng) -> Self {
        let mut flicker = Self { states: [0.0; 16] };
        flicker.states.iter_mut().for_each(|s| *s = Self::sigma() * normal(rng));
        flicker
    }

    fn sigma() -> f64 {
        FLICKER * std::f64::consts::LN_2.sqrt()
    }

    fn step(&mut self, dt: f64, rng: &mut ChaCha8Rng) -> f64 {
        for (k, state) in self.states.iter_mut().enumerate() {
            let kept = (-dt / (0.008 * f64::from(1 << k))).exp();
            *state = kept * *state + Self::sigma() * (1.0 - kept * kept).sqrt() * normal(rng);
        }
        self.states.iter().sum()
    }
}

fn normal(rng: &mut ChaCha8Rng) -> f64 {
    StandardNormal.sample(rng)
}

/// Errors over u at stop and closed, of a run `ratio` times as long as the zeros of 10 s before and after it.
fn scaled_errors(ratio: f64, seed: u64) -> ([f64; 2], Trust) {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let mut flicker = Flicker::new(&mut rng);
    let mut channel = Channel::new(&SETUP);
    let (mut level, mut tick) = (0.0, 0_u32);
    let run_samples = (ratio * 200.0) as u32;
    for (mode, samples, dt) in
        [(Mode::Zero, 1000, 0.01), (Mode::Integrate, run_samples, 0.05), (Mode::Zero, 1000, 0.01)]
    {
        for _ in 0..samples {
            let white = 0.3 * (dt / 2.0_f64).sqrt() * normal(&mut rng);
            level += (20.0 + flicker.step(dt, &mut rng)) * dt + white;
            tick = tick.wrapping_add((dt * 1e6) as u32);
            let counts = (level + normal(&mut rng)).round() as i32;
            channel.feed(Sample { tick, counts, mode, temperature: None });
        }
    }
    let reading = channel.reading().expect("a run");
    let scaled = |e: &brimline::Estimate<Charge>| e.integral.value.as_coulombs() / e.integral.u.as_coulombs();
    ([scaled(&reading.at_stop), reading.closed.as_ref().map_or(f64::NAN, scaled)], reading.trust)
}

#[test]
fn intervals_cover_runs_from_1_to_30_times_the_zero() {
    const TRIALS: u64 = 500;
    println!("run/zero   at stop 1.96 u   rms/u   closed 1.96 u   rms/u   not good");
    for ratio in [1.0, 3.0, 10.0, 30.0] {
        let outcomes: Vec<_> = (0..TRIALS).map(|seed| scaled_errors(ratio, seed)).collect();
        let share = |hits: usize| 100.0 * hits as f64 / TRIALS as f64;
        let rms = |k: usize| (outcomes.iter().map(|o| o.0[k] * o.0[k]).sum::<f64>() / TRIALS as f64).sqrt();
        let covered = [0, 1].map(|k| share(outcomes.iter().filter(|o| o.0[k].abs() <= 1.96).count()));
        let not_good = share(outcomes.iter().filter(|o| o.1 != Trust::Good).count());
        println!(
            "{ratio:>8}   {:>12.1} % {:>7.3}   {:>11.1} % {:>7.3}   {not_good:>6.1} %",
            covered[0],
            rms(0),
            covered[1],
            rms(1)
        );
        for (k, covered) in covered.into_iter().enumerate() {
            assert!((90.0..=99.0).contains(&covered), "{ratio}: {covered} %");
            assert!((0.7..=1.1).contains(&rms(k)), "{ratio}: {}", rms(k));
        }
        assert!(not_good < 5.0, "{ratio}: {not_good} %");
    }
}
