//! The closer look at a sample with which something may be the matter.

use super::Channel;
use crate::clock::Elapsed;
use crate::health::Health;
use crate::notice::{Event, Reason};
use crate::notices::Notices;
use crate::quantity::Integral;
use crate::run::Crossing;
use crate::sample::{Mode, Sample, Step};
use crate::zeroing::Taken;

impl<Q: Integral> Channel<'_, Q> {
    /// Takes a sample that may be anything.
    #[inline(never)]
    pub(super) fn look_at(&mut self, sample: &Sample) -> Step {
        self.steady = None;
        let before = self.clock.tick();
        let elapsed = self.clock.advance(sample.tick);
        let (ticks, switched_tick) = match elapsed {
            Elapsed::Ticks(ticks) => (ticks, before),
            Elapsed::Start | Elapsed::Stalled | Elapsed::Restarted => (0, sample.tick),
        };
        let mut notices = Notices::between(switched_tick, sample.tick);
        if elapsed == Elapsed::Stalled {
            self.stall(sample.tick, &mut notices);
        } else {
            if elapsed == Elapsed::Restarted {
                self.lose_time(sample.tick, &mut notices);
            }
            self.look_ahead(sample, ticks, switched_tick, &mut notices);
            self.keep(sample);
            self.take(sample, ticks, &mut notices);
            self.steady = self.steady_mode();
        }
        let request = self.advise(sample, ticks, &mut notices);
        Step { request, notices }
    }

    /// What can be said before the level is seen: switches, the step from the sample before, time.
    fn look_ahead(&mut self, sample: &Sample, ticks: u32, switched_tick: u32, notices: &mut Notices) {
        let derived = self.setup.derived();
        let was_running = self.is_running();
        let jumped = self.has_jumped(sample, ticks);
        if self.mode != Some(sample.mode) {
            self.switch(sample.mode, switched_tick, notices);
        }
        if jumped {
            self.fault(Reason::Jump, sample.tick, notices);
        }
        if ticks > derived.step_limit_ticks {
            self.gap(was_running, sample.tick, notices);
        }
        self.health.expect(ticks, derived);
    }

    /// Takes the level, and tells what follows from it.
    fn take(&mut self, sample: &Sample, ticks: u32, notices: &mut Notices) {
        let derived = self.setup.derived();
        let at_rail = Health::at_rail(sample.counts, derived);
        let told = matches!(sample.mode, Mode::Zero | Mode::Integrate);
        match sample.mode {
            Mode::Zero => self.zero_closely(sample, ticks, at_rail, notices),
            Mode::Integrate => self.integrate(sample, ticks, notices),
            Mode::Hold => self.hold(sample, ticks, at_rail),
            Mode::Reset => self.reset(sample, ticks, notices),
        }
        if at_rail && told {
            self.fault(Reason::AtRail, sample.tick, notices);
        }
        self.watch_opened(sample, ticks, notices);
        // At an end code readings rightly stand still.
        if self.health.frozen(derived) && !at_rail && sample.mode != Mode::Reset {
            self.fault(Reason::Frozen, sample.tick, notices);
        }
    }

    #[inline(never)]
    fn zero_closely(&mut self, sample: &Sample, ticks: u32, at_rail: bool, notices: &mut Notices) {
        let taken = self.zero(sample, ticks, at_rail);
        if !at_rail {
            self.tell_zero(taken, sample, notices);
        }
    }

    /// States what came of a zero sample.
    #[inline(never)]
    pub(super) fn tell_zero(&mut self, taken: Taken, sample: &Sample, notices: &mut Notices) {
        match taken {
            Taken::Used => {}
            Taken::Spike => {
                if let Some(run) = self.run.as_mut() {
                    run.spikes = run.spikes.saturating_add(1);
                }
                notices.push(sample.tick, Event::Spike);
            }
            Taken::Onset { since, contradicts_run, change } => {
                self.tell_decay(change, self.linear_q16(), sample.tick, notices);
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

    /// A segment that has filled a window is bridged to the one before it.
    #[inline(never)]
    fn integrate(&mut self, sample: &Sample, ticks: u32, notices: &mut Notices) {
        self.extend(sample, ticks);
        self.check_range(sample.tick, notices);
        let waits = self.run.as_ref().is_some_and(|run| run.crossing.is_some());
        if waits && self.window.is_full(self.setup.derived()) {
            self.settle_for_good(sample.tick, notices);
        }
    }

    #[inline(never)]
    fn hold(&mut self, sample: &Sample, ticks: u32, at_rail: bool) {
        let derived = self.setup.derived();
        let level_q16 = self.level.take(sample, ticks, derived);
        if at_rail {
            self.droop.forget_level();
        } else {
            self.droop.take(level_q16, ticks, self.level.terms(), derived);
        }
        self.interrupted(ticks, |crossing, ticks| {
            crossing.held = crossing.held.saturating_add(ticks);
            crossing.held_last = true;
            crossing.input_open = true;
        });
    }

    #[inline(never)]
    fn reset(&mut self, sample: &Sample, ticks: u32, notices: &mut Notices) {
        self.level.take(sample, ticks, self.setup.derived());
        self.interrupted(ticks, |crossing, ticks| {
            let booked = if crossing.input_open { &mut crossing.held } else { &mut crossing.dead };
            *booked = booked.saturating_add(ticks);
            crossing.held_last = false;
        });
        self.verify_closed(sample.tick, ticks, notices);
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
