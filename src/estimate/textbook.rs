//! The lines beside an instant against the textbook's sums in f64: Draper & Smith, Applied Regression Analysis, from
//! memory; the walk's share written out step by step.

#![allow(clippy::disallowed_methods, reason = "a reference on the host computes in f64; only src must give equal bits")]

extern crate std;

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

/// What the run keeps of the walk, less what it is charged with: of each step, the weight nearer to the instant, squared,
/// less 1. `gain`: the weight at the instant.
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

#[test]
fn a_line_before_is_that_of_the_textbook() {
    each(|dice, n, spacing, slope| {
        // Wild distances last long.
        let slope = if spacing == Spacing::Wild { 0.01 * slope } else { slope };
        let case = Case::new(dice, n, spacing, 8, |s| slope * s);
        let (x, y) = (case.x(), case.y());
        let derived = derived(8, 900.0, None);
        let line = Before::fit(&mut case.dots(), &case.nearest(), READOUT_VAR as f32, None, &derived);
        let (value_share, share) = shares(spacing);
        let span = x[n - 1] - x[0];
        let level = line.edge.anchor_q16 as f64 / 65536.0 + f64::from(line.edge.level_at_instant(0.0));
        let at = weights(&x, 0.0, 0.0);
        let u = (READOUT_VAR * product(&at, &at)).sqrt();
        near(
            "level",
            level as f32,
            product(&at, &y),
            value_share * u + rounding(&at, &case) + 1e-6 * level.abs(),
            &case,
        );
        let change: Vec<f64> = weights(&x, 1.0, 0.0).iter().zip(&at).map(|(b, a)| b - a).collect();
        let slope_u = (READOUT_VAR * product(&change, &change)).sqrt();
        let expected = product(&change, &y);
        let tolerance = value_share * slope_u + rounding(&change, &case) + 1e-6 * expected.abs();
        near("slope", line.edge.slope.unwrap(), expected, tolerance, &case);
        for d in [0.0, 0.3 * span, 5.0 * span] {
            let w = weights(&x, d, 0.0);
            let (readout, walk) = line.variances(d as f32);
            let expected = READOUT_VAR * product(&w, &w);
            near("readout", readout, expected, share * expected, &case);
            let (expected, all) = (900.0 * walked(&x, &w, 0.0), 900.0 * x[n - 1]);
            near("walk", walk, expected, share * (expected + 2.0 * all), &case);
        }
        let of_slope = READOUT_VAR * product(&change, &change) + 900.0 * (walked(&x, &change, 0.0) + x[n - 1]);
        near("variance of the slope", line.slope_var, of_slope, share * of_slope, &case);
    });
}

