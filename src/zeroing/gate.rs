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

/// Where the next samples are expected and how far off they may lie, and how many in a row were farther. In integers of
/// 32 bits, so that a sample costs no float.
#[derive(Clone, Copy, Debug)]
pub(super) struct Gate {
    /// At the filter's instant, fine steps (2^-8 count) above its whole counts.
    ahead: i32,
    /// Drift in `2^shift` ticks, 2^-16 fine steps, or 2^-4 where it is steep.
    drift: i32,
    is_steep: bool,
    /// How far off the noise of samples alone may take them, fine steps; `OPEN`: nothing is expected yet.
    reach: u32,
    since: u32,
    shift: u8,
    /// How many in a row were off, with their sign.
    astray: i8,
}

/// A reach that nothing exceeds.
const OPEN: u32 = u32::MAX;
/// Fine steps in a count.
const FINE: f32 = 256.0;

impl Default for Gate {
    fn default() -> Self {
        Self { ahead: 0, drift: 0, is_steep: false, reach: OPEN, since: 0, shift: 0, astray: 0 }
    }
}

/// How far noise of this variance (counts^2) takes a sample, fine steps.
pub(super) fn reach(variance: f32) -> u32 {
    (SPIKE_DEVIATIONS * FINE * variance * math::about_inverse_sqrt(variance)) as u32
}

impl Gate {
    /// Whether nothing is expected yet.
    pub(super) fn is_open(&self) -> bool {
        self.reach == OPEN
    }

    /// Noise of samples reaches so far, fine steps.
    pub(super) fn set_reach(&mut self, reach: u32) {
        self.reach = reach.min(OPEN - 1);
    }

    /// Expects levels `residual` counts above the filter's whole counts and onward by `rate` (counts per tick), for
    /// about so many ticks from the filter's instant.
    pub(super) fn aim(&mut self, residual: f32, rate: f32, ticks: u32) {
        self.shift = 12_u32.saturating_sub(ticks.leading_zeros()) as u8;
        self.ahead = (residual * FINE) as i32;
        let drift = rate * math::two_to(24 + i32::from(self.shift));
        // Past 2^7 counts in a shifted tick the fraction gives way.
        self.is_steep = math::abs(drift) >= math::two_to(31);
        self.drift = if self.is_steep { drift * math::two_to(-12) } else { drift } as i32;
    }

    /// How far a sample is off, fine steps, that is so many fine steps above the filter's whole counts and so many
    /// ticks after its instant.
    pub(super) fn off(&self, above: i32, ticks: u32) -> i32 {
        above.saturating_sub(self.ahead).saturating_sub(self.drifted(ticks))
    }

    fn drifted(&self, ticks: u32) -> i32 {
        let drifted = i64::from(self.drift) * i64::from(ticks >> self.shift);
        let drifted = if self.is_steep { drifted >> 4 } else { drifted >> 16 };
        i32::try_from(drifted).unwrap_or(if drifted < 0 { i32::MIN } else { i32::MAX })
    }

    /// Whether a sample that is so far off is no farther than the noise of samples reaches.
    pub(super) fn is_near(&self, off: i32) -> bool {
        off.unsigned_abs() <= self.reach
    }

    /// A sample was noise.
    pub(super) fn pass(&mut self) -> Verdict {
        self.astray = 0;
        Verdict::Noise
    }

    /// A sample at `tick` was more than noise.
    pub(super) fn refuse(&mut self, tick: u32, off: i32) -> Verdict {
        let sign = if off > 0 { 1 } else { -1 };
        if self.astray.signum() != sign {
            self.astray = 0;
            self.since = tick;
        }
        self.astray = self.astray.saturating_add(sign);
        if self.astray.saturating_abs() >= ONSET_SAMPLES { Verdict::Onset(self.since) } else { Verdict::Spike }
    }
}
