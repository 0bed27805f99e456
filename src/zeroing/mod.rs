//! What the zeros tell: level and drift, how they bracket the run before, and whether the input really was zero.

mod considered;
mod gate;
mod noise;
mod rate_change;
mod samples;
mod shown;
mod warmth;

pub(crate) use considered::{Considered, square_distance, squares};
use gate::Gate;
use noise::NoiseSeen;
pub(crate) use rate_change::RateChange;
pub(crate) use shown::Shown;
use warmth::Warmth;

use crate::clock::Span;
use crate::estimate::{Block, Bracket, Cusum, Trend, Walk};
use crate::level::Terms;
use crate::math;
use crate::quantity::Temperature;
use crate::setup::{Derived, WarmthLaw};

/// How the run before stopped, for its bracket.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Stop {
    /// Its last sample, 2^-16 counts, and what of a sample's variance that adds to a total that ends on it.
    pub(crate) last_q16: i64,
    pub(crate) last_weight: f32,
    /// Whether the level went on into the zero without an interruption.
    pub(crate) unbroken: bool,
}

/// What came of a zero sample.
#[derive(Clone, Copy, Debug)]
pub(crate) enum Taken {
    Used,
    /// Too far off for noise, and left out.
    Spike,
    /// The input was not zero, from this tick on. What was learned since is forgotten, and the zero is over.
    Onset {
        /// When, at the latest found.
        since: u32,
        /// Whether that is as good as the beginning of the zero: then the drift may have changed before, in the run;
        /// and by how much.
        contradicts_run: bool,
        change: Option<RateChange>,
    },
}

/// Level, drift and bracket as they were before anything gathered in the sums that look for an onset.
#[derive(Clone, Copy, Debug)]
struct Checkpoint {
    trend: Trend,
    bracket: Option<Bracket>,
    warmth: Warmth,
    considered: Considered,
    tick: u32,
    /// From the trend's instant to the present trend's.
    age: Span,
    /// Innovations in the zero before it.
    known: u16,
}

/// The filter of the zeros, which carries the baseline through the runs.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Zeroing {
    /// In a zero the level and its drift; in a run the baseline and the drift.
    pub(crate) trend: Trend,
    /// How the run before is bracketed; `None` before the zero has found the level.
    pub(crate) bracket: Option<Bracket>,
    /// By how much the latest sample is ahead of the trend.
    pub(crate) pending: Span,
    /// What wrong figures of leak and soakage would do.
    pub(crate) considered: Considered,
    /// Variance of a step that the rate has made since the run, (counts/s)^2.
    pub(crate) rate_step: f32,
    /// Ticks in which only the rate wandered.
    pub(crate) resting: u64,
    level_known: bool,
    /// Whether the input was found not to be zero: the rest of the zero is not used.
    disturbed: bool,
    block: Block,
    cusum: Cusum,
    checkpoint: Option<Checkpoint>,
    gate: Gate,
    noise: NoiseSeen,
    warmth: Warmth,
    /// Where the zero found its level, 2^-16 counts, and the variance of that, counts^2.
    found_q16: i64,
    found_var: f32,
    /// The drift and its variance as expected when the zero found its level, and what leak and soakage may have made of
    /// it.
    expected_rate: Option<(f32, f32, [f32; 2])>,
    /// How long the latest zero that is over had known its level, ticks.
    told_ticks: u64,
    /// Ticks and innovations since the zero found its level.
    known_ticks: u64,
    known_innovations: u16,
}

impl Zeroing {
    pub(crate) fn new(derived: &Derived) -> Self {
        Self {
            trend: Trend::new(0, derived.readout_var, 0.0, derived.rate_prior_var),
            bracket: None,
            pending: Span::default(),
            considered: Considered::default(),
            rate_step: 0.0,
            resting: 0,
            level_known: false,
            disturbed: false,
            block: Block::default(),
            cusum: Cusum::default(),
            checkpoint: None,
            gate: Gate::default(),
            noise: NoiseSeen::new(derived),
            warmth: Warmth::new(derived),
            found_q16: 0,
            found_var: 0.0,
            expected_rate: None,
            told_ticks: 0,
            known_ticks: 0,
            known_innovations: 0,
        }
    }

    /// A zero begins: the level is to be found. After a zero in which the input was not zero, or the drift not what was
    /// thought, the drift is as uncertain again as the data sheet.
    pub(crate) fn enter(&mut self, derived: &Derived) {
        if self.disturbed {
            self.trend.doubt_rate_beside(self.bracket.as_mut(), derived.rate_prior_var);
        }
        self.disturbed = false;
        self.forget_level();
    }

