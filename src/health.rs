//! Faults that a single sample or a pair of samples shows.

use crate::setup::Derived;

/// Watches for readings that stand still; everything else it decides from the sample before it.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Health {
    last: Option<i32>,
    repeats: u16,
    calm: Calm,
}

/// What needs no further look: most samples, and a few comparisons tell.
#[derive(Clone, Copy, Debug, Default)]
struct Calm {
    /// Shortest and longest step, ticks: samples mostly come at one pace.
    ticks: (u32, u32),
    /// Lowest and highest code from which the worst-case input reaches no rail in such a step.
    codes: (i32, i32),
    /// Largest change of the code that such a step explains.
    reach: u32,
    /// So many equal readings in a row are not frozen yet.
    repeats: u16,
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

    /// The latest reading.
    pub(crate) fn last(&self) -> Option<i32> {
        self.last
    }

    /// Whether the readings are frozen. Never so on a channel too quiet to tell.
    pub(crate) fn frozen(&self, derived: &Derived) -> bool {
        derived.frozen_samples > 0 && self.repeats >= derived.frozen_samples
    }

    /// Whether nothing could be said of a sample: a step of the usual length, by no more than there may be in it, to a
    /// code far enough from the rails.
    pub(crate) fn is_calm(&self, counts: i32, ticks: u32) -> bool {
        let Calm { ticks: (shortest, longest), codes: (low, high), reach, repeats } = self.calm;
        (shortest..=longest).contains(&ticks)
            && (low..=high).contains(&counts)
            && self.last.is_some_and(|last| counts.abs_diff(last) <= reach)
            && self.repeats < repeats
    }

    /// Takes steps of about `ticks` for the usual ones.
    pub(crate) fn expect(&mut self, ticks: u32, derived: &Derived) {
        let (shortest, longest) = self.calm.ticks;
        if (shortest..=longest).contains(&ticks) {
            return;
        }
        let play = ticks >> 4;
        let (shortest, longest) = (ticks - play, ticks.saturating_add(play).min(derived.gap_limit_ticks));
        let guard = match derived.worst_rate_q16 {
            0 => 0,
            _ => derived.worst_movement(longest).saturating_add(i64::from(derived.guard_counts)).saturating_add(1),
        };
        let guard = guard.clamp(0, i64::from(i32::MAX)) as i32;
        let (low, high) = derived.usable;
        self.calm = Calm {
            ticks: (shortest, longest),
            codes: (low.saturating_add(guard), high.saturating_sub(guard)),
            reach: Self::reach(shortest, derived).min(i64::from(u32::MAX)) as u32,
            repeats: derived.frozen_samples.wrapping_sub(1),
        };
    }

    /// Largest change of the code in `ticks` by the worst-case input and the noise, not negative.
    fn reach(ticks: u32, derived: &Derived) -> i64 {
        derived.worst_movement(ticks).saturating_add(i64::from(derived.step_counts)).max(0)
    }

    /// Whether the level moved to `counts` by more in `ticks` than the worst-case input and the noise can move it.
    pub(crate) fn jumped(&self, counts: i32, ticks: u32, derived: &Derived) -> bool {
        self.last.is_some_and(|last| i64::from(counts.abs_diff(last)) > Self::reach(ticks, derived))
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
