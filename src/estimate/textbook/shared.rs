//! Samples in the lines at both ends of a segment.

use super::*;

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
