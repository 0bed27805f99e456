//! The line just before the switch closes: how long the dead time will be is not known yet.

use super::edge::{Drawn, Edge, Nearest, quadratic};
use super::grid::Dot;
use super::running::Running;
use super::shared::Taken;
use crate::math::not_negative;
use crate::setup::Derived;

/// A line with the quadratic forms of what its extrapolation into the dead time adds to the run.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Before {
    pub(crate) edge: Edge,
    /// Of readout noise and misfit, counts^2.
    readout: [f32; 3],
    /// Of input noise: what the weights change in the walk that the whole run is charged with. May be negative.
    walk: [f32; 3],
    /// Variance of the slope, (counts/s)^2.
    pub(crate) slope_var: f32,
    /// The forms' unit of extrapolation.
    units_per_s: f32,
}

impl Before {
    /// Fits the samples in the order of growing distance, `nearest` being the first. `taken`: what the line at the
    /// other end of the segment has taken of them. Noise that both lines share is charged once and with its sign.
    ///
    /// The run is charged with the full walk of its whole duration. Of a step it keeps, instead of all, the square of
    /// the sum of the weights of the samples nearer to the instant.
    pub(crate) fn fit(
        dots: &mut [Dot],
        nearest: &Nearest,
        readout_var: f32,
        taken: Option<&Taken<'_>>,
        derived: &Derived,
    ) -> Self {
        let first_shared = taken.map_or(dots.len(), |taken| taken.first(dots, nearest.ticks));
        let Some(drawn) = Drawn::through(dots, nearest, readout_var, derived) else {
            let shared = taken.and_then(|taken| taken.weight(nearest.ticks)).unwrap_or(0.0);
            let reach = nearest.ticks as f32 * derived.tick_s;
            return Self {
                edge: Edge::of_single(nearest, -reach),
                readout: [readout_var * (1.0 - 2.0 * shared), 0.0, 0.0],
                walk: [-derived.level_walk * reach, 0.0, 0.0],
                slope_var: 0.0,
                units_per_s: 0.0,
            };
        };
        let (mut readout, mut walk) = (drawn.readout, [0.0; 3]);
        if drawn.walk_of_unit > 0.0 {
            let [level, change] = drawn.weights.map(|weights| Running::new(&weights, 0.0, dots));
            walk = level.products(change, dots);
            walk[0] -= drawn.farthest;
        }
        if let Some(taken) = taken.filter(|_| first_shared < dots.len()) {
            let [of_readout, of_walk] = taken.common(dots, first_shared, &drawn);
            readout[0] += of_readout[0] * readout_var;
            readout[1] += of_readout[1] * readout_var;
            walk[0] += of_walk[0];
            walk[1] += of_walk[1];
        }
        let walk = walk.map(|sum| sum * drawn.walk_of_unit);
        let mut edge = drawn.edge;
        edge.slope = edge.slope.map(|away| -away);
        let units_per_s = drawn.units_per_s;
        let slope_var = (readout[2] + walk[2]) * units_per_s * units_per_s;
        Self { edge, readout, walk, slope_var, units_per_s }
    }

    /// Variances when the line is extrapolated by `d` seconds: of readout noise, and the change of the run's by input
    /// noise, counts^2.
    pub(crate) fn variances(&self, d: f32) -> (f32, f32) {
        let d = d * self.units_per_s;
        (not_negative(quadratic(&self.readout, d)), quadratic(&self.walk, d))
    }
}
