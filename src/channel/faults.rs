//! What goes wrong, whom it concerns, and what the channel asks for.

use super::Channel;
use crate::decide;
use crate::ledger::is_past_books;
use crate::notice::{Event, Reason};
use crate::notices::Notices;
use crate::quantity::Integral;
use crate::run::{Run, Stage};
use crate::sample::{Mode, Sample};

impl<Q: Integral> Channel<'_, Q> {
    /// Whether the level moved since the sample before by more than the input can move it. Within a zero the spread of
    /// the samples tells more; through a reset or hold nothing is expected.
    pub(super) fn has_jumped(&self, sample: &Sample, ticks: u32) -> bool {
        let watched = matches!(
            (self.mode, sample.mode),
            (Some(Mode::Zero | Mode::Integrate), Mode::Integrate) | (Some(Mode::Integrate), Mode::Zero)
        );
        watched && self.health.jumped(sample.counts, ticks, self.setup.derived())
    }

    /// A long silence: a run may have missed anything; a zero finds its level again, and is none the worse.
    #[inline(never)]
    pub(super) fn gap(&mut self, was_running: bool, tick: u32, notices: &mut Notices) {
        if was_running || self.is_running() {
            self.mark_run(Reason::Gap, tick, notices);
        } else {
            self.lose_level();
        }
    }

    /// Whether the latest level of a segment is more than the books of its run can take.
    pub(super) fn check_range(&mut self, tick: u32, notices: &mut Notices) {
        if self.window.latest().is_some_and(|(_, level_q16)| is_past_books(level_q16)) {
            self.fault(Reason::OutOfRange, tick, notices);
        }
    }

    /// The counter does not move: how much time passes is not known, so a zero will have to find its level again.
    #[inline(never)]
    pub(super) fn stall(&mut self, tick: u32, notices: &mut Notices) {
        self.fault(Reason::ClockStalled, tick, notices);
        if !self.is_running() {
            self.lose_level();
        }
    }

    /// The counter began anew: nobody knows how much time passed.
    #[inline(never)]
    pub(super) fn lose_time(&mut self, tick: u32, notices: &mut Notices) {
        if let Some(run) = self.run.as_mut() {
            run.see(self.window.latest());
        }
        self.window.clear();
        self.gap(false, tick, notices);
    }

    fn lose_level(&mut self) {
        self.zeroing.forget_level();
        if let Some(Run { stage: Stage::Stopped { stop, .. }, .. }) = self.run.as_mut() {
            stop.unbroken = false;
        }
    }

    /// Marks the run that goes on, or that the very sample at `tick` has stopped.
    fn mark_run(&mut self, reason: Reason, tick: u32, notices: &mut Notices) {
        if self.run.as_mut().is_some_and(|run| run.reasons.insert(reason)) {
            notices.push(tick, Event::Fault(reason));
        }
    }

    /// Books a fault with the run that it concerns and states it if it is new. What happens in a zero concerns the run
    /// after it, and the run before it unless that was closed already without the samples in question.
    #[inline(never)]
    pub(super) fn fault(&mut self, reason: Reason, tick: u32, notices: &mut Notices) {
        let running = self.is_running();
        let left_out = reason == Reason::AtRail && self.zeroing.bracket.is_some();
        let in_zero = self.mode == Some(Mode::Zero) && !left_out;
        let mut new = false;
        if let Some(run) = self.run.as_mut().filter(|_| running || in_zero) {
            new |= run.reasons.insert(reason);
        }
        if !running {
            new |= self.zero_reasons.insert(reason);
        }
        if new {
            notices.push(tick, Event::Fault(reason));
        }
    }

    #[inline(never)]
    pub(super) fn advise(&mut self, sample: &Sample, ticks: u32, notices: &mut Notices) -> Option<Mode> {
        if sample.mode == Mode::Reset || self.verification.is_latched() {
            return None;
        }
        let derived = self.setup.derived();
        let due = decide::reset::due(sample.counts, derived.worst_movement(ticks), derived);
        if !due && !self.verification.wants_retry() {
            return None;
        }
        if due && !self.reset_advised {
            self.reset_advised = true;
            notices.push(sample.tick, Event::ResetDue);
        }
        Some(Mode::Reset)
    }
}
