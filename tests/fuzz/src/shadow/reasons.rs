//! Sets of reasons.

use brimline::Reason;

pub(super) type Set = u16;

pub(super) const fn only(reason: Reason) -> Set {
    1 << reason as u16
}

pub(super) fn set_of(reasons: impl Iterator<Item = Reason>) -> Set {
    reasons.map(only).fold(0, |set, reason| set | reason)
}

pub(super) fn names(set: Set) -> Vec<Reason> {
    Reason::ALL.into_iter().filter(|reason| set & only(*reason) != 0).collect()
}

/// What a reading alone may show and take back: by its closed value, or by the line after a reset, which is final only
/// when its samples are complete.
pub(super) const PROVISIONAL: Set =
    only(Reason::Inconsistent) | only(Reason::DriftOutsideLimits) | only(Reason::DeadTime) | only(Reason::OutOfRange);
