#![doc = include_str!("../README.md")]
#![no_std]
#![deny(missing_docs, unreachable_pub, clippy::disallowed_methods)]
// The core is total: nothing in it may panic.
#![cfg_attr(not(test), deny(clippy::indexing_slicing, clippy::unwrap_used, clippy::expect_used,))]

#[cfg(feature = "micromath")]
pub mod approximate;
mod channel;
mod clock;
mod decide;
mod droop;
mod error;
pub mod estimate;
mod health;
mod ledger;
mod level;
mod math;
mod notice;
mod notices;
mod quantity;
mod reading;
mod run;
mod sample;
mod setup;
#[cfg(feature = "embedded-hal")]
mod switches;
mod total;
pub mod unit;
mod verify;
mod window;
mod zeroing;

pub use channel::Channel;
pub use error::SetupError;
pub use notice::{Event, Notice, Reason, Reasons, Trust};
pub use notices::Notices;
pub use quantity::{Charge, Current, Flux, Integral, Measured, RadiantExposure, Temperature, Voltage, VoltageRate};
pub use reading::{Budget, Estimate, Reading};
pub use sample::{Mode, Sample, Step};
pub use setup::{Absorption, Circuit, Converter, Linearity, Noise, Policy, Setup, SoakageBranch, TemperatureLaw};
#[cfg(feature = "embedded-hal")]
pub use switches::Switches;
