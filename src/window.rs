//! The latest integrating samples, kept for the straight lines beside an interruption.

use heapless::Deque;

use crate::estimate::{Edge, EdgeNoise, Hint, Side, Weights, fine_step};
use crate::math;
use crate::setup::{Derived, EDGE_SAMPLES_MAX};

/// Integer work only, until a line is asked for.
#[derive(Clone, Debug, Default)]
pub(crate) struct Window {
    /// Tick and level, in fine steps; of the level the lower 32 bits, which is enough to tell one from the next.
    samples: Deque<(u32, i32), EDGE_SAMPLES_MAX>,
    /// The latest level, 2^-16 counts.
    latest_q16: i64,
    /// Samples since the segment began, saturating.
    seen: u8,
}

impl Window {
    /// A new segment begins.
    pub(crate) fn clear(&mut self) {
        self.samples.clear();
        self.seen = 0;
    }

    /// Takes a sample.
    pub(crate) fn push(&mut self, tick: u32, level_q16: i64, derived: &Derived) {
        if self.samples.len() >= usize::from(derived.edge_samples) {
            self.samples.pop_front();
        }
        self.latest_q16 = level_q16;
        let _ = self.samples.push_back((tick, (level_q16 >> (16 - derived.fine_bits)) as i32));
        self.seen = self.seen.saturating_add(1);
    }

    /// Tick and level, 2^-16 counts, of the latest sample of the segment.
    pub(crate) fn latest(&self) -> Option<(u32, i64)> {
        self.samples.back().map(|&(tick, _)| (tick, self.latest_q16))
    }

    /// Whether the segment has filled a window.
    pub(crate) fn is_full(&self, derived: &Derived) -> bool {
        self.seen >= derived.edge_samples
    }

    /// The line just after the switch opened at `instant`, when the level was as `opened` says, if it is known.
    pub(crate) fn after(
        &self,
        instant: u32,
        opened: Option<Opened>,
        sample_var: f32,
        derived: &Derived,
    ) -> Option<Edge> {
        let &(_, nearest) = self.iter().next()?;
        let samples = self.above(nearest, derived).map(|(tick, above)| (tick.wrapping_sub(instant), above));
        let anchor_q16 = self.level_q16(nearest, derived);
        let hint = opened.map(|opened| Hint {
            level: math::counts(opened.level_q16.saturating_sub(anchor_q16)),
            own_var: opened.own_var,
            shared_var: opened.pedestal_var,
            lever: opened.lever,
        });
        Edge::fit(Side::After, anchor_q16, samples, derived.tick_s, noise(sample_var, derived), hint, |_| 0.0)
    }

    /// The line just before the switch closed at `instant`. `opening`: the line at the other end of the segment, which
    /// may share samples with this one.
    pub(crate) fn before(
        &self,
        instant: u32,
        opening: Option<&Opening>,
        sample_var: f32,
        derived: &Derived,
    ) -> Option<Edge> {
        let &(_, nearest) = self.iter().next_back()?;
        let samples = self.above(nearest, derived).rev().map(|(tick, above)| (instant.wrapping_sub(tick), above));
        let taken = |ticks| opening.map_or(0.0, |opening| opening.weight(instant.wrapping_sub(ticks), derived));
        Edge::fit(
            Side::Before,
            self.level_q16(nearest, derived),
            samples,
            derived.tick_s,
            noise(sample_var, derived),
            None,
            taken,
        )
    }

    /// Ticks and levels, in counts above the level `origin`; oldest first.
    fn above(&self, origin: i32, derived: &Derived) -> impl DoubleEndedIterator<Item = (u32, f32)> + Clone {
        let step = fine_step(derived.fine_bits);
        self.iter().map(move |&(tick, level)| (tick, level.wrapping_sub(origin) as f32 * step))
    }

    /// A kept level as a whole, 2^-16 counts.
    fn level_q16(&self, level: i32, derived: &Derived) -> i64 {
        let shift = 16 - derived.fine_bits;
        let latest = self.latest_q16 >> shift;
        let above = i64::from(level.wrapping_sub(latest as i32));
        (latest << shift).saturating_add(above << shift)
    }

    /// Oldest first.
    fn iter(&self) -> impl DoubleEndedIterator<Item = &(u32, i32)> + Clone {
        let (older, newer) = self.samples.as_slices();
        older.iter().chain(newer)
    }
}

/// The level at which the reset switch opened: what it was with the switch closed, and the pedestal.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Opened {
    /// Effective level, 2^-16 counts.
    pub(crate) level_q16: i64,
    /// Variance of the reset level and of the pedestal, counts^2.
    pub(crate) own_var: f32,
    pub(crate) pedestal_var: f32,
    /// How much of the pedestal's error the run's total holds already.
    pub(crate) lever: f32,
}

/// The line with which a segment opened: which samples it used, and with what weights they are in the run's total.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Opening {
    weights: Weights,
    /// How far the line was extrapolated into the dead time, s.
    extrapolated_s: f32,
    instant: u32,
    /// Ticks from the instant to the last sample that the line used.
    window: u32,
}

impl Opening {
    pub(crate) fn new(line: &Edge, extrapolated_s: f32, instant: u32, last: u32) -> Self {
        Self { weights: line.weights(), extrapolated_s, instant, window: last.wrapping_sub(instant) }
    }

    /// The weight of the sample at `tick`; 0 if the line did not use it.
    pub(crate) fn weight(&self, tick: u32, derived: &Derived) -> f32 {
        let ticks = tick.wrapping_sub(self.instant);
        if ticks > self.window {
            return 0.0;
        }
        self.weights.of(ticks as f32 * derived.tick_s, self.extrapolated_s)
    }
}

fn noise(sample_var: f32, derived: &Derived) -> EdgeNoise {
    EdgeNoise { readout_var: sample_var, level_walk: derived.level_walk, bend_var: derived.bend_var }
}
