//! A drift that is not what it was.

/// How the drift that a zero found differs from the one expected.
#[derive(Clone, Copy, Debug)]
pub(crate) struct RateChange {
    /// Change of the estimate, counts/s, and its variance if the drift has not changed.
    pub(crate) off: f32,
    pub(crate) off_var: f32,
    /// How much of a change of the drift the estimate has followed.
    pub(crate) share: f32,
}

impl RateChange {
    /// The time constant of a decay that explains the change of a level that is `risen` counts farther from the reset
    /// level than it was in the zero before, s; `None` if it needs no explaining, or not that one.
    pub(crate) fn decay_s(&self, risen: f32) -> Option<u32> {
        let clear = self.off * self.off > 25.0 * self.off_var && self.off * risen < 0.0;
        clear.then(|| (-risen * self.share / self.off) as u32)
    }
}
