//! The conductor: samples in, steps out, a reading when asked for. It knows no pin and no clock.

use crate::clock::{Clock, Elapsed};
use crate::decide;
use crate::estimate::{Bracket, Trend, Walk};
use crate::health::Health;
use crate::ledger::Bridged;
use crate::math;
use crate::notice::{Event, Notices, Reason, Reasons};
use crate::quantity::{Integral, Measured, Temperature, VoltageRate};
use crate::reading::Reading;
use crate::run::{Crossing, Run, Stage};
use crate::sample::{Mode, Sample, Step};
use crate::setup::{Derived, Setup};
use crate::window::Window;

/// One integrator channel: the state beside a [`Setup`].
///
/// Feed every sample in the order it was taken, with the mode that the switches were in since the sample before; in
/// each mode at least one, in `Integrate` a few. [`reading`](Self::reading) may be asked for at any time; a run's
/// reading is final when the zero after it ends, so take it before the first sample of the next run.
///
/// Between two samples at most 2^31 - 1 ticks may pass. Totals saturate after 2^47 counts of movement.
#[derive(Clone, Debug)]
pub struct Channel<'s, Q> {
    setup: &'s Setup<Q>,
    clock: Clock,
    mode: Option<Mode>,
    /// In `Zero` the level and its drift; in a run the baseline and the drift.
    trend: Trend,
    /// Ticks that the baseline has still to be advanced by.
    pending: u64,
    /// Ticks in which only the rate wandered.
    resting: u64,
    level_known: bool,
    window: Window,
    run: Option<Run>,
    health: Health,
    /// Faults since the zero began, inherited by the run that it opens.
    zero_reasons: Reasons,
    /// Board temperature at the latest zero sample.
    zero_temperature: Option<Temperature>,
    reset_ticks: u64,
    reset_failed: bool,
    reset_advised: bool,
}

impl<'s, Q: Integral> Channel<'s, Q> {
    /// A channel that has seen nothing: the drift is what the data sheet allows.
    pub fn new(setup: &'s Setup<Q>) -> Self {
        let derived = setup.derived();
        Self {
            setup,
            clock: Clock::default(),
            mode: None,
            trend: Trend::new(0, derived.readout_var, 0.0, derived.rate_prior_var),
            pending: 0,
            resting: 0,
            level_known: false,
            window: Window::default(),
            run: None,
            health: Health::default(),
            zero_reasons: Reasons::default(),
            zero_temperature: None,
            reset_ticks: 0,
            reset_failed: false,
            reset_advised: false,
        }
    }

    /// Takes one sample. Bounded work; in `Integrate` integers only, except for the lines beside a reset.
    ///
    /// A sample whose tick does not move forward is not used and makes the reading invalid.
    pub fn feed(&mut self, sample: Sample) -> Step {
        let mut notices = Notices::default();
        let switched_tick = self.clock.tick();
        let (ticks, switched_tick) = match self.clock.advance(sample.tick) {
            Elapsed::Start => (0, sample.tick),
            Elapsed::Ticks(ticks) => (ticks, switched_tick),
            Elapsed::Stalled => {
                self.fault(Reason::ClockStalled, sample.tick, &mut notices);
                return Step { request: None, notices };
            }
        };
        let was_running = self.is_running();
        let continued = self.mode == Some(sample.mode);
        if !continued {
            self.switch(sample.mode, switched_tick, &mut notices);
        }
        if ticks > self.setup.derived().gap_limit_ticks {
            self.gap(was_running, sample.tick, &mut notices);
        }
        match sample.mode {
            Mode::Zero => self.zero(sample, ticks, &mut notices),
            Mode::Integrate => self.integrate(sample, ticks, continued, &mut notices),
            Mode::Hold => self.hold(ticks),
            Mode::Reset => self.reset(sample, ticks, &mut notices),
        }
        if sample.mode != Mode::Reset {
            self.watch(sample, &mut notices);
        }
        let request = self.advise(sample, ticks, &mut notices);
        Step { request, notices }
    }

    /// The reading of the latest run; `None` before the first.
    ///
    /// While the run goes on, its value as if it stopped at the latest sample.
    pub fn reading(&self) -> Option<Reading<Q>> {
        let derived = self.setup.derived();
        let mut run = self.run?;
        let (at_stop, closed) = match run.stage {
            Stage::Stopped { at_stop, bracket, .. } => {
                if bracket.is_some() && self.drift_outside_limits() {
                    run.reasons.insert(Reason::DriftOutsideLimits);
                }
                (at_stop, bracket.map(|b| run.closed_total(&b, &self.trend, derived)))
            }
            Stage::Integrating | Stage::Interrupted => {
                let mut baseline = self.trend;
                self.settle(&mut run, &mut baseline);
                baseline.advance(math::seconds(self.pending, derived.tick_s), walk(derived, self.pending));
                run.drift_q16 = run.drifted_q16(&baseline);
                (run.total(&baseline, derived), None)
            }
        };
        Some(Reading::new(self.setup, &run, &at_stop, closed.as_ref()))
    }

