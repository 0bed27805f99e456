//! What the temperature adds, against least squares over all zero samples in f64.

use brimline::{Charge, Circuit, Estimate, Event, Mode, Policy, Reading, Sample, Setup, Temperature, TemperatureLaw};
use nalgebra::{SMatrix, SVector};

use crate::script::{CIRCUIT, CONVERTER, NOISE, POLICY, STEP, Script};
use crate::{assert_near, counts, told};

/// 5 counts/s for each kelvin at most; the drift is at most 200 counts/s.
fn setup(policy: Policy) -> Setup<Charge> {
    let temperature_law = TemperatureLaw::Offset { limit_v_per_k: 50e-6 };
    Setup::new(Circuit { temperature_law, source_resistance_ohm: 10e6, ..CIRCUIT }, CONVERTER, NOISE, policy)
}
const DRIFT_LIMIT: f64 = 200.0;
const PER_KELVIN: f64 = 5.0;
const READOUT: f64 = 1.0 + 1.0 / 12.0;

/// A script with a temperature, whose drift at the first one is `drift`.
struct Warm<'s> {
    script: Script<'s>,
}

impl Warm<'_> {
    fn feed(&mut self, mode: Mode, samples: u32, kelvin: f64) -> &mut Self {
        for _ in 0..samples {
            let script = &mut self.script;
            script.level += (script.drift + 3.0 * kelvin) * 0.01;
            if mode == Mode::Reset {
                script.level = 0.0;
            }
            script.tick += STEP;
            // Half a count either way, in turn: dither without chance.
            let code = (script.level + if (script.tick / STEP).is_multiple_of(2) { 0.4 } else { -0.4 }).round() as i32;
            let temperature = Some(Temperature::from_millidegrees_celsius(25_000 + (1000.0 * kelvin) as i32));
            let step = script.channel.feed(Sample { tick: script.tick, counts: code, mode, temperature });
            script.notices.extend(step.notices.iter().map(|n| (n.tick, n.event)));
        }
        self
    }

    fn reading(&self) -> Reading<Charge> {
        self.script.reading()
    }
}

fn warm(setup: &Setup<Charge>) -> Warm<'_> {
    Warm { script: Script::new(setup) }
}

/// Least squares: level, drift, its change per kelvin, and the movement of each of two runs.
struct Squares {
    information: SMatrix<f64, 5, 5>,
    /// Time and the time integral of the warming so far, s and K s.
    time: f64,
    area: f64,
}

impl Squares {
    fn new() -> Self {
        let mut information = SMatrix::zeros();
        information[(1, 1)] = 3.0 / (DRIFT_LIMIT * DRIFT_LIMIT);
        information[(2, 2)] = 3.0 / (PER_KELVIN * PER_KELVIN);
        Self { information, time: 0.0, area: 0.0 }
    }

    fn row(&self, runs: usize) -> SVector<f64, 5> {
        SVector::from([1.0, self.time, self.area, f64::from(u8::from(runs > 0)), f64::from(u8::from(runs > 1))])
    }

    fn pass(&mut self, samples: u32, kelvin: f64) {
        self.time += 0.01 * f64::from(samples);
        self.area += 0.01 * f64::from(samples) * kelvin;
    }

    fn zero(&mut self, samples: u32, kelvin: f64, runs: usize) {
        for _ in 0..samples {
            self.pass(1, kelvin);
            let row = self.row(runs);
            self.information += row * row.transpose() / READOUT;
        }
    }

    /// Variance of a linear function, with the movements of runs that have not stopped left out.
    fn variance(&self, of: SVector<f64, 5>, runs: usize) -> f64 {
        let mut information = self.information;
        for unknown in 3 + runs..5 {
            information[(unknown, unknown)] = 1.0;
        }
        let covariance = information.try_inverse().expect("enough zeros");
        (of.transpose() * covariance * of)[(0, 0)]
    }
}

fn variance(estimate: &Estimate<Charge>) -> f64 {
    counts(estimate.integral.u).powi(2)
}

/// Zeros of 4 s, runs of 10 s, at 0, 0.1 and 0.25 K: before the coefficient is known, and after.
#[test]
fn uncertainties_of_runs_that_warm_are_those_of_least_squares() {
    let setup = setup(Policy { zero_block_s: 0.0, frozen_samples: 0, ..POLICY });
    let mut warm = warm(&setup);
    let mut squares = Squares::new();
    // The first sample of all only starts the clock: it is a zero sample at time 0.
    squares.zero(1, 0.0, 0);
    warm.feed(Mode::Zero, 400, 0.0);
    squares.zero(399, 0.0, 0);
    for (run, kelvin) in [(0, 0.1), (1, 0.25)] {
        warm.feed(Mode::Integrate, 1000, kelvin);
        squares.pass(1000, kelvin);
        // The run's movement is its last sample above the baseline.
        let at_stop = squares.variance(squares.row(run), run) + READOUT;
        assert_near(variance(&warm.reading().at_stop), at_stop, 2e-3);
        warm.feed(Mode::Zero, 400, kelvin);
        squares.zero(400, kelvin, run + 1);
        let mut movement = SVector::zeros();
        movement[3 + run] = 1.0;
        let closed = warm.reading().closed.expect("closed");
        assert_near(variance(&closed), squares.variance(movement, run + 1), 2e-3);
        assert!(counts(closed.integral.value).abs() < 3.0 * counts(closed.integral.u), "{closed:?}");
    }
    assert_eq!(told(&warm.script, Event::InputInZero), 0);
}

