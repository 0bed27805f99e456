//! The latest integrating samples, kept for the straight lines beside an interruption.

use heapless::Deque;

use crate::estimate::{Edge, Side};
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
    pub(crate) fn after(&self, instant: u32, derived: &Derived) -> Option<Edge> {
        let samples = self.iter().map(|&(tick, counts)| (tick.wrapping_sub(instant), counts));
        Edge::fit(Side::After, samples, derived.tick_s, derived.readout_var, derived.level_walk)
    }

    /// The line just before the switch closed at `instant`. `opened`: the segment began with a line of its own, which
    /// should not share samples with this one.
    pub(crate) fn before(&self, instant: u32, opened: bool, derived: &Derived) -> Option<Edge> {
        let fresh = usize::from(self.seen.saturating_sub(derived.edge_samples));
        let shares = opened && fresh < 2;
        let take = if opened && !shares { fresh } else { EDGE_SAMPLES_MAX };
        let samples = self.iter().rev().take(take).map(|&(tick, counts)| (instant.wrapping_sub(tick), counts));
        let edge = Edge::fit(Side::Before, samples, derived.tick_s, derived.readout_var, derived.level_walk);
        if shares { edge.map(Edge::sharing_samples) } else { edge }
    }

    /// Oldest first.
    fn iter(&self) -> impl DoubleEndedIterator<Item = &(u32, i32)> + Clone {
        let (older, newer) = self.samples.as_slices();
        older.iter().chain(newer)
    }
}
