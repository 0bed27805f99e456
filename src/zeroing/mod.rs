//! What the zeros tell: level and drift, how they bracket the run before, and whether the input really was zero.

mod gate;
mod noise;
mod warmth;

use gate::{Gate, Verdict};
use noise::NoiseSeen;
pub(crate) use noise::QUANTISATION_VAR;
use warmth::Warmth;

use crate::estimate::{Block, BlockMean, Bracket, Cusum, Trend, Walk};
use crate::math;
use crate::quantity::Temperature;
use crate::setup::Derived;

/// How the run before stopped, for its bracket.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Stop {
    /// Its last sample, and what that adds to the variance of a total that ends on it.
    pub(crate) last_counts: i32,
    pub(crate) last_var: f32,
    /// Whether the level went on into the zero without an interruption.
    pub(crate) unbroken: bool,
}

/// What came of a zero sample.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Taken {
    Used,
    /// Too far off for noise, and left out.
    Spike,
    /// The input was not zero, from this tick on. What was learned since is forgotten, and the zero is over.
    Onset {
        /// When, at the latest found.
        since: u32,
        /// Whether that is as good as the beginning of the zero: then the drift may have changed before, in the run.
        contradicts_run: bool,
    },
}

/// Level, drift and bracket as they were before anything gathered in the sums that look for an onset.
#[derive(Clone, Copy, Debug)]
struct Checkpoint {
    trend: Trend,
    bracket: Option<Bracket>,
    warmth: Warmth,
    tick: u32,
    /// Ticks from the trend's instant to the present trend's.
    age: u64,
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
    /// Ticks by which the latest sample is ahead of the trend.
    pub(crate) pending: u64,
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
    /// The drift and its variance as expected when the zero found its level.
    expected_rate: Option<(f32, f32)>,
    /// How long the latest zero that is over had known its level, ticks.
    told_ticks: u64,
    /// Ticks and innovations since the zero found its level.
    known_ticks: u64,
    known_innovations: u16,
}

/// What the zeros have shown of the noise, as far as it goes into a run's variance.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Shown {
    /// Variance of a single sample, counts^2.
    pub(crate) sample_var: f32,
    /// Factors on variances that rest on the zeros' level and on their drift; at least 1.
    pub(crate) widening: f32,
    pub(crate) rate_widening: f32,
    /// Added to the variance of a level and of the drift for rounding that no noise dithers, counts^2 and (counts/s)^2.
    pub(crate) rounding: (f32, f32),
}

impl Shown {
    /// The same as if the zeros had borne out the set-up.
    pub(crate) fn not_widened(self) -> Self {
        Self { widening: 1.0, rate_widening: 1.0, ..self }
    }
}

/// An onset before so many innovations is as good as the beginning of the zero.
const EARLY_INNOVATIONS: u16 = 16;

/// Variance by which flicker parts the mean rates of two equal stretches of time side by side, 4 ln 2 (IEEE Std 1139-2008:
/// twice the Allan variance); taken for what is new in each e-fold of a zero's age. Simulated zeros bear it out.
const FLICKER_SHARE: f32 = 2.772_588_7;

