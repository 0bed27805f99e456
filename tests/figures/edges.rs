//! The lines beside resets, against the variance of the sum of weighted samples that they are.

use brimline::{Charge, Circuit, Estimate, Mode, Noise, Policy, Setup, Trust};

use crate::script::{CIRCUIT, CONVERTER, NOISE, POLICY, STEP, Script};
use crate::{assert_near, counts};

/// No drift, and every sample by itself: nothing but readout noise and walk.
fn setup(walk: f64) -> Setup<Charge> {
    Setup::new(
        Circuit { offset_limit_v: 0.0, bias_limit_a: 0.0, ..CIRCUIT },
        CONVERTER,
        Noise { input_density: walk * 1e-12, ..NOISE },
        Policy { zero_block_s: 0.0, frozen_samples: 0, ..POLICY },
    )
}

fn quiet(setup: &Setup<Charge>) -> Script<'_> {
    let mut script = Script::new(setup);
    (script.noisy, script.drift) = (false, 0.0);
    script
}

const READOUT: f64 = 1.0 + 1.0 / 12.0;
const WINDOW: usize = 16;

/// Weights of the samples of a segment in the run's total. Sample `j` lies `j` steps after the switch opened.
struct Segment {
    weights: Vec<f64>,
}

impl Segment {
    fn new(samples: usize) -> Self {
        Self { weights: vec![0.0; samples + 1] }
    }

    /// The value at `at`, in steps, of the line through some samples (Draper & Smith, from memory).
    fn line(mut self, samples: std::ops::RangeInclusive<usize>, at: f64, sign: f64) -> Self {
        let n = samples.clone().count() as f64;
        let mean = samples.clone().map(|j| j as f64).sum::<f64>() / n;
        let squares: f64 = samples.clone().map(|j| (j as f64 - mean).powi(2)).sum();
        for j in samples {
            self.weights[j] += sign * (1.0 / n + (at - mean) * (j as f64 - mean) / squares);
        }
        self
    }

    fn opened(self, dead: f64) -> Self {
        let last = (self.weights.len() - 1).min(WINDOW);
        self.line(1..=last, -0.5 * dead, -1.0)
    }

    fn closed(self, dead: f64) -> Self {
        let last = self.weights.len() - 1;
        self.line(last + 1 - last.min(WINDOW)..=last, last as f64 + 0.5 * dead, 1.0)
    }

    fn stopped(mut self) -> Self {
        *self.weights.last_mut().unwrap() += 1.0;
        self
    }

    fn readout(&self) -> f64 {
        self.weights.iter().map(|w| w * w).sum::<f64>() * READOUT
    }

    /// In variances of one step: each step moves all samples after it.
    fn walked(&self) -> f64 {
        (1..self.weights.len()).map(|j| self.weights[j..].iter().sum::<f64>().powi(2)).sum()
    }
}

/// A segment of 20 samples between two resets: 12 of them are in both of its lines.
#[test]
fn samples_in_two_lines_count_with_both_weights() {
    let setup = setup(40.0);
    let mut script = quiet(&setup);
    script.zero(300).integrate(40, 20_000.0).reset(8, 0.0).integrate(20, 20_000.0).reset(8, 0.0);
    script.integrate(200, 20_000.0);
    let segments = [
        Segment::new(40).closed(8.0),
        Segment::new(20).opened(8.0).closed(8.0),
        Segment::new(200).opened(8.0).stopped(),
    ];
    let budget = script.reading().at_stop.budget;
    // The last sample is the run's end, and no part of the lines.
    let readout: f64 = segments.iter().map(Segment::readout).sum::<f64>() - READOUT;
    let walked: f64 = segments.iter().map(Segment::walked).sum();
    assert_near(counts(budget.dead_time), readout.sqrt(), 1e-3);
    assert_near(counts(budget.input_noise), (walked * 800.0 * 0.01).sqrt(), 1e-3);
}

fn variance(estimate: &Estimate<Charge>) -> f64 {
    counts(estimate.integral.u).powi(2)
}

/// The run's last sample is part of the line that opened its last segment, and a reset stops it.
#[test]
fn a_run_that_a_reset_stops_soon_after_a_reset() {
    let setup = setup(0.0);
    for samples in [3, 8, 12, 16] {
        let mut script = quiet(&setup);
        script.zero(300).integrate(40, 20_000.0);
        let start = variance(&script.reading().at_stop) - READOUT;
        script.reset(2, 0.0).integrate(samples, 20_000.0);
        let segments = [Segment::new(40).closed(2.0), Segment::new(samples as usize).opened(2.0).stopped()];
        let expected: f64 = start + segments.iter().map(Segment::readout).sum::<f64>();
        assert_near(variance(&script.reading().at_stop), expected, 2e-3);
        script.reset(2, 0.0).zero(100);
        assert_near(variance(&script.reading().closed.expect("closed")), expected, 2e-3);
    }
}

/// A run without a zero before it starts on its first line.
#[test]
fn the_walk_of_a_run_that_begins_on_a_line() {
    let setup = setup(40.0);
    let mut script = quiet(&setup);
    script.reset(3, 0.0).integrate(100, 2_000.0);
    let walked = Segment::new(100).opened(0.0).stopped().walked();
    assert_near(counts(script.reading().at_stop.budget.input_noise), (walked * 800.0 * 0.01).sqrt(), 1e-3);
}

