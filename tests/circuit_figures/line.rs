//! The line through the first samples after the switch has opened, and what the level at which it opened makes of it.

use brimline::{Charge, Circuit, Noise, Setup};

use crate::script::{CONVERTER, NOISE};
use crate::{PLAIN, READOUT, STILL};

pub const WINDOW: usize = 16;
/// k T / C of 100 nF at 300 K in codes of 10 uV, squared.
pub const KTC: f64 = 0.0203517738785 * 0.0203517738785;

pub fn setup(pedestal_u: Option<f64>, walk: f64) -> Setup<Charge> {
    Setup::new(
        Circuit { pedestal_u_v: pedestal_u.map(|counts| counts * 10e-6), ..STILL },
        CONVERTER,
        Noise { input_density: walk * 1e-12, ..NOISE },
        PLAIN,
    )
}

/// What a segment's samples, `j` steps of 10 ms after the switch opened, make of the level at `-d` steps.
pub struct Opening {
    pub weights: Vec<f64>,
    /// The weight of the level at which it opened.
    pub gain: f64,
}

/// Variance, counts^2, of the reset level and `k T / C` together and of the pedestal, and how much of the pedestal's
/// error is in the total already.
#[derive(Clone, Copy)]
pub struct Known {
    pub own: f64,
    pub pedestal: f64,
    pub lever: f64,
}

impl Opening {
    /// A straight line through the samples (Draper & Smith, from memory), pulled toward the known level with the gain
    /// that makes the total's variance least: `(1 - K)^2 v + K^2 own + (lever + K)^2 s`.
    pub fn new(samples: usize, d: f64, known: Option<Known>) -> Self {
        let n = samples.min(WINDOW) as f64;
        let mean = (n + 1.0) / 2.0;
        let squares = n * (n * n - 1.0) / 12.0;
        let line = |j: usize, at: f64| 1.0 / n + (at - mean) * (j as f64 - mean) / squares;
        let used = 1..=samples.min(WINDOW);
        let v: f64 = used.clone().map(|j| line(j, 0.0).powi(2)).sum::<f64>() * READOUT;
        let cross: f64 = used.clone().map(|j| line(j, 0.0) * line(j, -d)).sum::<f64>() * READOUT;
        let gain = known.map_or(0.0, |known| {
            let variance =
                |k: f64| (1.0 - k).powi(2) * v + k * k * known.own + (known.lever + k).powi(2) * known.pedestal;
            least(variance) * cross / v
        });
        let mut weights = vec![0.0; samples + 1];
        for j in used {
            weights[j] = line(j, -d) - gain * line(j, 0.0);
        }
        Self { weights, gain }
    }

    pub fn readout(&self) -> f64 {
        self.weights.iter().map(|w| w * w).sum::<f64>() * READOUT
    }

    /// Less the level at `-d`, plus the last sample.
    pub fn to_the_last(&self) -> Vec<f64> {
        let mut weights: Vec<f64> = self.weights.iter().map(|w| -w).collect();
        *weights.last_mut().unwrap() += 1.0;
        weights
    }
}

/// Where a parabola between 0 and 1 is least, by golden section.
fn least(f: impl Fn(f64) -> f64) -> f64 {
    let (mut low, mut high) = (0.0, 1.0);
    for _ in 0..60 {
        let (a, b) = (low + 0.381966 * (high - low), low + 0.618034 * (high - low));
        if f(a) < f(b) { high = b } else { low = a }
    }
    0.5 * (low + high)
}

pub fn squares(weights: &[f64]) -> f64 {
    weights.iter().map(|w| w * w).sum()
}
