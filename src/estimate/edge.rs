//! The level and slope beside a switching instant, from the few samples next to it.

use heapless::Vec;

use super::bend::{Bend, unexplained};
use super::line::{Line, Point};
use super::sums::Sums;
use crate::setup::EDGE_SAMPLES_MAX;

/// On which side of its switching instant an edge lies.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Side {
    /// The samples come before the instant (the switch closes).
    Before,
    /// The samples come after the instant (the switch opens).
    After,
}

/// Noise of the samples: readout variance of each, counts^2, and walk of the level between them, counts^2/s.
#[derive(Clone, Copy, Debug)]
pub(crate) struct EdgeNoise {
    pub(crate) readout_var: f32,
    pub(crate) level_walk: f32,
    /// How far the level may bend beside the instant: variance of half its second derivative, (counts/s^2)^2; `None`:
    /// unknown.
    pub(crate) bend_var: Option<f32>,
}

/// The level at the instant itself, known from somewhere else.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Hint {
    /// Counts above the line's anchor.
    pub(crate) level: f32,
    /// Its variance as far as it is new with each hint, counts^2.
    pub(crate) own_var: f32,
    /// Variance of an error that all hints share, counts^2, and how much of that error the run's total already holds.
    pub(crate) shared_var: f32,
    pub(crate) lever: f32,
}

/// A line through the samples beside a switching instant, described at that instant. Where the samples show plainly
/// that the input changes, a parabola.
///
/// Its quadratic forms give the variance that extrapolating it by `d` seconds away from its samples, into the dead
/// time, adds to the run: `v[0] + 2 v[1] d + v[2] d^2`.
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
    weights: Weights,
    /// The weight of a hint in the level, and its change with the extrapolation.
    hinted: [f32; 2],
}

/// The weights with which the samples make up the level at the distance `-d`: a polynomial in `u = x - centre`, each of
/// whose coefficients is linear in `d`.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(crate) struct Weights {
    pub(super) centre: f32,
    pub(super) at_instant: [f32; 3],
    pub(super) per_second: [f32; 3],
}

impl Weights {
    /// The weight at the instant of the sample at distance `x`, and its change with `d`.
    fn parts(&self, x: f32) -> (f32, f32) {
        let u = x - self.centre;
        let polynomial = |c: &[f32; 3]| c[0] + u * (c[1] + u * c[2]);
        (polynomial(&self.at_instant), polynomial(&self.per_second))
    }

    /// The weight of the sample at distance `x` in the level at `-d`.
    pub(crate) fn of(&self, x: f32, d: f32) -> f32 {
        let (at_instant, per_second) = self.parts(x);
        at_instant + d * per_second
    }
}

/// A bend that is left in: its variance, and what it does to the level and to the extrapolation.
#[derive(Clone, Copy, Debug, Default)]
struct Left {
    var: f32,
    at: [f32; 2],
}

impl Edge {
    /// Fits the samples `(ticks from the instant, counts above anchor)`, in the order of growing distance; `None` if
    /// there are none.
    ///
    /// `hint`: what else is known of the level at the instant. `taken(ticks)`: the weight that the sample so far from
    /// the instant has already in the line at the other end of its segment, 0 if none. Noise that both lines share is
    /// charged once and with its sign.
    pub(crate) fn fit(
        side: Side,
        anchor_q16: i64,
        samples: impl Iterator<Item = (u32, f32)>,
        tick_s: f32,
        noise: EdgeNoise,
        hint: Option<Hint>,
        taken: impl Fn(u32) -> f32,
    ) -> Option<Self> {
        let weight = 1.0 / noise.readout_var;
        let mut points: Vec<Point, EDGE_SAMPLES_MAX> = Vec::new();
        let mut sums = Sums::default();
        let mut shares: Vec<f32, EDGE_SAMPLES_MAX> = Vec::new();
        for (ticks, y) in samples {
            let _ = points.push(Point { x: ticks as f32 * tick_s, y, weight });
            let _ = shares.push(taken(ticks));
        }
        let first = points.first()?;
        let forward = match side {
            Side::Before => -1.0,
            Side::After => 1.0,
        };
        let mut edge = Self {
            anchor_q16,
            level: first.y,
            reach: first.x,
            slope: None,
            readout: [0.0; 3],
            walk: [0.0; 3],
            weights: Weights { centre: 0.0, at_instant: [1.0, 0.0, 0.0], per_second: [0.0; 3] },
            hinted: [0.0; 2],
        };
        let points = points.iter().copied();
        let mut left = Left::default();
        let mut misfit = 1.0;
        if let Some(line) = Line::fit(points.clone()) {
            let share = line.level_variance * weight;
            let lever = line.slope_variance * weight;
            edge.reach = 0.0;
            edge.level = line.at(0.0);
            edge.weights.centre = line.centre;
            edge.weights.at_instant = [share, -line.centre * lever, 0.0];
            edge.weights.per_second = [0.0, -lever, 0.0];
            let bend = Bend::of(&line, points.clone(), noise);
            let mut slope = line.slope;
            if let Some(bend) = bend {
                let (taken_off, left_in) = bend.share_to_take_off(noise.bend_var);
                edge.level += taken_off * bend.amount * bend.at_instant;
                slope -= taken_off * bend.amount * bend.per_second;
                bend.add_to(&mut edge.weights, taken_off);
                left = Left { var: left_in, at: [bend.at_instant, bend.per_second] };
            }
            edge.slope = Some(forward * slope);
            misfit = unexplained(&line, bend, points.clone(), noise);
        }
        for (point, share) in points.zip(shares) {
            sums.add(point.x, edge.weights.parts(point.x), share, noise.level_walk);
        }
        edge.charge(&sums, noise.readout_var, misfit, &left);
        if let Some(hint) = hint.filter(|hint| edge.slope.is_some() && edge.bears_out(hint)) {
            edge.take_hint(&hint, forward);
            edge.charge(&sums, noise.readout_var, misfit, &left);
            edge.add_error(hint.own_var, edge.hinted);
        }
        Some(edge)
    }

