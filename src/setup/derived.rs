//! What the estimator needs of a set-up, worked out once so that no sample pays for a division.

use super::{Circuit, Converter, Noise, Policy, TemperatureLaw};
use crate::error::{SetupError, check};
use crate::estimate::cusum_threshold;

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

/// The set-up in counts, seconds and ticks.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub(crate) struct Derived {
    /// Seconds per tick.
    pub(crate) tick_s: f32,
    /// Integral of the input per count of output movement, C or V s, with its sign.
    pub(crate) integral_per_count: f64,
    /// Variance of one sample, counts^2.
    pub(crate) readout_var: f32,
    /// Growth of the level's variance, counts^2/s.
    pub(crate) level_walk: f32,
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
    /// Lowest and highest code that is neither an end code nor past a rail.
    pub(crate) usable: (i32, i32),
    /// Where the level must be while the reset switch is closed.
    pub(crate) reset_window: (i32, i32),
    /// Where the level must be when the switch has opened: moved by the pedestal.
    pub(crate) opened_window: (i32, i32),
    /// Ticks after closing when the reset level must have been reached.
    pub(crate) settling_ticks: u32,
    /// Longest step of time within a whole run, ticks.
    pub(crate) gap_limit_ticks: u32,
    /// Largest rate of the level at the worst-case input and drift, 2^-16 counts per tick; 0: unknown.
    pub(crate) worst_rate_q16: u64,
    /// Headroom that the advice keeps besides one sample period: latency and readout noise, counts.
    pub(crate) guard_counts: i32,
    /// Largest step from sample to sample that readout noise explains, counts; without a worst-case input, a quarter of
    /// the usable span.
    pub(crate) step_counts: i32,
    /// Whether the noise is enough to make rounding errors of different samples independent.
    pub(crate) dithered: bool,
    /// Length of a block of zero samples, ticks; 0: each sample by itself.
    pub(crate) block_ticks: u32,
    /// Where the cumulative sums of a zero's innovations alarm, standard deviations.
    pub(crate) onset_threshold: f32,
    /// Equal readings in a row that are a fault; 0: not watched.
    pub(crate) frozen_samples: u16,
    /// Variance of half the level's second derivative, (counts/s^2)^2; `None`: unknown.
    pub(crate) bend_var: Option<f32>,
    /// Samples in the fits beside a reset.
    pub(crate) edge_samples: u8,
}

