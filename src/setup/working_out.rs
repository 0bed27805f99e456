//! A set-up in counts, seconds and ticks: worked out when it is made, usually at compile time.

use super::derived::{Derived, WarmthLaw};
use super::{Circuit, Converter, Noise, Policy, SOAKAGE_BRANCHES, TemperatureLaw};
use crate::error::{SetupError, check};
use crate::estimate::cusum_threshold;
use crate::level::{BranchLaw, LeakLaw, SoakageLaw};

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
        let reset_code = converter.code(circuit.reset_level_v);
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
            // So does the part of a code by which the reset level lies beside the nearest: levels above it are whole.
            let beside = reset_code - floor(reset_code) as f64;
            let beside = if beside < 0.5 { beside } else { 1.0 - beside };
            leaking_limit = (leaking_v / converter.lsb_v + beside) / time_constant_s;
            rate_limit += leaking_limit;
        }
        let coarse_shift = coarse_shift(leak_per_tick);
        let coarse_tick = leak_per_tick * (1_u64 << coarse_shift) as f64;
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
        let readout_var = noise.readout_counts * noise.readout_counts + 1.0 / 12.0;
        let min_on_time_s = policy.settling_s + circuit.settling_time_s(span * converter.lsb_v, 0.5 * converter.lsb_v);
        let slewing_s = match circuit.slew_v_per_s {
            Some(slew) => span * converter.lsb_v / slew,
            None => 0.0,
        };
        let follow_s = policy.settling_s + slewing_s;
        check!(
            min_on_time_s < policy.gap_limit_s,
            "gap_limit_s",
            "longer than a reset has to last (Setup::min_on_time_s)"
        );
        check!(min_on_time_s * converter.tick_hz <= 4e9, "settling_s", "such that a reset lasts at most 4e9 ticks");
        let gap_limit_ticks = policy.gap_limit_s * converter.tick_hz;
        // Longest step, in time constants of the leak: what leaks is told from the levels at its ends, and kept levels
        // have 32 bits for what leaks and soaks while the samples of a line are taken.
        let longest =
            if leak_per_tick * gap_limit_ticks > LEAK_STEP { LEAK_STEP } else { leak_per_tick * gap_limit_ticks };
        let [a, b, c, d]: &[super::SoakageBranch; SOAKAGE_BRANCHES] = &circuit.soakage;
        let soaked = a.share + b.share + c.share + d.share;
        let width = converter.code_max.abs_diff(converter.code_min) as f64;
        let samples = policy.edge_samples as f64;
        let fine_bits = fine_bits(width, soaked + samples * longest);
        let room = (KEPT / (width * (1_u32 << fine_bits) as f64) - 1.0 - soaked) / samples;
        let longest = if longest > room { room } else { longest };
        let step_limit_ticks = if leak_per_tick > 0.0 { longest / leak_per_tick } else { gap_limit_ticks };
        let switch_tau_s = circuit.switch_resistance_ohm * circuit.capacitance_f;
        let pedestal = match circuit.pedestal_u_v {
            Some(u) => {
                let (pedestal, u) = (circuit.pedestal_v / converter.lsb_v, u / converter.lsb_v);
                Some((pedestal as f32, (u * u) as f32))
            }
            None => None,
        };
        Ok(Self {
            keeps_level: leak.is_none() && soakage.is_none(),
            tick_s: (1.0 / converter.tick_hz) as f32,
            ticks_per_s: converter.tick_hz as f32,
            integral_per_count: 1.0 / counts_per_integral,
            readout_var: readout_var as f32,
            level_walk: (density * density / 2.0) as f32,
            rate_walk: normal(wander * wander),
            scatter_walk: (density * density / 30.0 / converter.tick_hz) as f32,
            flicker: normal(flicker * flicker),
            rate_limit: rate_limit as f32,
            rate_prior_var: (rate_limit * rate_limit / 3.0) as f32,
            warmth,
            usable,
            reset_window: (floor(reset_code - tolerance), ceil(reset_code + tolerance)),
            opened_window: (floor(opened_code - opened_tolerance), ceil(opened_code + opened_tolerance)),
            settling_ticks: (min_on_time_s * converter.tick_hz) as u32,
            follow_ticks: (follow_s * converter.tick_hz) as u32,
            min_on_time_s,
            slewing_s: (slewing_s / span) as f32,
            per_switch_tau: if switch_tau_s > 0.0 { (1.0 / switch_tau_s) as f32 } else { 0.0 },
            reset_attempts: policy.reset_attempts,
            pedestal,
            ktc_var: (BOLTZMANN * ROOM_K / circuit.capacitance_f / (converter.lsb_v * converter.lsb_v)) as f32,
            step_limit_ticks: step_limit_ticks as u32,
            gap_limit_ticks: gap_limit_ticks as u32,
            worst_rate_q16: per_tick_q16 as u64 + (worst_rate > 0.0) as u64,
            guard_counts: ceil(worst_rate * policy.latency_s + policy.guard_sigma * sigma),
            step_counts: if worst_rate > 0.0 { ceil(8.0 * sigma) } else { ceil(0.25 * span + 8.0 * sigma) },
            dithered: noise.readout_counts * noise.readout_counts + density * density / 2.0 * DITHER_S >= 0.25,
            block_ticks: block_ticks as u32,
            onset_threshold: cusum_threshold(policy.false_alarm_s / innovation_s),
            frozen_samples: if noise.readout_counts >= 0.5 { policy.frozen_samples } else { 0 },
            bend_var,
            edge_samples: policy.edge_samples,
            fine_bits,
            linearity: converter.linearity,
            reset_q16: (reset_code * 65536.0) as i64,
            leak,
            soakage,
            leak_per_s: (leak_per_tick * converter.tick_hz) as f32,
            coarse_shift: if leak.is_some() { Some(coarse_shift) } else { None },
            linearity_var: (converter.linearity_u_counts * converter.linearity_u_counts) as f32,
            leak_walk: (readout_var * coarse_tick * coarse_tick) as f32,
            terms_u_rel: [circuit.leak_u_rel as f32, circuit.soakage_u_rel as f32],
            gain_var_rel: (circuit.gain_u_rel * circuit.gain_u_rel + converter.lsb_u_rel * converter.lsb_u_rel) as f32,
            droop_limit: droop_limit as f32,
            droop_prior_var: (droop_limit * droop_limit / 3.0) as f32,
        })
    }
}