    /// Whether a hint lies within 5 standard deviations of the line: one that does not is wrong.
    fn bears_out(&self, hint: &Hint) -> bool {
        let off = hint.level - self.level;
        off * off <= 25.0 * (self.readout_variance(0.0) + hint.own_var + hint.shared_var)
    }

    /// Pulls the line toward a hint; the quadratic forms are to be worked out anew.
    ///
    /// With the line's variance `v`, the gain `(v - lever s) / (v + own + s)` makes the total's variance least, where
    /// `s` is the variance of the shared error: that adds up from hint to hint, and in the end it is better not to ask.
    fn take_hint(&mut self, hint: &Hint, forward: f32) {
        let [level_var, cross, _] = self.readout;
        let sum = level_var + hint.own_var + hint.shared_var;
        let gain = ((level_var - hint.lever * hint.shared_var) / sum).max(0.0);
        let gains = [gain, if level_var > 0.0 { gain * cross / level_var } else { 0.0 }];
        let off = hint.level - self.level;
        self.level += gains[0] * off;
        self.slope = self.slope.map(|slope| slope - forward * gains[1] * off);
        for (at_instant, per_second) in self.weights.at_instant.iter_mut().zip(&mut self.weights.per_second) {
            *per_second -= gains[1] * *at_instant;
            *at_instant *= 1.0 - gains[0];
        }
        self.hinted = gains;
    }

    /// Adds an error of variance `var` that weighs `at` in the level and in the extrapolation.
    fn add_error(&mut self, var: f32, at: [f32; 2]) {
        let [level, per_second] = at;
        self.readout[0] += var * level * level;
        self.readout[1] += var * level * per_second;
        self.readout[2] += var * per_second * per_second;
    }

    /// How much of a hint is in the level extrapolated by `d` seconds.
    pub(crate) fn hinted(&self, d: f32) -> f32 {
        let [level, per_second] = self.hinted;
        level + d * per_second
    }

    /// Works out the quadratic forms from sums over the line as fitted, of which a hint has left `1 - gain`.
    fn charge(&mut self, sums: &Sums, readout_var: f32, misfit: f32, left: &Left) {
        let [g, j] = self.hinted;
        let a = 1.0 - g;
        let Sums { pp, ps, ss, shared_p, shared_s, .. } = *sums;
        self.readout = [
            readout_var * (misfit * a * a * pp - 2.0 * a * shared_p),
            readout_var * (misfit * a * (ps - j * pp) - shared_s + j * shared_p),
            readout_var * misfit * (ss - j * (2.0 * ps - j * pp)),
        ];
        let Sums { span, h, k, hh, hk, kk, other, other_k, .. } = *sums;
        self.walk = [
            (g * g - 1.0) * span + a * (2.0 * g * h + a * hh) + other,
            g * j * span + g * k + j * (a - g) * h + a * (hk - j * hh) - other_k,
            kk + j * (2.0 * (k - hk) + j * (span - 2.0 * h + hh)),
        ];
        let [level, per_second] = left.at;
        self.add_error(left.var, [a * level, per_second - j * level]);
    }

    /// The level at the switching instant above `anchor`, counts, when the level moves by `slope`.
    pub(crate) fn level(&self, slope: f32) -> f32 {
        self.level - slope * self.reach
    }

    /// Variance from readout noise when the line is extrapolated by `d` seconds, counts^2.
    pub(crate) fn readout_variance(&self, d: f32) -> f32 {
        quadratic(&self.readout, d).max(0.0)
    }

    /// Change of the run's variance from input noise when the line is extrapolated by `d` seconds, counts^2.
    pub(crate) fn walk_variance(&self, d: f32) -> f32 {
        quadratic(&self.walk, d)
    }

    /// Variance of the slope, (counts/s)^2.
    pub(crate) fn slope_variance(&self) -> f32 {
        self.readout[2] + self.walk[2]
    }

    /// The weights of its samples.
    pub(crate) fn weights(&self) -> Weights {
        self.weights
    }
}

fn quadratic(v: &[f32; 3], d: f32) -> f32 {
    v[0] + d * (2.0 * v[1] + d * v[2])
}