/// A run with a reset in which every other sample is `by` counts too high and the others too low.
fn zigzag(setup: &Setup<Charge>, by: i32) -> f64 {
    let mut script = quiet(setup);
    script.zero(300).integrate(100, 20_000.0);
    for half in 0..2 {
        if half == 1 {
            script.reset(2, 0.0);
        }
        for j in 0..100 {
            script.level += 200.0;
            let code = script.level as i32 + if j % 2 == 0 { by } else { -by };
            script.sample_of(Mode::Integrate, STEP, code);
        }
    }
    counts(script.reading().at_stop.budget.dead_time)
}

/// Birge ratio: sixteen samples 20 counts off either way leave 16 * 20^2 about a line, where noise leaves 14 variances.
#[test]
fn samples_that_scatter_more_than_their_noise_widen_what_a_reset_costs() {
    let setup_of_none = setup(0.0);
    let ratio = zigzag(&setup_of_none, 20) / zigzag(&setup_of_none, 0);
    assert_near(ratio, (16.0 * 400.0 / (14.0 * READOUT)).sqrt(), 0.05);
    // A strong walk explains it: q h (n^2 - 4) / 15 is 17 of it for each count^2 in a step.
    let strong = setup(400.0);
    assert_near(zigzag(&strong, 20), zigzag(&strong, 0), 1e-3);
}

/// Where the level walks, a bend of a few counts is nothing: the line stays as it is.
#[test]
fn a_bend_that_walk_explains_is_left_alone() {
    let setup = setup(60.0);
    let run = |bend: f64| {
        let mut script = quiet(&setup);
        script.zero(300).integrate(100, 20_000.0);
        for j in 0..16 {
            let u = f64::from(j) - 7.5;
            let code = (script.level + 200.0 * f64::from(j + 1) + bend * (u * u - 21.25)).round() as i32;
            script.sample_of(Mode::Integrate, STEP, code);
        }
        script.level += 3200.0;
        script.reset(20, 0.0).integrate(100, 20_000.0);
        script.reading()
    };
    // Seven standard deviations of the readout's share.
    let (straight, bent) = (run(0.0), run(0.1));
    assert!(counts(straight.interpolated).abs() > 3900.0);
    assert_near(counts(bent.at_stop.budget.dead_time), counts(straight.at_stop.budget.dead_time), 0.01);
    assert_near(counts(bent.interpolated), counts(straight.interpolated), 1e-3);
}

/// Only the slope before is known: it is the uncertainty, and the drift is all that is added.
#[test]
fn a_guess_is_as_uncertain_as_the_input_it_does_not_count() {
    let mut script = Script::new(&crate::script::SETUP);
    script.zero(300).integrate(200, 20_000.0).reset(2, 0.0).integrate(1, 20_000.0);
    assert_near(counts(script.reading().at_stop.budget.dead_time), 20_020.0 * 0.02, 0.01);
    let mut script = Script::new(&crate::script::SETUP);
    script.drift = 90.0;
    script.zero(300).integrate(200, 0.0).reset(80, 0.0).integrate(1, 0.0);
    let reading = script.reading();
    assert!(counts(reading.at_stop.integral.value).abs() < 8.0, "{reading:?}");
    assert_eq!(reading.trust, Trust::LowerBound);
}

/// An input of known slew: of the bend that the samples show, the share is taken off that the slew makes likely, and
/// what may be left in is charged. Here the prior of the bend is as wide as what the readout noise says of it: half and
/// half.
#[test]
fn a_known_slew_shares_out_the_bend() {
    // In steps of 10 ms. Sum of (u^2 - mean)^2 over 16 samples, and half the slew, squared, over 2 (GUM 4.3.5).
    let power: f64 = (0..16).map(|j| ((f64::from(j) - 7.5).powi(2) - 21.25).powi(2)).sum();
    let of_noise = READOUT / power;
    let slew = 2.0 * (2.0 * of_noise).sqrt() * 1e4; // counts/s^2
    let circuit = Circuit { offset_limit_v: 0.0, bias_limit_a: 0.0, ..CIRCUIT };
    let policy = Policy { zero_block_s: 0.0, frozen_samples: 0, input_slew: Some(slew * 1e-12), ..POLICY };
    let setup = Setup::new(circuit, CONVERTER, NOISE, policy);
    let mut script = quiet(&setup);
    script.zero(300).integrate(100, 20_000.0).reset(8, 0.0).integrate(100, 20_000.0);
    let (share, left) = (0.5, of_noise * 0.25);
    // The parabola's weights are orthogonal to the line's. It is followed to the switching instant, and its slope there
    // for half the dead time, 4 steps.
    let edge = |centre: f64| {
        let bend = centre * centre - 21.25 + 4.0 * 2.0 * centre;
        let line = 1.0 / 16.0 + (centre + 4.0).powi(2) / 340.0;
        READOUT * (line + share * share * bend * bend / power) + left * bend * bend
    };
    let expected = edge(7.5) + edge(8.5);
    assert_near(counts(script.reading().at_stop.budget.dead_time), expected.sqrt(), 1e-3);
}
