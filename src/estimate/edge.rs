//! The level and slope beside a switching instant, from the few samples next to it.

use super::bend::{Bend, GridNoise, unexplained};
use super::form::{Form, Polynomial, dot};
use super::grid::{Dot, Grid};
use super::moments::Moments;
use super::shared::{Taken, Weights};
use crate::math;
use crate::setup::Derived;

/// On which side of its switching instant an edge lies.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Side {
    /// The samples come before the instant (the switch closes).
    Before,
    /// The samples come after the instant (the switch opens).
    After,
}

/// The sample nearest to the instant: ticks from it, and its level, 2^-16 counts.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Nearest {
    pub(crate) ticks: u32,
    pub(crate) level_q16: i64,
}

/// The level at the instant itself, known from somewhere else.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Hint {
    /// 2^-16 counts.
    pub(crate) level_q16: i64,
    /// Its variance as far as it is new with each hint, counts^2.
    pub(crate) own_var: f32,
    /// Variance of an error that all hints share, counts^2, and how much of that error the run's total already holds.
    pub(crate) shared_var: f32,
    pub(crate) lever: f32,
}

/// A line through the samples beside a switching instant, described at that instant. Where the samples show plainly
/// that the input changes, a parabola.
///
/// Its quadratic forms give the variance that extrapolating it by `d` units of its grid away from its samples, into the
/// dead time, adds to the run: `v[0] + 2 v[1] d + v[2] d^2`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Edge {
    /// A level near the instant, 2^-16 counts.
    pub(crate) anchor_q16: i64,
    /// The rest of the level at the instant, counts; with a single sample, the level at that sample.
    level: f32,
    /// Time between the instant and a single sample, s; 0 where a line was fitted.
    reach: f32,
    /// Slope in forward time, counts/s; `None` with a single sample.
    pub(crate) slope: Option<f32>,
    /// Readout noise and misfit.
    readout: [f32; 3],
    /// Input noise: what the weights change in the walk that the whole run is charged with. May be negative.
    walk: [f32; 3],
    units_per_s: f32,
    units_per_tick: f32,
    middle: f32,
    /// The weights of the samples in the level at the instant, and their change with the extrapolation.
    weights: [Polynomial; 2],
    /// The weight of a hint in the level, and its change with the extrapolation.
    hinted: [f32; 2],
}

impl Edge {
    /// Fits the samples in the order of growing distance, `nearest` being the first.
    ///
    /// `hint`: what else is known of the level at the instant. `taken`: what the line at the other end of the segment
    /// has taken of the samples. Noise that both lines share is charged once and with its sign.
    pub(crate) fn fit(
        side: Side,
        nearest: Nearest,
        dots: &mut [Dot],
        readout_var: f32,
        derived: &Derived,
        taken: Option<Taken<'_>>,
        hint: Option<Hint>,
    ) -> Self {
        let shared = taken.map(|taken| (taken, taken.first(dots, nearest.ticks)));
        match Grid::lay(dots) {
            Some(grid) => Self::line(side, nearest, &grid, dots, readout_var, derived, shared, hint),
            None => Self::single(nearest, readout_var, derived, taken),
        }
    }

    fn single(nearest: Nearest, readout_var: f32, derived: &Derived, taken: Option<Taken<'_>>) -> Self {
        let reach = nearest.ticks as f32 * derived.tick_s;
        let shared = taken.and_then(|taken| taken.weight(nearest.ticks)).unwrap_or(0.0);
        Self {
            anchor_q16: nearest.level_q16,
            level: 0.0,
            reach,
            slope: None,
            readout: [readout_var * (1.0 - 2.0 * shared), 0.0, 0.0],
            walk: [-derived.level_walk * reach, 0.0, 0.0],
            units_per_s: 0.0,
            units_per_tick: 0.0,
            middle: 0.0,
            weights: [[1.0, 0.0, 0.0], [0.0; 3]],
            hinted: [0.0; 2],
        }
    }