    /// The drift of the output and its standard uncertainty, as of the latest zero.
    pub fn drift(&self) -> Measured<VoltageRate> {
        let lsb_v = self.setup.converter().lsb_v;
        let u = math::sqrt(self.trend.rate_variance());
        Measured::new(
            VoltageRate::from_volts_per_second(f64::from(self.trend.rate()) * lsb_v),
            VoltageRate::from_volts_per_second(f64::from(u) * lsb_v),
        )
    }

    /// The mode of the latest sample; `None` before the first.
    pub fn mode(&self) -> Option<Mode> {
        self.mode
    }

    fn is_running(&self) -> bool {
        self.run.as_ref().is_some_and(Run::is_running)
    }

    fn drift_outside_limits(&self) -> bool {
        Health::drift_outside_limits(self.trend.rate(), self.trend.rate_variance(), self.setup.derived())
    }

    /// The switches moved at `tick`, the instant of the sample before.
    fn switch(&mut self, to: Mode, tick: u32, notices: &mut Notices) {
        match self.mode {
            Some(Mode::Integrate) => self.leave_integrate(to, tick, notices),
            Some(Mode::Zero) if self.drift_outside_limits() => {
                self.fault(Reason::DriftOutsideLimits, tick, notices);
            }
            _ => {}
        }
        self.reset_advised = false;
        match to {
            Mode::Zero => self.enter_zero(notices),
            Mode::Integrate => self.enter_integrate(tick, notices),
            Mode::Reset => {
                self.reset_ticks = 0;
                self.reset_failed = false;
                if let Some(run) = self.run.as_mut().filter(|run| run.is_running()) {
                    run.resets = run.resets.saturating_add(1);
                    notices.push(tick, Event::ResetClosed);
                }
            }
            Mode::Hold => {}
        }
        self.mode = Some(to);
    }

    /// Brings the baseline up to `tick`; if the run may go on, draws the line before the interruption.
    fn leave_integrate(&mut self, to: Mode, tick: u32, notices: &mut Notices) {
        let derived = self.setup.derived();
        let Some(mut run) = self.run else { return };
        let mut baseline = self.trend;
        self.settle_with_faults(&mut run, &mut baseline, tick, notices);
        baseline.advance(math::seconds(self.pending, derived.tick_s), walk(derived, self.pending));
        self.pending = 0;
        if to != Mode::Zero {
            let before = self.window.before(tick, run.opening.as_ref(), derived);
            run.crossing = Some(Crossing { before, dead: 0, held: 0 });
            run.stage = Stage::Interrupted;
        }
        self.trend = baseline;
        self.run = Some(run);
    }

    /// Stops a running run. The level is to be found anew whenever another mode came between.
    fn enter_zero(&mut self, notices: &mut Notices) {
        self.level_known = false;
        let trend = self.trend;
        self.zero_temperature = None;
        let Some(run) = self.run.as_mut() else { return };
        match &mut run.stage {
            Stage::Stopped { bracket, .. } => {
                if let Some(bracket) = bracket {
                    bracket.release_level();
                }
            }
            Stage::Integrating | Stage::Interrupted => {
                run.drift_q16 = run.drifted_q16(&trend);
                let at_stop = run.total(&trend, self.setup.derived());
                let unbroken = matches!(run.stage, Stage::Integrating);
                run.stage = Stage::Stopped { at_stop, bracket: None, unbroken };
                if let Some(crossing) = run.crossing {
                    self.resting = self.resting.saturating_add(crossing.dead).saturating_add(crossing.held);
                }
                self.zero_reasons = Reasons::default();
                notices.push(run.end_tick, Event::RunStopped);
            }
        }
    }

