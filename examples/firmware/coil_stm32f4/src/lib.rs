//! The half of the flux meter that knows no chip, so that it can be tested on a host.
#![no_std]
#![deny(clippy::indexing_slicing, clippy::unwrap_used, clippy::expect_used, clippy::panic)]

mod board;
mod button;
mod fluxmeter;
mod plan;
mod report;
mod setup;

pub use board::{Board, Fault, Taken};
pub use fluxmeter::Fluxmeter;
pub use outbox::Outbox;
pub use setup::{COIL, CONVERSIONS, PERIOD_TICKS, TICK_HZ};
