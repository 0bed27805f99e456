//! What the estimator needs of a set-up, worked out once so that no sample pays for a division.

use super::{Circuit, Converter, Linearity, Noise, Policy, SOAKAGE_BRANCHES, TemperatureLaw};
use crate::error::{SetupError, check};
use crate::estimate::cusum_threshold;
use crate::level::{BranchLaw, LeakLaw, SoakageLaw};

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
    /// Ticks that the amplifier is given to follow the switch.
    pub(crate) follow_ticks: u32,
    pub(crate) min_on_time_s: f64,
    /// One over `R_on C`, 1/s; 0: not known.
    pub(crate) per_switch_tau: f32,
    /// Resets in a row that may fail.
    pub(crate) reset_attempts: u8,
    /// Step when the reset switch opens and its variance, counts and counts^2; `None`: unknown.
    pub(crate) pedestal: Option<(f32, f32)>,
    /// Noise that an opening switch freezes on the capacitor, `k T / C`, counts^2.
    pub(crate) ktc_var: f32,
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
    /// Bits of a fraction of a count with which samples are kept: as many as 32 bits have to spare for the converter's
    /// span, at most 8.
    pub(crate) fine_bits: u8,
    linearity: Option<&'static Linearity>,
    /// Reset level, 2^-16 counts.
    reset_q16: i64,
    pub(crate) leak: Option<LeakLaw>,
    pub(crate) soakage: Option<SoakageLaw>,
    /// One over the leak's time constant, 1/s; 0: no leak.
    pub(crate) leak_per_s: f32,
    /// Variance that the readout noise of one sample adds to the effective level through the leak, counts^2 per squared tick.
    pub(crate) leak_walk: f32,
    /// Relative standard uncertainties of what leaks and of what soaks.
    pub(crate) terms_u_rel: [f32; 2],
    /// Relative variance of the gain.
    pub(crate) gain_var_rel: f32,
    /// Droop that the data sheet allows, counts/s, and its variance, rectangular.
    pub(crate) droop_limit: f32,
    pub(crate) droop_prior_var: f32,
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
        let mut rate_limit = circuit.drift_limit_v_per_s() / converter.lsb_v;
        let mut leak = None;
        let (mut leak_per_tick, mut leaking_limit) = (0.0, 0.0);
        if let Some(time_constant_s) = circuit.leak_time_constant_s {
            leak = match LeakLaw::new(time_constant_s, converter.tick_hz) {
                Ok(law) => Some(law),
                Err(e) => return Err(e),
            };
            leak_per_tick = 1.0 / (time_constant_s * converter.tick_hz);
            // What leaks at the reset level, by the offsets of amplifier and converter, is drift as well.
            let leaking_v = circuit.offset_limit_v + 2.0 * converter.code_zero_u_v;
            leaking_limit = leaking_v / time_constant_s / converter.lsb_v;
            rate_limit += leaking_limit;
        }
        let soakage = match soakage(circuit, converter.tick_hz) {
            Ok(law) => law,
            Err(e) => return Err(e),
        };
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
        let droop_limit = circuit.bias_limit_a * per_current + leaking_limit;
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
        let tolerance = tolerance + 5.0 * converter.code_zero_u_v / converter.lsb_v;
        let opened_tolerance = match circuit.pedestal_u_v {
            Some(u) => tolerance + 5.0 * u / converter.lsb_v,
            None => tolerance,
        };
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
        let min_on_time_s = policy.settling_s + circuit.settling_time_s(span * converter.lsb_v, 0.5 * converter.lsb_v);
        let slewing_s = match circuit.slew_v_per_s {
            Some(slew) => span * converter.lsb_v / slew,
            None => 0.0,
        };
        let follow_s = policy.settling_s + slewing_s;
        let switch_tau_s = circuit.switch_resistance_ohm * circuit.capacitance_f;
        let pedestal = match circuit.pedestal_u_v {
            Some(u) => {
                let (pedestal, u) = (circuit.pedestal_v / converter.lsb_v, u / converter.lsb_v);
                Some((pedestal as f32, (u * u) as f32))
            }
            None => None,
        };
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
            settling_ticks: (min_on_time_s * converter.tick_hz) as u32,
            follow_ticks: (follow_s * converter.tick_hz) as u32,
            min_on_time_s,
            per_switch_tau: if switch_tau_s > 0.0 { (1.0 / switch_tau_s) as f32 } else { 0.0 },
            reset_attempts: policy.reset_attempts,
            pedestal,
            ktc_var: (BOLTZMANN * ROOM_K / circuit.capacitance_f / (converter.lsb_v * converter.lsb_v)) as f32,
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
            fine_bits: fine_bits(converter),
            linearity: converter.linearity,
            reset_q16: (reset_code * 65536.0) as i64,
            leak,
            soakage,
            leak_per_s: (leak_per_tick * converter.tick_hz) as f32,
            leak_walk: ((noise.readout_counts * noise.readout_counts + 1.0 / 12.0) * leak_per_tick * leak_per_tick)
                as f32,
            terms_u_rel: [circuit.leak_u_rel as f32, circuit.soakage_u_rel as f32],
            gain_var_rel: (circuit.gain_u_rel * circuit.gain_u_rel + converter.lsb_u_rel * converter.lsb_u_rel) as f32,
            droop_limit: droop_limit as f32,
            droop_prior_var: (droop_limit * droop_limit / 3.0) as f32,
        })
    }

    /// Variance of the mean of `samples` samples, counts^2: rounding that nothing dithers does not average.
    ///
    /// Within a block that walks, the mean knows less of its instant than this; by how much is of no account beside what
    /// the walk does to a run longer than the block.
    pub(crate) fn block_var(&self, samples: u16) -> f32 {
        if self.dithered { self.readout_var / f32::from(samples) } else { self.readout_var }
    }

    /// What the variance of one of many blocks in a row is worth: rounding that nothing dithers keeps its sign over them.
    pub(crate) fn serial_var(&self, block_var: f32) -> f32 {
        if self.dithered { block_var } else { 4.0 * block_var }
    }

    /// Added to the variance of a rate that `ticks` of samples have told, for rounding that nothing dithers, (counts/s)^2:
    /// of the levels at both ends, and of the level that leaks.
    pub(crate) fn rate_rounding_var(&self, ticks: u64) -> f32 {
        if self.dithered || ticks == 0 {
            return 0.0;
        }
        let known_s = ticks as f32 * self.tick_s;
        2.0 * QUANTISATION_VAR / (known_s * known_s) + self.leaked_rounding_var(1.0)
    }

    /// Variance of what rounding that nothing dithers makes leak in `seconds`, counts^2.
    pub(crate) fn leaked_rounding_var(&self, seconds: f32) -> f32 {
        let taus = seconds * self.leak_per_s;
        if self.dithered { 0.0 } else { QUANTISATION_VAR * taus * taus }
    }

    /// Whether figures of leak or soakage are uncertain.
    pub(crate) fn has_doubts(&self) -> bool {
        self.terms_u_rel != [0.0; 2]
    }

    /// The level that a straight converter would have given, 2^-16 counts.
    pub(crate) fn linear_q16(&self, code: i32) -> i64 {
        match self.linearity {
            Some(table) => table.linear_q16(code),
            None => i64::from(code) << 16,
        }
    }

    /// Whole counts of a level above the reset level.
    pub(crate) fn above_reset(&self, linear_q16: i64) -> i32 {
        // Codes and reset level are within 2^29 and the table's errors within 2^14.
        ((linear_q16 - self.reset_q16 + 0x8000) >> 16) as i32
    }

    /// Largest movement of the level in `ticks` at the worst-case input, counts, rounded up; 0 if that is not known.
    pub(crate) fn worst_movement(&self, ticks: u32) -> i64 {
        // At most 2^30 * 2^32, below 2^63.
        ((self.worst_rate_q16 * u64::from(ticks)) >> 16).cast_signed() + i64::from(self.worst_rate_q16 > 0)
    }
}

