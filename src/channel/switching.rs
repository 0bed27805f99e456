//! What a change of mode does to the run and to the zero.

use super::{Channel, stop};
use crate::clock::Span;
use crate::estimate::Trend;
use crate::health::Health;
use crate::ledger::Bridged;
use crate::math;
use crate::notice::{Event, Reason, Reasons};
use crate::notices::Notices;
use crate::quantity::Integral;
use crate::run::{Crossing, Run, Stage};
use crate::sample::Mode;
use crate::setup::Derived;
use crate::verify::Settled;
use crate::window::Window;
use crate::zeroing::{advance, squares};

impl<Q: Integral> Channel<'_, Q> {
    /// The switches moved at `tick`, the instant of the sample before.
    pub(super) fn switch(&mut self, to: Mode, tick: u32, notices: &mut Notices) {
        // The first in a mode counts, whether or not it has changed.
        self.temperature = None;
        let mut settled = None;
        match self.mode {
            Some(Mode::Integrate) => self.leave_integrate(to, tick, notices),
            Some(Mode::Zero) => self.leave_zero(tick, notices),
            Some(Mode::Reset) => settled = self.verification.open(self.level.terms(), self.setup.derived()),
            Some(Mode::Hold) if self.droop_outside_limits() => {
                self.fault(Reason::DroopOutsideLimits, tick, notices);
            }
            _ => {}
        }
        match to {
            Mode::Zero => self.enter_zero(notices),
            Mode::Integrate => self.enter_integrate(tick, settled, notices),
            Mode::Reset => self.enter_reset(tick, notices),
            Mode::Hold => self.droop.enter(self.setup.derived()),
        }
        self.mode = Some(to);
    }

    /// The zero has told what it could.
    #[inline(never)]
    fn leave_zero(&mut self, tick: u32, notices: &mut Notices) {
        let derived = self.setup.derived();
        let change = self.zeroing.leave(tick, self.level.terms(), stop(&self.run), derived);
        let level_q16 = self.linear_q16();
        self.tell_decay(change, level_q16, tick, notices);
        self.zero_level_q16 = Some(level_q16);
        if let Some((stated_centicounts, observed_centicounts)) = self.zeroing.readout_centicounts(derived) {
            notices.push(tick, Event::ReadoutNoise { stated_centicounts, observed_centicounts });
        }
        if let Some(percent) = self.zeroing.noise_percent() {
            notices.push(tick, Event::NoiseFigures { percent });
        }
        if let Some(percent) = self.zeroing.drift_percent() {
            notices.push(tick, Event::DriftWander { percent });
        }
        if self.drift_outside_limits() {
            self.fault(Reason::DriftOutsideLimits, tick, notices);
        }
    }

    /// Brings the baseline up to `tick`; if the run may go on, draws the line before the interruption.
    #[inline(never)]
    fn leave_integrate(&mut self, to: Mode, tick: u32, notices: &mut Notices) {
        let derived = self.setup.derived();
        self.settle_for_good(tick, notices);
        self.check_range(tick, notices);
        if let Some(run) = self.run.as_mut() {
            run.book(&self.window, self.zeroing.pending, self.level.terms().sum_q16(), derived);
        }
        self.zeroing.catch_up(self.level.terms(), derived);
        if let Some(run) = self.run.as_mut().filter(|_| to != Mode::Zero) {
            let sample_var = self.zeroing.sample_var();
            let before = self.window.before(tick, run.opening.as_ref(), sample_var, derived);
            run.crossing = Some(Crossing { before, ..Crossing::default() });
            run.stage = Stage::Interrupted;
        }
    }

    /// Stops a running run. The level is to be found anew whenever another mode came between.
    #[inline(never)]
    fn enter_zero(&mut self, notices: &mut Notices) {
        let derived = self.setup.derived();
        let shown = self.zeroing.shown(derived);
        self.zero_temperature = None;
        self.zero_reasons = Reasons::default();
        match self.run.as_mut() {
            Some(run) if run.is_running() => {
                // The drift has stepped by flicker once on the way into the run, and does so again on the way out of
                // it.
                let flicker = run.flicker(derived);
                self.zeroing.warm_for_good(run.driven.ticks, derived);
                self.zeroing.trend.advance(0.0, flicker);
                run.drift_q16 = run.drifted_q16(&self.zeroing.trend);
                self.zeroing.considered.close_run();
                let considered = self.zeroing.considered.run();
                let total = |shown| run.total(&self.zeroing.trend, squares(considered), shown, derived);
                let at_stop = total(&shown);
                let plain_var = total(&shown.not_widened()).variance();
                let stop = run.stop(matches!(run.stage, Stage::Integrating));
                run.stage = Stage::Stopped { at_stop, plain_var, considered, stop };
                if let Some(crossing) = run.crossing.take() {
                    self.zeroing.resting =
                        self.zeroing.resting.saturating_add(crossing.dead).saturating_add(crossing.held);
                }
                self.zeroing.bracket = None;
                self.zeroing.rate_step = flicker.rate;
                notices.push(run.end_tick, Event::RunStopped);
            }
            // The level did not go on into this zero.
            Some(Run { stage: Stage::Stopped { stop, .. }, .. }) => stop.unbroken = false,
            _ => {}
        }
        self.zeroing.enter(derived);
    }

    /// Goes on with an interrupted run, or starts one.
    #[inline(never)]
    fn enter_integrate(&mut self, tick: u32, settled: Option<Settled>, notices: &mut Notices) {
        let derived = self.setup.derived();
        self.window.clear();
        let Some(run) = self.run.as_mut().filter(|run| run.is_running()) else {
            let moved = self.level.rebase();
            self.zeroing.trend.move_origin(moved);
            self.zeroing.considered.skip(self.level.terms());
            let mut run = Run::new(tick, &self.zeroing.trend, self.zero_reasons);
            run.opened_terms_q16 = self.level.terms().sum_q16();
            run.settled = settled;
            if self.mode != Some(Mode::Zero) || !self.zeroing.level_known() {
                self.zeroing.forget_level();
                self.zeroing.rest(derived);
                self.zeroing.considered.skip(self.level.terms());
                run.crossing = Some(Crossing::default());
            }
            run.zeroed = self.zeroing.known_ticks();
            self.zeroing.begin_run();
            self.run = Some(run);
            notices.push(tick, Event::RunStarted);
            if self.verification.is_latched() {
                self.fault(Reason::SwitchFailed, tick, notices);
            }
            return;
        };
        let crossing = run.crossing.unwrap_or_default();
        advance(&mut self.zeroing.trend, None, Span { ticks: crossing.dead, squares: 0 }, derived);
        self.zeroing.considered.advance(crossing.dead, derived);
        self.zeroing.considered.skip(self.level.terms());
        self.zeroing.trend.rest(derived.rate_walk * math::seconds(crossing.held, derived.tick_s));
        run.driven.add_blind(crossing.dead);
        self.zeroing.drive(crossing.dead);
        run.held = run.held.saturating_add(crossing.held);
        run.bridges = run.bridges.saturating_add(1);
        run.stage = Stage::Integrating;
        run.opening = None;
        run.opened_tick = tick;
        run.settled = settled;
        run.opened_terms_q16 = self.level.terms().sum_q16();
        if crossing.reset {
            run.resets = run.resets.saturating_add(1);
            notices.push(tick, Event::ResetOpened);
        }
        if crossing.dead > u64::from(derived.gap_limit_ticks) && run.reasons.insert(Reason::DeadTime) {
            notices.push(tick, Event::Fault(Reason::DeadTime));
        }
    }

    #[inline(never)]
    fn enter_reset(&mut self, tick: u32, notices: &mut Notices) {
        self.verification.close(self.linear_q16());
        self.reset_advised = false;
        if let Some(run) = self.run.as_mut().filter(|run| run.is_running()) {
            if let Some(crossing) = run.crossing.as_mut() {
                crossing.reset = true;
            }
            notices.push(tick, Event::ResetClosed);
        }
    }

    /// The latest level as a straight converter would have seen it, 2^-16 counts; 0 before the first sample.
    pub(super) fn linear_q16(&self) -> i64 {
        self.health.last().map_or(0, |counts| self.setup.derived().linear_q16(counts))
    }

    /// Closes the open crossing, if the level after it has been seen, with notices of what is wrong with it.
    #[inline(never)]
    pub(super) fn settle_for_good(&mut self, tick: u32, notices: &mut Notices) {
        let derived = self.setup.derived();
        let sample_var = self.zeroing.sample_var();
        let Some(run) = self.run.as_mut() else { return };
        let known = run.reasons;
        let Some(arrived) = settle(run, &mut self.zeroing.trend, &self.window, sample_var, derived) else { return };
        for reason in [Reason::DeadTime, Reason::OutOfRange] {
            if run.reasons.contains(reason) && !known.contains(reason) {
                notices.push(tick, Event::Fault(reason));
            }
        }
        if !arrived {
            self.reset_failed(Reason::ResetNotArrived, tick, notices);
        }
    }
}

