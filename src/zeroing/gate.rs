//! Single samples too far off for noise.

use crate::math;

/// Samples in a row and of one sign that are no spike but an onset.
const ONSET_SAMPLES: i8 = 3;
/// How far a sample may lie off, standard deviations.
const SPIKE_DEVIATIONS: f32 = 6.0;

/// What a sample is, by how far it lies off.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Verdict {
    Noise,
    Spike,
    /// The last of several in a row, which began at this tick.
    Onset(u32),
}

/// Where the next samples are expected, in integers, so that a sample costs no float.
#[derive(Clone, Copy, Debug)]
struct Aim {
    /// At the filter's instant, 2^-16 counts.
    level_q16: i64,
    /// Drift in `2^shift` ticks, 2^-16 counts.
    drift_q16: i64,
    shift: u8,
    /// How far off is still noise, 2^-16 counts.
    reach_q16: u64,
    /// For so many ticks from the filter's instant.
    ticks: u64,
}

/// Judges samples, and counts those that are off.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Gate {
    aim: Option<Aim>,
    /// How many in a row, with their sign.
    astray: i8,
    since: u32,
}

impl Gate {
    /// Expects levels `level_q16` (2^-16 counts) and onward by `rate` (counts per tick), for up to `ticks` from now, at
    /// the end of which they have the variance `variance` (counts^2).
    pub(super) fn aim(&mut self, level_q16: i64, rate: f32, ticks: u64, variance: f32) {
        let shift = (64 - ticks.leading_zeros()).min(40) as u8;
        self.aim = Some(Aim {
            level_q16,
            drift_q16: (rate * 65536.0 * (1_u64 << shift) as f32) as i64,
            shift,
            reach_q16: (SPIKE_DEVIATIONS * 65536.0 * math::sqrt(variance)) as u64,
            ticks,
        });
    }

    /// Whether a sample so many ticks after the filter's instant is beyond what was aimed at.
    pub(super) fn is_beyond(&self, ticks: u64) -> bool {
        self.aim.is_some_and(|aim| ticks > aim.ticks)
    }

    /// Whether nothing is expected yet.
    pub(super) fn is_open(&self) -> bool {
        self.aim.is_none()
    }

    /// Judges a sample at `tick`, so many ticks after the filter's instant. While too little is known to tell, all is
    /// noise.
    pub(super) fn judge(&mut self, tick: u32, level_q16: i64, ticks: u64) -> Verdict {
        let Some(aim) = self.aim else { return Verdict::Noise };
        // Steep drifts over long blocks of a fast counter: low bits give way.
        let cut = aim.shift.saturating_sub(22);
        let drifted_q16 = (aim.drift_q16 >> cut).saturating_mul(ticks.cast_signed()) >> (aim.shift - cut);
        let off_q16 = level_q16.saturating_sub(aim.level_q16).saturating_sub(drifted_q16);
        if off_q16.unsigned_abs() <= aim.reach_q16 {
            self.astray = 0;
            return Verdict::Noise;
        }
        let sign = if off_q16 > 0 { 1 } else { -1 };
        if self.astray.signum() != sign {
            self.astray = 0;
            self.since = tick;
        }
        self.astray = self.astray.saturating_add(sign);
        if self.astray.saturating_abs() >= ONSET_SAMPLES { Verdict::Onset(self.since) } else { Verdict::Spike }
    }
}