#[test]
fn a_line_after_is_pulled_as_by_another_sample() {
    each(|dice, n, spacing, slope| {
        let slope = if spacing == Spacing::Wild { 0.01 * slope } else { slope };
        let case = Case::new(dice, n, spacing, 8, |s| slope * s);
        let (x, y) = (case.x(), case.y());
        let derived = derived(8, 900.0, None);
        let (value_share, share) = shares(spacing);
        let d = 0.4 * (x[n - 1] - x[0]);
        let at = weights(&x, 0.0, 0.0);
        let change: Vec<f64> = weights(&x, 1.0, 0.0).iter().zip(&at).map(|(b, a)| b - a).collect();
        let (var, cross) = (READOUT_VAR * product(&at, &at), READOUT_VAR * product(&at, &change));
        let level = product(&at, &y);
        for off in [2.0, 7.0] {
            let (own, shared, lever) = (0.4, 0.3, 0.5);
            let off = off * (var + own + shared).sqrt();
            let hint = Hint {
                level_q16: ((level + off) * 65536.0) as i64,
                own_var: own as f32,
                shared_var: shared as f32,
                lever: lever as f32,
            };
            let believed = off * off < 25.0 * (var + own + shared);
            let gain = if believed { ((var - lever * shared) / (var + own + shared)).max(0.0) } else { 0.0 };
            let turn = gain * cross / var;
            let line =
                After::fit(&mut case.dots(), &case.nearest(), READOUT_VAR as f32, Some(&hint), d as f32, &derived);
            let found = line.edge.anchor_q16 as f64 / 65536.0 + f64::from(line.edge.level_at_instant(0.0));
            let expected = level + gain * off;
            let tolerance = value_share * (var + off * off).sqrt() + rounding(&at, &case) + 1e-6 * level.abs();
            near("level", found as f32, expected, tolerance, &case);
            let slope = -(product(&change, &y) + turn * off);
            let slope_u = (READOUT_VAR * product(&change, &change)).sqrt() + turn * off;
            let tolerance = value_share * slope_u + rounding(&change, &case) + 1e-6 * slope.abs();
            near("slope", line.edge.slope.unwrap(), slope, tolerance, &case);
            let pulled: Vec<f64> = at.iter().zip(&change).map(|(a, b)| a * (1.0 - gain) + d * (b - turn * a)).collect();
            let hinted = gain + d * turn;
            near("hinted", line.hinted, hinted, share * hinted, &case);
            let expected = READOUT_VAR * product(&pulled, &pulled) + own * hinted * hinted;
            near("readout", line.readout_var, expected, share * expected, &case);
            let (expected, all) = (900.0 * walked(&x, &pulled, hinted), 900.0 * x[n - 1]);
            near("walk", line.walk_var, expected, share * (expected + 2.0 * all), &case);
            let slopes: Vec<f64> = at.iter().zip(&change).map(|(a, b)| b - turn * a).collect();
            let of_slope = READOUT_VAR * product(&slopes, &slopes)
                + own * turn * turn
                + 900.0 * (walked(&x, &slopes, turn) + x[n - 1]);
            // Far from the samples the hint takes all but a millionth of it away.
            let tolerance = share * of_slope + 5e-7 * READOUT_VAR * product(&change, &change);
            near("variance of the slope", line.slope_var, of_slope, tolerance, &case);
            let largest = |weights: &[f64]| weights.iter().fold(0.0_f64, |m, w| m.max(w.abs()));
            let tolerance = share * largest(&pulled) + 1e-6 * largest(&at);
            for (&t, &w) in case.ticks.iter().zip(&pulled) {
                near("weight", line.weights.at(t + case.nearest), w, tolerance, &case);
            }
        }
    });
}

