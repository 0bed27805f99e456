//! How true the uncertainty is where the circuit has leak, soakage, holds and a known pedestal: seeded Monte Carlo on a
//! simulated network. `--nocapture` shows the tables as Markdown; `BRIMLINE_TRIALS=2000` makes them full-size.
#![allow(clippy::disallowed_methods, reason = "a reference on the host computes in f64; only src must give equal bits")]

mod common;

#[path = "circuit_honesty/hold.rs"]
mod hold;
#[path = "circuit_honesty/leak.rs"]
mod leak;
#[path = "circuit_honesty/pedestal.rs"]
mod pedestal;
#[path = "circuit_honesty/score.rs"]
mod score;
#[path = "circuit_honesty/soakage.rs"]
mod soakage;
#[path = "circuit_honesty/together.rs"]
mod together;

use brimline::Circuit;
use common::board::{Board, Character};

/// Readout noise and random walk that both count in a zero of some seconds.
const WHITE_AND_WALK: Character = Character { readout: 1.0, walk: 0.5, wander: 0.0, drift_limit: 15.0 };

/// 100 nF behind a current source of 10 Mohm, so that the amplifier's offset is at most 0.6 mV; nothing leaks or soaks
/// yet, and of the pedestal nothing is known.
fn board(character: &Character) -> Board {
    let board = Board::current(true, character);
    let circuit = Circuit {
        source_resistance_ohm: 0.01 * board.circuit.source_resistance_ohm,
        offset_limit_v: 0.01 * board.circuit.offset_limit_v,
        pedestal_u_v: None,
        ..board.circuit
    };
    Board { circuit, ..board }
}

/// Trials of each case: what the suite takes, or what the environment asks for.
fn trials(suite: u64) -> u64 {
    std::env::var("BRIMLINE_TRIALS").ok().and_then(|text| text.parse().ok()).unwrap_or(suite)
}
