//! A device's life at full speed: totals, drift and counters over ten years at ten samples a second.
//!
//! The suite runs a season. `BRIMLINE_YEARS=10 cargo test --release --test long_life -- --nocapture` runs ten years of
//! each case and a billion updates of the filter, tells how far it is on stderr, and prints the tables.
#![allow(clippy::disallowed_methods, reason = "a reference on the host computes in f64; only src must give equal bits")]

mod script;

#[path = "long_life/books.rs"]
mod books;
#[path = "long_life/decade.rs"]
mod decade;
#[path = "long_life/endless.rs"]
mod endless;
#[path = "long_life/ends.rs"]
mod ends;
#[path = "long_life/extent.rs"]
mod extent;
#[path = "long_life/lamp.rs"]
mod lamp;
#[path = "long_life/noise.rs"]
mod noise;
#[path = "long_life/reference.rs"]
mod reference;
#[path = "long_life/sums.rs"]
mod sums;
#[path = "long_life/wraps.rs"]
mod wraps;
