//! Monte Carlo: how often the readings' intervals cover the truth. `--nocapture` shows the table.

mod common;

use brimline::{Charge, Flux, Policy, Trust};
use common::board::{Board, Character};
use common::plant::{Input, Plant, Record, Resets, Sampling, Timing};
use common::tally::Tally;
use common::{Plain, answer, textbook};

const NO_WANDER: Character = Character { readout: 1.0, walk: 0.5, wander: 0.0, drift_limit: 15.0 };
const WANDER: Character = Character { wander: 0.1, ..NO_WANDER };

const TIMING: Timing = Timing { opening_s: 10.0, run_s: 20.0, closing_s: 10.0 };

/// A mix's score sheets.
#[derive(Clone, Copy, Debug, Default)]
struct Score {
    at_stop: Tally,
    closed: Tally,
    drift_opening: Tally,
    drift_closing: Tally,
    ordinary_line: Tally,
    uncorrected: Tally,
}

impl Score {
    /// `trials` records from `simulate`, each read by a new channel.
    fn of<Q: Plain>(trials: u64, board: &Board, policy: Policy, simulate: impl Fn(u64) -> Record) -> Self {
        let setup = board.setup::<Q>(policy);
        let mut score = Self::default();
        for seed in 0..trials {
            let record = simulate(seed);
            let answer = answer(&setup, &record);
            let reading = &answer.reading;
            assert_eq!(reading.trust, Trust::Good, "seed {seed}: {:?}", reading.reasons);
            assert_eq!(reading.resets, record.resets, "seed {seed}");
            score.at_stop.add(answer.at_stop, record.integral);
            score.closed.add(answer.closed, record.integral);
            score.drift_opening.add(answer.drift_opening, record.drift_opening);
            score.drift_closing.add(answer.drift_closing, record.drift_closing);
            if record.resets == 0 {
                score.ordinary_line.add(textbook::ordinary_line(board, &record), record.integral);
                score.uncorrected.add(textbook::uncorrected(board, &record), record.integral);
            }
        }
        score
    }

    /// Mean u in counts, that of the drift in counts/s.
    fn print(&self, mix: &str, board: &Board, naive: bool) {
        Tally::print_heading();
        let count = board.input_per_count();
        self.at_stop.print(mix, "at stop", count);
        self.closed.print(mix, "closed", count);
        self.drift_opening.print(mix, "drift, opening zero", board.converter.lsb_v);
        self.drift_closing.print(mix, "drift, closing zero", board.converter.lsb_v);
        if naive {
            self.ordinary_line.print(mix, "line, textbook error", count);
            self.uncorrected.print(mix, "no drift correction", count);
        }
    }

    fn assert_honest(&self, mix: &str) {
        self.at_stop.assert_honest(&format!("{mix}, at stop"));
        self.closed.assert_honest(&format!("{mix}, closed"));
        self.drift_opening.assert_honest(&format!("{mix}, drift of the opening zero"));
        self.drift_closing.assert_honest(&format!("{mix}, drift of the closing zero"));
    }
}

/// A steady current that takes the output over a third of the converter's range.
fn steady(board: &Board, seed: u64) -> Record {
    let input = Input::steady(1000.0 * board.input_per_count());
    Plant::new(board, input, Sampling::even(20.0), seed).measure(&TIMING, None)
}

#[test]
fn white_noise_and_random_walk() {
    let board = Board::current(true, &NO_WANDER);
    let score = Score::of::<Charge>(4000, &board, Policy::DEFAULT, |seed| steady(&board, seed));
    score.print("white + walk", &board, true);
    score.assert_honest("white + walk");
    // The reason for this crate: here the walk dominates, and the textbook does not know of it.
    let naive = score.ordinary_line.coverage_95();
    assert!(naive < 60.0, "the textbook's 95 % interval covers {naive:.1} %");
    let none = score.uncorrected.coverage_95();
    assert!(none < 60.0, "without correction the readout's 95 % interval covers {none:.1} %");
}

#[test]
fn with_wander_of_the_offset() {
    let board = Board::current(true, &WANDER);
    let score = Score::of::<Charge>(4000, &board, Policy::DEFAULT, |seed| steady(&board, seed));
    score.print("white + walk + wander", &board, true);
    score.assert_honest("white + walk + wander");
}

