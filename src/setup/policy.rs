//! What the crate should do where the board leaves a choice.

use crate::error::{SetupError, check};

/// Most samples a straight-line fit beside a reset may use.
pub(crate) const EDGE_SAMPLES_MAX: usize = 16;

/// Choices that are the user's. Start from [`Policy::DEFAULT`].
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Policy {
    /// Time over which samples of a zero are averaged before the filter sees them, s: 0 (not at all) to 60. Whole mains
    /// periods keep hum out; 0.1 s holds whole periods of 50 and 60 Hz. A block ends after 65,535
    /// samples at the latest.
    pub zero_block_s: f64,
    /// Mean time between false alarms of the watch for input during a zero, s: 1 to 1e12.
    pub false_alarm_s: f64,
    /// Samples in the straight-line fits before and after a reset: 2 to 16. Fewer follow a fast input better, more
    /// average better.
    pub edge_samples: u8,
    /// Longest time between samples, and longest time with the reset switch closed, that leaves a run whole, s: above
    /// 0, and below half the counter's span. Between samples at most 16 time constants of a leak, if that is less.
    pub gap_limit_s: f64,
    /// Equal readings in a row that mean a dead converter: 0 (never) to 65535. Only watched where `readout_counts` is
    /// at least 0.5: a quieter channel may rightly repeat itself.
    pub frozen_samples: u16,
    /// Largest magnitude of the input that the design allows, input units; `None`: unknown. With it the crate advises
    /// resets and notices a level that jumped; without it only a jump by a quarter of the usable span is noticed. A
    /// design constant, never an estimate.
    pub worst_input: Option<f64>,
    /// Fastest change of the input that the design expects, input units/s; `None`: unknown. It tells how far the input
    /// may bend beside a reset. Without it only a bend that stands out of the noise is seen, and one that just does not
    /// is missing from the uncertainty: where dead time dominates the budget and the input changes, give it, or take
    /// fewer samples. `edge_samples` should span no more than a sixth of the period of the fastest change.
    pub input_slew: Option<f64>,
    /// Time from a request to the reset switch closing, s: 0 to 3600.
    pub latency_s: f64,
    /// How many standard deviations of the readout the reset advice keeps from the rail: 0 to 100.
    pub guard_sigma: f64,
    /// Time the amplifier needs to follow the closed switch besides slewing, s: 0 to 3600. For how long the switch has
    /// to stay closed see [`Setup::min_on_time_s`](crate::Setup::min_on_time_s).
    pub settling_s: f64,
    /// Resets in a row that may fail before the switch is given up: 1 to 255. Until then another is asked for; from
    /// then on none, and every run that starts or goes on has the reason `SwitchFailed` until
    /// [`Channel::switch_repaired`](crate::Channel::switch_repaired).
    pub reset_attempts: u8,
    /// How far from the reset level a reset may arrive, V: above 0; `None`: one hundredth of the usable span.
    pub arrival_tolerance_v: Option<f64>,
}

impl Policy {
    /// Blocks of 0.1 s, a false alarm in four months of zeros, fits of 16 samples, gaps and resets up to 1 s, 64 equal
    /// readings mean frozen, no worst-case input or slew known, 4 sigma of guard, 1 ms of settling, 3 attempts at a
    /// reset.
    pub const DEFAULT: Self = Self {
        zero_block_s: 0.1,
        false_alarm_s: 1e7,
        edge_samples: 16,
        gap_limit_s: 1.0,
        frozen_samples: 64,
        worst_input: None,
        input_slew: None,
        latency_s: 0.0,
        guard_sigma: 4.0,
        settling_s: 1e-3,
        reset_attempts: 3,
        arrival_tolerance_v: None,
    };

    pub(super) const fn validate(&self, tick_hz: f64) -> Result<(), SetupError> {
        check!(self.zero_block_s >= 0.0 && self.zero_block_s <= 60.0, "zero_block_s", "0 to 60 (second)");
        check!(self.false_alarm_s >= 1.0 && self.false_alarm_s <= 1e12, "false_alarm_s", "1 to 1e12 (second)");
        check!(self.edge_samples >= 2 && self.edge_samples as usize <= EDGE_SAMPLES_MAX, "edge_samples", "2 to 16");
        check!(
            self.gap_limit_s > 0.0 && self.gap_limit_s * tick_hz < 2_147_483_648.0,
            "gap_limit_s",
            "above 0 and below half the counter's span, 2^31 / tick_hz (second)"
        );
        if let Some(worst) = self.worst_input {
            check!(worst > 0.0 && worst <= 1e6, "worst_input", "above 0 and at most 1e6 (input units)");
        }
        if let Some(slew) = self.input_slew {
            check!(slew >= 0.0 && slew <= 1e6, "input_slew", "0 to 1e6 (input units per second)");
        }
        check!(self.latency_s >= 0.0 && self.latency_s <= 3600.0, "latency_s", "0 to 3600 (second)");
        check!(self.guard_sigma >= 0.0 && self.guard_sigma <= 100.0, "guard_sigma", "0 to 100");
        check!(self.settling_s >= 0.0 && self.settling_s <= 3600.0, "settling_s", "0 to 3600 (second)");
        check!(self.reset_attempts >= 1, "reset_attempts", "1 to 255");
        if let Some(tolerance) = self.arrival_tolerance_v {
            check!(tolerance > 0.0 && tolerance <= 1e3, "arrival_tolerance_v", "above 0 and at most 1000 (volt)");
        }
        Ok(())
    }
}