    /// Goes on with an interrupted run, or starts one.
    fn enter_integrate(&mut self, tick: u32, notices: &mut Notices) {
        let derived = self.setup.derived();
        self.window.clear();
        if let Some(run) = self.run.as_mut().filter(|run| run.is_running()) {
            let (dead, held) = run.crossing.map_or((0, 0), |c| (c.dead, c.held));
            self.trend.advance(math::seconds(dead, derived.tick_s), walk(derived, dead));
            self.trend.rest(derived.rate_walk * math::seconds(held, derived.tick_s));
            run.driven = run.driven.saturating_add(dead);
            run.held = run.held.saturating_add(held);
            run.stage = Stage::Integrating;
            run.opening = None;
            run.opened_tick = tick;
            if dead > 0 {
                notices.push(tick, Event::ResetOpened);
            }
        } else {
            let mut run = Run::new(tick, &self.trend, self.zero_reasons);
            if self.mode != Some(Mode::Zero) || !self.level_known {
                self.rest();
                run.crossing = Some(Crossing::default());
            }
            self.run = Some(run);
            notices.push(tick, Event::RunStarted);
        }
    }

    fn zero(&mut self, sample: Sample, ticks: u32, notices: &mut Notices) {
        let derived = self.setup.derived();
        self.zero_temperature = sample.temperature.or(self.zero_temperature);
        let elapsed = u64::from(ticks);
        let dt_s = math::seconds(elapsed, derived.tick_s);
        if self.level_known {
            self.trend.advance(dt_s, walk(derived, elapsed));
        } else {
            self.resting = self.resting.saturating_add(elapsed);
        }
        let bracket = match self.run.as_mut().map(|run| &mut run.stage) {
            Some(Stage::Stopped { bracket: Some(bracket), .. }) if self.level_known => {
                bracket.advance(dt_s);
                Some(bracket)
            }
            _ => None,
        };
        if Health::at_rail(sample.counts, derived) {
            self.fault(Reason::AtRail, sample.tick, notices);
        } else if self.level_known {
            let innovation = self.trend.update(sample.counts, derived.readout_var);
            if let Some(bracket) = bracket {
                bracket.update(&innovation);
            }
        } else {
            self.find_level(sample.counts);
        }
    }

    /// The first usable sample of a zero: the level starts from it, and a run that has just stopped is bracketed.
    fn find_level(&mut self, counts: i32) {
        let derived = self.setup.derived();
        if let Some(run) = self.run.as_mut() {
            let (last_counts, last_var) = (run.last_counts, run.last_sample_var(derived));
            if let Stage::Stopped { bracket: bracket @ None, unbroken, .. } = &mut run.stage {
                *bracket = Some(if *unbroken {
                    // Level and baseline drift together from the stop on.
                    self.trend.advance(math::seconds(self.resting, derived.tick_s), walk(derived, self.resting));
                    self.resting = 0;
                    Bracket::on_level(counts, derived.readout_var, &self.trend)
                } else {
                    Bracket::on_rate(last_counts, last_var, &self.trend)
                });
            }
        }
        self.rest();
        self.trend.restart(counts, 0.0, derived.readout_var);
        self.level_known = true;
    }

    fn integrate(&mut self, sample: Sample, ticks: u32, continued: bool, notices: &mut Notices) {
        let derived = self.setup.derived();
        self.pending = self.pending.saturating_add(u64::from(ticks));
        let filled = self.window.push(sample.tick, sample.counts, derived);
        let Some(run) = self.run.as_mut() else { return };
        let jumped = continued && Health::jumped(run.last_counts, sample.counts, ticks, derived);
        run.driven = run.driven.saturating_add(u64::from(ticks));
        run.end_tick = sample.tick;
        run.last_counts = sample.counts;
        if let (Some(now), Some(then)) = (sample.temperature, self.zero_temperature) {
            run.warming = Some(now.since(then));
        }
        if jumped {
            self.fault(Reason::Jump, sample.tick, notices);
        }
        if Health::at_rail(sample.counts, derived) {
            self.fault(Reason::AtRail, sample.tick, notices);
        }
        if filled {
            let (Some(mut run), mut baseline) = (self.run, self.trend) else { return };
            self.settle_with_faults(&mut run, &mut baseline, sample.tick, notices);
            self.trend = baseline;
            self.run = Some(run);
        }
    }

    fn hold(&mut self, ticks: u32) {
        self.interrupted(ticks, |crossing, ticks| crossing.held = crossing.held.saturating_add(ticks));
    }

    fn reset(&mut self, sample: Sample, ticks: u32, notices: &mut Notices) {
        let derived = self.setup.derived();
        self.interrupted(ticks, |crossing, ticks| crossing.dead = crossing.dead.saturating_add(ticks));
        self.reset_ticks = self.reset_ticks.saturating_add(u64::from(ticks));
        let settled = self.reset_ticks > u64::from(derived.settling_ticks);
        if settled && !self.reset_failed && Health::outside(i64::from(sample.counts), derived.reset_window) {
            self.reset_failed = true;
            self.fault(Reason::ResetNotArrived, sample.tick, notices);
        }
    }

