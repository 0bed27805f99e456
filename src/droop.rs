//! What moves the level while the input is open.

use crate::clock::Span;
use crate::estimate::{Block, Trend};
use crate::level::Terms;
use crate::math;
use crate::setup::Derived;
use crate::zeroing::{advance, squares};

/// Growth of the droop's variance from hold to hold.
const FADING: f32 = 4.0;

/// Level and droop in the holds. With the input open the offset voltage drives no current through the source, so the
/// droop is the bias current's alone, with a prior and a memory of its own: the drift of the zeros says nothing of it.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Droop {
    trend: Trend,
    block: Block,
    pending: Span,
    level_known: bool,
    /// Time that holds have told of it, ticks.
    known_ticks: u64,
    /// Leak and soakage when the present hold found its level, what an uncertainty of each has made of the level since,
    /// and how long ago that was, ticks.
    start: Terms,
    doubts: [f32; 2],
    held: u64,
}

impl Droop {
    /// Nothing seen yet: what the data sheet allows.
    pub(crate) fn new(derived: &Derived) -> Self {
        Self {
            trend: Trend::new(0, derived.readout_var, 0.0, derived.droop_prior_var),
            block: Block::default(),
            pending: Span::default(),
            level_known: false,
            known_ticks: 0,
            start: Terms::default(),
            doubts: [0.0; 2],
            held: 0,
        }
    }

    /// A hold begins: the level is to be found. The bias may have changed since the last: what that told counts a
    /// quarter.
    pub(crate) fn enter(&mut self, derived: &Derived) {
        self.trend.doubt_rate((FADING * self.trend.rate_variance()).min(derived.droop_prior_var));
        self.forget_level();
    }

    /// The level is to be found anew.
    pub(crate) fn forget_level(&mut self) {
        self.block = Block::default();
        self.pending = Span::default();
        self.level_known = false;
    }

    /// A sample in a hold: its level, 2^-16 counts, `ticks` after the one before, and leak and soakage now.
    pub(crate) fn take(&mut self, level_q16: i64, ticks: u32, terms: Terms, derived: &Derived) {
        self.pending.add(ticks, derived.coarse_shift);
        if self.block.is_empty() {
            self.block.start(level_q16 >> 16);
        }
        let above = self.block.above(level_q16);
        if !self.block.push(above, above, ticks, derived.block_ticks) {
            return;
        }
        let Some(mean) = self.block.take() else { return };
        let span = self.pending.leave(u64::from(mean.age));
        let variance = derived.block_var(mean.share);
        if self.level_known {
            advance(&mut self.trend, None, span, derived);
            self.trend.update(mean.counts, mean.rest, derived.serial_var(variance));
            self.known_ticks = self.known_ticks.saturating_add(span.ticks);
            self.held = self.held.saturating_add(span.ticks);
            self.doubts = terms.doubts_since(self.start, derived);
        } else {
            self.trend.restart(mean.counts, mean.rest, variance);
            self.level_known = true;
            (self.start, self.held) = (terms, 0);
        }
    }

    /// The droop, counts/s, and its variance; that of the data sheet before any hold.
    pub(crate) fn rate(&self, derived: &Derived) -> (f32, f32) {
        let figures = squares(self.doubts(derived));
        (self.trend.rate(), self.trend.rate_variance() + derived.rate_rounding_var(self.known_ticks) + figures)
    }

    /// What one uncertainty of leak and of soakage makes of the latest hold's droop, counts/s.
    pub(crate) fn doubts(&self, derived: &Derived) -> [f32; 2] {
        let held_s = math::seconds(self.held, derived.tick_s);
        if held_s > 0.0 { self.doubts.map(|doubt| doubt / held_s) } else { [0.0; 2] }
    }

    /// Whether any hold was long enough to tell of it.
    pub(crate) fn is_known(&self) -> bool {
        self.known_ticks > 0
    }
}
