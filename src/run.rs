//! One run: from leaving zero to the end of the next zero, through resets and holds.

use crate::clock::Span;
use crate::estimate::{After, Before, Bracket, Hint, LEVEL_VARIANCE_MAX, Trend, Walk, movement_q16};
use crate::ledger::{Bridged, Ledger};
use crate::math::{self, to_q16, whole_q16};
use crate::notice::Reasons;
use crate::setup::{Derived, QUANTISATION_VAR};
use crate::total::Total;
use crate::verify::Settled;
use crate::window::{Opening, Window};
use crate::zeroing::{Shown, Stop};

/// An interruption of a run that waits for the line after it.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Crossing {
    /// The line before it; `None` where the run begins after a reset or hold that no zero preceded.
    pub(crate) before: Option<Before>,
    /// Time with the reset switch closed, ticks.
    pub(crate) dead: u64,
    /// Time with the input open, ticks.
    pub(crate) held: u64,
    /// Whether there was a reset in it, and whether a hold came last.
    pub(crate) reset: bool,
    pub(crate) held_last: bool,
    /// Whether a hold has opened the input: a reset from then on misses nothing.
    pub(crate) input_open: bool,
}

/// Where a run stands.
#[derive(Clone, Copy, Debug)]
pub(crate) enum Stage {
    /// The input is connected.
    Integrating,
    /// The reset switch is closed or the input open, and the run may go on.
    Interrupted,
    /// The input was disconnected.
    Stopped {
        /// What was known then.
        at_stop: Total,
        /// Its variance if nothing had been widened, counts^2.
        plain_var: f32,
        /// What one standard uncertainty of leak and of soakage makes of it, counts.
        considered: [f32; 2],
        /// What the closing zero has to know.
        stop: Stop,
    },
}

/// A run's books.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Run {
    pub(crate) stage: Stage,
    pub(crate) start_tick: u32,
    pub(crate) end_tick: u32,
    pub(crate) resets: u32,
    /// Interruptions of any kind.
    pub(crate) bridges: u32,
    pub(crate) reasons: Reasons,
    pub(crate) ledger: Ledger,
    pub(crate) crossing: Option<Crossing>,
    /// The line with which the present segment began, once it is drawn.
    pub(crate) opening: Option<Opening>,
    /// When the present segment began.
    pub(crate) opened_tick: u32,
    /// Leak and soakage then, 2^-16 counts, and the settled reset level, where the segment began with a reset.
    pub(crate) opened_terms_q16: i64,
    /// What leak and soakage took in the segments before, and was put back, 2^-16 counts.
    pub(crate) restored_q16: i64,
    pub(crate) settled: Option<Settled>,
    /// The last integrating sample, 2^-16 counts.
    pub(crate) last_q16: i64,
    /// Time up to it over which the baseline drifts (holds left out).
    pub(crate) driven: Span,
    /// Ticks in holds.
    pub(crate) held: u64,
    /// How long the zero before it had known its level, ticks.
    pub(crate) zeroed: u64,
    /// What the drift has moved the baseline by, 2^-16 counts; known once stopped.
    pub(crate) drift_q16: i64,
    /// Samples of the zero after it that were left out.
    pub(crate) spikes: u16,
    /// How much warmer the board is than at the zero before, mK.
    pub(crate) warming: Option<i32>,
    start_q16: i64,
    start_var: f32,
}

impl Run {
    /// Starts at `tick` on a known baseline.
    pub(crate) fn new(tick: u32, baseline: &Trend, reasons: Reasons) -> Self {
        let mut run = Self {
            stage: Stage::Integrating,
            start_tick: tick,
            end_tick: tick,
            resets: 0,
            bridges: 0,
            reasons,
            ledger: Ledger::default(),
            crossing: None,
            opening: None,
            opened_tick: tick,
            opened_terms_q16: 0,
            restored_q16: 0,
            settled: None,
            last_q16: 0,
            driven: Span::default(),
            held: 0,
            zeroed: 0,
            drift_q16: 0,
            spikes: 0,
            warming: None,
            start_q16: 0,
            start_var: 0.0,
        };
        run.begin_on(baseline);
        run
    }