    /// Books time in an interruption; outside a run only the rate wanders.
    fn interrupted(&mut self, ticks: u32, book: impl FnOnce(&mut Crossing, u64)) {
        let ticks = u64::from(ticks);
        match self.run.as_mut().filter(|run| run.is_running()).and_then(|run| run.crossing.as_mut()) {
            Some(crossing) => book(crossing, ticks),
            None => self.resting = self.resting.saturating_add(ticks),
        }
    }

    /// Lets the rate wander for the time in which it could not be seen.
    fn rest(&mut self) {
        let derived = self.setup.derived();
        self.trend.rest(derived.rate_walk * math::seconds(self.resting, derived.tick_s));
        self.resting = 0;
    }

    /// Closes an open crossing of `run` with the samples at hand; `None` if there is none, or no sample yet.
    fn settle(&self, run: &mut Run, baseline: &mut Trend) -> Option<(Bridged, bool)> {
        let derived = self.setup.derived();
        let crossing = run.crossing.filter(|_| matches!(run.stage, Stage::Integrating))?;
        let after = self.window.after(run.opened_tick, derived)?;
        let opened_at = i64::from(after.anchor).saturating_add(math::nearest(after.level(baseline.rate())));
        let arrived = crossing.dead == 0 || !Health::outside(opened_at, derived.opened_window);
        let bridged = run.settle(after, baseline, derived);
        if bridged == Bridged::Guessed {
            run.reasons.insert(Reason::DeadTime);
        }
        Some((bridged, arrived))
    }

    /// The same, for good: with notices of what is wrong with it.
    fn settle_with_faults(&mut self, run: &mut Run, baseline: &mut Trend, tick: u32, notices: &mut Notices) {
        let known = run.reasons;
        let Some((bridged, arrived)) = self.settle(run, baseline) else { return };
        if bridged == Bridged::Guessed && !known.contains(Reason::DeadTime) {
            notices.push(tick, Event::Fault(Reason::DeadTime));
        }
        if !arrived && run.reasons.insert(Reason::ResetNotArrived) {
            notices.push(tick, Event::Fault(Reason::ResetNotArrived));
        }
    }

    /// A long silence: a run may have missed anything; a zero finds its level again, and is none the worse.
    fn gap(&mut self, was_running: bool, tick: u32, notices: &mut Notices) {
        let running = was_running || self.is_running();
        let Some(run) = self.run.as_mut() else {
            self.level_known = false;
            return;
        };
        if running {
            // The run may have been stopped by the very sample that ended the gap.
            if run.reasons.insert(Reason::Gap) {
                notices.push(tick, Event::Fault(Reason::Gap));
            }
        } else {
            self.level_known = false;
            if let Stage::Stopped { bracket: Some(bracket), .. } = &mut run.stage {
                bracket.release_level();
            }
        }
    }

    /// Books a fault with the run that it concerns and states it if it is new. What happens in a zero concerns the run
    /// before it and the run after it.
    fn fault(&mut self, reason: Reason, tick: u32, notices: &mut Notices) {
        let running = self.is_running();
        let mut new = false;
        if let Some(run) = self.run.as_mut().filter(|_| running || self.mode == Some(Mode::Zero)) {
            new |= run.reasons.insert(reason);
        }
        if !running {
            new |= self.zero_reasons.insert(reason);
        }
        if new {
            notices.push(tick, Event::Fault(reason));
        }
    }

    /// Readings that stand still. At an end code they rightly do, and that is a fault of its own.
    fn watch(&mut self, sample: Sample, notices: &mut Notices) {
        let derived = self.setup.derived();
        if self.health.frozen(sample.counts, derived) && !Health::at_rail(sample.counts, derived) {
            self.fault(Reason::Frozen, sample.tick, notices);
        }
    }

    fn advise(&mut self, sample: Sample, ticks: u32, notices: &mut Notices) -> Option<Mode> {
        if sample.mode == Mode::Reset || !decide::reset::due(sample.counts, ticks, self.setup.derived()) {
            return None;
        }
        if !self.reset_advised {
            self.reset_advised = true;
            notices.push(sample.tick, Event::ResetDue);
        }
        Some(Mode::Reset)
    }
}

/// How far level and rate may walk in `ticks`.
fn walk(derived: &Derived, ticks: u64) -> Walk {
    Walk::over(math::seconds(ticks, derived.tick_s), derived.level_walk, derived.rate_walk)
}