/// A run of 2 s with a pause in it, 4 K warmer than the zero, which said nothing of what that does.
#[test]
fn warming_counts_while_the_switch_is_closed_and_not_while_the_input_is_open() {
    let setup = setup(POLICY);
    for (pause, driven_s) in [(Mode::Reset, 2.8), (Mode::Hold, 2.0)] {
        let mut warm = warm(&setup);
        warm.feed(Mode::Zero, 6000, 0.0);
        warm.feed(Mode::Integrate, 100, 4.0).feed(pause, 80, 4.0).feed(Mode::Integrate, 100, 4.0);
        let drift = counts(warm.reading().at_stop.budget.drift);
        assert_near(drift, PER_KELVIN / 3.0_f64.sqrt() * 4.0 * driven_s, 0.01);
    }
}

/// A junction of up to 100 pA, 100 counts/s, at 25 degrees Celsius: the double 10 K above. The run lasts a second.
#[test]
fn a_junction_s_leakage_doubles() {
    let temperature_law = TemperatureLaw::Junction { doubling_k: 10.0 };
    let setup = Setup::new(Circuit { temperature_law, ..CIRCUIT }, CONVERTER, NOISE, POLICY);
    let mut warm = warm(&setup);
    warm.feed(Mode::Zero, 6000, 0.0).feed(Mode::Integrate, 100, 10.0);
    let drift = counts(warm.reading().at_stop.budget.drift);
    assert_near(drift, 100.0 / 3.0_f64.sqrt() * (2.0 - 1.0), 0.01);
}

/// What the running reading says is what is kept when the run stops: with flicker, wander and warming as well.
#[test]
fn the_running_reading_is_the_one_at_stop() {
    let noise = brimline::Noise { input_flicker: 1e-12, offset_wander: 0.1e-12, input_density: 1e-12, ..NOISE };
    let temperature_law = TemperatureLaw::Offset { limit_v_per_k: 50e-6 };
    let circuit = Circuit { temperature_law, source_resistance_ohm: 10e6, ..CIRCUIT };
    let setup = Setup::new(circuit, CONVERTER, noise, POLICY);
    let mut warm = warm(&setup);
    warm.feed(Mode::Zero, 400, 0.0).feed(Mode::Integrate, 300, 1.0).feed(Mode::Reset, 3, 1.0);
    let running = warm.feed(Mode::Integrate, 300, 2.0).reading().at_stop;
    warm.feed(Mode::Zero, 1, 2.0);
    assert_eq!(warm.reading().at_stop, running);
}

/// Input begins in a zero that had just begun to tell what warming does: what the sums had gathered until it was found
/// is not taken for warmth. The run after it lasts 4 s, 10 K warmer.
#[test]
fn an_onset_takes_back_what_was_learned_of_the_warmth() {
    let setup = setup(POLICY);
    let mut warm = warm(&setup);
    warm.feed(Mode::Zero, 500, 0.0).feed(Mode::Integrate, 10, 2.0).feed(Mode::Zero, 150, 2.0);
    for _ in 0..200 {
        warm.script.level += 0.06;
        warm.feed(Mode::Zero, 1, 2.0);
    }
    assert_eq!(told(&warm.script, Event::InputInZero), 1);
    warm.feed(Mode::Integrate, 400, 12.0);
    let integral = warm.reading().at_stop.integral;
    let (error, u) = (-counts(integral.value) - 12.0, counts(integral.u));
    assert!(error.abs() < 3.0 * u && u < 10.0, "off by {error}, u {u}");
}

/// A sensor that is read with each 40th sample and shows the same again: it counts in every mode anew.
#[test]
fn a_temperature_measured_seldom_counts_in_every_mode() {
    let setup = Setup::new(CIRCUIT, CONVERTER, NOISE, POLICY);
    let warming = |in_hold: i32| {
        let mut script: Script<'_> = Script::new(&setup);
        for (mode, celsius) in
            [(Mode::Zero, 20), (Mode::Integrate, 20), (Mode::Hold, in_hold), (Mode::Integrate, in_hold)]
        {
            for k in 0..100 {
                script.tick += STEP;
                let temperature = (k % 40 == 39).then(|| Temperature::from_millidegrees_celsius(1000 * celsius));
                script.channel.feed(Sample { tick: script.tick, counts: k % 3 - 1, mode, temperature });
            }
        }
        script.reading().warming_mk
    };
    assert_eq!((warming(20), warming(25)), (Some(0), Some(5000)));
}
