//! Totals across resets and holds: what was measured, what was interpolated, and the variance they added.

use crate::estimate::{After, Before, LEVEL_VARIANCE_MAX, Sum};
use crate::math::{self, to_q16};

/// Whether 2^-16 counts are more than the books of a run are sure to take without saturating: 2^46 counts.
pub(crate) fn is_past_books(q16: i64) -> bool {
    q16.unsigned_abs() > 1 << 62
}

/// What interruptions have carried over, in 2^-16 counts of output movement.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub(crate) struct Ledger {
    /// Drop of the level across the interruptions, to be added back.
    pub(crate) carried_q16: i64,
    /// Movement that the lines say there would have been during dead time, drift included.
    pub(crate) interpolated_q16: i64,
    /// The drift's share of it.
    pub(crate) dead_drift_q16: i64,
    /// Variance from the fits beside the interruptions and from the interpolation, counts^2.
    pub(crate) dead_time_var: Sum,
    /// How much of the pedestal is in the total: its error adds up from reset to reset.
    pub(crate) pedestal_lever: Sum,
    /// Change of the run's walk variance, counts^2; may be negative.
    pub(crate) walk_var: Sum,
}

/// How well a dead time could be bridged.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Bridged {
    /// From both sides.
    Interpolated,
    /// The slope of one side or of both is unknown: the input during the dead time is a guess.
    Guessed,
}

impl Ledger {
    /// Bridges an interruption with `dead_s` seconds of dead time, to whose middle `after` is extrapolated.
    ///
    /// The lines before and after meet in the middle of the dead time: drop `= before - after` at the switching
    /// instants, and interpolated input `= dead (slope before + slope after) / 2`. Where the slopes differ by more than
    /// their noise, the input changed at an unknown instant in between: a rectangular distribution of the full width
    /// `|difference| dead`, variance `width^2 / 12` (GUM 4.3.7).
    ///
    /// Where a slope is not known, nothing is taken for input: the level is carried over, the dead time adds its drift
    /// at `rate`, and what the known slope would have added is the uncertainty.
    pub(crate) fn bridge(
        &mut self,
        before: &Before,
        after: &After,
        dead_s: f32,
        rate: f32,
        level_walk: f32,
    ) -> Bridged {
        let half = math::scaled(dead_s, -1);
        let (slopes, bridged) = match (before.edge.slope, after.edge.slope) {
            (Some(b), Some(a)) => ((b, a), Bridged::Interpolated),
            (Some(s), None) | (None, Some(s)) => ((s, s), Bridged::Guessed),
            (None, None) => ((0.0, 0.0), Bridged::Guessed),
        };
        let drifted = to_q16(dead_s * rate);
        let interpolated = match bridged {
            Bridged::Interpolated => to_q16(half * (slopes.0 + slopes.1)),
            Bridged::Guessed => drifted,
        };
        let difference = slopes.0 - slopes.1;
        let noise = before.slope_var + after.slope_var;
        let changed = match bridged {
            Bridged::Interpolated => difference * difference - noise,
            Bridged::Guessed => slopes.0 * slopes.0 * 12.0,
        };
        let whole = before.edge.anchor_q16.saturating_sub(after.edge.anchor_q16);
        let rest = to_q16(before.edge.level_at_instant(slopes.0) - after.edge.level_at_instant(slopes.1));
        self.carried_q16 = self.carried_q16.saturating_add(whole.saturating_add(rest));
        self.interpolated_q16 = self.interpolated_q16.saturating_add(interpolated);
        self.dead_drift_q16 = self.dead_drift_q16.saturating_add(drifted);
        let input = if changed > 0.0 { changed * dead_s * dead_s * (1.0 / 12.0) } else { 0.0 };
        let (before_var, before_walk) = before.variances(half);
        self.dead_time_var.add(before_var + after.readout_var + input, LEVEL_VARIANCE_MAX);
        self.pedestal_lever.add(after.hinted, LEVEL_VARIANCE_MAX);
        // With the switch closed the level does not walk, but the run is charged for its whole duration.
        let walk = before_walk + after.walk_var - level_walk * dead_s;
        self.walk_var.add(walk, LEVEL_VARIANCE_MAX);
        bridged
    }

    /// Whether so much was carried that it may have come to the end of its range: 2^46 counts.
    pub(crate) fn is_full(&self) -> bool {
        is_past_books(self.carried_q16) || is_past_books(self.interpolated_q16)
    }

    /// Carried and interpolated movement together, 2^-16 counts.
    pub(crate) fn total_q16(&self) -> i64 {
        self.carried_q16.saturating_add(self.interpolated_q16)
    }
}