/// Closes an open crossing of `run` with the samples of the segment after it, each of variance `sample_var`. Gives
/// whether a reset had arrived; `None` if there is no crossing, or no sample yet.
pub(super) fn settle(
    run: &mut Run,
    baseline: &mut Trend,
    window: &Window,
    sample_var: f32,
    derived: &Derived,
) -> Option<bool> {
    let crossing = run.crossing.as_ref().filter(|_| matches!(run.stage, Stage::Integrating))?;
    let judged = crossing.reset && !crossing.held_last;
    let half_s = math::scaled(math::seconds(crossing.dead, derived.tick_s), -1);
    let after = window.after(run.opened_tick, run.opened(derived).as_ref(), half_s, sample_var, derived)?;
    let opened_q16 = after.edge.anchor_q16.saturating_sub(run.opened_terms_q16);
    let opened_at = (opened_q16 >> 16).saturating_add(math::nearest(after.edge.level_at_instant(baseline.rate())));
    let arrived = !judged || !Health::outside(opened_at, derived.opened_window);
    run.see(window.latest());
    if run.settle(&after, baseline, derived) == Bridged::Guessed {
        run.reasons.insert(Reason::DeadTime);
    }
    if run.ledger.is_full() {
        run.reasons.insert(Reason::OutOfRange);
    }
    Some(arrived)
}
