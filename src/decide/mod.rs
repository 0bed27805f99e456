//! Decisions, apart from estimation.

pub(crate) mod reset;
