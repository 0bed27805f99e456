//! A zero's samples: one by one through the gate, in blocks to the filter, and back to the checkpoint on an onset.

use super::gate::{self, Verdict};
use super::{Checkpoint, RateChange, Stop, Taken, Zeroing, advance};
use crate::clock::Span;
use crate::estimate::{BlockMean, Bracket, DEVIATION, Innovation};
use crate::level::Terms;
use crate::math::{self, to_q16, whole_q16};
use crate::setup::{Derived, WarmthLaw};

/// An onset before so many innovations is as good as the beginning of the zero.
const EARLY_INNOVATIONS: u16 = 16;

/// Standard deviations of leak and soakage that are no onset; and how much of that, in deviations of an innovation, the
/// watch over the noise may overlook.
const DOUBTED: f32 = 3.0;
const NEGLIGIBLE: f32 = 0.3;

/// Variance by which flicker parts the mean rates of two equal stretches of time side by side, 4 ln 2 (IEEE Std
/// 1139-2008: twice the Allan variance); taken for what is new in each e-fold of a zero's age. Simulated zeros bear it
/// out.
const FLICKER_SHARE: f32 = 2.772_588_7;

impl Zeroing {
    /// Time in a zero without a usable sample.
    pub(crate) fn skip(&mut self, ticks: u32, derived: &Derived) {
        self.pending.add(ticks, derived.coarse_shift);
        self.block.skip(ticks);
    }

    /// A sample in a zero: `level_q16` (2^-16 counts) at `tick`, `ticks` after the one before. `around` tells how the
    /// run before stopped, and leak and soakage now; only the end of a block asks.
    pub(crate) fn take<'r>(
        &mut self,
        tick: u32,
        ticks: u32,
        level_q16: i64,
        around: impl FnOnce() -> (Option<&'r Stop>, Terms),
        derived: &Derived,
    ) -> Taken {
        if self.disturbed {
            self.skip(ticks, derived);
            return Taken::Used;
        }
        if self.block.is_empty() {
            // Deviations are small where the filter expects the level.
            let base = if self.level_known { self.trend.anchor() } else { level_q16 >> 16 };
            self.block.start(base);
        }
        let above = self.block.above(level_q16);
        let ticks_ahead = self.pending_ticks().saturating_add(ticks);
        let off = self.gate.off(above, ticks_ahead);
        // Past the block's range nobody knows how far.
        let verdict = match self.block.is_within(above) {
            true => self.judge(tick, off, ticks_ahead, derived),
            false => self.gate.refuse(tick, off),
        };
        match verdict {
            Verdict::Noise => {}
            Verdict::Spike => {
                self.skip(ticks, derived);
                return Taken::Spike;
            }
            Verdict::Onset(since) => {
                let ticks_known = self.known_ticks.saturating_add(self.pending.ticks).saturating_add(u64::from(ticks));
                let change = self.turn(level_q16, self.noise.sample_var(), ticks_known, derived);
                self.skip(ticks, derived);
                self.roll_back();
                let contradicts_run = self.known_innovations < EARLY_INNOVATIONS;
                return Taken::Onset { since, contradicts_run, change };
            }
        }
        self.pending.add(ticks, derived.coarse_shift);
        if self.block.push(above, off, ticks, derived.block_ticks) {
            let (stop, terms) = around();
            return self.finish_block(tick, terms, stop, derived);
        }
        Taken::Used
    }

    /// How the rate has changed from what was expected, if the level is `level_q16` (2^-16 counts, with the variance
    /// `var`) so many ticks after it was found; only while the zero has hardly begun.
    fn turn(&self, level_q16: i64, var: f32, ticks: u64, derived: &Derived) -> Option<RateChange> {
        let (rate, rate_var, _) = self.expected_rate?;
        if self.known_innovations >= EARLY_INNOVATIONS || ticks == 0 {
            return None;
        }
        let per_s = 1.0 / math::seconds(ticks, derived.tick_s);
        let moved = math::counts(level_q16.saturating_sub(self.found_q16));
        let off_var = (var + self.found_var) * per_s * per_s + rate_var;
        Some(RateChange { off: moved * per_s - rate, off_var, share: 1.0 })
    }

    /// The zero ends or is asked about before its first block was full: what there is of it has to do.
    pub(crate) fn finish(&mut self, tick: u32, terms: Terms, stop: Option<&Stop>, derived: &Derived) {
        if !self.level_known && !self.disturbed {
            self.finish_block(tick, terms, stop, derived);
        }
    }

