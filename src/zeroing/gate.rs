//! Single samples too far off for noise.

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

/// Counts the samples that are off.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Gate {
    /// How many in a row, with their sign.
    astray: i8,
    since: u32,
}

impl Gate {
    /// Judges a sample that lies `off` counts from what was expected with `variance`, counts^2.
    pub(super) fn judge(&mut self, tick: u32, off: f32, variance: f32) -> Verdict {
        if off * off <= SPIKE_DEVIATIONS * SPIKE_DEVIATIONS * variance {
            self.astray = 0;
            return Verdict::Noise;
        }
        let sign = if off > 0.0 { 1 } else { -1 };
        if self.astray.signum() != sign {
            self.astray = 0;
            self.since = tick;
        }
        self.astray = self.astray.saturating_add(sign);
        if self.astray.saturating_abs() >= ONSET_SAMPLES { Verdict::Onset(self.since) } else { Verdict::Spike }
    }
}
