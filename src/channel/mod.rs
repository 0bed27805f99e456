//! The conductor: samples in, steps out, a reading when asked for. It knows no pin and no clock.

mod faults;
mod idle;
mod modes;
mod steady;
mod switching;
mod verifying;

use crate::clock::Clock;
use crate::droop::Droop;
use crate::health::Health;
use crate::level::Level;
use crate::notice::{Reason, Reasons};
use crate::quantity::{Integral, Temperature};
use crate::reading::Reading;
use crate::run::{Run, Stage};
use crate::sample::{Mode, Sample, Step};
use crate::setup::Setup;
use crate::verify::Verification;
use crate::window::Window;
use crate::zeroing::{Stop, Zeroing, advance, square_distance, squares};
use switching::settle;

/// One integrator channel: the state beside a [`Setup`].
///
/// Feed every sample in the order it was taken, with the mode that the switches were in since the sample before; in
/// each mode at least one, in `Integrate` a few. [`reading`](Self::reading) may be asked for at any time; a run's
/// reading is final when the zero after it ends, so take it before the first sample of the next run.
///
/// Between two samples at most 2^31 - 1 ticks may pass. A run's movement, what leaked in it included, and what it has
/// carried over resets may come to 2^46 counts; past that the run has the reason `OutOfRange`. Times are counted to
/// 2^64 ticks. Where no wander of the drift is stated, a zero holds it for constant over 2^18 samples or blocks at
/// most.
// In this order, what every sample needs comes first: a Cortex-M0 reaches the first 124 bytes in one instruction.
#[repr(C)]
#[derive(Clone, Debug)]
pub struct Channel<'s, Q> {
    setup: &'s Setup<Q>,
    /// The mode, where it goes on and nothing is left to wait for.
    steady: Option<Mode>,
    mode: Option<Mode>,
    reset_advised: bool,
    clock: Clock,
    health: Health,
    window: Window,
    /// Board temperature as last measured in this mode.
    temperature: Option<Temperature>,
    /// The same at the latest zero sample.
    zero_temperature: Option<Temperature>,
    zeroing: Zeroing,
    level: Level,
    run: Option<Run>,
    droop: Droop,
    /// Faults since the zero began, inherited by the run that it opens.
    zero_reasons: Reasons,
    verification: Verification,
    /// Where the zero before ended, 2^-16 counts.
    zero_level_q16: Option<i64>,
}

impl<'s, Q: Integral> Channel<'s, Q> {
    /// A channel that has seen nothing: the drift is what the data sheet allows.
    pub fn new(setup: &'s Setup<Q>) -> Self {
        Self {
            setup,
            clock: Clock::default(),
            mode: None,
            level: Level::default(),
            zeroing: Zeroing::new(setup.derived()),
            droop: Droop::new(setup.derived()),
            window: Window::default(),
            run: None,
            health: Health::default(),
            zero_reasons: Reasons::default(),
            temperature: None,
            zero_temperature: None,
            verification: Verification::default(),
            reset_advised: false,
            zero_level_q16: None,
            steady: None,
        }
    }

    /// Takes one sample. Bounded work; in `Integrate` integers only, except for the lines beside a reset.
    ///
    /// A sample whose tick does not move forward is not used and makes the reading invalid; after a few of them that
    /// agree with each other the counter is taken for restarted.
    pub fn feed(&mut self, sample: Sample) -> Step {
        let ticks = self.clock.ticks_to(sample.tick);
        if !self.goes_on(&sample, ticks) {
            return self.look_at(&sample);
        }
        self.clock.pass(sample.tick);
        self.keep(&sample);
        if sample.mode == Mode::Zero {
            return self.go_on_in_zero(&sample, ticks);
        }
        self.extend(&sample, ticks);
        Step::default()
    }

    /// The reading of the latest run; `None` before the first.
    ///
    /// While the run goes on, its value as if it stopped at the latest sample.
    pub fn reading(&self) -> Option<Reading<Q>> {
        let derived = self.setup.derived();
        let mut run = self.run?;
        let shown = self.zeroing.shown(derived);
        let noise_tested = self.zeroing.noise_is_tested();
        let Stage::Stopped { at_stop, plain_var, considered, .. } = run.stage else {
            let mut baseline = self.zeroing.trend;
            let mut considered = self.zeroing.considered;
            settle(&mut run, &mut baseline, &self.window, self.zeroing.sample_var(), derived);
            if matches!(run.stage, Stage::Integrating) {
                run.book(&self.window, self.zeroing.pending, self.level.terms().sum_q16(), derived);
                considered.advance(self.zeroing.pending.ticks, derived);
                considered.follow(self.level.terms(), derived);
            }
            advance(&mut baseline, None, self.zeroing.pending, derived);
            self.zeroing.warm(&mut baseline, run.driven.ticks, derived);
            baseline.advance(0.0, run.flicker(derived));
            run.drift_q16 = run.drifted_q16(&baseline);
            let at_stop = run.total(&baseline, considered.lag_variance(), &shown, derived);
            return Some(Reading::new(self.setup, &run, &at_stop, None, noise_tested));
        };
        let mut zeroing = self.zeroing;
        zeroing.finish(self.clock.tick(), self.level.terms(), stop(&self.run), derived);
        let closing = zeroing.considered.run();
        let closed_as = |shown| {
            let total = |bracket| run.closed_total(bracket, &zeroing.trend, squares(closing), shown, derived);
            zeroing.bracket.as_ref().map(total)
        };
        let closed = closed_as(&shown);
        if let Some(plain) = closed_as(&shown.not_widened()) {
            if self.drift_outside_limits() {
                run.reasons.insert(Reason::DriftOutsideLimits);
            }
            if !plain.agrees_with(&at_stop, plain_var, square_distance(closing, considered), &shown) {
                run.reasons.insert(Reason::Inconsistent);
            }
        }
        Some(Reading::new(self.setup, &run, &at_stop, closed.as_ref(), noise_tested))
    }

    /// The mode of the latest sample; `None` before the first.
    pub fn mode(&self) -> Option<Mode> {
        self.mode
    }

    fn is_running(&self) -> bool {
        self.run.as_ref().is_some_and(Run::is_running)
    }
}

/// How the run before the present zero stopped.
fn stop(run: &Option<Run>) -> Option<&Stop> {
    match run {
        Some(Run { stage: Stage::Stopped { stop, .. }, .. }) => Some(stop),
        _ => None,
    }
}
