//! Faults that a single sample or a pair of samples shows.

use crate::clock::LONGEST_STEP;
use crate::decide;
use crate::setup::Derived;

/// The latest reading, how often in a row it came, and what a sample may be without a closer look.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Health {
    /// The latest reading, and how often in a row it came; 0: never.
    last: i32,
    repeats: u16,
    calm: Calm,
}

/// What needs no further look: most samples, and a few comparisons tell.
#[derive(Clone, Copy, Debug, Default)]
struct Calm {
    /// The shortest step, and by how much the longest is longer, ticks: samples mostly come at one pace.
    shortest: u32,
    play: u32,
    /// The lowest code from which the worst-case input reaches no rail in such a step, and by how much the highest is
    /// higher.
    low: i32,
    width: u32,
    /// Largest change of the code that such a step explains; below 2^31.
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
        self.repeats = if self.last == counts { self.repeats.saturating_add(1) } else { 1 };
        self.last = counts;
    }

    /// The latest reading; `None` before the first.
    pub(crate) fn last(&self) -> Option<i32> {
        (self.repeats > 0).then_some(self.last)
    }

    /// Whether the readings are frozen. Never so on a channel too quiet to tell.
    pub(crate) fn frozen(&self, derived: &Derived) -> bool {
        derived.frozen_samples > 0 && self.repeats >= derived.frozen_samples
    }

    /// Whether nothing could be said of a sample: a step of the usual length, by no more than there may be in it, to a
    /// code far enough from the rails.
    pub(crate) fn is_calm(&self, counts: i32, ticks: u32) -> bool {
        let Calm { shortest, play, low, width, reach, repeats } = self.calm;
        // Each comparison is of a range: what is below its beginning wraps to far above its end.
        let change = counts.wrapping_sub(self.last).cast_unsigned();
        ticks.wrapping_sub(shortest) <= play
            && counts.wrapping_sub(low).cast_unsigned() <= width
            && change.wrapping_add(reach) <= 2 * reach
            && self.repeats < repeats
    }

    /// Takes steps of about `ticks` for the usual ones.
    pub(crate) fn expect(&mut self, ticks: u32, derived: &Derived) {
        if ticks == 0 || ticks.wrapping_sub(self.calm.shortest) <= self.calm.play {
            return;
        }
        let shortest = ticks - (ticks >> 4);
        let longest = ticks.saturating_add(ticks >> 4).min(derived.step_limit_ticks).min(LONGEST_STEP);
        let guard = match derived.worst_rate_q16 {
            0 => 0,
            _ => decide::reset::guard(derived.worst_movement(longest), derived).saturating_add(1),
        };
        let guard = guard.clamp(0, 1 << 30) as i32;
        let (low, high) = (derived.usable.0 + guard, derived.usable.1 - guard);
        // In a gap, or where every code is within reach of a rail, nothing is calm: no reading came less than 0 times.
        let calm = shortest <= longest && low <= high;
        self.calm = Calm {
            shortest,
            play: longest.saturating_sub(shortest),
            low,
            width: high.wrapping_sub(low).cast_unsigned(),
            reach: Self::reach(shortest, derived).min(1 << 30) as u32,
            repeats: if calm { derived.frozen_samples.wrapping_sub(1) } else { 0 },
        };
    }

    /// Largest change of the code in `ticks` by the worst-case input and the noise, not negative.
    fn reach(ticks: u32, derived: &Derived) -> i64 {
        derived.worst_movement(ticks).saturating_add(i64::from(derived.step_counts)).max(0)
    }

    /// Whether the level moved to `counts` by more in `ticks` than the worst-case input and the noise can move it.
    pub(crate) fn jumped(&self, counts: i32, ticks: u32, derived: &Derived) -> bool {
        self.last().is_some_and(|last| i64::from(counts.abs_diff(last)) > Self::reach(ticks, derived))
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