    #[expect(clippy::too_many_arguments)]
    fn line(
        side: Side,
        nearest: Nearest,
        grid: &Grid,
        dots: &[Dot],
        readout_var: f32,
        derived: &Derived,
        shared: Option<(Taken<'_>, usize)>,
        hint: Option<Hint>,
    ) -> Self {
        let m = Moments::of(dots);
        let fine = i32::from(derived.fine_bits);
        let level_bits = grid.level_bits.cast_signed();
        let per_spread = 1.0 / m.spread as f32;
        let (share, lever) = (m.squares as f32 * per_spread, m.count as f32 * per_spread);

        let span = grid.span as f32;
        let units_per_tick = grid.units as f32 / span;
        let beyond = grid.sum as f32 * math::power_of_two(grid.tick_bits.cast_signed()) * share;
        let middle = (nearest.ticks as f32 + beyond) * units_per_tick;
        let walk_of_unit = derived.level_walk * derived.tick_s * span / grid.units as f32;
        let to_grid = math::power_of_two(2 * (fine - level_bits));
        let units_per_s = units_per_tick * derived.ticks_per_s;
        let noise = GridNoise {
            readout: readout_var * to_grid,
            walk: walk_of_unit * to_grid,
            bend: derived.bend_var.map(|var| {
                let squared = units_per_s * units_per_s;
                var * to_grid / (squared * squared)
            }),
        };
        let bend = Bend::of(&m, per_spread, &noise, || Form::of_steps(dots, true).1);
        let misfit = unexplained(&m, grid.units, bend.as_ref(), &noise);

        let mut level = m.heights as f32 * share;
        let mut slope = m.tilts as f32 * lever;
        level -= slope * middle;
        let mut weights = [[share, -lever * middle, 0.0], [0.0, -lever, 0.0]];
        let var = readout_var * misfit;
        let slope_var = var * lever;
        let cross = slope_var * middle;
        let mut readout = [var * share + cross * middle, cross, slope_var];
        let mut curved = false;
        if let Some(bend) = bend {
            let at = bend.at(-middle);
            if bend.taken_off > 0.0 {
                curved = true;
                let amount = bend.taken_off * bend.amount;
                level += amount * at[0];
                slope -= amount * at[1];
                for (weights, at) in weights.iter_mut().zip(at) {
                    for (weight, change) in weights.iter_mut().zip(bend.weights(at)) {
                        *weight += change;
                    }
                }
            }
            let from_grid = 1.0 / to_grid;
            let mut charge = bend.left_in * from_grid;
            if curved {
                charge += var * bend.taken_off * bend.taken_off / bend.power;
            }
            add_error(&mut readout, charge, at);
        }
        let mut seen = Seen::default();
        let mut walk = [0.0; 3];
        if walk_of_unit > 0.0 {
            let (passed, steps) = Form::of_steps(dots, curved);
            let farthest = dots.last().map_or(0, |dot| dot.x) as f32 + middle;
            seen = Seen::new(&weights, &passed, &steps, farthest);
            walk = seen.walk(walk_of_unit);
        }
        if let Some((taken, first)) = shared
            && let Some(both) = dots.get(first..).filter(|both| !both.is_empty())
        {
            let common = taken.common(both, (units_per_tick, middle), &weights, walk_of_unit > 0.0);
            for (form, (common, var)) in
                [&mut readout, &mut walk].into_iter().zip(common.into_iter().zip([readout_var, walk_of_unit]))
            {
                form[0] += common[0] * var;
                form[1] += common[1] * var;
            }
        }

        // The chord is put back where it was taken off, in whole numbers.
        let chord_q16 = grid.chord_q32.saturating_mul(i64::from(nearest.ticks)) >> (16 + fine);
        let to_counts = math::power_of_two(level_bits - fine);
        let chord = grid.chord_q32 as f32 * math::power_of_two(-32 - fine);
        let forward = match side {
            Side::Before => -1.0,
            Side::After => 1.0,
        };
        let slope = (chord + slope * to_counts * units_per_tick) * derived.ticks_per_s;
        let mut edge = Self {
            anchor_q16: nearest.level_q16.saturating_sub(chord_q16),
            level: level * to_counts,
            reach: 0.0,
            slope: Some(forward * slope),
            readout,
            walk,
            units_per_s,
            units_per_tick,
            middle,
            weights,
            hinted: [0.0; 2],
        };
        if let Some(hint) = hint {
            edge.take_hint(&hint, forward, &seen, walk_of_unit);
        }
        edge
    }

    /// Pulls the line toward a hint.
    ///
    /// With the line's variance `v`, the gain `(v - lever s) / (v + own + s)` makes the total's variance least, where
    /// `s` is the variance of the shared error: that adds up from hint to hint, and in the end it is better not to ask.
    /// A hint 5 standard deviations off the line is wrong.
    fn take_hint(&mut self, hint: &Hint, forward: f32, seen: &Seen, walk_of_unit: f32) {
        let [level_var, cross, slope_var] = self.readout;
        let sum = level_var + hint.own_var + hint.shared_var;
        let off = math::counts(hint.level_q16.saturating_sub(self.anchor_q16)) - self.level;
        if off * off > 25.0 * sum {
            return;
        }
        let gain = ((level_var - hint.lever * hint.shared_var) / sum).max(0.0);
        let ratio = if level_var > 0.0 { cross / level_var } else { 0.0 };
        let (kept, turn) = (1.0 - gain, gain * ratio);
        self.level += gain * off;
        self.slope = self.slope.map(|slope| slope - forward * turn * off * self.units_per_s);
        let [at_instant, change] = &mut self.weights;
        for (at_instant, change) in at_instant.iter_mut().zip(change) {
            *change -= turn * *at_instant;
            *at_instant *= kept;
        }
        self.hinted = [gain, turn];
        // What the hint does to the level it does to the extrapolation in the ratio of their covariance.
        let pulled = kept * kept * level_var + gain * gain * hint.own_var;
        self.readout = [pulled, ratio * pulled, slope_var - ratio * (cross - ratio * pulled)];
        if walk_of_unit > 0.0 {
            self.walk = seen.walk_pulled(kept, turn, walk_of_unit);
        }
    }

    /// How much of a hint is in the level extrapolated by `d` seconds.
    pub(crate) fn hinted(&self, d: f32) -> f32 {
        let [level, change] = self.hinted;
        level + d * self.units_per_s * change
    }

    /// The level at the switching instant above `anchor`, counts, when the level moves by `slope`.
    pub(crate) fn level(&self, slope: f32) -> f32 {
        self.level - slope * self.reach
    }

    /// Variance from readout noise when the line is extrapolated by `d` seconds, counts^2.
    pub(crate) fn readout_variance(&self, d: f32) -> f32 {
        quadratic(&self.readout, d * self.units_per_s).max(0.0)
    }

    /// Change of the run's variance from input noise when the line is extrapolated by `d` seconds, counts^2.
    pub(crate) fn walk_variance(&self, d: f32) -> f32 {
        quadratic(&self.walk, d * self.units_per_s)
    }

    /// Variance of the slope, (counts/s)^2.
    pub(crate) fn slope_variance(&self) -> f32 {
        (self.readout[2] + self.walk[2]) * self.units_per_s * self.units_per_s
    }

    /// The weights of its samples in the level extrapolated by `d` seconds.
    pub(crate) fn weights(&self, d: f32) -> Weights {
        let d = d * self.units_per_s;
        let [[a, b, c], [by_a, by_b, by_c]] = self.weights;
        Weights {
            units_per_tick: self.units_per_tick,
            middle: self.middle,
            of_x: [a + d * by_a, b + d * by_b, c + d * by_c],
        }
    }
}

/// What a line sees of a random walk, in steps of a unit from the instant to its farthest sample.
///
/// The run is charged with the full walk of its whole duration. Of a step it keeps, instead of all, the square of the
/// sum `h` of the weights of the samples nearer to the instant; `k` is the same of the weights' change with the
/// extrapolation. These are sums over the steps, of products of `k` and of `1 - h`, what the line leaves of a step.
#[derive(Clone, Copy, Debug, Default)]
struct Seen {
    left: f32,
    left_left: f32,
    left_k: f32,
    k: f32,
    kk: f32,
}

impl Seen {
    fn new(weights: &[Polynomial; 2], passed: &Polynomial, steps: &Form, farthest: f32) -> Self {
        let [level, change] = weights;
        let curved = level[2] != 0.0 || change[2] != 0.0;
        let (h, k) = (dot(passed, level, curved), dot(passed, change, curved));
        let seen = steps.with(level);
        let (hh, hk) = (dot(&seen, level, curved), dot(&seen, change, curved));
        Self { left: farthest - h, left_left: farthest - 2.0 * h + hh, left_k: k - hk, k, kk: steps.of(change, change) }
    }

    fn walk(&self, of_unit: f32) -> [f32; 3] {
        [of_unit * (self.left_left - 2.0 * self.left), of_unit * (self.k - self.left_k), of_unit * self.kk]
    }

    /// The same of a line that a hint has pulled: it sees `1 - kept (1 - h)` of a step, and `k + turn (1 - h)`.
    fn walk_pulled(&self, kept: f32, turn: f32, of_unit: f32) -> [f32; 3] {
        let turned = turn * self.left_left;
        [
            of_unit * kept * (kept * self.left_left - 2.0 * self.left),
            of_unit * (self.k + turn * self.left - kept * (self.left_k + turned)),
            of_unit * (self.kk + turn * (2.0 * self.left_k + turned)),
        ]
    }
}

/// Adds an error of variance `var` that weighs `at` in the level and in the extrapolation.
fn add_error(form: &mut [f32; 3], var: f32, at: [f32; 2]) {
    let [level, change] = at;
    form[0] += var * level * level;
    form[1] += var * level * change;
    form[2] += var * change * change;
}

fn quadratic(v: &[f32; 3], d: f32) -> f32 {
    v[0] + d * (2.0 * v[1] + d * v[2])
}
