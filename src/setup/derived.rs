//! What the estimator needs of a set-up, worked out once so that no sample pays for a division.

use super::Linearity;
use crate::level::{LeakLaw, SoakageLaw};
use crate::math;

/// Variance of rounding to whole counts (IEEE Std 1241).
pub(crate) const QUANTISATION_VAR: f32 = 1.0 / 12.0;

/// How the drift follows the temperature: variance of the change of the rate for each thousandth, before anything is
/// measured, (counts/s)^2, rectangular within the data sheet's limit.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub(crate) enum WarmthLaw {
    Unknown,
    /// For each thousandth of a kelvin.
    Linear {
        coefficient_var: f32,
    },
    /// For each thousandth of the current at 25 degrees Celsius.
    Junction {
        coefficient_var: f32,
        doublings_per_millikelvin: f32,
    },
}

/// The set-up in counts, seconds and ticks; what every sample needs first.
#[repr(C)]
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub(crate) struct Derived {
    /// Whether nothing leaks or soaks.
    pub(crate) keeps_level: bool,
    /// Coarse ticks, in which steps are squared: 2^17 to 2^18 in the leak's time constant, or the counter's own; `None`
    /// without a leak.
    pub(crate) coarse_shift: Option<u8>,
    /// Bits of a fraction of a count with which samples are kept: as many as 32 bits have to spare for the converter's
    /// width and what leaks and soaks, at most 8.
    pub(crate) fine_bits: u8,
    /// Samples in the fits beside a reset.
    pub(crate) edge_samples: u8,
    pub(super) linearity: Option<&'static Linearity>,
    /// Lowest and highest code that is neither an end code nor past a rail.
    pub(crate) usable: (i32, i32),
    /// Length of a block of zero samples, ticks; 0: each sample by itself.
    pub(crate) block_ticks: u32,
    /// Seconds per tick.
    pub(crate) tick_s: f32,
    /// Ticks in a second.
    pub(crate) ticks_per_s: f32,
    /// Integral of the input per count of output movement, C or V s, with its sign.
    pub(crate) integral_per_count: f64,
    /// Variance of one sample, counts^2.
    pub(crate) readout_var: f32,
    /// Growth of the level's variance, counts^2/s.
    pub(crate) level_walk: f32,
    /// A fifteenth of that in a tick: what it adds to the scatter of a block, counts^2.
    pub(crate) scatter_walk: f32,
    /// Growth of the drift's variance, (counts/s)^2/s.
    pub(crate) rate_walk: f32,
    /// Flicker of the drift: its one-sided density times the frequency, (counts/s)^2.
    pub(crate) flicker: f32,
    /// Drift that the data sheet allows, counts/s.
    pub(crate) rate_limit: f32,
    /// Variance of the drift before anything is measured: rectangular within the limit, `limit^2 / 3` (GUM 4.3.7).
    pub(crate) rate_prior_var: f32,
    /// How the drift follows the temperature.
    pub(crate) warmth: WarmthLaw,
    /// Where the level must be while the reset switch is closed.
    pub(crate) reset_window: (i32, i32),
    /// Where the level must be when the switch has opened: moved by the pedestal.
    pub(crate) opened_window: (i32, i32),
    /// Ticks after closing when the reset level must have been reached.
    pub(crate) settling_ticks: u32,
    /// Ticks that the amplifier is given to follow the switch.
    pub(crate) follow_ticks: u32,
    pub(crate) min_on_time_s: f64,
    /// Time in which the amplifier slews by a count, s.
    pub(crate) slewing_s: f32,
    /// One over `R_on C`, 1/s; 0: not known.
    pub(crate) per_switch_tau: f32,
    /// Resets in a row that may fail.
    pub(crate) reset_attempts: u8,
    /// Step when the reset switch opens and its variance, counts and counts^2; `None`: unknown.
    pub(crate) pedestal: Option<(f32, f32)>,
    /// Noise that an opening switch freezes on the capacitor, `k T / C`, counts^2.
    pub(crate) ktc_var: f32,
    /// Longest time with the reset switch closed within a whole run, and longest step from sample to sample, ticks.
    pub(crate) gap_limit_ticks: u32,
    pub(crate) step_limit_ticks: u32,
    /// Largest rate of the level at the worst-case input and drift, 2^-16 counts per tick; 0: unknown.
    pub(crate) worst_rate_q16: u64,
    /// Headroom that the advice keeps besides one sample period: latency and readout noise, counts.
    pub(crate) guard_counts: i32,
    /// Largest step from sample to sample that readout noise explains, counts; without a worst-case input, a quarter of
    /// the usable span.
    pub(crate) step_counts: i32,
    /// Whether the noise is enough to make rounding errors of different samples independent.
    pub(crate) dithered: bool,
    /// Where the cumulative sums of a zero's innovations alarm, 2^-12 standard deviations.
    pub(crate) onset_threshold: i32,
    /// Equal readings in a row that are a fault; 0: not watched.
    pub(crate) frozen_samples: u16,
    /// Variance of half the level's second derivative, (counts/s^2)^2; `None`: unknown.
    pub(crate) bend_var: Option<f32>,
    /// Reset level, 2^-16 counts.
    pub(super) reset_q16: i64,
    pub(crate) leak: Option<LeakLaw>,
    pub(crate) soakage: Option<SoakageLaw>,
    /// One over the leak's time constant, 1/s; 0: no leak.
    pub(crate) leak_per_s: f32,
    /// Variance that the readout noise of one sample adds to the effective level through the leak, counts^2 per squared
    /// coarse tick.
    pub(crate) leak_walk: f32,
    /// Relative standard uncertainties of what leaks and of what soaks.
    pub(crate) terms_u_rel: [f32; 2],
    /// Variance that the converter's remaining non-linearity gives to the level at each end of a segment, counts^2.
    pub(crate) linearity_var: f32,
    /// Relative variance of the gain.
    pub(crate) gain_var_rel: f32,
    /// Droop that the data sheet allows, counts/s, and its variance, rectangular.
    pub(crate) droop_limit: f32,
    pub(crate) droop_prior_var: f32,
}

