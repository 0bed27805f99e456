//! The recursion in f32 gives what a batch estimate over all samples gives in f64: value, uncertainty and drift.
//! `--nocapture` shows how near.
#![allow(clippy::disallowed_methods, reason = "a reference on the host computes in f64; only src must give equal bits")]

mod common;

use brimline::{Charge, Flux, Policy, Trust};
use common::batch::{Using, optimum};
use common::board::{Board, Character};
use common::plant::{Input, Plant, Record, Sampling, Timing};
use common::{Claim, Plain, answer};

struct Mix {
    name: &'static str,
    character: Character,
    sampling: Sampling,
    timing: Timing,
}

const EVEN: Sampling = Sampling::even(10.0);
const TIMING: Timing = Timing { opening_s: 5.0, run_s: 20.0, closing_s: 4.5 };

const MIXES: [Mix; 8] = [
    Mix {
        name: "white only",
        character: Character { readout: 1.0, walk: 0.0, wander: 0.0, drift_limit: 15.0 },
        sampling: EVEN,
        timing: TIMING,
    },
    Mix {
        name: "random walk only",
        character: Character { readout: 0.0, walk: 3.0, wander: 0.0, drift_limit: 15.0 },
        sampling: EVEN,
        timing: TIMING,
    },
    Mix {
        name: "white and walk",
        character: Character { readout: 1.0, walk: 0.8, wander: 0.0, drift_limit: 15.0 },
        sampling: EVEN,
        timing: TIMING,
    },
    Mix {
        name: "wander only",
        character: Character { readout: 1.0, walk: 0.0, wander: 0.1, drift_limit: 15.0 },
        sampling: EVEN,
        timing: TIMING,
    },
    Mix {
        name: "all three",
        character: Character { readout: 1.0, walk: 0.8, wander: 0.1, drift_limit: 15.0 },
        sampling: EVEN,
        timing: TIMING,
    },
    Mix {
        name: "irregular samples",
        character: Character { readout: 1.0, walk: 0.8, wander: 0.1, drift_limit: 15.0 },
        sampling: Sampling { hz: 10.0, jitter: 0.4, lost: 0.2 },
        timing: Timing { opening_s: 6.0, run_s: 20.0, closing_s: 5.5 },
    },
    Mix {
        name: "strong prior",
        character: Character { readout: 1.0, walk: 0.8, wander: 0.01, drift_limit: 0.2 },
        sampling: EVEN,
        timing: TIMING,
    },
    Mix {
        name: "ten minutes",
        character: Character { readout: 1.0, walk: 0.2, wander: 0.002, drift_limit: 15.0 },
        sampling: Sampling::even(1.0),
        timing: Timing { opening_s: 60.0, run_s: 600.0, closing_s: 40.0 },
    },
];

/// Largest difference of a value in its `u`, and of a `u` relative to the optimum's.
#[derive(Clone, Copy, Debug, Default)]
struct Apart {
    value: f64,
    u: f64,
}

impl Apart {
    fn note(&mut self, ours: Claim, best: Claim) {
        self.value = self.value.max((ours.value - best.value).abs() / best.u);
        self.u = self.u.max((ours.u / best.u - 1.0).abs());
    }
}

const SEEDS: u64 = 5;

/// What f32 leaves: measured at most 8e-5 of a value's `u`, and 1e-6 of `u` itself.
const VALUE_TOLERANCE: f64 = 3e-4;
const U_TOLERANCE: f64 = 1e-5;

fn record(mix: &Mix, board: &Board, seed: u64) -> Record {
    // A third of the converter's range by the end, so that the level is large against the noise.
    let counts_per_s = 2e4 / mix.timing.run_s;
    let input = Input::steady(counts_per_s * board.input_per_count());
    Plant::new(board, input, mix.sampling, seed).measure(&mix.timing, None)
}

/// Value at stop, closed value, drift of the opening and of the closing zero.
fn compare<Q: Plain>(mix: &Mix, board: &Board) -> [Apart; 4] {
    let setup = board.setup::<Q>(Policy { gap_limit_s: 10.0, zero_block_s: 0.0, ..Policy::DEFAULT });
    let mut apart = [Apart::default(); 4];
    for seed in 0..SEEDS {
        let record = record(mix, board, seed);
        let ours = answer(&setup, &record);
        assert_eq!(ours.reading.trust, Trust::Good, "{}, seed {seed}", mix.name);
        let stop = optimum(board, &record, Using::UntilStop);
        let closed = optimum(board, &record, Using::BothZeros);
        let pairs = [
            (ours.at_stop, stop.integral),
            (ours.closed, closed.integral),
            (ours.drift_opening, stop.drift),
            (ours.drift_closing, closed.drift),
        ];
        for (apart, (ours, best)) in apart.iter_mut().zip(pairs) {
            apart.note(ours, best);
        }
    }
    apart
}

