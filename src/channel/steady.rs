//! What every sample goes through. For most this is all: the mode goes on, and a few comparisons tell that nothing can
//! be said of them.

use super::{Channel, stop};
use crate::ledger::is_past_books;
use crate::notices::Notices;
use crate::quantity::Integral;
use crate::sample::{Mode, Sample, Step};
use crate::zeroing::Taken;

impl<Q: Integral> Channel<'_, Q> {
    /// The mode, if nothing is left to wait for in it.
    pub(super) fn steady_mode(&self) -> Option<Mode> {
        let steady = match self.mode {
            Some(Mode::Zero) => true,
            Some(Mode::Integrate) => self.window.is_full(self.setup.derived()),
            _ => false,
        };
        self.mode.filter(|_| steady && self.verification.is_idle())
    }

    /// Whether a sample, `ticks` after the one before, needs no other look than at its level.
    pub(super) fn goes_on(&self, sample: &Sample, ticks: u32) -> bool {
        self.steady == Some(sample.mode) && self.health.is_calm(sample.counts, ticks)
    }

    /// What is to be kept of a sample in any mode, whether or not it is looked at closely.
    #[inline(always)]
    pub(super) fn keep(&mut self, sample: &Sample) {
        self.health.take(sample.counts);
        if sample.temperature.is_some() && sample.temperature != self.temperature {
            self.take_temperature(sample);
        }
    }

    /// A temperature that has changed, or is the first in a mode.
    #[inline(never)]
    fn take_temperature(&mut self, sample: &Sample) {
        self.temperature = sample.temperature;
        let Some(temperature) = sample.temperature else { return };
        self.zeroing.take_temperature(temperature, self.setup.derived());
        match (sample.mode, self.zero_temperature, self.run.as_mut()) {
            (Mode::Zero, ..) => self.zero_temperature = Some(temperature),
            (Mode::Integrate, Some(before), Some(run)) => run.warming = Some(temperature.since(before)),
            _ => {}
        }
    }

    /// Extends a segment of a run. What can be told from the window and the pending time is booked later.
    #[inline(always)]
    pub(super) fn extend(&mut self, sample: &Sample, ticks: u32) {
        let derived = self.setup.derived();
        let level_q16 = if derived.keeps_level {
            self.zeroing.pending.add_blind(u64::from(ticks));
            derived.linear_q16(sample.counts)
        } else {
            self.zeroing.pending.add(ticks, derived.coarse_shift);
            let level_q16 = self.level.take(sample, ticks, derived);
            if is_past_books(level_q16) {
                // The next sample is looked at closely.
                self.steady = None;
            }
            level_q16
        };
        self.zeroing.drive(u64::from(ticks));
        self.window.push(sample.tick, level_q16, derived);
    }

    /// Takes a sample of a zero. A level that leaks or soaks forgets one that is left out.
    #[inline(always)]
    pub(super) fn zero(&mut self, sample: &Sample, ticks: u32, at_rail: bool) -> Taken {
        let derived = self.setup.derived();
        let (level_q16, before) = if derived.keeps_level {
            (derived.linear_q16(sample.counts), None)
        } else {
            let before = self.level;
            (self.level.take(sample, ticks, derived), Some(before))
        };
        let taken = if at_rail {
            self.zeroing.skip(ticks, derived);
            Taken::Spike
        } else {
            let around = || (stop(&self.run), self.level.terms());
            self.zeroing.take(sample.tick, ticks, level_q16, around, derived)
        };
        if let (Taken::Spike, Some(before)) = (&taken, before) {
            self.level = before.without(ticks);
        }
        taken
    }

    /// The same where nothing else can be said of the sample.
    #[inline(never)]
    pub(super) fn go_on_in_zero(&mut self, sample: &Sample, ticks: u32) -> Step {
        match self.zero(sample, ticks, false) {
            Taken::Used => Step::default(),
            taken => {
                let mut notices = Notices::between(sample.tick, sample.tick);
                self.tell_zero(taken, sample, &mut notices);
                Step { request: None, notices }
            }
        }
    }
}
