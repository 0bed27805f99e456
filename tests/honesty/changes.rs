//! What no noise figure describes: a drift that changes between the zeros around a run, and light in a zero's first
//! second. The value may be wrong then, but not be called good.

use brimline::{Charge, Policy, Trust};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

use crate::common::answer;
use crate::common::board::{Board, Character};
use crate::common::plant::{Input, Plant, Sampling, Timing, Trouble};
use crate::{Table, WHITE_AND_WALK, percent, trials};

/// Wander 0: by the set-up the drift is constant.
const CHARACTER: Character = Character { drift_limit: 50.0, ..WHITE_AND_WALK };
const ZERO_FROM_S: f64 = 0.05;

#[derive(Clone, Debug, Default)]
struct Outcome {
    not_good: u32,
    /// Largest error of what is called good, in `u`: at stop, closed, whichever is the latest.
    worst_good: [f64; 2],
    worst_of_all: f64,
    good_beyond_5_u: u32,
}

impl Outcome {
    fn row(&self, what: &str, trials: u64) -> String {
        let [stop, closed] = self.worst_good;
        format!(
            "| {what} | {:.1} % | {:.1} | {stop:.1} | {closed:.1} | {} |",
            percent(self.not_good, trials as u32),
            self.worst_of_all,
            self.good_beyond_5_u
        )
    }
}

fn outcome(trials: u64, mut disturb: impl FnMut(&mut ChaCha8Rng, &Board, &Timing) -> Trouble) -> Outcome {
    let board = Board::current(true, &CHARACTER);
    let setup = board.setup::<Charge>(Policy::DEFAULT);
    let mut outcome = Outcome::default();
    for seed in 0..trials {
        let mut rng = ChaCha8Rng::seed_from_u64(!seed);
        let timing = Timing {
            opening_s: rng.random_range(5..=20).into(),
            run_s: rng.random_range(5..=40).into(),
            closing_s: rng.random_range(5..=20).into(),
        };
        let trouble = disturb(&mut rng, &board, &timing);
        let input = Input::steady(200.0 * board.input_per_count());
        let record = Plant::new(&board, input, Sampling::even(100.0), seed).with(trouble).measure(&timing, None);
        let answer = answer(&setup, &record);
        let off = [answer.at_stop, answer.closed].map(|claim| (claim.value - record.integral).abs() / claim.u);
        let [_, closed] = off;
        outcome.worst_of_all = outcome.worst_of_all.max(closed);
        if answer.reading.trust != Trust::Good {
            outcome.not_good += 1;
            continue;
        }
        for (worst, off) in outcome.worst_good.iter_mut().zip(off) {
            *worst = worst.max(off);
        }
        outcome.good_beyond_5_u += u32::from(closed > 5.0);
    }
    outcome
}

#[test]
fn what_is_far_off_is_not_called_good() {
    let trials = trials(200);
    let mut table = Table::new(
        "| what happens | not good | largest error, u | largest if good, at stop | largest if good, closed | good and over 5 u off |",
    );
    let in_run = |rng: &mut ChaCha8Rng, timing: &Timing| {
        ZERO_FROM_S + timing.opening_s + timing.run_s * rng.random_range(0.0..1.0)
    };
    let by_5 = outcome(trials, |rng, _, timing| Trouble {
        drift_change: Some((in_run(rng, timing), 5.0)),
        ..Trouble::default()
    });
    table.row(by_5.row("drift changes by 5 counts/s in the run", trials));
    let by_any = outcome(trials, |rng, _, timing| Trouble {
        drift_change: Some((in_run(rng, timing), rng.random_range(-10.0..=10.0))),
        ..Trouble::default()
    });
    table.row(by_any.row("drift changes by up to 10 counts/s in the run", trials));
    let by_little = outcome(trials, |rng, _, timing| Trouble {
        drift_change: Some((in_run(rng, timing), rng.random_range(-2.0..=2.0))),
        ..Trouble::default()
    });
    table.row(by_little.row("drift changes by up to 2 counts/s in the run", trials));
    let light = outcome(trials, |rng, board, _| {
        let counts_per_s = 10.0_f64.powf(rng.random_range(0.0..3.0));
        let stray = Input {
            to_s: ZERO_FROM_S + rng.random_range(0.1..1.0),
            ..Input::steady(counts_per_s * board.input_per_count())
        };
        Trouble { stray: Some(stray), ..Trouble::default() }
    });
    table.row(light.row("1 to 1000 counts/s of light in the first second of the opening zero", trials));
    table.print();
    let beyond = |outcome: &Outcome| percent(outcome.good_beyond_5_u, trials as u32);
    assert!(beyond(&by_5) == 0.0 && beyond(&light) == 0.0, "{by_5:?} {light:?}");
    assert!(by_5.not_good as u64 == trials, "{by_5:?}");
    // Falls short of never: a change that the two zeros' drifts hardly show is much in a run many times their length.
    // Measured 0.3 and 2.2 % of 2,000.
    assert!(beyond(&by_any) <= 1.0, "{by_any:?}");
    assert!(beyond(&by_little) <= 3.0, "{by_little:?}");
}
