//! Value, uncertainty, what it is made of, and whether it can be trusted.

use crate::math;
use crate::notice::{Reasons, Trust};
use crate::quantity::{Integral, Measured};
use crate::run::Run;
use crate::setup::Setup;
use crate::total::Total;

/// What the variance of an estimate is made of, as standard uncertainties in the reading's unit.
///
/// The squares add up to `u^2`. At stop the parts are exact. For a closed value the closing zero mixes the sources; its
/// variance is exact, and apportioned: input noise of the run first, then the levels at both ends (readout), the rest
/// is drift.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Budget<Q> {
    /// Readout noise of the levels at both ends of the run.
    pub readout: Q,
    /// White noise of the input, integrated over the run.
    pub input_noise: Q,
    /// Uncertainty of the drift, times the duration, and its wander.
    pub drift: Q,
    /// Fits beside the resets, pedestals, and interpolation of the input while the switch was closed.
    pub dead_time: Q,
    /// Uncertain figures of leak and soakage, and the readout noise that the leak integrates. Runs of one board are
    /// wrong alike by the former: do not add them as if they were independent.
    pub leak_and_soakage: Q,
    /// Relative uncertainty of the gain, times the value.
    pub scale: Q,
}

/// One estimate of a run's integral.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Estimate<Q> {
    /// The integral with its standard uncertainty.
    pub integral: Measured<Q>,
    /// What the uncertainty is made of.
    pub budget: Budget<Q>,
}

impl<Q: Integral> Estimate<Q> {
    fn new(setup: &Setup<Q>, total: &Total) -> Self {
        let per_count = setup.derived().integral_per_count;
        let counts = from_q16(total.movement_q16);
        let scale = counts as f32 * counts as f32 * setup.derived().gain_var_rel;
        let variance = total.variance() + scale;
        let size = if per_count < 0.0 { -per_count } else { per_count };
        let u = |variance: f32| Q::from_si_value(f64::from(math::sqrt(variance)) * size);
        Self {
            integral: Measured::new(Q::from_si_value(counts * per_count), u(variance)),
            budget: Budget {
                readout: u(total.readout),
                input_noise: u(total.input_noise),
                drift: u(total.drift),
                dead_time: u(total.dead_time),
                leak_and_soakage: u(total.leak_and_soakage),
                scale: u(scale),
            },
        }
    }
}

/// Counts as a number; exact below 2^37 counts.
fn from_q16(q16: i64) -> f64 {
    q16 as f64 * (1.0 / 65536.0)
}

/// A run's reading: what it is now, or what it was when it stopped and what the zero after it made of that.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Reading<Q> {
    /// From everything up to the run's last integrating sample; in a running run, up to the latest sample.
    pub at_stop: Estimate<Q>,
    /// With the zero after the run as well, up to its latest sample; `None` until that zero begins.
    pub closed: Option<Estimate<Q>>,
    /// Part of the latest estimate that was measured.
    pub measured: Q,
    /// Part of the latest estimate that was interpolated over dead time, drift taken off.
    pub interpolated: Q,
    /// What leak and soakage had taken from the run, and was put back.
    pub restored: Q,
    /// What the drift would have added to the value at stop, and was taken off.
    pub drift_removed: Q,
    /// Samples of the zero after the run that were too far off and left out; stands at 65,535 if there were more.
    pub spikes: u16,
    /// Resets within the run; stands at 2^32 - 1 if there were more.
    pub resets: u32,
    /// Counter value when the run started.
    pub start_tick: u32,
    /// Counter value of the run's last integrating sample so far.
    pub end_tick: u32,
    /// From start to the last integrating sample, resets and holds included, s. Exact to 2^53 ticks, 285 years at 1
    /// MHz.
    pub elapsed_s: f64,
    /// Of that the time in holds, s.
    pub held_s: f64,
    /// How much warmer the board was at the last integrating sample than at the zero before, mK; `None` if not
    /// measured.
    pub warming_mk: Option<i32>,
    /// Whether the zeros so far were enough to show noise figures of the set-up that are wrong by a factor of 3: 64
    /// blocks and 6 zeros that have ended. Until then `u` is as true as the figures.
    pub noise_tested: bool,
    /// How far the reading can be trusted.
    pub trust: Trust,
    /// Why it is not good.
    pub reasons: Reasons,
}

impl<Q: Integral> Reading<Q> {
    pub(crate) fn new(
        setup: &Setup<Q>,
        run: &Run,
        at_stop: &Total,
        closed: Option<&Total>,
        noise_tested: bool,
    ) -> Self {
        let latest = closed.unwrap_or(at_stop);
        let integral = |q16: i64| Q::from_si_value(from_q16(q16) * setup.derived().integral_per_count);
        let interpolated_q16 = run.ledger.interpolated_q16.saturating_sub(run.ledger.dead_drift_q16);
        let ticks = run.driven.ticks.saturating_add(run.held);
        Self {
            at_stop: Estimate::new(setup, at_stop),
            closed: closed.map(|total| Estimate::new(setup, total)),
            measured: integral(latest.movement_q16.saturating_sub(interpolated_q16)),
            interpolated: integral(interpolated_q16),
            restored: integral(run.restored_q16),
            drift_removed: integral(run.drift_q16),
            spikes: run.spikes,
            resets: run.resets,
            start_tick: run.start_tick,
            end_tick: run.end_tick,
            elapsed_s: ticks as f64 / setup.converter().tick_hz,
            held_s: run.held as f64 / setup.converter().tick_hz,
            warming_mk: run.warming,
            noise_tested,
            trust: run.reasons.trust(),
            reasons: run.reasons,
        }
    }

    /// The better of the two estimates: closed if there is one, at stop otherwise.
    pub fn latest(&self) -> &Estimate<Q> {
        self.closed.as_ref().unwrap_or(&self.at_stop)
    }
}
