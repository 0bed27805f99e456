//! What a sample does in each mode.

use super::steady::is_out_of_range;
use super::{Channel, stop};
use crate::health::Health;
use crate::level::Seen;
use crate::notice::{Event, Reason};
use crate::notices::Notices;
use crate::quantity::Integral;
use crate::run::Crossing;
use crate::sample::Sample;
use crate::zeroing::Taken;

impl<Q: Integral> Channel<'_, Q> {
    #[inline(never)]
    pub(super) fn zero(&mut self, sample: &Sample, seen: &Seen, notices: &mut Notices) {
        let derived = self.setup.derived();
        if Health::at_rail(sample.counts, derived) {
            self.zeroing.skip(seen.ticks, derived);
            self.fault(Reason::AtRail, sample.tick, notices);
            return;
        }
        let taken = self.zeroing.take(seen, stop(&self.run), derived);
        self.tell_zero(taken, seen, notices);
    }

    /// States what came of a zero sample.
    #[inline(never)]
    pub(super) fn tell_zero(&mut self, taken: Taken, seen: &Seen, notices: &mut Notices) {
        match taken {
            Taken::Used => {}
            Taken::Spike => {
                if let Some(run) = self.run.as_mut() {
                    run.spikes = run.spikes.saturating_add(1);
                }
                notices.push(seen.tick, Event::Spike);
            }
            Taken::Onset { since, contradicts_run, change } => {
                self.tell_decay(change, seen.linear_q16(), seen.tick, notices);
                notices.push(since, Event::InputInZero);
                if contradicts_run && let Some(run) = self.run.as_mut() {
                    run.reasons.insert(Reason::InputInZero);
                }
                if self.zero_reasons.insert(Reason::InputInZero) {
                    notices.push(seen.tick, Event::Fault(Reason::InputInZero));
                }
            }
        }
    }

    #[inline(never)]
    pub(super) fn integrate(&mut self, sample: &Sample, seen: &Seen, notices: &mut Notices) {
        let filled = self.extend(seen);
        if Health::at_rail(sample.counts, self.setup.derived()) {
            self.fault(Reason::AtRail, sample.tick, notices);
        }
        if is_out_of_range(seen) {
            self.fault(Reason::OutOfRange, sample.tick, notices);
        }
        if filled {
            self.settle_for_good(sample.tick, notices);
        }
    }

    #[inline(never)]
    pub(super) fn hold(&mut self, sample: &Sample, seen: &Seen) {
        let derived = self.setup.derived();
        if Health::at_rail(sample.counts, derived) {
            self.droop.forget_level();
        } else {
            self.droop.take(seen, derived);
        }
        self.interrupted(seen.ticks, |crossing, ticks| {
            crossing.held = crossing.held.saturating_add(ticks);
            crossing.held_last = true;
            crossing.input_open = true;
        });
    }

    #[inline(never)]
    pub(super) fn reset(&mut self, seen: &Seen, notices: &mut Notices) {
        if !self.run.and_then(|run| run.crossing).is_some_and(|crossing| crossing.input_open) {
            self.zeroing.drive(seen.ticks);
        }
        self.interrupted(seen.ticks, |crossing, ticks| {
            let booked = if crossing.input_open { &mut crossing.held } else { &mut crossing.dead };
            *booked = booked.saturating_add(ticks);
            crossing.held_last = false;
        });
        self.verify_closed(seen, notices);
    }

    /// Books time in an interruption; outside a run only the rate wanders.
    fn interrupted(&mut self, ticks: u32, book: impl FnOnce(&mut Crossing, u64)) {
        let ticks = u64::from(ticks);
        match self.run.as_mut().filter(|run| run.is_running()).and_then(|run| run.crossing.as_mut()) {
            Some(crossing) => book(crossing, ticks),
            None => self.zeroing.resting = self.zeroing.resting.saturating_add(ticks),
        }
    }
}