#[test]
fn a_voltage_pulse_and_a_long_pause_with_lost_and_late_samples() {
    let mut board = Board::voltage(false, &Character { walk: 0.2, wander: 0.02, ..NO_WANDER });
    board.circuit.gain_u_rel = 5e-4;
    let timing = Timing { opening_s: 10.0, run_s: 60.0, closing_s: 10.0 };
    let sampling = Sampling { hz: 20.0, jitter: 0.3, lost: 0.05 };
    let score = Score::of::<Flux>(2000, &board, Policy::DEFAULT, |seed| {
        // A coil is moved for half a second, 2 s into the run; then nothing happens for nearly a minute.
        let pulse = Input { from_s: 12.25, to_s: 12.75, ..Input::steady(2.0 * 15_000.0 * board.input_per_count()) };
        Plant::new(&board, pulse, sampling, seed).measure(&timing, None)
    });
    score.print("pulse and pause", &board, true);
    score.assert_honest("pulse and pause");
}

/// A run with resets.
struct ResetMix {
    name: &'static str,
    character: Character,
    /// Of the input, whose phase differs from run to run.
    ripple: f64,
    ripple_hz: f64,
    counts_per_s: f64,
    when: Resets,
    timing: Timing,
    resets: u32,
    /// Whether the set-up knows how fast the ripple changes.
    slew_known: bool,
}

const THREE_RESETS: ResetMix = ResetMix {
    name: "3 resets, 20 ms",
    character: NO_WANDER,
    ripple: 0.03,
    ripple_hz: 0.3,
    counts_per_s: 5000.0,
    when: Resets { at_v: 0.5, periods: 2 },
    timing: Timing { opening_s: 2.5, run_s: 5.0, closing_s: 2.5 },
    resets: 3,
    slew_known: false,
};

/// Even over the circle, rad.
const GOLDEN_ANGLE: f64 = 2.399_963_229_728_653;

impl ResetMix {
    fn check(&self) {
        self.score().assert_honest(self.name);
    }

    fn score(&self) -> Score {
        let board = Board::current(true, &self.character);
        let steady = Input::steady(self.counts_per_s * board.input_per_count());
        let slew = self.ripple * self.counts_per_s * core::f64::consts::TAU * self.ripple_hz * board.input_per_count();
        let policy = Policy { input_slew: self.slew_known.then_some(slew), ..Policy::DEFAULT };
        let score = Score::of::<Charge>(4000, &board, policy, |seed| {
            let input =
                Input { ripple: self.ripple, ripple_hz: self.ripple_hz, phase: seed as f64 * GOLDEN_ANGLE, ..steady };
            let plant = Plant::new(&board, input, Sampling::even(100.0), seed);
            let record = plant.measure(&self.timing, Some(&self.when));
            assert_eq!(record.resets, self.resets, "{}, seed {seed}", self.name);
            record
        });
        score.print(self.name, &board, false);
        score
    }
}

#[test]
fn three_resets_under_a_varying_input() {
    THREE_RESETS.check();
}

/// Without random walk to speak of, the fits beside the resets carry the uncertainty.
#[test]
fn three_resets_of_a_quiet_channel() {
    let character = Character { walk: 0.05, ..NO_WANDER };
    ResetMix { name: "3 resets, quiet", character, ..THREE_RESETS }.check();
}

/// The lines are extrapolated by 100 ms from either side, so that their slopes count.
#[test]
fn three_long_resets_of_a_quiet_channel() {
    let character = Character { walk: 0.05, ..NO_WANDER };
    let when = Resets { periods: 20, ..THREE_RESETS.when };
    ResetMix { name: "3 resets, 200 ms", character, ripple: 0.0, when, ..THREE_RESETS }.check();
}

/// An input that bends the lines, by a known slew: the bend is part of `u`. The bends before and after a short reset
/// are much alike and cancel for the most part, which is not counted on: `u` is on the safe side, by at most a fifth,
/// as long as the window of the fits is no longer than a sixth of the ripple's period.
#[test]
fn three_resets_under_a_ripple_of_known_slew() {
    let character = Character { walk: 0.05, ..NO_WANDER };
    for (name, ripple_hz) in [("0.3 Hz, slew known", 0.3), ("0.7 Hz, slew known", 0.7), ("1 Hz, slew known", 1.0)] {
        let score = ResetMix { name, character, ripple_hz, slew_known: true, ..THREE_RESETS }.score();
        for tally in [&score.at_stop, &score.closed] {
            let (covered, rms) = (tally.coverage_95(), tally.rms_z());
            assert!((94.0..=99.0).contains(&covered), "{name}: 1.96 u covers {covered:.1} %");
            assert!((0.8..=1.0).contains(&rms), "{name}: rms error is {rms:.3} u");
        }
    }
}

/// The same where the slew is not known: a bend that stands out of the noise is charged or taken off, one that does not
/// is missing from `u`. The worst is just too small to be seen, at about 0.7 Hz. This is a limit, stated in the policy.
#[test]
fn three_resets_under_a_ripple_of_unknown_slew() {
    let character = Character { walk: 0.05, ..NO_WANDER };
    for (name, ripple_hz, least) in [("0.7 Hz, slew unknown", 0.7, 75.0), ("2 Hz, slew unknown", 2.0, 90.0)] {
        let score = ResetMix { name, character, ripple_hz, ..THREE_RESETS }.score();
        for tally in [&score.at_stop, &score.closed] {
            let covered = tally.coverage_95();
            assert!(covered > least && covered < 97.0, "{name}: 1.96 u covers {covered:.1} %");
        }
    }
}

