//! Leak, soakage, holds, resets, a known pedestal and an offset of the reset level, all at once, each figure uncertain.

use brimline::{Circuit, Mode, SoakageBranch};
use rand::RngExt;
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;

use crate::common::board::{Board, Character};
use crate::common::plant::bench::{Flaws, Stay};
use crate::score::{Asked, Case, table};
use crate::{WHITE_AND_WALK, board, trials};

const SOAKAGE: [SoakageBranch; 4] = [
    SoakageBranch { share: 0.001, time_constant_s: 0.1 },
    SoakageBranch { share: 0.003, time_constant_s: 2.0 },
    SoakageBranch::NONE,
    SoakageBranch::NONE,
];

const LEAK_U_REL: f64 = 1e-3;
const SOAKAGE_U_REL: f64 = 0.05;
const PEDESTAL_U_V: f64 = 30e-6;
const CONVERTER_U_V: f64 = 0.5e-3;

fn everything(character: &Character, leak_s: f64) -> Board {
    let mut board = board(character);
    board.circuit = Circuit {
        leak_time_constant_s: Some(leak_s),
        leak_u_rel: LEAK_U_REL,
        soakage: SOAKAGE,
        soakage_u_rel: SOAKAGE_U_REL,
        pedestal_u_v: Some(PEDESTAL_U_V),
        ..board.circuit
    };
    board.converter.code_zero_u_v = CONVERTER_U_V;
    board
}

fn flaws(rng: &mut ChaCha8Rng) -> Flaws {
    let mut normal = || rng.sample::<f64, _>(StandardNormal);
    Flaws {
        leak: LEAK_U_REL * normal(),
        shares: SOAKAGE_U_REL * normal(),
        pedestal_v: PEDESTAL_U_V * normal(),
        pedestal_scatter_v: 0.2 * PEDESTAL_U_V,
        converter_v: CONVERTER_U_V * normal(),
        lost: 0.02,
        ..Flaws::default()
    }
}

#[test]
fn all_at_once() {
    let segment: Stay = (Mode::Integrate, 3.0);
    let (reset, hold): (Stay, Stay) = ((Mode::Reset, 0.05), (Mode::Hold, 8.0));
    let zero: Stay = (Mode::Zero, 12.0);
    let script =
        [reset, zero, segment, reset, segment, hold, segment, reset, hold, segment, hold, reset, segment, zero];
    let noisy = Character { readout: 5.0, ..WHITE_AND_WALK };
    let cases = [("30 s", 30.0, WHITE_AND_WALK), ("3 s", 3.0, WHITE_AND_WALK), ("30 s, noisy", 30.0, noisy)].map(
        |(name, leak_s, character)| {
            let case = Case::new(format!("all, {name}"), everything(&character, leak_s), script.to_vec(), 5000.0);
            Case { flaws: Box::new(flaws), asked: Asked::SeveralHolds, ..case }
        },
    );
    let (_, faults) = table(&cases, trials(150));
    assert!(faults.is_empty(), "{faults:#?}");
}