/// At stop the parts of the uncertainty are what the batch estimate says of each source alone.
#[test]
fn the_budget_at_stop_is_exact() {
    for mix in &MIXES {
        let mut board = Board::current(true, &mix.character);
        board.circuit.gain_u_rel = 1e-4;
        let setup = board.setup::<Charge>(Policy { gap_limit_s: 10.0, zero_block_s: 0.0, ..Policy::DEFAULT });
        let record = record(mix, &board, 0);
        let reading = answer(&setup, &record).reading;
        let stop = optimum(&board, &record, Using::UntilStop);
        let last_readout_u = (mix.character.readout.powi(2) + 1.0 / 12.0).sqrt() * board.input_per_count();
        let run_s = reading.elapsed_s;
        let expected = [
            ("readout", reading.at_stop.budget.readout, stop.level_u.hypot(last_readout_u)),
            ("input noise", reading.at_stop.budget.input_noise, board.noise.input_density * (0.5 * run_s).sqrt()),
            ("dead time", reading.at_stop.budget.dead_time, 0.0),
            ("scale", reading.at_stop.budget.scale, 1e-4 * stop.integral.value.abs()),
        ];
        let mut rest = reading.at_stop.integral.u.plain().powi(2);
        for (part, ours, best) in expected {
            let ours = ours.plain();
            assert!((ours - best).abs() <= 1e-4 * stop.integral.u, "{}, {part}: {ours:e} against {best:e}", mix.name);
            rest -= ours * ours;
        }
        let drift = reading.at_stop.budget.drift.plain();
        assert!((drift - rest.sqrt()).abs() <= 1e-4 * drift, "{}, drift: {drift:e} for {rest:e}", mix.name);
    }
}

/// In both polarities and for both kinds of input.
fn compare_all(mix: &Mix) -> [Apart; 4] {
    let mut worst = [Apart::default(); 4];
    for inverting in [true, false] {
        let current = compare::<Charge>(mix, &Board::current(inverting, &mix.character));
        let voltage = compare::<Flux>(mix, &Board::voltage(inverting, &mix.character));
        for apart in [current, voltage] {
            for (worst, apart) in worst.iter_mut().zip(apart) {
                worst.value = worst.value.max(apart.value);
                worst.u = worst.u.max(apart.u);
            }
        }
    }
    worst
}

#[test]
fn readings_and_drift_are_the_batch_optimum() {
    println!("{:<18} {:<14} {:>12} {:>12}", "mix", "estimate", "value, u", "u, relative");
    for mix in &MIXES {
        let worst = compare_all(mix);
        for (what, apart) in ["at stop", "closed", "opening drift", "closing drift"].iter().zip(worst) {
            println!("{:<18} {what:<14} {:>12.1e} {:>12.1e}", mix.name, apart.value, apart.u);
            assert!(
                apart.value <= VALUE_TOLERANCE,
                "{}, {what}: value is {:.1e} u from the optimum",
                mix.name,
                apart.value
            );
            assert!(apart.u <= U_TOLERANCE, "{}, {what}: u is {:.1e} from the optimum", mix.name, apart.u);
        }
    }
}

/// The closed value takes the level from the zeros alone. The run's last sample, one sample period earlier, could say
/// as much as one zero sample more.
#[test]
fn leaving_out_the_last_sample_of_the_run_costs_little() {
    for mix in &MIXES {
        let board = Board::current(true, &mix.character);
        let record = record(mix, &board, 0);
        let ours = optimum(&board, &record, Using::BothZeros).integral.u;
        let best = optimum(&board, &record, Using::Everything).integral.u;
        println!("{:<18} closed u is {:.2} % above what all samples would give", mix.name, 100.0 * (ours / best - 1.0));
        assert!((1.0..1.02).contains(&(ours / best)), "{}: {ours:e} against {best:e}", mix.name);
    }
}
