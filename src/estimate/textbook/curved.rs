//! Parabolas.

use super::*;

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
