//! What a sample does in each mode.

use super::{Channel, stop};
use crate::health::Health;
use crate::level::Seen;
use crate::notice::{Event, Notices, Reason};
use crate::quantity::Integral;
use crate::run::Crossing;
use crate::sample::Sample;
use crate::zeroing::Taken;

/// Past this the books of a run may saturate: 2^46 counts.
const LEVEL_END_Q16: u64 = 1 << 62;

impl<Q: Integral> Channel<'_, Q> {
    pub(super) fn zero(&mut self, sample: Sample, seen: &Seen, notices: &mut Notices) {
        let derived = self.setup.derived();
        self.zero_temperature = sample.temperature.or(self.zero_temperature);
        if Health::at_rail(sample.counts, derived) {
            self.zeroing.skip(seen.ticks, derived);
            self.fault(Reason::AtRail, sample.tick, notices);
            return;
        }
        match self.zeroing.take(seen, stop(&self.run), derived) {
            Taken::Used => {}
            Taken::Spike => {
                if let Some(run) = self.run.as_mut() {
                    run.spikes = run.spikes.saturating_add(1);
                }
                notices.push(sample.tick, Event::Spike);
            }
            Taken::Onset { since, contradicts_run, change } => {
                self.tell_decay(change, false, sample.tick, notices);
                notices.push(since, Event::InputInZero);
                if contradicts_run && let Some(run) = self.run.as_mut() {
                    run.reasons.insert(Reason::InputInZero);
                }
                if self.zero_reasons.insert(Reason::InputInZero) {
                    notices.push(sample.tick, Event::Fault(Reason::InputInZero));
                }
            }
        }
    }

    pub(super) fn integrate(&mut self, sample: Sample, seen: &Seen, notices: &mut Notices) {
        let derived = self.setup.derived();
        self.zeroing.pending.add(seen.ticks, derived.coarse_shift);
        self.zeroing.drive(seen.ticks);
        let filled = self.window.push(seen.tick, seen.level_q16, derived);
        let Some(run) = self.run.as_mut() else { return };
        run.driven.add(seen.ticks, derived.coarse_shift);
        run.end_tick = seen.tick;
        run.last_q16 = seen.level_q16;
        if let (Some(now), Some(then)) = (sample.temperature, self.zero_temperature) {
            run.warming = Some(now.since(then));
        }
        if Health::at_rail(sample.counts, derived) {
            self.fault(Reason::AtRail, sample.tick, notices);
        }
        if seen.level_q16.unsigned_abs() > LEVEL_END_Q16 {
            self.fault(Reason::OutOfRange, sample.tick, notices);
        }
        if filled {
            self.settle_for_good(sample.tick, notices);
        }
    }

    pub(super) fn hold(&mut self, sample: Sample, seen: &Seen) {
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