/// Longest step over which what leaks can be told from the levels at its ends, time constants.
const LEAK_STEP: f64 = 16.0;

/// A variance as `f32`; 0 where one over it would be infinite.
const fn normal(variance: f64) -> f32 {
    if variance < 1e-30 { 0.0 } else { variance as f32 }
}

/// Boltzmann constant, J/K (SI Brochure, 9th edition: exact), and the temperature that kTC noise is reckoned for.
const BOLTZMANN: f64 = 1.380_649e-23;
const ROOM_K: f64 = 300.0;

/// A walk by half a count in this time dithers the readings as well as half a count of noise, s.
const DITHER_S: f64 = 0.1;

/// Rms error of rounding to whole counts, `1/sqrt(12)` (IEEE Std 1241).
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

/// How far the counter's ticks are coarsened for squares: to between 2^17 and 2^18 in a time constant of the leak. Of
/// shorter steps the noise that leaks is less than a thousandth of a sample's; and the longest fill a sum after 2^20.
const fn coarse_shift(leak_per_tick: f64) -> u8 {
    let ticks = if leak_per_tick > 0.0 { (1.0 / leak_per_tick) as u64 } else { 0 };
    let bits = 64 - ticks.leading_zeros();
    if bits > 18 { (bits - 18) as u8 } else { 0 }
}

/// How far levels that are kept in 32 bits may lie apart.
const KEPT: f64 = 2_147_483_648.0;

/// Bits of a fraction that 32 bits have to spare for a converter's width and for so many widths more that leak and
/// soak; at least 3 where there is room for them and one more width, at most 8.
const fn fine_bits(width: f64, more: f64) -> u8 {
    let (mut bits, mut all) = (8, (1.0 + more) * 256.0);
    while bits > 0 && width * all > KEPT && (bits > 3 || width * 2.0 * (1_u32 << bits) as f64 > KEPT) {
        (bits, all) = (bits - 1, all / 2.0);
    }
    bits
}

const fn floor(x: f64) -> i32 {
    let whole = x as i32;
    if (whole as f64) > x { whole.saturating_sub(1) } else { whole }
}

const fn ceil(x: f64) -> i32 {
    let whole = x as i32;
    if (whole as f64) < x { whole.saturating_add(1) } else { whole }
}
