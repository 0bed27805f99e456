//! Figures and decisions that no other test holds to a number: each of these fails when one term of the code is left
//! out.
#![allow(clippy::disallowed_methods, reason = "a reference on the host computes in f64; only src must give equal bits")]

mod script;

#[path = "figures/between_modes.rs"]
mod between_modes;
#[path = "figures/blocks.rs"]
mod blocks;
#[path = "figures/edges.rs"]
mod edges;
#[path = "figures/noise_seen.rs"]
mod noise_seen;
#[path = "figures/spikes_and_onsets.rs"]
mod spikes_and_onsets;
#[path = "figures/undithered.rs"]
mod undithered;
#[path = "figures/warmth.rs"]
mod warmth;

use brimline::{Charge, Event};
use script::Script;

/// In counts.
fn counts(charge: Charge) -> f64 {
    charge.as_coulombs() / script::COULOMBS_PER_COUNT
}

/// Drift and its standard uncertainty, counts/s.
fn drift(script: &Script<'_>) -> (f64, f64) {
    let drift = script.channel.drift();
    let lsb_v = script::CONVERTER.lsb_v;
    (drift.value.as_volts_per_second() / lsb_v, drift.u.as_volts_per_second() / lsb_v)
}

/// How often something was told.
fn told(script: &Script<'_>, event: Event) -> usize {
    script.notices.iter().filter(|(_, e)| *e == event).count()
}

/// Within a share of what is expected.
#[track_caller]
fn assert_near(value: f64, expected: f64, share: f64) {
    assert!((value / expected - 1.0).abs() <= share, "{value:e} instead of {expected:e}");
}
