//! What the verification of a reset leads to.

use super::Channel;
use crate::math;
use crate::notice::{Event, Reason};
use crate::notices::Notices;
use crate::quantity::Integral;
use crate::sample::{Mode, Sample};
use crate::verify::{Closed, Mover};
use crate::zeroing::RateChange;

impl<Q: Integral> Channel<'_, Q> {
    /// Whether the switch has been given up after too many resets in a row that failed. No reset is asked for then, and
    /// every run has the reason `SwitchFailed`, until [`switch_repaired`](Self::switch_repaired).
    pub fn switch_has_failed(&self) -> bool {
        self.verification.is_latched()
    }

    /// Someone has seen to the reset switch: resets are asked for again. Runs that had the fault keep it.
    pub fn switch_repaired(&mut self) {
        self.verification.release();
    }

    /// A sample with the switch closed.
    pub(super) fn verify_closed(&mut self, tick: u32, ticks: u32, notices: &mut Notices) {
        match self.verification.take_closed(self.linear_q16(), ticks, self.setup.derived()) {
            Closed::Nothing => {}
            Closed::Slow(percent) => notices.push(tick, Event::SettlingSlow { percent }),
            Closed::NotArrived => self.reset_failed(Reason::ResetNotArrived, tick, notices),
        }
    }

    /// A sample with the switch open: has the level left the reset level?
    pub(super) fn watch_opened(&mut self, sample: &Sample, ticks: u32, notices: &mut Notices) {
        if !self.verification.is_watching() || !matches!(sample.mode, Mode::Zero | Mode::Integrate) {
            return;
        }
        let derived = self.setup.derived();
        let trend = &self.zeroing.trend;
        let mover = Mover {
            rate: trend.rate(),
            rate_var: trend.rate_variance(),
            sample_var: self.zeroing.shown(derived).sample_var,
            soaked_q16: self.level.terms().soaked_q16,
            input: sample.mode == Mode::Integrate,
        };
        if self.verification.is_held(self.linear_q16(), ticks, &mover, derived) {
            if sample.mode == Mode::Zero {
                self.zeroing.roll_back();
            }
            self.reset_failed(Reason::SwitchStuckClosed, sample.tick, notices);
        }
    }

    /// States a change of the drift that a level which decays would show, now at `level_q16` (2^-16 counts).
    pub(super) fn tell_decay(&self, change: Option<RateChange>, level_q16: i64, tick: u32, notices: &mut Notices) {
        let risen = self.zero_level_q16.map_or(0.0, |before| math::counts(level_q16 - before));
        if let Some(time_constant_s) = change.and_then(|change| change.decay_s(risen)) {
            notices.push(tick, Event::Decay { time_constant_s });
        }
    }

    /// Books a reset that failed: another is to be tried, or the switch is given up.
    pub(super) fn reset_failed(&mut self, reason: Reason, tick: u32, notices: &mut Notices) {
        if self.verification.fail(self.setup.derived()) {
            notices.push(tick, Event::ResetFailed { in_a_row: self.verification.failures() });
        }
        self.fault(reason, tick, notices);
        if self.verification.is_latched() {
            self.fault(Reason::SwitchFailed, tick, notices);
        }
    }
}