    /// Whether a sample, so many fine steps off and so many ticks after the trend's instant, is too far off to be
    /// noise; while too little is known to tell, none is.
    fn judge(&mut self, tick: u32, off: i32, ticks: u32, derived: &Derived) -> Verdict {
        // Most samples lie within what noise alone does: what else there may be is reckoned only for the others.
        let is_noise = self.gate.is_near(off) || off.unsigned_abs() <= gate::reach(self.variance_ahead(ticks, derived));
        if is_noise { self.gate.pass() } else { self.gate.refuse(tick, off) }
    }

    /// By how much the latest sample is ahead of the trend, ticks; in a zero these fit 32 bits but for hours without a
    /// usable sample.
    fn pending_ticks(&self) -> u32 {
        u32::try_from(self.pending.ticks).unwrap_or(u32::MAX)
    }

    /// Variance of a sample so many ticks after the trend's instant, counts^2.
    fn variance_ahead(&self, ticks: u32, derived: &Derived) -> f32 {
        let trend = &self.trend;
        let ahead_s = math::seconds(u64::from(ticks), derived.tick_s);
        let spread = ahead_s * (2.0 * trend.covariance() + ahead_s * trend.rate_variance());
        let walked = derived.level_walk * ahead_s;
        let figures = DOUBTED * DOUBTED * self.considered.lag_variance_ahead();
        self.noise.sample_var_stated(derived) + trend.level_variance() + spread + walked + figures
    }

    /// Tells the gate what to expect of the next block, and when enough is known to tell noise from more, what is
    /// noise.
    fn aim_next(&mut self, mean: &BlockMean, derived: &Derived) {
        let can_tell = derived.block_ticks == 0 || self.noise.has_scatter();
        // A single sample shows no scatter: then the reach stays what it is.
        if can_tell && (self.gate.is_open() || mean.samples > 1) {
            self.gate.set_reach(gate::reach(self.noise.sample_var_stated(derived)));
        }
        let ticks = self.pending_ticks().saturating_add(mean.span);
        self.gate.aim(self.trend.residual(), self.trend.rate() * derived.tick_s, ticks);
    }

    #[inline(never)]
    fn finish_block(&mut self, tick: u32, terms: Terms, stop: Option<&Stop>, derived: &Derived) -> Taken {
        let Some(mean) = self.block.take() else { return Taken::Used };
        if !self.level_known && self.noise.is_torn(&mean) {
            return Taken::Spike;
        }
        self.noise.take_block(&mean, derived);
        let variance = derived.block_var(mean.share);
        if !self.level_known {
            self.find_level(&mean, variance, terms, stop, derived);
            // There is always something to go back to.
            self.keep(tick, derived);
            self.aim_next(&mean, derived);
            return Taken::Used;
        }
        let span = self.pending.leave(u64::from(mean.age));
        let elapsed = span.ticks;
        let wandered = self.flicker_walk(elapsed, derived);
        self.warmth.half_step(&mut self.trend, self.bracket.as_mut());
        let dt_s = advance(&mut self.trend, self.bracket.as_mut(), span, derived);
        self.considered.advance(elapsed, derived);
        self.considered.follow(terms, derived);
        self.warmth.advance(dt_s);
        self.warmth.half_step(&mut self.trend, self.bracket.as_mut());
        self.warmth.follow();
        self.trend.rest_beside(self.bracket.as_mut(), wandered);
        let variance_here = derived.serial_var(variance);
        let (innovation, run_gain) =
            self.trend.update_beside(self.bracket.as_mut(), mean.counts, mean.rest, variance_here);
        let deviation = self.deviation(&innovation, derived);
        self.considered.update(&innovation, run_gain, derived);
        self.warmth.update(&innovation);
        if let Some(checkpoint) = self.checkpoint.as_mut() {
            checkpoint.age.join(span);
        }
        self.known_ticks = self.known_ticks.saturating_add(elapsed);
        self.known_innovations = self.known_innovations.saturating_add(1);
        if self.cusum.take(deviation, derived.onset_threshold) {
            let (since, known) = self.checkpoint.map_or((tick, 0), |checkpoint| (checkpoint.tick, checkpoint.known));
            let contradicts_run = known < EARLY_INNOVATIONS;
            let level_q16 = whole_q16(mean.counts).saturating_add(to_q16(mean.rest));
            let change = self.turn(level_q16, variance, self.known_ticks, derived);
            self.roll_back();
            return Taken::Onset { since, contradicts_run, change };
        }
        if self.cusum.is_quiet() {
            self.keep(tick, derived);
        }
        self.aim_next(&mean, derived);
        Taken::Used
    }

