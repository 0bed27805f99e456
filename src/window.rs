//! The latest integrating samples, kept for the straight lines beside an interruption.

use heapless::Deque;

use crate::estimate::{Edge, EdgeNoise, Side, Weights};
use crate::setup::{Derived, EDGE_SAMPLES_MAX};

/// Integer work only, until a line is asked for.
#[derive(Clone, Debug, Default)]
pub(crate) struct Window {
    samples: Deque<(u32, i32), EDGE_SAMPLES_MAX>,
    /// Samples since the segment began, saturating.
    seen: u8,
}

impl Window {
    /// A new segment begins.
    pub(crate) fn clear(&mut self) {
        self.samples.clear();
        self.seen = 0;
    }

    /// Takes a sample; `true` when the segment has just filled one window.
    pub(crate) fn push(&mut self, tick: u32, counts: i32, derived: &Derived) -> bool {
        if self.samples.len() >= usize::from(derived.edge_samples) {
            self.samples.pop_front();
        }
        let _ = self.samples.push_back((tick, counts));
        self.seen = self.seen.saturating_add(1);
        self.seen == derived.edge_samples
    }

    /// The line just after the switch opened at `instant`.
    pub(crate) fn after(&self, instant: u32, sample_var: f32, derived: &Derived) -> Option<Edge> {
        let samples = self.iter().map(|&(tick, counts)| (tick.wrapping_sub(instant), counts));
        Edge::fit(Side::After, samples, derived.tick_s, noise(sample_var, derived), |_| 0.0)
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
        let samples = self.iter().rev().map(|&(tick, counts)| (instant.wrapping_sub(tick), counts));
        let taken = |ticks| opening.map_or(0.0, |opening| opening.weight(instant.wrapping_sub(ticks), derived));
        Edge::fit(Side::Before, samples, derived.tick_s, noise(sample_var, derived), taken)
    }

    /// Oldest first.
    fn iter(&self) -> impl DoubleEndedIterator<Item = &(u32, i32)> + Clone {
        let (older, newer) = self.samples.as_slices();
        older.iter().chain(newer)
    }
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