/// Samples that the line after the last reset used as well; straight lines and parabolas.
#[test]
fn samples_in_two_lines_weigh_with_both_weights() {
    let mut dice = Dice(7);
    let straight = [(16, 16), (16, 12), (16, 1), (9, 9), (6, 4), (16, 0)].map(|(n, both)| (n, both, 0.0, 900.0));
    let curved = [(16, 16), (16, 13)].map(|(n, both)| (n, both, 9_000.0, 20.0));
    for spacing in [Spacing::Even, Spacing::Jittered, Spacing::Widening] {
        for (n, both, bend, level_walk) in straight.into_iter().chain(curved) {
            // Each line uses `n` samples of the segment.
            let all = Case::new(&mut dice, 2 * n - both, spacing, 8, |s| 500.0 * s + bend * s * s);
            let case = Case { ticks: all.ticks[..n].to_vec(), fine: all.fine[..n].to_vec(), ..all.clone() };
            let x = case.x();
            let derived = derived(8, level_walk, None);
            let taken_off = if bend > 0.0 { 1.0 } else { 0.0 };
            let apart = all.ticks[all.ticks.len() - 1] + all.nearest + 9_000;
            // Seen from the other instant: the farthest come first.
            let from_there: Vec<u32> = all.ticks.iter().rev().take(n).map(|t| apart - all.nearest - t).collect();
            let there: Vec<f64> = from_there.iter().map(|&t| f64::from(t) * 1e-6).collect();
            let rises = all.fine.iter().rev().map(|y| y - all.fine[all.fine.len() - 1]);
            let dots = from_there.iter().zip(rises).map(|(&t, y)| Dot { x: (t - from_there[0]) as i32, y });
            let nearest = Nearest { ticks: from_there[0], level_q16: 0 };
            let d = 0.05;
            let mut dots: Vec<Dot> = dots.collect();
            let other = After::fit(&mut dots, &nearest, READOUT_VAR as f32, None, d as f32, &derived);
            let taken = Taken { weights: &other.weights, apart, window: from_there[n - 1] };
            let line = Before::fit(&mut case.dots(), &case.nearest(), READOUT_VAR as f32, Some(&taken), &derived);
            let mut others = std::vec![0.0; n];
            for (i, w) in weights(&there, d, taken_off).iter().enumerate().skip(n - both) {
                others[2 * n - both - 1 - i] = *w;
            }
            for e in [0.0, 0.07] {
                let w = weights(&x, e, taken_off);
                let (readout, walk) = line.variances(e as f32);
                let share = (1.0 + taken_off) * shares(spacing).1;
                // The total holds this line's less the other's; what only the other sees is charged there.
                let expected = READOUT_VAR * (product(&w, &w) - 2.0 * product(&w, &others));
                let scale = READOUT_VAR * (product(&w, &w) + 2.0 * product(&w, &others).abs());
                near("readout", readout, expected.max(0.0), share * scale, &case);
                let (mut at, mut seen, mut other_seen, mut sum, mut scale) = (0.0, 0.0, 0.0, 0.0, 0.0);
                for i in 0..n {
                    let step: f64 = x[i] - at;
                    sum += step * (seen * seen - 1.0 + 2.0 * other_seen * (1.0 - seen));
                    scale += step * (seen * seen + 1.0 + 2.0 * (other_seen * (1.0 - seen)).abs());
                    (at, seen, other_seen) = (x[i], seen + w[i], other_seen + others[i]);
                }
                near("walk", walk, level_walk * sum, share * level_walk * scale, &case);
            }
        }
    }
}

/// A parabola of which `1` or, where the bend is known to be of the order of what noise makes of it, a part is taken
/// off; with the walk that its weights see.
#[test]
fn a_bend_that_walks() {
    let mut dice = Dice(11);
    let level_walk = 20.0;
    for spacing in [Spacing::Even, Spacing::Jittered, Spacing::Widening] {
        for (n, known) in [(11, false), (16, false), (11, true), (16, true)] {
            let case = Case::new(&mut dice, n, spacing, 8, |s| 9_000.0 * s * s - 700.0 * s);
            let (x, y) = (case.x(), case.y());
            let parts = |taken_off: f64| {
                let at = weights(&x, 0.0, taken_off);
                let change: Vec<f64> = weights(&x, 1.0, taken_off).iter().zip(&at).map(|(b, a)| b - a).collect();
                (at, change)
            };
            // The bend's own weights are what taking it off adds to any level's, over what it does there.
            let line = parts(0.0);
            let mean = x.iter().sum::<f64>() / n as f64;
            let u: Vec<f64> = x.iter().map(|x| x - mean).collect();
            let sum = |power: i32| u.iter().map(|u| u.powi(power)).sum::<f64>();
            let (skew, square) = (sum(3) / sum(2), sum(2) / n as f64);
            let q: Vec<f64> = u.iter().map(|u| u * u - skew * u - square).collect();
            let power = product(&q, &q);
            let of_noise = (READOUT_VAR + level_walk * (walked(&x, &q, 0.0) + x[n - 1]) / power) / power;
            let (taken_off, left, prior) = match known {
                false => (1.0, 0.0, None),
                true => (0.6, 1.5 * of_noise * 0.16, Some(1.5 * of_noise)),
            };
            let (at, change) = parts(taken_off);
            let derived = derived(8, level_walk, prior);
            let after = After::fit(&mut case.dots(), &case.nearest(), READOUT_VAR as f32, None, 0.1, &derived);
            let before = Before::fit(&mut case.dots(), &case.nearest(), READOUT_VAR as f32, None, &derived);
            let (value_share, share) = shares(spacing);
            let bent = 9_000.0 * (x[n - 1] - x[0]).powi(2);
            let tolerance = |weights: &[f64]| {
                let weighed = weights.iter().map(|w| w.abs()).sum::<f64>();
                let of_grid = if spacing == Spacing::Even { 1e-5 } else { 1e-3 } * bent * weighed;
                value_share * (READOUT_VAR * product(weights, weights)).sqrt() + rounding(weights, &case) + of_grid
            };
            let level = before.edge.anchor_q16 as f64 / 65536.0 + f64::from(before.edge.level_at_instant(0.0));
            near("level", level as f32, product(&at, &y), tolerance(&at), &case);
            near("slope", before.edge.slope.unwrap(), product(&change, &y), tolerance(&change), &case);
            near("slope", after.edge.slope.unwrap(), -product(&change, &y), tolerance(&change), &case);
            let w: Vec<f64> = at.iter().zip(&change).map(|(a, b)| a + 0.1 * b).collect();
            let bend_at = if known { (product(&w, &q) - product(&line.0, &q)) / taken_off } else { 0.0 };
            let readout = READOUT_VAR * product(&w, &w) + left * bend_at * bend_at;
            let walk = level_walk * walked(&x, &w, 0.0);
            let tolerances = (2.0 * share * readout, 2.0 * share * (walk + 2.0 * level_walk * x[n - 1]));
            let (before_readout, before_walk) = before.variances(0.1);
            near("readout after", after.readout_var, readout, tolerances.0, &case);
            near("readout before", before_readout, readout, tolerances.0, &case);
            near("walk after", after.walk_var, walk, tolerances.1, &case);
            near("walk before", before_walk, walk, tolerances.1, &case);
            let largest = w.iter().fold(0.0_f64, |m, w| m.max(w.abs()));
            for (&t, &w) in case.ticks.iter().zip(&w) {
                near("weight", after.weights.at(t + case.nearest), w, 2.0 * share * largest, &case);
            }
        }
    }
}

