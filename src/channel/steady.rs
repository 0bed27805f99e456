//! Most samples: the mode goes on, and a few comparisons tell that nothing can be said of them.

use super::{Channel, stop};
use crate::level::Seen;
use crate::notices::Notices;
use crate::quantity::{Integral, Temperature};
use crate::sample::{Mode, Sample, Step};
use crate::zeroing::Taken;

/// Past this the books of a run may saturate: 2^46 counts.
const LEVEL_END_Q16: u64 = 1 << 62;

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

    /// Takes such a sample.
    pub(super) fn go_on(&mut self, sample: &Sample, ticks: u32) -> Step {
        let seen = self.see(sample, ticks);
        if sample.mode == Mode::Integrate {
            self.extend(&seen);
            if is_out_of_range(&seen) {
                // The next sample gets a closer look.
                self.steady = None;
            }
            return Step::default();
        }
        match self.zeroing.take(&seen, stop(&self.run), self.setup.derived()) {
            Taken::Used => Step::default(),
            taken => {
                let mut notices = Notices::between(sample.tick, sample.tick);
                self.tell_zero(taken, &seen, &mut notices);
                Step { request: None, notices }
            }
        }
    }

    /// The sample's level, and what else is to be kept of it in any mode.
    pub(super) fn see(&mut self, sample: &Sample, ticks: u32) -> Seen {
        let derived = self.setup.derived();
        self.health.take(sample.counts);
        if let Some(temperature) = sample.temperature {
            self.take_temperature(temperature, sample.mode);
        }
        self.level.take(sample, ticks, derived)
    }

    fn take_temperature(&mut self, temperature: Temperature, mode: Mode) {
        self.zeroing.take_temperature(temperature, self.setup.derived());
        match (mode, self.zero_temperature, self.run.as_mut()) {
            (Mode::Zero, ..) => self.zero_temperature = Some(temperature),
            (Mode::Integrate, Some(before), Some(run)) => run.warming = Some(temperature.since(before)),
            _ => {}
        }
    }

    /// Extends a segment of a run. What can be told from the window and the pending time is booked later.
    /// `true` when it has just filled one window.
    pub(super) fn extend(&mut self, seen: &Seen) -> bool {
        let derived = self.setup.derived();
        self.zeroing.pending.add(seen.ticks, derived.coarse_shift);
        self.zeroing.drive(seen.ticks);
        self.window.push(seen.tick, seen.level_q16, derived)
    }
}

/// Whether a run that holds a sample has come to more than its books can take.
pub(super) fn is_out_of_range(seen: &Seen) -> bool {
    seen.level_q16.unsigned_abs() > LEVEL_END_Q16
}
