//! The level and slope beside a switching instant, from the few samples next to it.

use super::line::{Line, Point};
use crate::math;

/// On which side of its switching instant an edge lies.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Side {
    /// The samples come before the instant (the switch closes).
    Before,
    /// The samples come after the instant (the switch opens).
    After,
}

/// A straight line through the samples beside a switching instant, described at that instant.
///
/// Its quadratic forms give the variance that extrapolating the line by `d` seconds away from its samples, into the
/// dead time, adds to the run: `v[0] + 2 v[1] d + v[2] d^2`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Edge {
    /// Whole part of the level at the instant, counts.
    pub(crate) anchor: i32,
    /// The rest of the level; with a single sample, the level at that sample.
    level: f32,
    /// Time between the instant and a single sample, s; 0 where a line was fitted.
    reach: f32,
    /// Slope in forward time, counts/s; `None` with a single sample.
    pub(crate) slope: Option<f32>,
    /// Readout noise and misfit.
    readout: [f32; 3],
    /// Input noise: what the line's weights change in the walk that the whole run is charged with. May be negative.
    walk: [f32; 3],
}

impl Edge {
    /// Fits the samples `(ticks from the instant, counts)`, in the order of growing distance, at most
    /// [`EDGE_SAMPLES_MAX`](crate::setup::EDGE_SAMPLES_MAX) of them; `None` if there are none.
    pub(crate) fn fit(
        side: Side,
        samples: impl Iterator<Item = (u32, i32)> + Clone,
        tick_s: f32,
        readout_var: f32,
        level_walk: f32,
    ) -> Option<Self> {
        let (first_ticks, anchor) = samples.clone().next()?;
        let weight = 1.0 / readout_var;
        let points = samples.map(move |(ticks, counts)| Point {
            x: ticks as f32 * tick_s,
            y: (i64::from(counts) - i64::from(anchor)) as f32,
            weight,
        });
        let Some(line) = Line::fit(points.clone()) else {
            let reach = first_ticks as f32 * tick_s;
            return Some(Self {
                anchor,
                level: 0.0,
                reach,
                slope: None,
                readout: [readout_var, 0.0, 0.0],
                walk: [level_walk * -reach, 0.0, 0.0],
            });
        };
        let span = points.clone().last().map_or(0.0, |p| p.x) - points.clone().next().map_or(0.0, |p| p.x);
        let misfit = misfit(&line, level_walk * span * weight);
        Some(Self {
            anchor,
            level: line.at(0.0),
            reach: 0.0,
            slope: Some(match side {
                Side::Before => -line.slope,
                Side::After => line.slope,
            }),
            // The extrapolation goes to -d in terms of the distance x.
            readout: [misfit * line.variance_at(0.0), misfit * -line.covariance_at(0.0), misfit * line.slope_variance],
            walk: walk_forms(&line, points.map(|p| p.x), weight, level_walk),
        })
    }

    /// The same edge if it shares its samples with the edge at the other end of its segment. Rise and extrapolation of
    /// a line fitted twice to the same points have up to 1.5 times the variance of two separate fits; this edge takes
    /// the excess of both.
    pub(crate) fn sharing_samples(mut self) -> Self {
        self.readout = self.readout.map(|v| 2.0 * v);
        self
    }

    /// The level at the switching instant above `anchor`, counts, when the level moves by `slope`.
    pub(crate) fn level(&self, slope: f32) -> f32 {
        self.level - slope * self.reach
    }

    /// Variance from readout noise when the line is extrapolated by `d` seconds, counts^2.
    pub(crate) fn readout_variance(&self, d: f32) -> f32 {
        quadratic(&self.readout, d)
    }

    /// Change of the run's variance from input noise when the line is extrapolated by `d` seconds, counts^2.
    pub(crate) fn walk_variance(&self, d: f32) -> f32 {
        quadratic(&self.walk, d)
    }

    /// Variance of the slope, (counts/s)^2.
    pub(crate) fn slope_variance(&self) -> f32 {
        self.readout[2] + self.walk[2]
    }
}

fn quadratic(v: &[f32; 3], d: f32) -> f32 {
    v[0] + d * (2.0 * v[1] + d * v[2])
}

/// Factor on the variances where the points scatter about the line by clearly more than their noise: the input curved,
/// or hum is present. It is `chi^2` over its expectation, once it lies 3 standard deviations above (Birge ratio).
///
/// A random walk that gains `walk` readout variances over the window adds `walk (n + 2)(n - 2) / (15 (n - 1))` to the
/// expectation `n - 2`.
fn misfit(line: &Line, walk: f32) -> f32 {
    let n = f32::from(line.points);
    let expected = (n - 2.0) * (1.0 + walk * (n + 2.0) / (15.0 * (n - 1.0)));
    let scatter = expected * math::sqrt(2.0 / (n - 2.0));
    if n > 2.0 && line.chi_squared > expected + 3.0 * scatter { line.chi_squared / expected } else { 1.0 }
}

/// The run is charged with the full walk of its whole duration. A fit's weights see the walk of its own window
/// differently: of an increment between two samples the run keeps, instead of all, the square of the sum of the weights of
/// the samples nearer to the instant. The weights, and with them the sum, are linear in the extrapolation: `h + d k`.
fn walk_forms(line: &Line, distances: impl Iterator<Item = f32>, weight: f32, level_walk: f32) -> [f32; 3] {
    let share = line.level_variance * weight;
    let lever = line.slope_variance * weight;
    let (mut h, mut k, mut near) = (0.0_f32, 0.0_f32, 0.0_f32);
    let mut forms = [0.0_f32; 3];
    for far in distances {
        let span = level_walk * (far - near);
        forms[0] += span * (h * h - 1.0);
        forms[1] += span * h * k;
        forms[2] += span * k * k;
        let weight_slope = (far - line.centre) * lever;
        h += share - line.centre * weight_slope;
        k -= weight_slope;
        near = far;
    }
    forms
}