    fn begin_on(&mut self, baseline: &Trend) {
        self.start_q16 = baseline_q16(baseline);
        self.start_var = baseline.level_variance();
    }

    /// The latest sample, if there is one: its tick and level.
    pub(crate) fn see(&mut self, latest: Option<(u32, i64)>) {
        if let Some((tick, level_q16)) = latest {
            self.end_tick = tick;
            self.last_q16 = level_q16;
        }
    }

    /// Books a segment up to its latest sample: the time that `passed`, and what leak and soakage, `terms_q16` now,
    /// took since it opened.
    pub(crate) fn book(&mut self, window: &Window, passed: Span, terms_q16: i64, derived: &Derived) {
        self.see(window.latest());
        if window.has_left_opening(derived) {
            self.opening = None;
        }
        self.driven.join(passed);
        self.restored_q16 = self.restored_q16.saturating_add(terms_q16.saturating_sub(self.opened_terms_q16));
    }

    /// Whether the run has not stopped.
    pub(crate) fn is_running(&self) -> bool {
        !matches!(self.stage, Stage::Stopped { .. })
    }

    /// Closes the open crossing with the line after it, extrapolated to the middle of the dead time. A run without a
    /// line before gets its baseline here.
    pub(crate) fn settle(&mut self, after: &After, baseline: &mut Trend, derived: &Derived) -> Bridged {
        let Some(crossing) = self.crossing.take() else {
            return Bridged::Interpolated;
        };
        self.opening = Some(Opening::new(after, self.opened_tick, self.end_tick));
        let Some(before) = crossing.before else {
            let (counts, rest) = math::whole_and_rest(after.edge.anchor_q16);
            let level = rest + after.edge.level_at_instant(baseline.rate());
            baseline.restart(counts, level, after.readout_var);
            self.ledger.walk_var.add(after.walk_var, LEVEL_VARIANCE_MAX);
            self.ledger.pedestal_lever.add(after.hinted, LEVEL_VARIANCE_MAX);
            self.begin_on(baseline);
            if after.edge.slope.is_some() {
                return Bridged::Interpolated;
            }
            // A single sample is baseline and end in one.
            self.ledger.dead_time_var.add(derived.readout_var, LEVEL_VARIANCE_MAX);
            return Bridged::Guessed;
        };
        let dead_s = math::seconds(crossing.dead, derived.tick_s);
        self.ledger.bridge(&before, after, dead_s, baseline.rate(), derived.level_walk)
    }

    /// The total up to the last integrating sample, with the baseline at that time.
    ///
    /// What rests on the zeros is widened by what they have shown of the noise. `considered` is the variance by
    /// uncertain figures of leak and soakage.
    pub(crate) fn total(&self, baseline: &Trend, considered: f32, shown: &Shown, derived: &Derived) -> Total {
        let driven_s = math::seconds(self.driven.ticks, derived.tick_s);
        let walk = derived.level_walk * driven_s;
        let weight = self.last_sample_weight();
        let own = 1.0 - weight;
        let counted_twice = shown.sample_var * weight * weight;
        let start_var = (self.start_var * shown.widening).max(shown.rounding.0);
        let leaked = self.leaked_readout(derived);
        let drift =
            math::not_negative(baseline.level_variance() - self.start_var - walk - leaked) * shown.rate_widening;
        let (of_start, of_dead_time) = match self.dead_time_var(derived) >= counted_twice {
            true => (0.0, counted_twice),
            false => (counted_twice, 0.0),
        };
        Total {
            movement_q16: movement_q16(self.last_q16, baseline).saturating_add(self.ledger.total_q16()),
            readout: (shown.sample_var * own * own + start_var - of_start).max(QUANTISATION_VAR)
                + 2.0 * derived.linearity_var,
            input_noise: math::not_negative(walk + self.ledger.walk_var.value()),
            drift: drift + shown.rounding.1 * driven_s * driven_s,
            dead_time: self.dead_time_var(derived) - of_dead_time,
            leak_and_soakage: leaked + self.leaked_rounding(derived) + considered,
        }
    }

