//! Holds within a run: the input is open, and the output droops by the bias current alone.

use brimline::Mode;

use crate::common::board::Character;
use crate::common::plant::bench::Stay;
use crate::score::{Asked, Case, WHAT, table};
use crate::{WHITE_AND_WALK, board, trials};

const ZERO: Stay = (Mode::Zero, 10.0);
const RESET: Stay = (Mode::Reset, 0.05);
const SEGMENT: Stay = (Mode::Integrate, 3.0);
const HOLD: Stay = (Mode::Hold, 10.0);

fn case(name: impl Into<String>, character: &Character, script: Vec<Stay>) -> Case {
    Case::new(name, board(character), script, 2000.0)
}

#[test]
fn in_the_middle_of_a_run() {
    let cases = [5.0, 15.0, 60.0].map(|seconds| {
        let script = vec![RESET, ZERO, SEGMENT, (Mode::Hold, seconds), SEGMENT, ZERO];
        case(format!("hold of {seconds} s"), &WHITE_AND_WALK, script)
    });
    let (_, faults) = table(&cases, trials(150));
    assert!(faults.is_empty(), "{faults:#?}");
}

/// What wanders is the offset, which does nothing to a hold; the droop's uncertainty allows for it to be the bias. In
/// a long hold the drift wanders off while the level it has made so far stays.
#[test]
fn with_wander_of_the_offset() {
    let cases = [
        ("hold, wander", vec![RESET, ZERO, SEGMENT, (Mode::Hold, 20.0), SEGMENT, ZERO]),
        (
            "long hold, wander",
            vec![RESET, ZERO, (Mode::Integrate, 12.0), (Mode::Hold, 60.0), (Mode::Integrate, 1.0), ZERO],
        ),
    ]
    .map(|(name, script)| {
        let case = case(name, &Character { wander: 0.1, ..WHITE_AND_WALK }, script);
        Case { asked: Asked::AtLeast, ..case }
    });
    let (scores, mut faults) = table(&cases, trials(150));
    for (score, case) in scores.iter().zip(&cases) {
        // Of integrals and drifts, of the droop, of offset and bias.
        let least = [0.97, 0.97, 0.97, 0.97, 0.4, 0.8, 0.4];
        for ((tally, least), what) in score.rows.iter().zip(least).zip(WHAT) {
            let (rms, scatter) = (tally.rms_z(), 3.5 / (2.0 * f64::from(tally.trials())).sqrt());
            if rms < least - scatter {
                faults.push(format!("{}, {what}: rms error is only {rms:.3} u", case.name));
            }
        }
    }
    assert!(faults.is_empty(), "{faults:#?}");
}

#[test]
fn beside_a_reset() {
    let mut cases = [
        ("reset, then hold", vec![RESET, ZERO, SEGMENT, RESET, HOLD, SEGMENT, ZERO]),
        ("hold, then reset", vec![RESET, ZERO, SEGMENT, HOLD, RESET, SEGMENT, ZERO]),
        ("reset, hold, reset", vec![RESET, ZERO, SEGMENT, RESET, HOLD, RESET, SEGMENT, ZERO]),
        ("stop after a hold", vec![RESET, ZERO, SEGMENT, HOLD, RESET, ZERO]),
        ("three holds", vec![RESET, ZERO, SEGMENT, HOLD, SEGMENT, HOLD, SEGMENT, HOLD, SEGMENT, ZERO]),
    ]
    .map(|(name, script)| case(name, &WHITE_AND_WALK, script));
    let [.., three] = &mut cases;
    three.asked = Asked::SeveralHolds;
    let (_, faults) = table(&cases, trials(150));
    assert!(faults.is_empty(), "{faults:#?}");
}