/// Boltzmann constant, J/K (SI Brochure, 9th edition: exact), and the temperature that kTC noise is reckoned for.
const BOLTZMANN: f64 = 1.380_649e-23;
const ROOM_K: f64 = 300.0;

/// A walk by half a count in this time dithers the readings as well as half a count of noise, s.
const DITHER_S: f64 = 0.1;

/// Variance of rounding to whole counts (IEEE Std 1241).
pub(crate) const QUANTISATION_VAR: f32 = 1.0 / 12.0;

/// Its root.
const QUANTISATION_RMS: f64 = 0.288_675_134_594_812_9;

/// The laws of the branches; `None` if there are none.
const fn soakage(circuit: &Circuit, tick_hz: f64) -> Result<Option<SoakageLaw>, SetupError> {
    let [a, b, c, d]: &[super::SoakageBranch; SOAKAGE_BRANCHES] = &circuit.soakage;
    let shares = a.share + b.share + c.share + d.share;
    match (
        BranchLaw::new(a, tick_hz),
        BranchLaw::new(b, tick_hz),
        BranchLaw::new(c, tick_hz),
        BranchLaw::new(d, tick_hz),
    ) {
        (Ok(a), Ok(b), Ok(c), Ok(d)) => Ok(if shares > 0.0 { Some([a, b, c, d]) } else { None }),
        (Err(e), ..) | (_, Err(e), ..) | (_, _, Err(e), _) | (.., Err(e)) => Err(e),
    }
}

/// Spare bits above the converter's span and a sign.
const fn fine_bits(converter: &Converter) -> u8 {
    let span = converter.code_max.abs_diff(converter.code_min);
    // At most 2^30, so no less than one leading zero.
    let spare = span.leading_zeros() - 1;
    if spare < 8 { spare as u8 } else { 8 }
}

const fn floor(x: f64) -> i32 {
    let whole = x as i32;
    if (whole as f64) > x { whole.saturating_sub(1) } else { whole }
}

const fn ceil(x: f64) -> i32 {
    let whole = x as i32;
    if (whole as f64) < x { whole.saturating_add(1) } else { whole }
}