    /// The weight that the last sample has in the opening line as well, shortly after a reset.
    fn last_sample_weight(&self) -> f32 {
        self.opening.map_or(0.0, |opening| opening.weight(self.end_tick))
    }

    /// What the closing zero has to know of the stop; `unbroken`: whether the level goes on into it.
    pub(crate) fn stop(&self, unbroken: bool) -> Stop {
        // Shortly after a reset the last sample is part of the opening line as well: r (1 - 2 w) instead of r.
        let last_weight = 1.0 - 2.0 * self.last_sample_weight();
        Stop { last_q16: self.last_q16, last_weight, unbroken }
    }

    /// The total as the closing zero sees it; `zero` is the level and drift there.
    pub(crate) fn closed_total(
        &self,
        bracket: &Bracket,
        zero: &Trend,
        considered: f32,
        shown: &Shown,
        derived: &Derived,
    ) -> Total {
        let driven_s = math::seconds(self.driven.ticks, derived.tick_s);
        let walk = derived.level_walk * driven_s;
        // Rounding without dither: of the level at both ends, and of the drift of the two zeros together.
        let rounding = 2.0 * shown.rounding.0 + 0.5 * shown.rounding.1 * driven_s * driven_s;
        let input_noise = math::not_negative(walk + self.ledger.walk_var.value());
        let leaked = self.leaked_readout(derived);
        let of_zeros = math::not_negative(bracket.variance(zero) + self.ledger.walk_var.value() - input_noise - leaked);
        let rest = of_zeros * shown.rate_widening + rounding;
        let readout = ((self.start_var + zero.level_variance()) * shown.widening + 2.0 * shown.rounding.0).min(rest);
        Total {
            movement_q16: bracket.movement_q16().saturating_add(self.ledger.total_q16()),
            readout: readout + 2.0 * derived.linearity_var,
            input_noise,
            drift: rest - readout,
            dead_time: self.dead_time_var(derived),
            leak_and_soakage: leaked + self.leaked_rounding(derived) + considered,
        }
    }

    /// Variance that resets have added.
    fn dead_time_var(&self, derived: &Derived) -> f32 {
        let (_, pedestal_var) = derived.pedestal.unwrap_or_default();
        let bridges = 2.0 * derived.linearity_var * self.bridges as f32;
        self.ledger.dead_time_var.value()
            + pedestal_var * self.ledger.pedestal_lever.value() * self.ledger.pedestal_lever.value()
            + bridges
    }

    /// Variance that readout noise has put into what leaked during the run, as a walk of the baseline.
    fn leaked_readout(&self, derived: &Derived) -> f32 {
        derived.leak_walk * self.driven.squares as f32
    }

    /// The same for rounding that nothing dithers, which is no walk.
    fn leaked_rounding(&self, derived: &Derived) -> f32 {
        derived.leaked_rounding_var(math::seconds(self.driven.ticks, derived.tick_s))
    }

    /// What is known of the level at which the present segment began: the reset level and a known pedestal.
    pub(crate) fn opened(&self, derived: &Derived) -> Option<Hint> {
        let (settled, (pedestal, pedestal_var)) = (self.settled?, derived.pedestal?);
        Some(Hint {
            level_q16: settled.level_q16.saturating_add(to_q16(pedestal)).saturating_add(self.opened_terms_q16),
            own_var: settled.var + derived.ktc_var,
            shared_var: pedestal_var,
            lever: self.ledger.pedestal_lever.value(),
        })
    }

    /// What flicker did to the baseline since the zero.
    pub(crate) fn flicker(&self, derived: &Derived) -> Walk {
        let seconds = |ticks| math::seconds(ticks, derived.tick_s);
        Walk::of_flicker(derived.flicker, seconds(self.zeroed), seconds(self.driven.ticks))
    }

    /// How far the drift has moved `baseline` since the start, 2^-16 counts.
    pub(crate) fn drifted_q16(&self, baseline: &Trend) -> i64 {
        baseline_q16(baseline).saturating_sub(self.start_q16)
    }
}

fn baseline_q16(baseline: &Trend) -> i64 {
    whole_q16(baseline.anchor()).saturating_add(to_q16(baseline.residual()))
}
