//! Scatter, and what must not overflow.

use super::*;

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
