//! Mains hum on the readings, and what averaging over whole periods costs where there is none.

use core::f64::consts::TAU;

use brimline::{Charge, Policy, Trust};

use crate::common::answer;
use crate::common::board::Board;
use crate::common::plant::{Hum, Input, Plant, Record, Sampling, Trouble};
use crate::common::tally::Tally;
use crate::{TIMING, Table, WHITE_AND_WALK, median, trials};

fn record(board: &Board, hum: Option<f64>, seed: u64) -> Record {
    let input = Input::steady(1000.0 * board.input_per_count());
    // Phases spread evenly by the golden section.
    let phase = (seed as f64 * 0.618_033_988_749_895).fract() * TAU;
    let hum = hum.map(|hz| Hum { peak_v: 5e-3, hz, phase });
    let trouble = Trouble { hum, ..Trouble::default() };
    Plant::new(board, input, Sampling::even(400.0), seed).with(trouble).measure(&TIMING, None)
}

/// What hum of a frequency did to the readings.
#[derive(Clone, Debug, Default)]
struct Outcome {
    closed: Tally,
    stop: Tally,
    drift: Tally,
    good: u64,
    /// Largest error of a closed value, u.
    worst: f64,
    /// Median of `u` over that of the same record without hum.
    closed_u: f64,
    stop_u: f64,
}

fn outcome(hz: f64, trials: u64) -> Outcome {
    let board = Board::current(true, &WHITE_AND_WALK);
    let setup = board.setup::<Charge>(Policy::DEFAULT);
    let mut outcome = Outcome::default();
    let (mut closed_u, mut stop_u) = (Vec::new(), Vec::new());
    for seed in 0..trials {
        let with = record(&board, Some(hz), seed);
        let without = answer(&setup, &record(&board, None, seed));
        let answer = answer(&setup, &with);
        outcome.good += u64::from(answer.reading.trust == Trust::Good);
        outcome.closed.add(answer.closed, with.integral);
        outcome.stop.add(answer.at_stop, with.integral);
        outcome.drift.add(answer.drift_opening, with.drift_opening);
        outcome.worst = outcome.worst.max((answer.closed.value - with.integral).abs() / answer.closed.u);
        closed_u.push(answer.closed.u / without.closed.u);
        stop_u.push(answer.at_stop.u / without.at_stop.u);
    }
    Outcome { closed_u: median(closed_u), stop_u: median(stop_u), ..outcome }
}

/// 5 mV peak on an LSB of 76 uV: 66 counts, where the readout noise is 1. In blocks of 0.1 s, whole periods of 50 and
/// 60 Hz. A mains frequency that is off leaves a rest that beats.
#[test]
fn hum_is_kept_out() {
    let trials = trials(100);
    let mut table = Table::new(
        "| hum | good | closed, 95 % holds | 68 % holds | rms/u | largest error, u | u against no hum | at stop, 95 % holds | u against no hum | drift, 95 % holds |",
    );
    let outcomes = [50.0, 60.0, 49.9, 49.8].map(|hz| (hz, outcome(hz, trials)));
    for (hz, outcome) in &outcomes {
        table.row(format!(
            "| {hz} Hz | {:.0} % | {:.1} % | {:.1} % | {:.2} | {:.2} | {:.3} | {:.1} % | {:.1} | {:.1} % |",
            100.0 * outcome.good as f64 / trials as f64,
            outcome.closed.coverage_95(),
            outcome.closed.coverage_68(),
            outcome.closed.rms_z(),
            outcome.worst,
            outcome.closed_u,
            outcome.stop.coverage_95(),
            outcome.stop_u,
            outcome.drift.coverage_95()
        ));
    }
    table.print();
    for (hz, outcome) in outcomes.iter().take(2) {
        assert_eq!(outcome.good, trials, "{hz} Hz: readings called good");
        // Of 100 sound values one is beyond 3 u with a probability of 1 in 4; of 2000, one beyond 4.5 u of 1 in 70.
        let (worst, most) = (outcome.worst, if trials <= 100 { 3.0 } else { 4.5 });
        assert!(worst <= most, "{hz} Hz: a closed value is {worst:.2} u off");
        let closed_u = outcome.closed_u;
        assert!((0.95..=1.3).contains(&closed_u), "{hz} Hz: u is {closed_u:.3} of that without hum");
        for (what, tally) in [("closed", &outcome.closed), ("drift", &outcome.drift)] {
            let scatter = 3.5 * (95.0 * 5.0 / trials as f64).sqrt();
            let covered = tally.coverage_95();
            assert!((covered - 95.0).abs() <= scatter, "{hz} Hz, {what}: 1.96 u covers {covered:.1} %");
        }
        // The run's last sample stands anywhere in the hum: its error is distributed like a sine, within 1.41 of its
        // standard deviations; so 1.96 u covers all of it, and u is that of the hum.
        let (covered, times) = (outcome.stop.coverage_95(), outcome.stop_u);
        assert!(covered > 99.0 && times > 5.0, "{hz} Hz, at stop: 1.96 u covers {covered:.1} %, u is {times:.1} times");
    }
}

#[test]
fn without_hum_blocks_cost_little() {
    let board = Board::current(true, &WHITE_AND_WALK);
    let [blocks, single] = [0.1, 0.0].map(|zero_block_s| Policy { zero_block_s, ..Policy::DEFAULT });
    let (blocks, single) = (board.setup::<Charge>(blocks), board.setup::<Charge>(single));
    let mut tallies = [[Tally::default(); 4]; 2];
    for seed in 0..trials(500) {
        let record = record(&board, None, seed);
        for (setup, tallies) in [&blocks, &single].into_iter().zip(&mut tallies) {
            let answer = answer(setup, &record);
            let claims = [answer.at_stop, answer.closed, answer.drift_opening, answer.drift_closing];
            let truths = [record.integral, record.integral, record.drift_opening, record.drift_closing];
            for ((tally, claim), truth) in tallies.iter_mut().zip(claims).zip(truths) {
                tally.add(claim, truth);
            }
        }
    }
    let mut table = Table::new("| estimate | rms error with blocks against without | u with blocks against without |");
    let mut costs = Vec::new();
    let [blocks, single] = tallies;
    for ((what, with), without) in ["at stop", "closed", "drift", "drift, closed"].iter().zip(blocks).zip(single) {
        let (rms, u) = (with.rms_error() / without.rms_error(), with.mean_u() / without.mean_u());
        table.row(format!("| {what} | {rms:.3} | {u:.3} |"));
        costs.push((what, rms, u));
    }
    table.print();
    for (what, rms, u) in costs {
        assert!(rms <= 1.05 && u <= 1.05, "{what}: blocks cost {rms:.3} in rms error, {u:.3} in u");
    }
}
