//! Books kept beside a channel, from its documentation and in nothing but whole ticks: which run there is, how long it
//! lasted, what must have been found wrong with it, and what may be asked for.

mod counter;
mod heard;
mod limits;
mod reasons;
mod run;

use brimline::{Channel, Mode, Reading, Reason, Sample, Setup, Step};

use crate::board::Plain;
use crate::sound::figures;

use counter::{Counter, Time};
use heard::{Heard, Scene};
use limits::Limits;
use reasons::{Set, only};
use run::Run;

pub struct Shadow {
    limits: Limits,
    counter: Counter,
    mode: Option<Mode>,
    run: Option<Run>,
    /// What the next run inherits.
    zero_must: Set,
    heard: Heard,
    /// The latest code, and how often in a row it came.
    last: Option<i32>,
    repeats: u32,
    closed_ticks: u64,
}

impl Shadow {
    pub fn new<Q: Plain>(setup: &Setup<Q>) -> Self {
        Self {
            limits: Limits::new(setup),
            counter: Counter::default(),
            mode: None,
            run: None,
            zero_must: 0,
            heard: Heard::default(),
            last: None,
            repeats: 0,
            closed_ticks: 0,
        }
    }

    /// The switch was seen to.
    pub fn repaired(&mut self) {
        self.heard.repaired();
        self.closed_ticks = 0;
    }

    fn running(&mut self) -> Option<&mut Run> {
        self.run.as_mut().filter(|run| run.running)
    }

    /// A fault must be found: by the run, and outside a run by the one to come. What a zero leaves out need not concern
    /// the run before it.
    fn must(&mut self, reason: Reason) {
        let in_zero = self.mode == Some(Mode::Zero) && reason != Reason::AtRail;
        let running = self.running().is_some();
        if let Some(run) = self.run.as_mut().filter(|run| run.running || in_zero) {
            run.must |= only(reason);
        }
        if !running {
            self.zero_must |= only(reason);
        }
    }

    /// A sample was fed, and `channel` said `step`. Gives whether time simply went on.
    pub fn take<Q: Plain>(&mut self, sample: Sample, step: &Step, channel: &Channel<'_, Q>) -> bool {
        let before = self.counter.last;
        let time = self.counter.take(sample.tick);
        let (ticks, switched) = match time {
            Time::Ticks(ticks) => (ticks, before.unwrap_or(sample.tick)),
            _ => (0, sample.tick),
        };
        let used = time != Time::Stalled;
        let boundary = used && self.mode != Some(sample.mode);
        if used {
            if time == Time::Restarted
                && let Some(run) = self.running()
            {
                run.must |= only(Reason::Gap);
            }
            let (was, was_running) = (self.mode, self.running().is_some());
            self.pass(sample, ticks, switched);
            self.judge(sample, ticks, was, was_running);
        } else {
            self.must(Reason::ClockStalled);
        }
        assert_eq!(channel.mode(), self.mode);
        let scene = Scene {
            boundary,
            mode: sample.mode,
            tick: sample.tick,
            run: self.run.as_ref(),
            advises: self.limits.advises,
            due: self.limits.is_due(sample.counts),
        };
        self.heard.hear(step, &scene);
        self.heard.judge_request(step.request, channel.switch_has_failed(), &scene);
        if channel.switch_has_failed() && used && self.running().is_some() {
            self.must(Reason::SwitchFailed);
        }
        matches!(time, Time::Ticks(_))
    }

    /// Books the time and the change of mode.
    fn pass(&mut self, sample: Sample, ticks: u32, switched: u32) {
        let ticks = u64::from(ticks);
        if self.mode.replace(sample.mode) != Some(sample.mode) {
            self.switch(sample.mode, switched);
        }
        if let Some(run) = self.running() {
            run.pass(sample.mode, ticks, sample.tick);
        }
        self.closed_ticks = if sample.mode == Mode::Reset { self.closed_ticks + ticks } else { 0 };
        self.repeats = if self.last == Some(sample.counts) { self.repeats + 1 } else { 1 };
    }