impl Derived {
    pub(super) const fn new(
        circuit: &Circuit,
        converter: &Converter,
        noise: &Noise,
        policy: &Policy,
    ) -> Result<Self, SetupError> {
        let counts_per_integral = circuit.gain() / converter.lsb_v;
        let per_input = if counts_per_integral < 0.0 { -counts_per_integral } else { counts_per_integral };
        // Squares of these are held in f32 and multiplied with each other: stay well inside its range.
        check!(
            per_input >= 1e-9 && per_input <= 1e24,
            "lsb_v",
            "such that 1/(lsb_v C) or 1/(lsb_v R C) is 1e-9 to 1e24"
        );
        let density = noise.input_density * per_input;
        check!(
            density <= 1e6,
            "input_density",
            "small enough to move the level by at most 1e6 counts per square root of second"
        );
        let wander = noise.offset_wander * per_input;
        check!(
            wander <= 1e6,
            "offset_wander",
            "small enough to change the drift by at most 1e6 counts/s per square root of second"
        );
        let flicker = noise.input_flicker * per_input;
        check!(flicker <= 1e6, "input_flicker", "small enough to change the drift by at most 1e6 counts/s");
        let rate_limit = circuit.drift_limit_v_per_s() / converter.lsb_v;
        check!(rate_limit <= 1e9, "offset_limit_v", "such that, with bias_limit_a, the drift is at most 1e9 counts/s");

        let per_current = 1.0 / (circuit.capacitance_f * converter.lsb_v);
        let warmth = match circuit.temperature_law {
            TemperatureLaw::Unknown => WarmthLaw::Unknown,
            TemperatureLaw::Offset { limit_v_per_k } => {
                let limit = limit_v_per_k / circuit.offset_resistance_ohm() * per_current / 1000.0;
                WarmthLaw::Linear { coefficient_var: (limit * limit / 3.0) as f32 }
            }
            TemperatureLaw::Junction { doubling_k } => {
                let limit = circuit.bias_limit_a * per_current / 1000.0;
                WarmthLaw::Junction {
                    coefficient_var: (limit * limit / 3.0) as f32,
                    doublings_per_millikelvin: (1.0 / (1000.0 * doubling_k)) as f32,
                }
            }
        };
        let low = ceil(converter.code(circuit.rail_low_v));
        let high = floor(converter.code(circuit.rail_high_v));
        let usable = (
            if low > converter.code_min { low } else { converter.code_min + 1 },
            if high < converter.code_max { high } else { converter.code_max - 1 },
        );
        check!(
            usable.1 as i64 - usable.0 as i64 >= 8,
            "rail_high_v",
            "such that at least 8 codes lie between the rails"
        );
        let span = (usable.1 as i64 - usable.0 as i64) as f64;
        let tolerance = match policy.arrival_tolerance_v {
            Some(volts) => volts / converter.lsb_v,
            None => 0.01 * span,
        };
        let reset_code = converter.code(circuit.reset_level_v);
        check!(
            reset_code >= usable.0 as f64 && reset_code <= usable.1 as f64,
            "reset_level_v",
            "inside the converter's range and the rails (volt)"
        );
        let opened_tolerance = tolerance + 5.0 * circuit.pedestal_u_v / converter.lsb_v;
        let opened_code = converter.code(circuit.reset_level_v + circuit.pedestal_v);

        let worst_rate = match policy.worst_input {
            Some(worst) => worst * per_input + rate_limit,
            None => 0.0,
        };
        let per_tick_q16 = worst_rate / converter.tick_hz * 65536.0;
        check!(per_tick_q16 <= 1e9, "worst_input", "small enough for at most 15,000 counts per tick");
        // An input that swings at its fastest: a sine's slew has half the square of its peak (GUM 4.3.5, U-shaped).
        let bend_var = match policy.input_slew {
            Some(slew) => {
                let bend = 0.5 * slew * per_input;
                check!(
                    bend <= 1e9,
                    "input_slew",
                    "small enough to bend the level by at most 2e9 counts per square second"
                );
                Some((bend * bend / 2.0) as f32)
            }
            None => None,
        };
        let block_ticks = policy.zero_block_s * converter.tick_hz;
        check!(block_ticks <= 2e9, "zero_block_s", "at most 2e9 ticks of the counter");
        // Without blocks the sample period is not known: a millisecond is on the side of fewer false alarms.
        let innovation_s = if policy.zero_block_s > 0.0 { policy.zero_block_s } else { 1e-3 };
        let sigma = noise.readout_counts + QUANTISATION_RMS;
        let settling_s = policy.settling_s + 10.0 * circuit.switch_resistance_ohm * circuit.capacitance_f;
        Ok(Self {
            tick_s: (1.0 / converter.tick_hz) as f32,
            integral_per_count: 1.0 / counts_per_integral,
            readout_var: (noise.readout_counts * noise.readout_counts + 1.0 / 12.0) as f32,
            level_walk: (density * density / 2.0) as f32,
            rate_walk: (wander * wander) as f32,
            flicker: (flicker * flicker) as f32,
            rate_limit: rate_limit as f32,
            rate_prior_var: (rate_limit * rate_limit / 3.0) as f32,
            warmth,
            usable,
            reset_window: (floor(reset_code - tolerance), ceil(reset_code + tolerance)),
            opened_window: (floor(opened_code - opened_tolerance), ceil(opened_code + opened_tolerance)),
            settling_ticks: (settling_s * converter.tick_hz) as u32,
            gap_limit_ticks: (policy.gap_limit_s * converter.tick_hz) as u32,
            worst_rate_q16: per_tick_q16 as u64 + (worst_rate > 0.0) as u64,
            guard_counts: ceil(worst_rate * policy.latency_s + policy.guard_sigma * sigma),
            step_counts: if worst_rate > 0.0 { ceil(8.0 * sigma) } else { ceil(0.25 * span + 8.0 * sigma) },
            dithered: noise.readout_counts * noise.readout_counts + density * density / 2.0 * DITHER_S >= 0.25,
            block_ticks: block_ticks as u32,
            onset_threshold: cusum_threshold(policy.false_alarm_s / innovation_s),
            frozen_samples: if noise.readout_counts >= 0.5 { policy.frozen_samples } else { 0 },
            bend_var,
            edge_samples: policy.edge_samples,
        })
    }

    /// Largest movement of the level in `ticks` at the worst-case input, counts, rounded up; 0 if that is not known.
    pub(crate) fn worst_movement(&self, ticks: u32) -> i64 {
        // At most 2^30 * 2^32, below 2^63.
        ((self.worst_rate_q16 * u64::from(ticks)) >> 16).cast_signed() + i64::from(self.worst_rate_q16 > 0)
    }
}

/// A walk by half a count in this time dithers the readings as well as half a count of noise, s.
const DITHER_S: f64 = 0.1;

/// Rms error of rounding to whole counts, `1/sqrt(12)` (IEEE Std 1241).
const QUANTISATION_RMS: f64 = 0.288_675_134_594_812_9;

const fn floor(x: f64) -> i32 {
    let whole = x as i32;
    if (whole as f64) > x { whole.saturating_sub(1) } else { whole }
}

const fn ceil(x: f64) -> i32 {
    let whole = x as i32;
    if (whole as f64) < x { whole.saturating_add(1) } else { whole }
}
