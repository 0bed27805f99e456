//! The lines beside an instant against the textbook's sums in f64: Draper & Smith, Applied Regression Analysis, from
//! memory; the walk's share written out step by step.

#![allow(clippy::disallowed_methods, reason = "a reference on the host computes in f64; only src must give equal bits")]

extern crate std;

mod curved;
mod ends;
mod shared;
mod straight;

use std::vec::Vec;

use super::{After, Before, Dot, Hint, Nearest, Taken};
use crate::setup::Derived;
use crate::{Charge, Circuit, Converter, Noise, Policy, Setup};

const READOUT_VAR: f64 = 2.25;

fn derived(fine_bits: u8, level_walk: f64, bend_var: Option<f64>) -> Derived {
    let setup: Setup<Charge> = Setup::new(Circuit::DEFAULT, Converter::DEFAULT, Noise::NONE, Policy::DEFAULT);
    let mut derived = *setup.derived();
    (derived.tick_s, derived.ticks_per_s, derived.fine_bits) = (1e-6, 1e6, fine_bits);
    (derived.level_walk, derived.bend_var) = (level_walk as f32, bend_var.map(|var| var as f32));
    derived
}

/// Repeatable noise.
struct Dice(u64);

impl Dice {
    fn uniform(&mut self) -> f64 {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 11) as f64 / (1_u64 << 53) as f64
    }

    fn normal(&mut self) -> f64 {
        (0..12).map(|_| self.uniform()).sum::<f64>() - 6.0
    }
}

#[derive(Clone, Copy, Debug, PartialEq)]
enum Spacing {
    Even,
    Jittered,
    /// Wider and wider: no symmetry.
    Widening,
    Wild,
}

/// Samples away from the instant: seconds, counts above the nearest; and as they are fitted.
#[derive(Clone, Debug)]
struct Case {
    nearest: u32,
    ticks: Vec<u32>,
    fine: Vec<i32>,
    fine_bits: u8,
}

impl Case {
    /// `level(s)`: counts at a distance in seconds beyond the nearest sample.
    fn new(dice: &mut Dice, n: usize, spacing: Spacing, fine_bits: u8, level: impl Fn(f64) -> f64) -> Self {
        let mut wider = 4_000;
        let mut step = || match spacing {
            Spacing::Even => 10_000,
            Spacing::Jittered => 8_000 + (4_000.0 * dice.uniform()) as u32,
            Spacing::Widening => {
                wider += 1_000;
                wider
            }
            Spacing::Wild => 2_f64.powf(26.0 * dice.uniform()) as u32,
        };
        let nearest = step();
        let mut ticks = std::vec![0];
        for _ in 1..n {
            ticks.push(ticks.last().unwrap() + step());
        }
        let fine =
            |&t: &u32| ((level(f64::from(t) * 1e-6) + 1.5 * dice.normal()) * 2_f64.powi(fine_bits.into())).round();
        let fine: Vec<f64> = ticks.iter().map(fine).collect();
        Self { nearest, fine: fine.iter().map(|y| (y - fine[0]) as i32).collect(), ticks, fine_bits }
    }

    fn dots(&self) -> Vec<Dot> {
        self.ticks.iter().zip(&self.fine).map(|(&t, &y)| Dot { x: t as i32, y }).collect()
    }

    fn nearest(&self) -> Nearest {
        Nearest { ticks: self.nearest, level_q16: 0 }
    }

    fn x(&self) -> Vec<f64> {
        self.ticks.iter().map(|&t| f64::from(t + self.nearest) * 1e-6).collect()
    }

    fn y(&self) -> Vec<f64> {
        self.fine.iter().map(|&y| f64::from(y) / 2_f64.powi(self.fine_bits.into())).collect()
    }
}

/// Weights of samples at distances `x` in the level at `-d`, of a line, and of a parabola's share `taken_off`.
fn weights(x: &[f64], d: f64, taken_off: f64) -> Vec<f64> {
    let n = x.len() as f64;
    let mean = x.iter().sum::<f64>() / n;
    let u: Vec<f64> = x.iter().map(|x| x - mean).collect();
    let sum = |f: &dyn Fn(f64) -> f64| u.iter().map(|&u| f(u)).sum::<f64>();
    let squares = sum(&|u| u * u);
    let (skew, square) = (sum(&|u| u * u * u) / squares, squares / n);
    let q = |u: f64| u * u - skew * u - square;
    // A parabola is followed to the instant, and from there its tangent.
    let at = q(-mean) + d * (2.0 * mean + skew);
    let power = sum(&|u| q(u) * q(u));
    let bend = |u: f64| if taken_off > 0.0 { taken_off * at * q(u) / power } else { 0.0 };
    u.iter().map(|&u| 1.0 / n - (mean + d) * u / squares + bend(u)).collect()
}

fn product(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

/// What the run keeps of the walk, less what it is charged with: of each step, the weight nearer to the instant,
/// squared, less 1. `gain`: the weight at the instant.
fn walked(x: &[f64], weights: &[f64], gain: f64) -> f64 {
    let (mut near, mut seen, mut sum) = (0.0, gain, 0.0);
    for (x, w) in x.iter().zip(weights) {
        sum += (x - near) * (seen * seen - 1.0);
        (near, seen) = (*x, seen + w);
    }
    sum
}

#[track_caller]
fn near(what: &str, value: f32, expected: f64, tolerance: f64, case: &Case) {
    assert!(
        (f64::from(value) - expected).abs() <= tolerance,
        "{what}: {value:e}, not {expected:e} +- {tolerance:e} in {case:?}"
    );
}

/// How far values and variances may be off, as shares of the standard uncertainty and of the variance.
fn shares(spacing: Spacing) -> (f64, f64) {
    match spacing {
        Spacing::Even => (1e-4, 2e-3),
        Spacing::Jittered | Spacing::Widening => (0.02, 0.01),
        Spacing::Wild => (0.02, 0.03),
    }
}

fn each(mut check: impl FnMut(&mut Dice, usize, Spacing, f64)) {
    let mut dice = Dice(1);
    for spacing in [Spacing::Even, Spacing::Jittered, Spacing::Wild] {
        for n in 2..=16 {
            for slope in [0.0, 3_000.0, -40_000.0, 1.0] {
                check(&mut dice, n, spacing, slope);
            }
        }
    }
}

/// The counts that rounding each sample's residual to a fine step may move a sum with these weights by.
fn rounding(weights: &[f64], case: &Case) -> f64 {
    0.75 * weights.iter().map(|w| w.abs()).sum::<f64>() / 2_f64.powi(case.fine_bits.into())
}