    fn switch(&mut self, to: Mode, tick: u32) {
        let longest = self.limits.reset_ticks;
        match (to, self.running()) {
            (Mode::Zero, run) => {
                if let Some(run) = run {
                    run.running = false;
                }
                self.zero_must = 0;
            }
            (Mode::Integrate, Some(run)) => {
                if run.resume() as f64 > longest {
                    run.must |= only(Reason::DeadTime);
                }
            }
            (Mode::Integrate, None) => self.run = Some(Run::start(tick, self.zero_must)),
            (Mode::Reset, run) => {
                if let Some(run) = run {
                    run.close();
                }
                self.closed_ticks = 0;
                self.heard.reset_closed();
            }
            (Mode::Hold, _) => {}
        }
    }

    /// What this sample alone shows to be wrong.
    fn judge(&mut self, sample: Sample, ticks: u32, was: Option<Mode>, was_running: bool) {
        let limits = &self.limits;
        let at_rail = limits.at_rail(sample.counts);
        let frozen = limits.frozen > 0 && self.repeats >= limits.frozen && sample.mode != Mode::Reset;
        let gap = f64::from(ticks) > limits.step_ticks;
        let reach = limits.counts_per_tick * f64::from(ticks) * 1.000_001 + limits.step;
        let moved = self.last.map_or(0.0, |last| f64::from(sample.counts) - f64::from(last));
        let watched = matches!(
            (was, sample.mode),
            (Some(Mode::Zero | Mode::Integrate), Mode::Integrate) | (Some(Mode::Integrate), Mode::Zero)
        );
        let settled = sample.mode == Mode::Reset && self.closed_ticks as f64 > limits.settled;
        let code = f64::from(sample.counts);
        let elsewhere = limits.elsewhere(sample.counts);
        // At a rail readings rightly stand still.
        let inside = (limits.usable.0 + 1.0..=limits.usable.1 - 1.0).contains(&code);
        let inside = inside && sample.counts > limits.codes.0 && sample.counts < limits.codes.1;
        self.last = Some(sample.counts);
        if at_rail && matches!(sample.mode, Mode::Integrate | Mode::Zero) {
            self.must(Reason::AtRail);
        }
        if frozen && inside {
            self.must(Reason::Frozen);
        }
        if watched && moved.abs() > reach {
            self.must(Reason::Jump);
        }
        if settled && elsewhere {
            self.must(Reason::ResetNotArrived);
        }
        // A gap concerns the run that it was in, or that the sample after it has stopped or started.
        if gap
            && (was_running || self.running().is_some())
            && let Some(run) = self.run.as_mut()
        {
            run.must |= only(Reason::Gap);
        }
    }

    /// Checks a reading against the books.
    pub fn check<Q: Plain>(&mut self, setup: &Setup<Q>, reading: Option<&Reading<Q>>) {
        match (self.run.as_mut(), reading) {
            (Some(run), Some(reading)) => run.check(setup, reading, self.heard.stated),
            (run, reading) => {
                assert_eq!(run.is_some(), reading.is_some(), "a reading without a run, or a run without a reading");
            }
        }
    }
}

/// While the run does not integrate, its value at stop stays, but for rounding.
pub fn assert_kept<Q: Plain>(before: &Reading<Q>, after: &Reading<Q>) {
    let (then, now) = (figures(before), figures(after));
    let near = |(a, b): (&f64, &f64)| a == b || (a - b).abs() <= 1e-4 * then.unsigned[0];
    assert!(
        (then.signed[0] - now.signed[0]).abs() <= 1e-6 * then.unsigned[0]
            && then.unsigned[..7].iter().zip(&now.unsigned[..7]).all(near),
        "the value at stop has changed:\n{before:?}\n{after:?}"
    );
}