impl Zeroing {
    pub(crate) fn new(derived: &Derived) -> Self {
        Self {
            trend: Trend::new(0, derived.readout_var, 0.0, derived.rate_prior_var),
            bracket: None,
            pending: 0,
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
            self.trend.doubt_rate(derived.rate_prior_var);
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
        self.resting = self.resting.saturating_add(self.pending);
        self.pending = 0;
        self.warmth.release_level();
        if let Some(bracket) = self.bracket.as_mut() {
            bracket.release_level();
        }
    }

    /// How long the zero that the drift rests on has known its level, ticks: this one, or the one before while that is longer.
    pub(crate) fn known_ticks(&self) -> u64 {
        self.known_ticks.max(self.told_ticks)
    }

    /// Whether a run can start on this level.
    pub(crate) fn level_known(&self) -> bool {
        self.level_known
    }

    /// What the zeros have shown of the noise.
    pub(crate) fn shown(&self, derived: &Derived) -> Shown {
        let level = if derived.dithered { 0.0 } else { QUANTISATION_VAR };
        let known_s = math::seconds(self.known_ticks(), derived.tick_s);
        let rate = if known_s > 0.0 { 2.0 * level / (known_s * known_s) } else { 0.0 };
        Shown {
            sample_var: self.noise.sample_var(),
            widening: self.noise.widening(),
            rate_widening: self.noise.rate_widening(),
            rounding: (level, rate),
        }
    }

    /// Whether the zeros were enough to show noise figures that are wrong.
    pub(crate) fn noise_is_tested(&self) -> bool {
        self.noise.is_tested()
    }

    /// Noise of single samples, stated and observed, in hundredths of a count rms, if the two are clearly different.
    pub(crate) fn readout_centicounts(&self, derived: &Derived) -> Option<(u16, u16)> {
        self.noise.readout_centicounts(derived)
    }

    /// Scatter of the innovations in per cent of the expected, if it is clearly another.
    pub(crate) fn noise_percent(&self) -> Option<u16> {
        self.noise.percent()
    }

    /// Scatter of the zeros' drifts in per cent of the expected, if it is clearly more.
    pub(crate) fn drift_percent(&self) -> Option<u16> {
        self.noise.rate_percent()
    }

    /// Time in a zero without a usable sample.
    pub(crate) fn skip(&mut self, ticks: u32) {
        self.pending = self.pending.saturating_add(u64::from(ticks));
        self.block.skip(ticks);
    }

    /// A sample in a zero, `ticks` after the one before.
    pub(crate) fn take(&mut self, tick: u32, counts: i32, ticks: u32, stop: Option<Stop>, derived: &Derived) -> Taken {
        if self.disturbed {
            self.skip(ticks);
            return Taken::Used;
        }
        match self.judge(tick, counts, ticks, derived) {
            Verdict::Noise => {}
            Verdict::Spike => {
                self.skip(ticks);
                return Taken::Spike;
            }
            Verdict::Onset(since) => {
                self.skip(ticks);
                self.roll_back();
                return Taken::Onset { since, contradicts_run: false };
            }
        }
        self.pending = self.pending.saturating_add(u64::from(ticks));
        if self.block.push(counts, ticks, derived.block_ticks) {
            return self.finish_block(tick, stop, derived);
        }
        Taken::Used
    }

    /// The zero ends or is asked about before its first block was full: what there is of it has to do.
    pub(crate) fn finish(&mut self, tick: u32, stop: Option<Stop>, derived: &Derived) {
        if !self.level_known && !self.disturbed {
            self.finish_block(tick, stop, derived);
        }
    }

    /// The zero is over.
    pub(crate) fn leave(&mut self, tick: u32, stop: Option<Stop>, derived: &Derived) {
        self.finish(tick, stop, derived);
        self.judge_rate();
        if self.known_ticks > 0 {
            self.told_ticks = self.known_ticks;
        }
        self.catch_up(derived);
    }

    /// The zero is over: how far was the drift from what was expected?
    fn judge_rate(&mut self) {
        let Some((rate, variance)) = self.expected_rate.take().filter(|_| self.level_known && !self.disturbed) else {
            return;
        };
        // What the zero added to the knowledge of the rate has the variance that it took away.
        let learned = variance - self.trend.rate_variance();
        if learned > 0.1 * variance {
            let off = self.trend.rate() - rate;
            self.noise.take_rate(off * off / learned);
        }
    }

    /// Brings the trend up to the latest sample: what is drift from here on belongs to a run.
    pub(crate) fn catch_up(&mut self, derived: &Derived) {
        let pending = core::mem::take(&mut self.pending);
        advance(&mut self.trend, pending, derived);
    }

    /// Takes the board's temperature, if it is measured.
    pub(crate) fn take_temperature(&mut self, temperature: Option<Temperature>, derived: &Derived) {
        self.warmth.take(temperature, derived);
    }

    /// Time of a run in which the baseline drifts, whatever the temperature.
    pub(crate) fn drive(&mut self, ticks: u32) {
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
        self.trend.rest(derived.rate_walk * math::seconds(resting, derived.tick_s) + step);
    }

    /// Whether a sample is too far off to be noise; while too little is known to tell, none is.
    fn judge(&mut self, tick: u32, counts: i32, ticks: u32, derived: &Derived) -> Verdict {
        if !self.level_known || (derived.block_ticks > 0 && !self.noise.has_scatter()) {
            return Verdict::Noise;
        }
        let ahead_s = math::seconds(self.pending.saturating_add(u64::from(ticks)), derived.tick_s);
        let expected = self.trend.residual() + self.trend.rate() * ahead_s;
        let off = i64::from(counts).saturating_sub(self.trend.anchor()) as f32 - expected;
        let spread = ahead_s * (2.0 * self.trend.covariance() + ahead_s * self.trend.rate_variance());
        let walked = derived.level_walk * ahead_s;
        let sample_var = self.noise.sample_var().max(derived.readout_var);
        self.gate.judge(tick, off, sample_var + self.trend.level_variance() + spread + walked)
    }

    fn finish_block(&mut self, tick: u32, stop: Option<Stop>, derived: &Derived) -> Taken {
        let Some(mean) = self.block.take() else { return Taken::Used };
        if !self.level_known && self.noise.is_torn(&mean) {
            return Taken::Spike;
        }
        self.noise.take_block(&mean, derived);
        // Within a block that walks, the mean knows less of its instant than this; by how much is of no account beside
        // what the walk does to a run longer than the block.
        let variance = if derived.dithered {
            derived.readout_var / f32::from(mean.samples)
        } else {
            // Rounding that nothing dithers does not average ...
            derived.readout_var
        };
        if !self.level_known {
            self.find_level(&mean, variance, stop, derived);
            return Taken::Used;
        }
        let elapsed = self.pending.saturating_sub(mean.age);
        self.pending -= elapsed;
        let wandered = self.flicker_walk(elapsed, derived);
        self.warmth.half_step(&mut self.trend);
        advance(&mut self.trend, elapsed, derived);
        self.warmth.advance(math::seconds(elapsed, derived.tick_s));
        self.warmth.half_step(&mut self.trend);
        self.warmth.follow();
        self.trend.rest(wandered);
        if let Some(bracket) = self.bracket.as_mut() {
            bracket.advance(math::seconds(elapsed, derived.tick_s));
        }
        // ... and keeps its sign over many blocks.
        let variance = if derived.dithered { variance } else { 4.0 * variance };
        let innovation = self.trend.update(mean.counts, mean.rest, variance);
        if let Some(bracket) = self.bracket.as_mut() {
            bracket.update(&innovation);
        }
        self.warmth.update(&innovation);
        if let Some(checkpoint) = self.checkpoint.as_mut() {
            checkpoint.age = checkpoint.age.saturating_add(elapsed);
        }
        self.known_ticks = self.known_ticks.saturating_add(elapsed);
        self.known_innovations = self.known_innovations.saturating_add(1);
        let deviation = innovation.residual * math::sqrt(innovation.precision / self.noise.dispersion());
        self.noise.take_innovation(deviation);
        if self.cusum.take(deviation, derived.onset_threshold) {
            let (since, known) = self.checkpoint.map_or((tick, 0), |checkpoint| (checkpoint.tick, checkpoint.known));
            self.roll_back();
            return Taken::Onset { since, contradicts_run: known < EARLY_INNOVATIONS };
        }
        if self.cusum.is_quiet() || self.checkpoint.is_none() {
            let known = self.known_innovations;
            self.checkpoint =
                Some(Checkpoint { trend: self.trend, bracket: self.bracket, warmth: self.warmth, tick, age: 0, known });
        }
        Taken::Used
    }

    /// The first block of a zero: the level starts from it, and a run that has just stopped is bracketed.
    fn find_level(&mut self, mean: &BlockMean, variance: f32, stop: Option<Stop>, derived: &Derived) {
        let elapsed = self.pending.saturating_sub(mean.age);
        self.pending -= elapsed;
        match stop {
            // Level and baseline drift together from the stop on.
            Some(stop) if stop.unbroken => {
                advance(&mut self.trend, elapsed, derived);
                self.bracket = Some(Bracket::on_level(mean.counts, mean.rest, variance, &self.trend));
            }
            Some(stop) => {
                self.bracket = Some(Bracket::on_rate(stop.last_counts, stop.last_var, &self.trend));
                self.resting = self.resting.saturating_add(elapsed);
            }
            None => self.resting = self.resting.saturating_add(elapsed),
        }
        self.rest(derived);
        self.warmth.whole_step(&mut self.trend);
        self.trend.restart(mean.counts, mean.rest, variance);
        self.expected_rate = Some((self.trend.rate(), self.trend.rate_variance()));
        self.level_known = true;
    }

    /// How far flicker makes the rate wander in the next `ticks` of a zero: it has as much variance in each octave of time, so
    /// the older the zero the less is new.
    fn flicker_walk(&self, ticks: u64, derived: &Derived) -> f32 {
        let age = self.known_ticks.saturating_add(ticks).max(1);
        FLICKER_SHARE * derived.flicker * (ticks as f32 / age as f32)
    }

    /// Forgets what was learned since the sums were last empty.
    fn roll_back(&mut self) {
        self.disturbed = true;
        if let Some(checkpoint) = self.checkpoint.take() {
            self.trend = checkpoint.trend;
            self.bracket = checkpoint.bracket;
            self.warmth = checkpoint.warmth;
            self.pending = self.pending.saturating_add(checkpoint.age);
        }
    }
}

/// Lets `ticks` pass for a level that drifts.
pub(crate) fn advance(trend: &mut Trend, ticks: u64, derived: &Derived) {
    let dt_s = math::seconds(ticks, derived.tick_s);
    trend.advance(dt_s, Walk::over(dt_s, derived.level_walk, derived.rate_walk));
}
