//! The line just after the switch opens, extrapolated into a dead time that is over.

use super::edge::{Drawn, Edge, Nearest, quadratic};
use super::grid::Dot;
use super::running::Running;
use super::shared::Weights;
use crate::math;
use crate::setup::Derived;

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

/// A line, and what its extrapolation adds to the run.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct After {
    pub(crate) edge: Edge,
    /// Readout noise and misfit, counts^2.
    pub(crate) readout_var: f32,
    /// Input noise: what the weights change in the walk that the whole run is charged with. May be negative.
    pub(crate) walk_var: f32,
    /// Of the slope, (counts/s)^2.
    pub(crate) slope_var: f32,
    /// The weights of its samples in the extrapolated level, and that of a hint.
    pub(crate) weights: Weights,
    pub(crate) hinted: f32,
}

impl After {
    /// Fits the samples in the order of growing distance, `nearest` being the first, and extrapolates the line by
    /// `d_s` seconds. `hint`: what else is known of the level at the instant.
    pub(crate) fn fit(
        dots: &mut [Dot],
        nearest: &Nearest,
        readout_var: f32,
        hint: Option<&Hint>,
        d_s: f32,
        derived: &Derived,
    ) -> Self {
        let Some(mut drawn) = Drawn::through(dots, nearest, readout_var, derived) else {
            let reach = nearest.ticks as f32 * derived.tick_s;
            return Self {
                edge: Edge::of_single(nearest, reach),
                readout_var,
                walk_var: -derived.level_walk * reach,
                slope_var: 0.0,
                weights: Weights { units_per_tick: 0.0, middle: 0.0, of_x: [1.0, 0.0, 0.0] },
                hinted: 0.0,
            };
        };
        let hinted = hint.and_then(|hint| drawn.take(hint));
        let d = d_s * drawn.units_per_s;
        let [level, change] = &drawn.weights;
        let mut of_x = [level[0] + d * change[0], level[1] + d * change[1], 0.0];
        if drawn.curved {
            of_x[2] = level[2] + d * change[2];
        }
        let [gain, turn] = hinted.unwrap_or_default();
        let gain = gain + d * turn;
        let mut slope_var = drawn.readout[2];
        let mut walk_var = 0.0;
        if drawn.walk_of_unit > 0.0 {
            let sums = Running::new(&of_x, gain, dots);
            let [own, _, others] = sums.products(Running::new(change, turn, dots), dots);
            walk_var = drawn.walk_of_unit * (own + gain * gain * drawn.nearest - drawn.farthest);
            slope_var += drawn.walk_of_unit * (others + turn * turn * drawn.nearest);
        }
        Self {
            edge: drawn.edge,
            readout_var: math::not_negative(quadratic(&drawn.readout, d)),
            walk_var,
            slope_var: slope_var * drawn.units_per_s * drawn.units_per_s,
            weights: Weights { units_per_tick: drawn.units_per_tick, middle: drawn.middle, of_x },
            hinted: gain,
        }
    }
}

impl Drawn {
    /// Pulls the line toward a hint. Gives the weight of the hint in the level and in the extrapolation, if it is
    /// believed: one that lies 5 standard deviations off is wrong.
    ///
    /// With the line's variance `v`, the gain `(v - lever s) / (v + own + s)` makes the total's variance least, where
    /// `s` is the variance of the shared error: that adds up from hint to hint, and in the end it is better not to ask.
    fn take(&mut self, hint: &Hint) -> Option<[f32; 2]> {
        let [level_var, cross, slope_var] = self.readout;
        let sum = level_var + hint.own_var + hint.shared_var;
        let off = math::counts(hint.level_q16.saturating_sub(self.edge.anchor_q16)) - self.edge.level;
        if off * off > 25.0 * sum {
            return None;
        }
        let gain = math::not_negative(level_var - hint.lever * hint.shared_var) / sum;
        let ratio = if level_var > 0.0 { cross / level_var } else { 0.0 };
        let (kept, turn) = (1.0 - gain, gain * ratio);
        self.edge.level += gain * off;
        self.edge.slope = self.edge.slope.map(|slope| slope - turn * off * self.units_per_s);
        let [level, change] = &mut self.weights;
        let used = if self.curved { 3 } else { 2 };
        for (level, change) in level.iter_mut().zip(change).take(used) {
            *change -= turn * *level;
            *level *= kept;
        }
        // What the hint does to the level it does to the extrapolation in the ratio of their covariance.
        let pulled = kept * kept * level_var + gain * gain * hint.own_var;
        let crossed = ratio * pulled;
        self.readout = [pulled, crossed, slope_var - ratio * (cross - crossed)];
        Some([gain, turn])
    }
}