impl Derived {
    /// Variance of the mean of `1 / share` samples, counts^2: rounding that nothing dithers does not average.
    ///
    /// Within a block that walks, the mean knows less of its instant than this; by how much is of no account beside
    /// what the walk does to a run longer than the block.
    pub(crate) fn block_var(&self, share: f32) -> f32 {
        if self.dithered { self.readout_var * share } else { self.readout_var }
    }

    /// What the variance of one of many blocks in a row is worth: rounding that nothing dithers keeps its sign over
    /// them.
    pub(crate) fn serial_var(&self, block_var: f32) -> f32 {
        if self.dithered { block_var } else { 4.0 * block_var }
    }

    /// Added to the variance of a rate that `ticks` of samples have told, for rounding that nothing dithers,
    /// (counts/s)^2: of the levels at both ends, and of the level that leaks.
    pub(crate) fn rate_rounding_var(&self, ticks: u64) -> f32 {
        if self.dithered || ticks == 0 {
            return 0.0;
        }
        let known_s = math::seconds(ticks, self.tick_s);
        2.0 * QUANTISATION_VAR / (known_s * known_s) + self.leaked_rounding_var(1.0)
    }

    /// Variance of what rounding that nothing dithers makes leak in `seconds`, counts^2.
    pub(crate) fn leaked_rounding_var(&self, seconds: f32) -> f32 {
        let taus = seconds * self.leak_per_s;
        if self.dithered { 0.0 } else { QUANTISATION_VAR * taus * taus }
    }

    /// Whether figures of leak or soakage are uncertain.
    pub(crate) fn has_doubts(&self) -> bool {
        self.terms_u_rel.map(f32::to_bits) != [0; 2]
    }

    /// The level that a straight converter would have given, 2^-16 counts.
    #[inline(always)]
    pub(crate) fn linear_q16(&self, code: i32) -> i64 {
        match self.linearity {
            Some(table) => table.linear_q16(code),
            None => i64::from(code) << 16,
        }
    }

    /// Whole counts of a level above the reset level.
    pub(crate) fn above_reset(&self, linear_q16: i64) -> i32 {
        // What is fed may be any code: beyond the converter's range the level ends, so that areas stay within 2^62.
        ((linear_q16 - self.reset_q16 + 0x8000) >> 16).clamp(-(1 << 30), 1 << 30) as i32
    }

    /// Largest movement of the level in `ticks` at the worst-case input, counts, rounded up; 0 if that is not known.
    pub(crate) fn worst_movement(&self, ticks: u32) -> i64 {
        // At most 2^30 * 2^32, below 2^63.
        ((self.worst_rate_q16 * u64::from(ticks)) >> 16).cast_signed() + i64::from(self.worst_rate_q16 > 0)
    }
}
