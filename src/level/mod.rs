//! From codes to the effective level: what the output would be if the converter were straight, nothing leaked and the
//! dielectric kept nothing.

mod leak;
mod soakage;

use leak::Leak;
pub(crate) use leak::LeakLaw;
use soakage::Soakage;
pub(crate) use soakage::{BranchLaw, SoakageLaw};

use crate::clock::LONGEST_STEP;
use crate::math;
use crate::sample::{Mode, Sample};
use crate::setup::Derived;

/// What has leaked and what the dielectric holds, 2^-16 counts of the level.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(crate) struct Terms {
    pub(crate) leaked_q16: i64,
    pub(crate) soaked_q16: i64,
}

impl Terms {
    /// What they add to the level.
    pub(crate) fn sum_q16(self) -> i64 {
        self.leaked_q16.saturating_add(self.soaked_q16)
    }

    /// What one standard uncertainty of leak and of soakage has made of the level since `start`, counts.
    pub(crate) fn doubts_since(self, start: Self, derived: &Derived) -> [f32; 2] {
        let [leak_u_rel, soakage_u_rel] = derived.terms_u_rel;
        let counts = |now: i64, then: i64| math::counts(now.saturating_sub(then));
        [
            counts(self.leaked_q16, start.leaked_q16) * leak_u_rel,
            counts(self.soaked_q16, start.soaked_q16) * soakage_u_rel,
        ]
    }
}

/// The effective level `level + leaked + soaked`. With the switch open only input, drift and noise move it.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Level {
    /// Of the latest sample, above the reset level, counts; `None` before the first.
    above: Option<i32>,
    leak: Leak,
    soakage: Soakage,
    terms: Terms,
    /// Time that samples which were left out have taken, ticks.
    left_out: u32,
}

impl Level {
    /// Takes a sample, `ticks` after the one before, and gives the effective level, 2^-16 counts. While the reset
    /// switch is closed nothing leaks, and the dielectric sees the reset level.
    ///
    /// The first sample finds the dielectric at rest.
    #[inline(never)]
    pub(crate) fn take(&mut self, sample: &Sample, ticks: u32, derived: &Derived) -> i64 {
        let linear_q16 = derived.linear_q16(sample.counts);
        if derived.keeps_level {
            return linear_q16;
        }
        let closed = sample.mode == Mode::Reset;
        let mut ticks = ticks;
        match (core::mem::take(&mut self.left_out), self.above) {
            (0, _) => {}
            // Samples were left out up to the instant at which the switch closed: until then the level stood.
            (left_out, Some(level)) if closed => self.pass(level, level, left_out.min(LONGEST_STEP), true, derived),
            (left_out, _) => ticks = ticks.saturating_add(left_out).min(LONGEST_STEP),
        }
        let above = if closed { 0 } else { derived.above_reset(linear_q16) };
        // The switch closes and opens at the beginning of a step: after it the level is where the reset left it.
        let from = match self.above.replace(above) {
            None => {
                self.soakage.start(above);
                above
            }
            Some(_) if closed => 0,
            Some(from) => from,
        };
        self.pass(from, above, ticks, !closed, derived);
        linear_q16.saturating_add(self.terms.sum_q16())
    }

    /// The level goes from `from` to `to` in `ticks`.
    fn pass(&mut self, from: i32, to: i32, ticks: u32, leaks: bool, derived: &Derived) {
        if let Some(law) = derived.leak.as_ref().filter(|_| leaks) {
            self.leak.take(from, to, ticks, law);
            self.terms.leaked_q16 = self.leak.q16(law);
        }
        if let Some(law) = derived.soakage.as_ref() {
            self.soakage.take(from, to, ticks, law);
            self.terms.soaked_q16 = self.soakage.q16(law);
        }
    }

    /// The level as it was, for a sample `ticks` after it that will be left out: what leaks and soaks follows from the
    /// samples on both sides of it.
    pub(crate) fn without(self, ticks: u32) -> Self {
        Self { left_out: self.left_out.saturating_add(ticks), ..self }
    }

    /// Puts the zero of what has leaked near the present, and gives by how much, counts: only differences of the
    /// effective level count, and what leaked in months must not use up its range.
    pub(crate) fn rebase(&mut self) -> i64 {
        let moved = self.leak.rebase();
        self.terms.leaked_q16 = self.terms.leaked_q16.saturating_sub(moved.saturating_mul(1 << 16));
        moved
    }

    /// Leak and soakage as of the latest sample.
    pub(crate) fn terms(&self) -> Terms {
        self.terms
    }
}
