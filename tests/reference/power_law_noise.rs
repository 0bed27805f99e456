//! Levels with known noise: readout noise, random walk of the level, flicker and random walk of its rate.

use core::f64::consts::TAU;

use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;

/// Noise figures in counts and seconds.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Truth {
    pub(crate) readout_var: f64,
    pub(crate) level_walk: f64,
    pub(crate) rate_flicker: f64,
    pub(crate) rate_walk: f64,
}

pub(crate) struct Simulator(ChaCha8Rng);

impl Simulator {
    pub(crate) fn new(seed: u64) -> Self {
        Self(ChaCha8Rng::seed_from_u64(seed))
    }

    fn normal(&mut self) -> f64 {
        self.0.sample(StandardNormal)
    }

    /// A level sampled every `dt` seconds and rounded to whole counts, which adds 1/12 to the readout variance.
    pub(crate) fn level(&mut self, truth: &Truth, samples: usize, dt: f64) -> Vec<i64> {
        let mut flicker = if truth.rate_flicker > 0.0 { self.flicker_level(samples) } else { vec![0.0; samples] };
        flicker.iter_mut().for_each(|x| *x *= truth.rate_flicker.sqrt() * dt);
        let (mut level, mut rate) = (0.0, 0.0);
        flicker
            .iter()
            .map(|flicker| {
                // A Brownian path's end, and its mean given the end.
                let wandered = (truth.rate_walk * dt).sqrt() * self.normal();
                let mean = rate + 0.5 * wandered + (truth.rate_walk * dt / 12.0).sqrt() * self.normal();
                rate += wandered;
                level += mean * dt + (truth.level_walk * dt).sqrt() * self.normal();
                (level + flicker + truth.readout_var.sqrt() * self.normal()).round() as i64
            })
            .collect()
    }

    /// The integral of a rate with the spectral density `1 / f` at whole numbers, up to a straight line: exact in
    /// distribution. Its second differences are stationary with the covariances that the fourth difference of
    /// `h^2 ln|h| / 2` gives; a circulant matrix with these is diagonal in Fourier space (Davies & Harte 1987, Tests
    /// for Hurst effect, Biometrika 74, from memory).
    fn flicker_level(&mut self, samples: usize) -> Vec<f64> {
        let size = (2 * samples).next_power_of_two();
        let g = |h: f64| if h == 0.0 { 0.0 } else { 0.5 * h * h * h.abs().ln() };
        let covariance = |m: usize| {
            let m = m.min(size - m) as f64;
            if m > 100.0 {
                return -1.0 / (m * m) - 1.0 / (m * m * m * m); // the same to 1e-11, where the difference cancels
            }
            g(m - 2.0) - 4.0 * g(m - 1.0) + 6.0 * g(m) - 4.0 * g(m + 1.0) + g(m + 2.0)
        };
        let mut wave: Vec<(f64, f64)> = (0..size).map(|m| (covariance(m), 0.0)).collect();
        fourier(&mut wave);
        for value in &mut wave {
            assert!(value.0 > -1e-6, "the covariances are those of a noise");
            let size = (value.0.max(0.0) / size as f64).sqrt();
            *value = (size * self.normal(), size * self.normal());
        }
        fourier(&mut wave);
        let (mut rise, mut level) = (0.0, 0.0);
        let second_differences = wave.iter().take(samples).map(|value| value.0);
        second_differences
            .map(|second_difference| {
                rise += second_difference;
                level += rise;
                level
            })
            .collect()
    }

    /// Flicker noise of a rate by fractional differencing of white noise (Kasdin & Walter 1992, Discrete simulation of
    /// power law noise, from memory): the one-sided density at low frequency is `1 / (pi f)`.
    pub(crate) fn fractional_flicker(&mut self, samples: usize) -> Vec<f64> {
        let size = 4 * samples.next_power_of_two();
        let mut filter = vec![(0.0, 0.0); size];
        let mut weight = 1.0;
        for (k, tap) in filter.iter_mut().take(size / 2).enumerate() {
            tap.0 = weight;
            weight *= (k as f64 + 0.5) / (k as f64 + 1.0);
        }
        let mut noise: Vec<(f64, f64)> =
            (0..size).map(|k| if k < size / 2 { (self.normal(), 0.0) } else { (0.0, 0.0) }).collect();
        fourier(&mut filter);
        fourier(&mut noise);
        let mut product: Vec<(f64, f64)> = filter
            .iter()
            .zip(&noise)
            // Conjugated, so that transforming forwards transforms back.
            .map(|(a, b)| (a.0 * b.0 - a.1 * b.1, -(a.0 * b.1 + a.1 * b.0)))
            .collect();
        fourier(&mut product);
        // The filter's memory is empty at first: the later half has seen as much past as it lasts.
        product.iter().skip(size / 2 - samples).take(samples).map(|value| value.0 / size as f64).collect()
    }
}

/// Fourier transform in place of a power of two of complex numbers (textbook radix 2).
fn fourier(values: &mut [(f64, f64)]) {
    let n = values.len();
    if n < 2 {
        return;
    }
    let (mut even, mut odd): (Vec<_>, Vec<_>) = values.chunks(2).map(|pair| (pair[0], pair[1])).unzip();
    fourier(&mut even);
    fourier(&mut odd);
    for (k, (a, b)) in even.iter().zip(&odd).enumerate() {
        let (sin, cos) = (-TAU * k as f64 / n as f64).sin_cos();
        let turned = (b.0 * cos - b.1 * sin, b.0 * sin + b.1 * cos);
        values[k] = (a.0 + turned.0, a.1 + turned.1);
        values[k + n / 2] = (a.0 - turned.0, a.1 - turned.1);
    }
}
