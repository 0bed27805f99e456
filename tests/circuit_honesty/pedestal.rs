//! A pedestal of which something is known: an error that stays through a run, and what is new at every reset.

use brimline::{Circuit, Mode};
use rand::RngExt;
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;

use crate::common::board::{Board, Character};
use crate::common::plant::bench::{Flaws, Stay};
use crate::score::{Asked, Case, table};
use crate::{WHITE_AND_WALK, board, trials};

/// Lines beside the resets make most of the uncertainty.
const QUIET: Character = Character { walk: 0.05, drift_limit: 2.0, ..WHITE_AND_WALK };

/// A run with resets: how many, how long the switch is closed, and the lengths of the stretches between them and of the
/// last, s.
#[derive(Clone, Copy)]
struct Resets {
    count: usize,
    closed_s: f64,
    between_s: f64,
    last_s: f64,
    /// Whether the first stretch is preceded by a reset.
    begins_with_reset: bool,
}

/// Every half second.
const EVEN: Resets = Resets { count: 3, closed_s: 0.05, between_s: 0.5, last_s: 0.5, begins_with_reset: false };

impl Resets {
    fn script(&self) -> Vec<Stay> {
        let mut script = vec![(Mode::Reset, 0.05), (Mode::Zero, 10.0)];
        if self.begins_with_reset {
            script.push((Mode::Reset, self.closed_s));
        }
        for _ in 0..self.count {
            script.extend([(Mode::Integrate, self.between_s), (Mode::Reset, self.closed_s)]);
        }
        script.extend([(Mode::Integrate, self.last_s), (Mode::Zero, 10.0)]);
        script
    }
}

/// A pedestal known to `u_v`, of which the part `scatter` is new at each reset.
fn case(name: String, u_v: f64, scatter: f64, resets: &Resets) -> Case {
    let board = board(&QUIET);
    let board = Board { circuit: Circuit { pedestal_u_v: Some(u_v), ..board.circuit }, ..board };
    let flaws = Box::new(move |rng: &mut ChaCha8Rng| Flaws {
        pedestal_v: u_v * (1.0 - scatter * scatter).sqrt() * rng.sample::<f64, _>(StandardNormal),
        pedestal_scatter_v: scatter * u_v,
        converter_v: 1e-3 * rng.random_range(-1.0..=1.0),
        ..Flaws::default()
    });
    // What scatters is taken for what stays: the sum of many is less uncertain than stated.
    let asked = if scatter > 0.3 { Asked::AtLeast } else { Asked::Right };
    let counts_per_s = 20_000.0 / resets.between_s;
    Case { flaws, asked, ..Case::new(name, board, resets.script(), counts_per_s) }
}

/// Scores, and asks besides that the pedestal makes nothing worse; gives what is wrong.
fn faults(cases: &[Case]) -> Vec<String> {
    let (scores, mut faults) = table(cases, trials(160));
    for (score, case) in scores.iter().zip(cases) {
        for (simple, (ours, what)) in score.uncorrected.iter().zip(score.rows.iter().zip(["at stop", "closed"])) {
            let worse = ours.rms_error() / simple.rms_error();
            if worse > 1.02 {
                faults.push(format!("{}, {what}: error is {worse:.3} of that without the pedestal", case.name));
            }
        }
    }
    faults
}

/// Runs of 1 to 60 resets.
fn through_resets(u_v: f64, scatter: f64, closed_s: f64) -> Vec<String> {
    let cases = [1, 3, 10, 60].map(|count| {
        let name = format!("u {:.0} uV, {closed_s} s closed, {count} resets", 1e6 * u_v);
        case(name, u_v, scatter, &Resets { count, closed_s, ..EVEN })
    });
    faults(&cases)
}

#[test]
fn known_well() {
    let mut faults = through_resets(5e-6, 0.2, 0.1);
    faults.extend(through_resets(20e-6, 0.2, 0.05));
    assert!(faults.is_empty(), "{faults:#?}");
}

#[test]
fn known_badly() {
    let faults = through_resets(100e-6, 0.2, 0.05);
    assert!(faults.is_empty(), "{faults:#?}");
}

#[test]
fn scattering_as_much_as_it_is_unknown() {
    let faults = through_resets(20e-6, 0.7, 0.05);
    assert!(faults.is_empty(), "{faults:#?}");
}

/// Lines that share samples with each other or with the stop, and a run whose baseline is the pedestal's.
#[test]
fn in_tight_places() {
    let cases = [
        (10e-6, "20 samples between", Resets { count: 10, between_s: 0.2, last_s: 0.2, ..EVEN }),
        (10e-6, "stop 3 after a reset", Resets { last_s: 0.03, ..EVEN }),
        (10e-6, "stop 8 after a reset", Resets { last_s: 0.08, ..EVEN }),
        (10e-6, "begins with a reset", Resets { begins_with_reset: true, ..EVEN }),
        (10e-6, "begins with one, no more", Resets { count: 0, begins_with_reset: true, ..EVEN }),
        (100e-6, "begins with one, 6 samples", Resets { count: 0, last_s: 0.06, begins_with_reset: true, ..EVEN }),
    ]
    .map(|(u_v, name, resets)| case(format!("u {:.0} uV, {name}", 1e6 * u_v), u_v, 0.2, &resets));
    let faults = faults(&cases);
    assert!(faults.is_empty(), "{faults:#?}");
}

/// What a level walks between the instant and its samples, a line takes for level, and a hint does not.
#[test]
fn under_a_strong_walk() {
    let character = Character { walk: 5.0, drift_limit: 15.0, ..QUIET };
    let cases = [1, 10].map(|count| {
        let name = format!("u 10 uV, strong walk, {count} resets");
        let case = case(name, 10e-6, 0.2, &Resets { count, between_s: 0.25, last_s: 0.25, ..EVEN });
        let circuit = Circuit { pedestal_u_v: case.board.circuit.pedestal_u_v, ..board(&character).circuit };
        Case { board: Board { circuit, ..board(&character) }, ..case }
    });
    let faults = faults(&cases);
    assert!(faults.is_empty(), "{faults:#?}");
}
