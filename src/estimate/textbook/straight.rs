//! Straight lines before and after, and a level that pulls.

use super::*;

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
