//! Samples of a short segment that are in the lines at both of its ends.

use super::edge::Drawn;
use super::grid::Dot;
use super::running::{Polynomial, Running, product};
use crate::math;

/// How the level at an instant was made of samples: their weights, a polynomial in `units_per_tick * ticks - middle`,
/// where `ticks` is the distance of the sample.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(crate) struct Weights {
    pub(super) units_per_tick: f32,
    pub(super) middle: f32,
    pub(super) of_x: Polynomial,
}

impl Weights {
    /// Of the sample at a distance.
    pub(crate) fn at(&self, ticks: u32) -> f32 {
        let x = ticks as f32 * self.units_per_tick - self.middle;
        let [a, b, c] = self.of_x;
        a + x * (b + x * c)
    }

    /// The same polynomial, in units and from the middle of samples `apart` ticks away that are counted the other way.
    fn turned(&self, apart: u32, units_per_tick: f32, middle: f32) -> Polynomial {
        let ratio = self.units_per_tick / units_per_tick;
        let x = apart as f32 * self.units_per_tick - self.middle - ratio * middle;
        let [a, b, c] = self.of_x;
        [a + x * (b + x * c), -ratio * (b + 2.0 * x * c), ratio * ratio * c]
    }
}

/// What the line at the other end of a segment has taken of its samples.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Taken<'w> {
    pub(crate) weights: &'w Weights,
    /// Ticks between the two instants.
    pub(crate) apart: u32,
    /// Ticks from the other instant to the last sample that its line used.
    pub(crate) window: u32,
}

impl Taken<'_> {
    /// The weight of the sample so far from this line's instant; `None` if the other line did not use it.
    pub(super) fn weight(&self, ticks: u32) -> Option<f32> {
        let from_there = self.apart.wrapping_sub(ticks);
        (from_there <= self.window).then(|| self.weights.at(from_there))
    }

    /// How many of the samples, in the order of growing distance, are only in this line.
    pub(super) fn first(&self, dots: &[Dot], nearest: u32) -> usize {
        let is_own = |dot: &&Dot| self.apart.wrapping_sub(nearest.wrapping_add(dot.x.cast_unsigned())) > self.window;
        dots.iter().take_while(is_own).count()
    }

    /// What noise that both lines see adds to the quadratic forms of readout and walk of this one, in a sample's
    /// variance and in the walk of a unit. Of `dots` the first `own` are only in this line.
    ///
    /// Of a step of the walk, the other line sees the sum of its own weights nearer to this line's instant, and the run
    /// 1 less that of this line.
    pub(super) fn common(&self, dots: &[Dot], own: usize, drawn: &Drawn) -> [[f32; 2]; 2] {
        let turned = self.weights.turned(self.apart, drawn.units_per_tick, drawn.middle);
        let [mut level, mut change] = drawn.weights.map(|weights| Running::new(&weights, 0.0, dots));
        let mut others = Running::new(&turned, 0.0, dots);
        let (mut with_level, mut with_change) = (0_i32, 0_i32);
        let (mut passed, mut passed_level, mut passed_change) = (0_i32, 0_i32, 0_i32);
        let mut near = 0;
        for (i, dot) in dots.iter().enumerate() {
            let (step, seen) = (dot.x - near, others.passed());
            near = dot.x;
            passed += step * seen;
            passed_level += step * product(seen, level.passed());
            passed_change += step * product(seen, change.passed());
            let (p, k) = (level.pass(dot.x), change.pass(dot.x));
            if i >= own {
                let weight = others.pass(dot.x);
                with_level += product(p, weight);
                with_change += product(k, weight);
            }
        }
        let readout = [-2.0 * others.of_weights(&level, with_level), -others.of_weights(&change, with_change)];
        let passed = math::scaled(passed as f32, others.passed_bits());
        let walk = [2.0 * (passed - others.of_passed(&level, passed_level)), -others.of_passed(&change, passed_change)];
        [readout, walk]
    }
}