/// Birge ratio: samples that scatter by more than 3 standard deviations of `chi^2` above its expectation.
#[test]
fn scatter_beyond_noise_and_walk_widens() {
    for level_walk in [0.0, 100.0] {
        for (n, deviations, widens) in
            [(16, 2.8, false), (16, 3.2, true), (4, 2.8, false), (4, 3.2, true), (7, 20.0, true)]
        {
            let ticks: Vec<u32> = (0..n).map(|i| 10_000 * i).collect();
            let degrees = f64::from(n) - 2.0;
            let (walked, terms) = (level_walk * 0.01 * (f64::from(n) + 2.0) / 15.0, (2.0 / degrees).sqrt());
            let expected = degrees * (READOUT_VAR + walked);
            // A zigzag that a line does not follow; of four samples no parabola either, of an even number.
            let shape: Vec<f64> = (0..n).map(|i| if i % 2 == 0 { 1.0 } else { -1.0 }).collect();
            let x: Vec<f64> = ticks.iter().map(|&t| f64::from(t + 10_000) * 1e-6).collect();
            let (at, far) = (weights(&x, 0.0, 0.0), weights(&x, 1.0, 0.0));
            let (level, slope) = (product(&at, &shape), product(&at, &shape) - product(&far, &shape));
            let chi: f64 = x.iter().zip(&shape).map(|(x, y)| (y - level - slope * x).powi(2)).sum();
            let height = (expected * (1.0 + deviations * terms) / chi).sqrt();
            let fine: Vec<i32> = shape.iter().map(|y| ((y - shape[0]) * height * 256.0).round() as i32).collect();
            let case = Case { nearest: 10_000, ticks, fine, fine_bits: 8 };
            let line =
                Before::fit(&mut case.dots(), &case.nearest(), READOUT_VAR as f32, None, &derived(8, level_walk, None));
            let factor = if widens { 1.0 + deviations * terms } else { 1.0 };
            let var = READOUT_VAR * product(&at, &at) * factor;
            near("readout", line.variances(0.0).0, var, 5e-3 * var, &case);
        }
    }
}