    /// Lets the level go, and with it what a bracket could learn from it.
    pub(crate) fn forget_level(&mut self) {
        self.level_known = false;
        self.known_ticks = 0;
        self.known_innovations = 0;
        self.block = Block::default();
        self.cusum = Cusum::default();
        self.checkpoint = None;
        self.gate = Gate::default();
        self.noise.drop_sum();
        self.set_pending_aside();
        self.warmth.release_level();
        self.considered.release_level();
        if let Some(bracket) = self.bracket.as_mut() {
            bracket.release_level(&self.trend);
        }
    }

    /// How long the zero that the drift rests on has known its level, ticks: this one, or the one before while that is
    /// longer.
    pub(crate) fn known_ticks(&self) -> u64 {
        self.known_ticks.max(self.told_ticks)
    }

    /// Whether a run can start on this level.
    pub(crate) fn level_known(&self) -> bool {
        self.level_known
    }

    /// The zero is over; leak and soakage are `terms`. Gives how the drift has changed, if it told enough of that.
    pub(crate) fn leave(
        &mut self,
        tick: u32,
        terms: Terms,
        stop: Option<&Stop>,
        derived: &Derived,
    ) -> Option<RateChange> {
        self.finish(tick, terms, stop, derived);
        let change = self.judge_rate();
        if self.known_ticks > 0 {
            self.told_ticks = self.known_ticks;
        }
        if self.level_known {
            self.catch_up(terms, derived);
        } else {
            // Of the level that the run before left nothing was seen: its baseline ends with the run.
            self.set_pending_aside();
        }
        change
    }

    /// The zero is over: how far was the drift from what was expected?
    fn judge_rate(&mut self) -> Option<RateChange> {
        let change = self.rate_change().filter(|_| !self.disturbed);
        self.expected_rate = None;
        if let Some(change) = change {
            self.noise.take_rate(change.off * change.off / change.off_var);
        }
        change
    }

    /// How far the drift is from what was expected; `None` while the zero has not told enough of it.
    fn rate_change(&self) -> Option<RateChange> {
        let (rate, variance, considered) = self.expected_rate.filter(|_| self.level_known)?;
        // What the zero added to the knowledge of the rate has the variance that it took away.
        let learned = variance - self.trend.rate_variance();
        let off_var = learned + square_distance(self.considered.rate(), considered);
        let off = self.trend.rate() - rate;
        (learned > 0.1 * variance).then(|| RateChange { off, off_var, share: learned / variance })
    }

    /// Brings the trend up to the latest sample: what is drift from here on belongs to a run.
    pub(crate) fn catch_up(&mut self, terms: Terms, derived: &Derived) {
        let pending = core::mem::take(&mut self.pending);
        advance(&mut self.trend, self.bracket.as_mut(), pending, derived);
        self.considered.advance(pending.ticks, derived);
        self.considered.follow(terms, derived);
    }

    /// Nothing followed the level meanwhile: only the rate has wandered.
    fn set_pending_aside(&mut self) {
        self.resting = self.resting.saturating_add(core::mem::take(&mut self.pending).ticks);
    }

    /// Takes the board's temperature.
    pub(crate) fn take_temperature(&mut self, temperature: Temperature, derived: &Derived) {
        if derived.warmth != WarmthLaw::Unknown {
            self.warmth.take(temperature, derived);
        }
    }

    /// Time of a run in which the baseline drifts, whatever the temperature.
    pub(crate) fn drive(&mut self, ticks: u64) {
        self.warmth.drive(ticks);
    }

    /// What the warming in a run has done to the baseline.
    pub(crate) fn warm(&self, baseline: &mut Trend, driven: u64, derived: &Derived) {
        let mut warmth = self.warmth;
        warmth.apply(baseline, math::seconds(driven, derived.tick_s), derived);
    }

    /// The same, for good: the run has ended.
    pub(crate) fn warm_for_good(&mut self, driven: u64, derived: &Derived) {
        self.warmth.apply(&mut self.trend, math::seconds(driven, derived.tick_s), derived);
    }

    /// A run begins.
    pub(crate) fn begin_run(&mut self) {
        self.warmth.follow();
    }

    /// Lets the rate wander for the time in which it could not be seen.
    pub(crate) fn rest(&mut self, derived: &Derived) {
        let resting = core::mem::take(&mut self.resting);
        let step = core::mem::take(&mut self.rate_step);
        self.trend
            .rest_beside(self.bracket.as_mut(), derived.rate_walk * math::seconds(resting, derived.tick_s) + step);
    }
}

/// Lets time pass for a level that drifts. Through a leak the samples' own noise walks into the effective level.
///
/// Gives the time, s.
pub(crate) fn advance(trend: &mut Trend, bracket: Option<&mut Bracket>, span: Span, derived: &Derived) -> f32 {
    let dt_s = math::seconds(span.ticks, derived.tick_s);
    let mut walk = Walk::over(dt_s, derived.level_walk, derived.rate_walk);
    if span.squares > 0 {
        walk.level += derived.leak_walk * span.squares as f32;
    }
    trend.advance_beside(bracket, dt_s, walk);
    dt_s
}
