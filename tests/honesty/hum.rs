//! Mains hum on the readings, and what averaging over whole periods costs where there is none.

use core::f64::consts::TAU;

use brimline::{Charge, Policy, Trust};

use crate::common::answer;
use crate::common::board::Board;
use crate::common::plant::{Hum, Input, Plant, Record, Sampling, Trouble};
use crate::common::tally::Tally;
use crate::{TIMING, WHITE_AND_WALK, median, trials};

fn record(board: &Board, hum: Option<f64>, seed: u64) -> Record {
    let input = Input::steady(1000.0 * board.input_per_count());
    // Phases spread evenly by the golden section.
    let phase = (seed as f64 * 0.618_033_988_749_895).fract() * TAU;
    let hum = hum.map(|hz| Hum { peak_v: 5e-3, hz, phase });
    let trouble = Trouble { hum, ..Trouble::default() };
    Plant::new(board, input, Sampling::even(400.0), seed).with(trouble).measure(&TIMING, None)
}

/// 5 mV peak on an LSB of 76 uV: 66 counts, where the readout noise is 1.
#[test]
fn hum_is_kept_out() {
    let board = Board::current(true, &WHITE_AND_WALK);
    let setup = board.setup::<Charge>(Policy::DEFAULT);
    let trials = trials(100);
    println!(
        "| hum | closed, 95 % holds | 68 % holds | rms/u | largest error, u | u against no hum | at stop, 95 % holds | u at stop against no hum | drift, 95 % holds |"
    );
    println!("|---|--:|--:|--:|--:|--:|--:|--:|--:|");
    for hz in [50.0, 60.0] {
        let (mut closed, mut stop, mut drift) = (Tally::default(), Tally::default(), Tally::default());
        let (mut worst, mut closed_u, mut stop_u) = (0.0_f64, Vec::new(), Vec::new());
        let mut good = 0;
        for seed in 0..trials {
            let with = record(&board, Some(hz), seed);
            let without = answer(&setup, &record(&board, None, seed));
            let answer = answer(&setup, &with);
            good += u64::from(answer.reading.trust == Trust::Good);
            closed.add(answer.closed, with.integral);
            stop.add(answer.at_stop, with.integral);
            drift.add(answer.drift_opening, with.drift_opening);
            worst = worst.max((answer.closed.value - with.integral).abs() / answer.closed.u);
            closed_u.push(answer.closed.u / without.closed.u);
            stop_u.push(answer.at_stop.u / without.at_stop.u);
        }
        let (closed_u, stop_u) = (median(closed_u), median(stop_u));
        println!(
            "| {hz} Hz | {:.1} % | {:.1} % | {:.2} | {worst:.2} | {closed_u:.3} | {:.1} % | {stop_u:.1} | {:.1} % |",
            closed.coverage_95(),
            closed.coverage_68(),
            closed.rms_z(),
            stop.coverage_95(),
            drift.coverage_95()
        );
        assert_eq!(good, trials, "{hz} Hz: readings called good");
        // Of 100 sound values one is beyond 3 u with a probability of a quarter, beyond 4 u of 1 in 160.
        assert!(worst <= if trials <= 100 { 3.0 } else { 4.5 }, "{hz} Hz: a closed value is {worst:.2} u off");
        assert!((0.95..=1.3).contains(&closed_u), "{hz} Hz: u is {closed_u:.3} of that without hum");
        for (what, tally) in [("closed", &closed), ("drift", &drift)] {
            let scatter = 3.5 * (95.0 * 5.0 / trials as f64).sqrt();
            let covered = tally.coverage_95();
            assert!((covered - 95.0).abs() <= scatter, "{hz} Hz, {what}: 1.96 u covers {covered:.1} %");
        }
        // The run's last sample stands anywhere in the hum: its error has the distribution of a sine, which stays within
        // 1.41 of its standard deviations.
        assert!(stop.coverage_95() > 95.0, "{hz} Hz, at stop: 1.96 u covers {:.1} %", stop.coverage_95());
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
    println!("| estimate | rms error with blocks against without | u with blocks against without |");
    println!("|---|--:|--:|");
    let [blocks, single] = tallies;
    for ((what, with), without) in ["at stop", "closed", "drift", "drift, closed"].iter().zip(blocks).zip(single) {
        let (rms, u) = (with.rms_error() / without.rms_error(), with.mean_u() / without.mean_u());
        println!("| {what} | {rms:.3} | {u:.3} |");
        assert!(rms <= 1.05 && u <= 1.05, "{what}: blocks cost {rms:.3} in rms error, {u:.3} in u");
    }
}
