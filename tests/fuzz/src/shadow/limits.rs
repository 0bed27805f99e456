//! What a set-up allows, in counts and ticks.

use brimline::Setup;

use crate::board::Plain;

/// Where limits are a matter of rounding, on the side of letting pass.
pub(super) struct Limits {
    /// Longest step between samples, and longest time with the reset switch closed within a run.
    pub(super) step_ticks: f64,
    pub(super) reset_ticks: f64,
    /// What a level may move by: in a tick, and besides.
    pub(super) counts_per_tick: f64,
    pub(super) step: f64,
    pub(super) usable: (f64, f64),
    pub(super) codes: (i32, i32),
    pub(super) frozen: u32,
    pub(super) settled: f64,
    /// Codes that are taken for the reset level, and whether they are levels.
    reset: (f64, f64),
    straight: bool,
    pub(super) advises: bool,
}

impl Limits {
    pub(super) fn new<Q: Plain>(setup: &Setup<Q>) -> Self {
        let (circuit, converter, policy) = (setup.circuit(), setup.converter(), setup.policy());
        let noise = setup.noise().readout_counts;
        let leaking_v = circuit.offset_limit_v + 2.0 * converter.code_zero_u_v;
        let leaking = circuit.leak_time_constant_s.map_or(0.0, |tau| leaking_v / tau);
        let drift = (circuit.drift_limit_v_per_s() + leaking) / converter.lsb_v;
        let input = policy.worst_input.map(|worst| worst * circuit.gain().abs() / converter.lsb_v);
        let usable = (converter.code(circuit.rail_low_v), converter.code(circuit.rail_high_v));
        let span = usable.1.min(f64::from(converter.code_max)) - usable.0.max(f64::from(converter.code_min));
        let tolerance = policy.arrival_tolerance_v.map_or(0.01 * span, |volts| volts / converter.lsb_v);
        let tolerance = tolerance + 5.0 * converter.code_zero_u_v / converter.lsb_v + 2.0;
        // What leaks in a longer step cannot be told from its ends.
        let longest_s = policy.gap_limit_s.min(circuit.leak_time_constant_s.map_or(f64::INFINITY, |tau| 16.0 * tau));
        let reset_code = converter.code(circuit.reset_level_v);
        Self {
            step_ticks: longest_s * converter.tick_hz + 1.0,
            reset_ticks: policy.gap_limit_s * converter.tick_hz + 1.0,
            counts_per_tick: input.map_or(0.0, |input| (input + drift) / converter.tick_hz + 2.0 / 65536.0),
            step: 9.0 * (noise + 0.3) + 3.0 + if input.is_some() { 0.0 } else { 0.25 * span },
            usable,
            codes: (converter.code_min, converter.code_max),
            frozen: if noise >= 0.5 { u32::from(policy.frozen_samples) } else { 0 },
            settled: setup.min_on_time_s() * converter.tick_hz + 1.0,
            reset: (reset_code - tolerance, reset_code + tolerance),
            straight: converter.linearity.is_none(),
            advises: policy.worst_input.is_some(),
        }
    }

    fn near_reset(&self, counts: i32) -> bool {
        (self.reset.0..=self.reset.1).contains(&f64::from(counts))
    }

    /// Whether a settled level cannot be the reset level's.
    pub(super) fn elsewhere(&self, counts: i32) -> bool {
        self.straight && !self.near_reset(counts)
    }

    /// Whether a reset must be asked for: at a rail there is no headroom.
    pub(super) fn is_due(&self, counts: i32) -> bool {
        self.advises && self.at_rail(counts) && !self.near_reset(counts)
    }

    pub(super) fn at_rail(&self, counts: i32) -> bool {
        let (low, high) = self.usable;
        let code = f64::from(counts);
        counts <= self.codes.0 || counts >= self.codes.1 || code < low - 1.0 || code > high + 1.0
    }
}
