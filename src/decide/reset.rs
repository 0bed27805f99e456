//! When a reset is due.

use crate::setup::Derived;

/// Whether the level could reach a rail before a reset asked for at the next sample would take effect:
/// headroom at most `worst-case rate (sample period + latency) + z sigma`.
///
/// `movement` is the worst-case rate times the sample period, counts. Without a worst-case input in the policy nothing is advised,
/// nor at the reset level itself, where a reset changes nothing.
pub(crate) fn due(counts: i32, movement: i64, derived: &Derived) -> bool {
    let headroom =
        (i64::from(counts) - i64::from(derived.usable.0)).min(i64::from(derived.usable.1) - i64::from(counts));
    let guard = movement.saturating_add(i64::from(derived.guard_counts));
    let at_reset_level = counts >= derived.reset_window.0 && counts <= derived.reset_window.1;
    derived.worst_rate_q16 > 0 && headroom <= guard && !at_reset_level
}
