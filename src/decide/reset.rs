//! When a reset is due.

use crate::setup::Derived;

/// Whether the level could reach a rail before a reset asked for at the next sample would take effect:
/// headroom at most `worst-case rate (sample period + latency) + z sigma`.
///
/// `movement` is the worst-case rate times the sample period, counts. Without a worst-case input in the policy nothing
/// is advised, nor at the reset level itself, where a reset changes nothing.
pub(crate) fn due(counts: i32, movement: i64, derived: &Derived) -> bool {
    if derived.worst_rate_q16 == 0 {
        return false;
    }
    // Codes are within 2^29, but what is fed may be anything.
    let headroom = counts.saturating_sub(derived.usable.0).min(derived.usable.1.saturating_sub(counts));
    let guard = guard(movement, derived);
    let at_reset_level = counts >= derived.reset_window.0 && counts <= derived.reset_window.1;
    i64::from(headroom) <= guard && !at_reset_level
}

/// Headroom that is too little: what the worst-case input moves the level by, latency and readout noise, counts.
pub(crate) fn guard(movement: i64, derived: &Derived) -> i64 {
    movement.saturating_add(i64::from(derived.guard_counts))
}