    /// Keeps what is known as the checkpoint.
    fn keep(&mut self, tick: u32, derived: &Derived) {
        let (trend, bracket, known) = (self.trend, self.bracket, self.known_innovations);
        let age = Span::default();
        let Some(checkpoint) = self.checkpoint.as_mut() else {
            let (warmth, considered) = (self.warmth, self.considered);
            self.checkpoint = Some(Checkpoint { trend, bracket, warmth, considered, tick, age, known });
            return;
        };
        (checkpoint.trend, checkpoint.bracket, checkpoint.known) = (trend, bracket, known);
        (checkpoint.tick, checkpoint.age) = (tick, age);
        // Most boards have neither, and copies are dear.
        if derived.warmth != WarmthLaw::Unknown {
            checkpoint.warmth = self.warmth;
        }
        if derived.has_doubts() {
            checkpoint.considered = self.considered;
        }
    }

    /// An innovation for the watch over the input, 2^-12 standard deviations; the watch over the noise takes it as
    /// well.
    fn deviation(&mut self, innovation: &Innovation, derived: &Derived) -> i32 {
        let per_deviation = self.noise.per_deviation(innovation.precision);
        let mut deviation = innovation.residual * per_deviation;
        let mut is_noise = true;
        if derived.has_doubts() {
            // What wrong figures of leak and soakage may have done is the same in block after block: no noise, and no
            // onset.
            let doubt = DOUBTED * math::sqrt(self.considered.lag_variance()) * per_deviation;
            deviation = beyond(deviation, doubt);
            is_noise = doubt < NEGLIGIBLE;
        }
        let deviation = (deviation * DEVIATION as f32) as i32;
        if is_noise {
            self.noise.take_innovation(deviation);
        }
        deviation
    }

    /// The first block of a zero: the level starts from it, and a run that has just stopped is bracketed.
    fn find_level(&mut self, mean: &BlockMean, variance: f32, terms: Terms, stop: Option<&Stop>, derived: &Derived) {
        let span = self.pending.leave(u64::from(mean.age));
        let elapsed = span.ticks;
        // A second zero after the same run goes on with the bracket that there is.
        let stop = stop.filter(|_| self.bracket.is_none());
        match stop {
            // Level and baseline drift together from the stop on.
            Some(stop) if stop.unbroken => {
                advance(&mut self.trend, None, span, derived);
                self.considered.advance(elapsed, derived);
                self.considered.follow(terms, derived);
                self.considered.extend_run();
                self.bracket = Some(Bracket::on_level(mean.counts, mean.rest, &self.trend));
            }
            Some(stop) => {
                let last_var = self.noise.sample_var() * stop.last_weight;
                self.bracket = Some(Bracket::on_rate(stop.last_q16, last_var, &self.trend));
                self.resting = self.resting.saturating_add(elapsed);
            }
            None => self.resting = self.resting.saturating_add(elapsed),
        }
        self.trend.restart(mean.counts, mean.rest, variance);
        if let (Some(bracket), Some(Stop { unbroken: true, .. })) = (self.bracket.as_mut(), stop) {
            bracket.hold_level();
        }
        self.rest(derived);
        self.warmth.whole_step(&mut self.trend, self.bracket.as_mut());
        self.found_q16 = whole_q16(mean.counts).saturating_add(to_q16(mean.rest));
        self.found_var = variance;
        self.considered.release_level();
        self.considered.skip(terms);
        self.expected_rate = Some((self.trend.rate(), self.trend.rate_variance(), self.considered.rate()));
        self.level_known = true;
    }

    /// How far flicker makes the rate wander in the next `ticks` of a zero: it has as much variance in each octave of
    /// time, so the older the zero the less is new.
    fn flicker_walk(&self, ticks: u64, derived: &Derived) -> f32 {
        if derived.flicker <= 0.0 {
            return 0.0;
        }
        let age = self.known_ticks.saturating_add(ticks).max(1);
        FLICKER_SHARE * derived.flicker * (ticks as f32 / age as f32)
    }

    /// The input was not zero, or the level not free: the zero is over. Forgets what was learned since the sums were
    /// last empty.
    pub(crate) fn roll_back(&mut self) {
        self.disturbed = true;
        if let Some(checkpoint) = self.checkpoint.take() {
            self.trend = checkpoint.trend;
            self.bracket = checkpoint.bracket;
            self.warmth.roll_back(checkpoint.warmth);
            self.considered = checkpoint.considered;
            self.pending.join(checkpoint.age);
        }
    }
}

/// By how much `x` lies outside `-doubt` to `doubt`.
fn beyond(x: f32, doubt: f32) -> f32 {
    x - x.max(-doubt).min(doubt)
}
