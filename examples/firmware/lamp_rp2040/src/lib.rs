//! The half of the lamp monitor that knows no chip, so that it can be tested on a host.
#![no_std]
#![deny(clippy::indexing_slicing, clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod board;
mod monitor;
mod plan;
mod report;
mod setup;

pub use board::{Board, Fault};
pub use monitor::Monitor;
pub use outbox::Outbox;
pub use setup::{CONVERSIONS, LAMP, PERIOD_US};
