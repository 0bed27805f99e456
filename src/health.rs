//! Faults that a single sample or a pair of samples shows.

use crate::setup::Derived;

/// Watches for readings that stand still; everything else it decides from the sample before it.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Health {
    last: Option<i32>,
    repeats: u16,
    /// How far the worst-case input moves the level in so many ticks: samples mostly come at one pace.
    pace: u32,
    movement: i64,
}

impl Health {
    /// Whether the converter gave an end code or the level is past a usable rail.
    pub(crate) fn at_rail(counts: i32, derived: &Derived) -> bool {
        counts < derived.usable.0 || counts > derived.usable.1
    }

    /// Takes a sample.
    pub(crate) fn take(&mut self, counts: i32) {
        self.repeats = if self.last == Some(counts) { self.repeats.saturating_add(1) } else { 1 };
        self.last = Some(counts);
    }

    /// Whether the readings are frozen. Never so on a channel too quiet to tell.
    pub(crate) fn frozen(&self, derived: &Derived) -> bool {
        derived.frozen_samples > 0 && self.repeats >= derived.frozen_samples
    }

    /// Largest movement of the level in `ticks` at the worst-case input, counts.
    pub(crate) fn worst_movement(&mut self, ticks: u32, derived: &Derived) -> i64 {
        if ticks != self.pace {
            self.pace = ticks;
            self.movement = derived.worst_movement(ticks);
        }
        self.movement
    }

    /// Whether the level moved to `counts` by more in `ticks` than the worst-case input and the noise can move it.
    pub(crate) fn jumped(&mut self, counts: i32, ticks: u32, derived: &Derived) -> bool {
        let reach = self.worst_movement(ticks, derived).saturating_add(i64::from(derived.step_counts));
        self.last.is_some_and(|last| i64::from(counts).abs_diff(i64::from(last)) > reach.unsigned_abs())
    }

    /// Whether a level lies outside a window of codes.
    pub(crate) fn outside(counts: i64, window: (i32, i32)) -> bool {
        counts < i64::from(window.0) || counts > i64::from(window.1)
    }

    /// Whether a drift or droop lies outside the data-sheet limit by more than 4 of its own uncertainties. A limit of 0
    /// means that the rate is held at 0, and nothing can be told.
    pub(crate) fn rate_outside(rate: f32, rate_variance: f32, limit: f32) -> bool {
        let excess = crate::math::abs(rate) - limit;
        limit > 0.0 && excess > 0.0 && excess * excess > 16.0 * rate_variance
    }
}
