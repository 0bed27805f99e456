//! The level and slope beside a switching instant, from the few samples next to it.

use super::bend::{Bend, GridNoise, unexplained};
use super::grid::{Dot, Grid};
use super::moments::Moments;
use super::running::{Polynomial, Running};
use super::trend::LEVEL_VARIANCE_MAX;
use crate::math;
use crate::setup::{Derived, EDGE_SAMPLES_MAX};

/// The sample nearest to the instant: ticks from it, and its level, 2^-16 counts.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Nearest {
    pub(crate) ticks: u32,
    pub(crate) level_q16: i64,
}

/// A line through the samples beside a switching instant, described at that instant. Where the samples show plainly
/// that the input changes, a parabola.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Edge {
    /// A level near the instant, 2^-16 counts.
    pub(crate) anchor_q16: i64,
    /// The rest of the level at the instant, counts.
    pub(crate) level: f32,
    /// Slope in forward time, counts/s; `None` with a single sample, whose level the anchor is.
    pub(crate) slope: Option<f32>,
    /// Time between the instant and a single sample in forward time, s; 0 where a line was fitted.
    reach: f32,
}

impl Edge {
    pub(super) fn of_single(nearest: &Nearest, reach: f32) -> Self {
        Self { anchor_q16: nearest.level_q16, level: 0.0, slope: None, reach }
    }

    /// The level at the switching instant above `anchor`, counts, when the level moves by `slope`.
    pub(crate) fn level_at_instant(&self, slope: f32) -> f32 {
        if self.slope.is_some() { self.level } else { self.level - slope * self.reach }
    }
}

/// A line as drawn, with what its uncertainty is made of. Distances are in units of its grid.
#[derive(Clone, Copy, Debug)]
pub(super) struct Drawn {
    /// Slope away from the instant.
    pub(super) edge: Edge,
    pub(super) units_per_tick: f32,
    pub(super) units_per_s: f32,
    /// From the instant to the middle of the samples, to the nearest and to the farthest.
    pub(super) middle: f32,
    pub(super) nearest: f32,
    pub(super) farthest: f32,
    /// The weights of the samples in the level at the instant, and their change with the extrapolation.
    pub(super) weights: [Polynomial; 2],
    pub(super) curved: bool,
    /// Quadratic form of readout noise and misfit: extrapolated by `d` away from its samples, into the dead time, the
    /// level has the variance `v[0] + 2 v[1] d + v[2] d^2`.
    pub(super) readout: [f32; 3],
    /// Growth of the level's variance by the walk, counts^2.
    pub(super) walk_of_unit: f32,
}

impl Drawn {
    /// Fits samples in the order of growing distance, `nearest` being the first, and leaves them on their grid; `None`
    /// unless two distances differ.
    pub(super) fn through(dots: &mut [Dot], nearest: &Nearest, readout_var: f32, derived: &Derived) -> Option<Self> {
        let grid = Grid::lay(dots)?;
        let m = Moments::of(dots);
        let (share, lever) = (reciprocal(m.count), 1.0 / m.squares as f32);

        let span = grid.span as f32;
        let units_per_tick = ((m.count - 1) << grid.unit_bits) as f32 / span;
        let units_per_s = units_per_tick * derived.ticks_per_s;
        let beyond = math::scaled(grid.sum as f32 * share, grid.tick_bits.cast_signed());
        let middle = (nearest.ticks as f32 + beyond) * units_per_tick;

        let step_walk = derived.level_walk * (span * derived.tick_s) * reciprocal(m.count - 1);
        let unit_bits = grid.unit_bits.cast_signed();
        // A residual's unit is 2^counts_bits counts.
        let counts_bits = grid.level_bits.cast_signed() - i32::from(derived.fine_bits);
        let to_grid = |var| math::scaled(var, -2 * counts_bits);
        let noise = GridNoise {
            readout: to_grid(readout_var),
            walk: to_grid(step_walk),
            bend: derived.bend_var.map(|var| {
                let squared = units_per_s * units_per_s;
                to_grid(var / (squared * squared))
            }),
        };
        let bend = Bend::of(&m, &noise, |p| {
            let sums = Running::new(p, 0.0, dots);
            let [walked, ..] = sums.products(sums, dots);
            math::scaled(walked, -unit_bits)
        });
        let var = readout_var * unexplained(&m, bend.as_ref(), &noise);

        let mut tilt = m.tilts as f32 * lever;
        let mut level = m.heights as f32 * share - tilt * middle;
        let mut weights = [[share, -lever * middle, 0.0], [0.0, -lever, 0.0]];
        let slope_var = var * lever;
        let cross = slope_var * middle;
        let mut readout = [var * share + cross * middle, cross, slope_var];
        let mut curved = false;
        if let Some(bend) = bend {
            let at = bend.at(-middle);
            let mut charge = math::scaled(bend.left_in, 2 * counts_bits);
            if bend.taken_off > 0.0 {
                curved = true;
                let amount = bend.taken_off * bend.amount;
                level += amount * at[0];
                tilt -= amount * at[1];
                bend.add_to(&mut weights, at);
                charge += var * bend.taken_off * bend.taken_off / bend.power;
            }
            readout[0] += charge * at[0] * at[0];
            readout[1] += charge * at[0] * at[1];
            readout[2] += charge * at[1] * at[1];
        }

        // The chord is put back where it was taken off: to the level in whole numbers.
        let fine = i32::from(derived.fine_bits);
        let chord_q16 = grid.chord_q32.saturating_mul(i64::from(nearest.ticks)) >> (16 + fine);
        let chord_per_tick = math::scaled(grid.chord_q32 as f32, -32 - fine);
        let slope = chord_per_tick * derived.ticks_per_s + math::scaled(tilt, counts_bits) * units_per_s;
        Some(Self {
            edge: Edge {
                anchor_q16: nearest.level_q16.saturating_sub(chord_q16),
                level: math::scaled(level, counts_bits),
                slope: Some(slope),
                reach: 0.0,
            },
            units_per_tick,
            units_per_s,
            middle,
            nearest: dots.first().map_or(0, |dot| dot.x) as f32 + middle,
            farthest: dots.last().map_or(0, |dot| dot.x) as f32 + middle,
            weights,
            curved,
            readout: readout.map(|form| math::within(form, LEVEL_VARIANCE_MAX)),
            walk_of_unit: math::scaled(step_walk, -unit_bits),
        })
    }
}

pub(super) fn quadratic(v: &[f32; 3], d: f32) -> f32 {
    v[0] + d * (v[1] + v[1] + d * v[2])
}

/// One over a number of samples.
fn reciprocal(count: i32) -> f32 {
    #[rustfmt::skip]
    const OF: [f32; EDGE_SAMPLES_MAX + 1] = [
        0.0, 1.0, 1.0 / 2.0, 1.0 / 3.0, 1.0 / 4.0, 1.0 / 5.0, 1.0 / 6.0, 1.0 / 7.0, 1.0 / 8.0,
        1.0 / 9.0, 1.0 / 10.0, 1.0 / 11.0, 1.0 / 12.0, 1.0 / 13.0, 1.0 / 14.0, 1.0 / 15.0, 1.0 / 16.0,
    ];
    usize::try_from(count).ok().and_then(|count| OF.get(count)).copied().unwrap_or(0.0)
}
