//! Single samples far off in the zeros: left out, counted, and of no effect. Three in a row are input.

use brimline::{Charge, Event, Policy, Trust};

use crate::common::board::Board;
use crate::common::plant::{Input, Plant, Record, Sampling};
use crate::common::{Answer, answer_with_notices};
use crate::{TIMING, Table, WHITE_AND_WALK, percent, trials};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;

/// Samples in a block.
const BLOCK: usize = 10;

/// Adds a spike of 50 to 500 counts of either sign to `samples` samples in a row from `at` on.
fn spike(record: &mut Record, at: usize, samples: usize, rng: &mut ChaCha8Rng) {
    let size = rng.random_range(50..=500) * if rng.random_bool(0.5) { 1 } else { -1 };
    for sample in record.samples.iter_mut().skip(at).take(samples) {
        sample.counts += size;
    }
}

fn record(board: &Board, seed: u64) -> Record {
    let input = Input::steady(500.0 * board.input_per_count());
    Plant::new(board, input, Sampling::even(100.0), seed).measure(&TIMING, None)
}

/// How far the spikes moved the closed value and the two drifts, in `u` of what it was without them.
fn moved(with: &Answer<Charge>, without: &Answer<Charge>) -> f64 {
    [
        (with.closed, without.closed),
        (with.drift_opening, without.drift_opening),
        (with.drift_closing, without.drift_closing),
    ]
    .iter()
    .map(|(with, without)| (with.value - without.value).abs() / without.u)
    .fold(0.0, f64::max)
}

/// Where the spikes are.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Place {
    /// Three in each zero, none in its first block, at least a block apart.
    Later,
    /// One in the first block of the opening or the closing zero, before the zero has found its level.
    FirstOpening,
    FirstClosing,
}

#[derive(Clone, Copy, Debug, Default)]
struct Outcome {
    all_counted: u32,
    good: u32,
    largest_move: f64,
    moved_silently: u32,
}

fn outcome(place: Place, trials: u64) -> Outcome {
    let board = Board::current(true, &WHITE_AND_WALK);
    let setup = board.setup::<Charge>(Policy::DEFAULT);
    let mut outcome = Outcome::default();
    for seed in 0..trials {
        let clean = record(&board, seed);
        let (without, _) = answer_with_notices(&setup, &clean);
        let mut rng = ChaCha8Rng::seed_from_u64(!seed);
        let mut spiked = clean.clone();
        let (opening, closing) = (5, clean.run_end + 1);
        let places: Vec<usize> = match place {
            Place::Later => [opening, closing]
                .iter()
                .flat_map(|zero| [20, 45, 70].map(|block| zero + block * BLOCK))
                .map(|from| from + rng.random_range(0..20 * BLOCK))
                .collect(),
            Place::FirstOpening => vec![opening + rng.random_range(0..BLOCK)],
            Place::FirstClosing => vec![closing + rng.random_range(0..BLOCK)],
        };
        places.iter().for_each(|&at| spike(&mut spiked, at, 1, &mut rng));
        let (with, notices) = answer_with_notices(&setup, &spiked);
        let seen = notices.iter().filter(|(_, notice)| notice.event == Event::Spike).count();
        let after_run = places.iter().filter(|&&at| at >= closing).count();
        outcome.all_counted += u32::from(seen == places.len() && usize::from(with.reading.spikes) == after_run);
        let good = with.reading.trust == Trust::Good;
        outcome.good += u32::from(good);
        let by = moved(&with, &without);
        outcome.largest_move = outcome.largest_move.max(by);
        outcome.moved_silently += u32::from(good && by > 0.3);
    }
    outcome
}

#[test]
fn single_spikes_are_left_out_and_counted() {
    let trials = trials(200);
    let mut table =
        Table::new("| spikes | all counted | reading good | largest move, u | good and moved by over 0.3 u |");
    let share = |n: u32| percent(n, trials as u32);
    let [later, opening, closing] = [
        (Place::Later, "three in each zero, later than its first block"),
        (Place::FirstOpening, "one in the first block of the opening zero"),
        (Place::FirstClosing, "one in the first block of the closing zero"),
    ]
    .map(|(place, name)| {
        let outcome = outcome(place, trials);
        table.row(format!(
            "| {name} | {:.1} % | {:.1} % | {:.2} | {:.1} % |",
            share(outcome.all_counted),
            share(outcome.good),
            outcome.largest_move,
            share(outcome.moved_silently)
        ));
        outcome
    });
    table.print();
    assert!(share(later.all_counted) == 100.0 && share(later.good) == 100.0 && later.largest_move < 0.3, "{later:?}");
    // There the whole block is left out, with the nine good samples in it: a zero shorter by a hundredth. Sound values
    // from the two differ by more than 0.3 u now and then.
    for outcome in [opening, closing] {
        assert!(
            share(outcome.all_counted) == 100.0 && share(outcome.good) == 100.0 && outcome.largest_move < 0.6,
            "{outcome:?}"
        );
    }
}

#[test]
fn three_in_a_row_of_one_sign_are_input() {
    let board = Board::current(true, &WHITE_AND_WALK);
    let setup = board.setup::<Charge>(Policy::DEFAULT);
    for seed in 0..trials(200) {
        let mut rng = ChaCha8Rng::seed_from_u64(!seed);
        let mut record = record(&board, seed);
        let at = 5 + rng.random_range(20 * BLOCK..90 * BLOCK);
        spike(&mut record, at, 3, &mut rng);
        let (_, notices) = answer_with_notices(&setup, &record);
        let found = crate::first_of(&notices, Event::InputInZero);
        let began = record.samples.get(at).map(|sample| sample.tick);
        assert_eq!(found.map(|(index, _)| index), Some(at + 2), "seed {seed}");
        assert_eq!(found.map(|(_, tick)| tick), began, "seed {seed}");
    }
}