/// A bend far above the noise is followed as the textbook's parabola.
#[test]
fn a_bend_is_that_of_the_textbook() {
    let mut dice = Dice(3);
    for (spacing, bend) in [(Spacing::Even, 20_000.0), (Spacing::Even, -3e6), (Spacing::Jittered, 20_000.0)] {
        for n in [5, 9, 16] {
            let case = Case::new(&mut dice, n, spacing, 8, |s| bend * s * s - 700.0 * s);
            let (x, y) = (case.x(), case.y());
            let bent = bend.abs() * (x[n - 1] - x[0]).powi(2);
            let derived = derived(8, 0.0, None);
            let line = Before::fit(&mut case.dots(), &case.nearest(), READOUT_VAR as f32, None, &derived);
            let at = weights(&x, 0.0, 1.0);
            let level = line.edge.anchor_q16 as f64 / 65536.0 + f64::from(line.edge.level_at_instant(0.0));
            let (value_share, share) = shares(spacing);
            let tolerance = value_share * (READOUT_VAR * product(&at, &at)).sqrt() + rounding(&at, &case);
            let grid = if spacing == Spacing::Even { 1e-5 } else { 0.02 };
            near("level", level as f32, product(&at, &y), tolerance + grid * bent, &case);
            let w = weights(&x, 0.1, 1.0);
            let expected = READOUT_VAR * product(&w, &w);
            let (readout, _) = line.variances(0.1);
            if spacing == Spacing::Even {
                near("readout", readout, expected, share * expected, &case);
            }
        }
    }
}

/// Nothing overflows, whatever is fed: all tests check for that.
#[test]
fn the_ends_of_all_ranges() {
    let derived = derived(0, 1e12, Some(1e18));
    let ends = [i32::MIN, i32::MAX, 0, -1];
    for n in 1..=16_usize {
        for (step, nearest) in [(1, 0), (1, u32::MAX), (1 << 27, 1), (i32::MAX, u32::MAX), (0, 5), (10_000, 10_000)] {
            for pattern in 0..8_usize {
                let dots: Vec<Dot> = (0..n)
                    .map(|i| Dot {
                        x: step.saturating_mul(i as i32),
                        y: if i == 0 { 0 } else { ends[(i * (pattern + 1) + pattern / 4) % 4] },
                    })
                    .collect();
                for level_q16 in [i64::MIN, 0, i64::MAX] {
                    let nearest = Nearest { ticks: nearest, level_q16 };
                    let hint = Hint { level_q16: i64::MIN, own_var: 1.0, shared_var: 0.0, lever: 0.0 };
                    let after = After::fit(&mut dots.clone(), &nearest, 1e12, Some(&hint), 1e6, &derived);
                    let taken = Taken { weights: &after.weights, apart: u32::MAX, window: u32::MAX };
                    let before = Before::fit(&mut dots.clone(), &nearest, 0.1, Some(&taken), &derived);
                    assert!(!after.readout_var.is_nan() && !before.slope_var.is_nan());
                }
            }
        }
    }
}

/// A steep ramp between levels at the two ends of 32 bits, in 16 samples: the chord is exact.
#[test]
fn a_steep_ramp_is_exact() {
    let derived = derived(0, 0.0, None);
    for sign in [-1, 1] {
        for step in [3, 10_007, 1 << 27] {
            let dots: Vec<Dot> = (0..16).map(|i| Dot { x: step * i, y: sign * i * 143_165_576 }).collect();
            let nearest = Nearest { ticks: 2 * step as u32, level_q16: 0 };
            let line = After::fit(&mut dots.clone(), &nearest, 1.0, None, 0.0, &derived);
            assert_eq!(line.edge.anchor_q16 >> 16, i64::from(-2 * sign) * 143_165_576);
            assert!(line.edge.level_at_instant(0.0).abs() < 0.01, "{line:?}");
        }
    }
}
