//! What wrong figures of leak and soakage would do to the run.

use crate::estimate::Innovation;
use crate::level::Terms;
use crate::math;
use crate::setup::Derived;

/// Leak and soakage.
const FIGURES: usize = 2;

/// For each figure, what one of its standard uncertainties would change: the filter weighs samples, so it weighs what
/// is wrong with them alike. The figures are not estimated, their uncertainty is carried along (Schmidt 1966, Advances
/// in Control Systems 3, from memory: "consider" parameters).
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Considered {
    /// Leak and soakage when they were last followed.
    followed: Terms,
    /// The samples' levels above the filter's level (in a run: above the baseline), counts.
    level: [f32; FIGURES],
    /// The filter's rate, counts/s.
    rate: [f32; FIGURES],
    /// The movement of the run that has stopped, counts.
    run: [f32; FIGURES],
    /// By how much the samples' levels changed when they were last followed.
    step: [f32; FIGURES],
}

impl Considered {
    /// The level went on, and leak and soakage changed with it.
    pub(crate) fn follow(&mut self, terms: Terms, derived: &Derived) {
        if !derived.has_doubts() {
            return;
        }
        self.step = terms.doubts_since(self.followed, derived);
        for (level, step) in self.level.iter_mut().zip(self.step) {
            *level = bounded(*level + step);
        }
        self.followed = terms;
    }

    /// What leak and soakage did meanwhile belongs to no run and no zero.
    pub(crate) fn skip(&mut self, terms: Terms) {
        self.followed = terms;
    }

    /// The level is found anew at the present sample.
    pub(crate) fn release_level(&mut self) {
        self.level = [0.0; FIGURES];
    }

    /// Time passes for level or baseline.
    pub(crate) fn advance(&mut self, ticks: u64, derived: &Derived) {
        if !derived.has_doubts() {
            return;
        }
        let dt_s = math::seconds(ticks, derived.tick_s);
        for (level, rate) in self.level.iter_mut().zip(self.rate) {
            *level = bounded(*level - rate * dt_s);
        }
    }

    /// A sample of the level, as weighed by the filter and, with `run_gain`, by the bracket of the run before.
    pub(crate) fn update(&mut self, innovation: &Innovation, run_gain: f32, derived: &Derived) {
        if !derived.has_doubts() {
            return;
        }
        for ((level, rate), run) in self.level.iter_mut().zip(&mut self.rate).zip(&mut self.run) {
            *run = bounded(*run + run_gain * *level);
            *rate = bounded(*rate + innovation.rate_gain * *level);
            *level -= innovation.level_gain * *level;
        }
    }

    /// The run is what the level is above the baseline now.
    pub(crate) fn close_run(&mut self) {
        self.run = core::mem::take(&mut self.level);
    }

    /// The level went on after the run had stopped, and is the run's for so much longer.
    pub(crate) fn extend_run(&mut self) {
        for (run, level) in self.run.iter_mut().zip(self.level) {
            *run += level;
        }
    }

    /// Of the run that has stopped, counts.
    pub(crate) fn run(&self) -> [f32; FIGURES] {
        self.run
    }

    /// Of the drift, counts/s.
    pub(crate) fn rate(&self) -> [f32; FIGURES] {
        self.rate
    }

    /// How much farther off than noise a sample may lie, as a variance, counts^2; in a run, that of its movement.
    pub(crate) fn lag_variance(&self) -> f32 {
        squares(self.level)
    }

    /// The same until they are followed again: creep slows down, so it goes on by less than before.
    pub(crate) fn lag_variance_ahead(&self) -> f32 {
        let mut farthest = self.level;
        for (level, step) in farthest.iter_mut().zip(self.step) {
            *level = math::abs(*level) + math::abs(step);
        }
        squares(farthest)
    }
}

/// The variance that independent figures add up to.
pub(crate) fn squares(levers: [f32; FIGURES]) -> f32 {
    levers.iter().map(|lever| lever * lever).sum()
}

/// The variance of a difference.
pub(crate) fn square_distance(a: [f32; FIGURES], b: [f32; FIGURES]) -> f32 {
    a.iter().zip(b).map(|(a, b)| (a - b) * (a - b)).sum()
}

/// So far off nothing is known, and squares stay within `f32`.
fn bounded(lever: f32) -> f32 {
    lever.clamp(-1e15, 1e15)
}
