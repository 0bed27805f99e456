//! A resistor across the capacitor: runs of many time constants, with its figure exact and uncertain.

use brimline::{Circuit, Mode, Policy};
use rand::RngExt;
use rand_distr::StandardNormal;

use crate::common::board::{Board, Character};
use crate::common::plant::bench::{Flaws, Stay};
use crate::score::{Asked, Case, table};
use crate::{WHITE_AND_WALK, board, trials};

/// Where a steady input takes the output in the end, counts.
const LEVEL: f64 = 20_000.0;

const ZERO: Stay = (Mode::Zero, 10.0);

fn leaky(character: &Character, time_constant_s: f64, u_rel: f64) -> Board {
    let board = board(character);
    let circuit = Circuit { leak_time_constant_s: Some(time_constant_s), leak_u_rel: u_rel, ..board.circuit };
    Board { circuit, ..board }
}

fn script(run_s: f64) -> Vec<Stay> {
    vec![(Mode::Reset, 0.05), ZERO, (Mode::Integrate, run_s), ZERO]
}

/// With 8 counts of noise and 30 time constants of 0.3 s, what the leak makes of the noise is a third of the variance.
#[test]
fn an_exact_figure() {
    let noisy = Character { readout: 8.0, walk: 0.2, ..WHITE_AND_WALK };
    let quiet = Character { readout: 0.7, walk: 0.2, ..WHITE_AND_WALK };
    let mut cases = Vec::new();
    for (tau, taus, hz) in [
        (0.3, 1.0, 100.0),
        (0.3, 30.0, 100.0),
        (1.0, 1.0, 100.0),
        (1.0, 30.0, 100.0),
        (30.0, 1.0, 20.0),
        (30.0, 30.0, 10.0),
    ] {
        for (word, character) in [("quiet", quiet), ("noisy", noisy)] {
            let name = format!("{tau} s, {taus} tau, {word}");
            let case = Case::new(name, leaky(&character, tau, 0.0), script(tau * taus), LEVEL / tau);
            cases.push(Case { hz, ..case });
        }
    }
    let (_, faults) = table(&cases, trials(150));
    assert!(faults.is_empty(), "{faults:#?}");
}

#[test]
fn an_uncertain_figure() {
    let mut cases = Vec::new();
    for u_rel in [1e-4, 1e-3, 1e-2] {
        for (tau, run_s) in [(1.0, 5.0), (30.0, 30.0)] {
            let name = format!("{tau} s, off by {u_rel}");
            let case = Case::new(name, leaky(&WHITE_AND_WALK, tau, u_rel), script(run_s), LEVEL / tau);
            let flaws = Box::new(move |rng: &mut _| Flaws {
                leak: u_rel * RngExt::sample::<f64, _>(rng, StandardNormal),
                ..Flaws::default()
            });
            cases.push(Case { flaws, ..case });
        }
    }
    let (_, faults) = table(&cases, trials(150));
    assert!(faults.is_empty(), "{faults:#?}");
}

/// Codes that nothing dithers: of a level that stands, the rounding leaks on and on.
#[test]
fn rounding_that_nothing_dithers() {
    let character = Character { readout: 0.05, walk: 0.0, drift_limit: 0.5, ..WHITE_AND_WALK };
    // Not by whole codes above the level of the zeros, where the roundings would cancel.
    let case = Case::new("1 s, 20 tau, no dither", leaky(&character, 1.0, 0.0), script(20.0), LEVEL + 0.4);
    // It rightly stands still.
    let policy = Policy { frozen_samples: 0, ..Policy::DEFAULT };
    let (_, faults) = table(&[Case { policy, asked: Asked::AtLeast, ..case }], trials(150));
    assert!(faults.is_empty(), "{faults:#?}");
}

/// Resets, samples that are lost, and few of them to a time constant.
#[test]
fn resets_and_lost_samples() {
    let segment = (Mode::Integrate, 2.0);
    let reset = (Mode::Reset, 0.1);
    let character = Character { readout: 2.0, walk: 0.2, ..WHITE_AND_WALK };
    let cases = [(0.3, 100.0, 0.0), (0.3, 40.0, 0.0), (3.0, 100.0, 0.2)].map(|(tau, hz, lost): (f64, f64, f64)| {
        let name = format!("{tau} s, 2 resets, {hz} Hz, {:.0} % lost", 100.0 * lost);
        let script = vec![reset, ZERO, segment, reset, segment, reset, segment, ZERO];
        let case = Case::new(name, leaky(&character, tau, 0.0), script, LEVEL / tau.min(2.0));
        Case { hz, flaws: Box::new(move |_| Flaws { lost, ..Flaws::default() }), ..case }
    });
    let (_, faults) = table(&cases, trials(150));
    assert!(faults.is_empty(), "{faults:#?}");
}