/// A run that stops while its last sample is still part of the line that opened the segment.
#[test]
fn a_stop_soon_after_a_reset() {
    for samples_after in [2, 4, 8, 16, 24] {
        let board = Board::current(true, &Character { walk: 0.1, drift_limit: 1.0, ..NO_WANDER });
        // The level comes to 2 V in 400 samples.
        let input = Input::steady(26_214.4 / 3.995 * board.input_per_count());
        let run_s = f64::from(402 + samples_after) / 100.0;
        let timing = Timing { opening_s: 5.0, run_s, closing_s: 5.0 };
        let when = Resets { at_v: 2.0, periods: 2 };
        let score = Score::of::<Charge>(4000, &board, Policy::DEFAULT, |seed| {
            Plant::new(&board, input, Sampling::even(100.0), seed).measure(&timing, Some(&when))
        });
        let name = format!("stop {samples_after} after a reset");
        score.print(&name, &board, false);
        for tally in [&score.at_stop, &score.closed] {
            let (covered, rms) = (tally.coverage_95(), tally.rms_z());
            assert!((93.0..=97.0).contains(&covered), "{name}: 1.96 u covers {covered:.1} %");
            assert!((0.94..=1.04).contains(&rms), "{name}: rms error is {rms:.3} u");
        }
    }
}

/// A third of the run is dead time, a third lies in the fits' windows, and walk is nearly all of the noise.
#[test]
fn ten_resets_in_six_seconds_under_a_strong_walk() {
    ResetMix {
        name: "10 resets, strong walk",
        character: Character { readout: 0.7, walk: 8.0, ..NO_WANDER },
        ripple: 0.0,
        ripple_hz: 0.3,
        counts_per_s: 32_768.0,
        // Every 40 samples.
        when: Resets { at_v: 0.988, periods: 20 },
        timing: Timing { opening_s: 10.0, run_s: 6.3, closing_s: 2.5 },
        resets: 10,
        slew_known: false,
    }
    .check();
}

/// Too few samples between resets for two full windows: the lines at the two ends share some of them.
#[test]
fn ten_resets_with_20_samples_between() {
    ResetMix {
        name: "10 resets, 20 apart",
        character: Character { walk: 0.05, ..NO_WANDER },
        ripple: 0.0,
        ripple_hz: 0.3,
        counts_per_s: 65_536.0,
        when: Resets { at_v: 0.975, periods: 2 },
        timing: Timing { opening_s: 2.5, run_s: 2.39, closing_s: 2.5 },
        resets: 10,
        slew_known: false,
    }
    .check();
}

/// The input ends anywhere within the dead time. Half way is the best guess, wrong by a rectangular distribution whose
/// width is the input times the dead time: `u` is its standard deviation, `width / sqrt(12)`, and `1.96 u` covers it
/// all.
#[test]
fn an_input_that_ends_within_a_reset() {
    let board = Board::current(true, &NO_WANDER);
    let when = Resets { at_v: 0.985, periods: 20 };
    let timing = Timing { opening_s: 2.5, run_s: 2.0, closing_s: 2.5 };
    // The switch closes on the 40th sample of the run, which begins after 5 samples in reset and 250 in zero.
    let (counts_per_s, closes_s, dead_s) = (32_768.0, 2.95, 0.2);
    let score = Score::of::<Charge>(2000, &board, Policy::DEFAULT, |seed| {
        let share = (seed as f64 * GOLDEN_ANGLE / core::f64::consts::TAU).fract();
        let ends = Input { to_s: closes_s + share * dead_s, ..Input::steady(counts_per_s * board.input_per_count()) };
        let record = Plant::new(&board, ends, Sampling::even(100.0), seed).measure(&timing, Some(&when));
        assert_eq!(record.resets, 1, "seed {seed}");
        record
    });
    score.print("input ends in a reset", &board, false);
    for (what, tally) in [("at stop", &score.at_stop), ("closed", &score.closed)] {
        // A rectangular distribution reaches to sqrt(3) u.
        let covered = tally.coverage_95();
        assert!(covered > 99.5, "{what}: 1.96 u covers {covered:.1} %");
        let (mean, rms) = (tally.mean_z(), tally.rms_z());
        assert!(mean.abs() < 0.02 && (rms - 1.0).abs() < 0.02, "{what}: errors {mean:.3} +- {rms:.3} u");
    }
}
