//! Coverage and efficiency over eight noise mixes, and beside them what firmware usually does.

use brimline::{Charge, Policy, Reason, Trust};

use crate::common::batch::{Plan, Using, optimum};
use crate::common::board::{Board, Character};
use crate::common::plant::{Input, Plant, Record, Resets, Sampling, Timing};
use crate::common::tally::Tally;
use crate::common::{Claim, answer, textbook};
use crate::{TIMING, Table, WHITE_AND_WALK, trials};

struct Mix {
    name: &'static str,
    character: Character,
    sampling: Sampling,
    timing: Timing,
    resets: Option<Resets>,
    counts_per_s: f64,
    /// Rounding that nothing dithers is no noise: intervals that hold its worst case hold the truth more often.
    may_over_cover: bool,
}

const PLAIN: Mix = Mix {
    name: "",
    character: WHITE_AND_WALK,
    sampling: Sampling::even(100.0),
    timing: TIMING,
    resets: None,
    counts_per_s: 1000.0,
    may_over_cover: false,
};

const MIXES: [Mix; 8] = [
    Mix { name: "white", character: Character { walk: 0.0, ..WHITE_AND_WALK }, ..PLAIN },
    Mix { name: "random walk", character: Character { readout: 0.0, walk: 3.0, ..WHITE_AND_WALK }, ..PLAIN },
    Mix { name: "white, walk", ..PLAIN },
    Mix { name: "white, walk, wander", character: Character { wander: 0.1, ..WHITE_AND_WALK }, ..PLAIN },
    Mix {
        name: "strong wander",
        // In 40 s the drift wanders by 6 counts/s; the data sheet has room for it.
        character: Character { readout: 1.0, walk: 0.0, wander: 1.0, drift_limit: 200.0 },
        ..PLAIN
    },
    Mix {
        name: "rounding, no dither",
        character: Character { readout: 0.05, walk: 0.0, wander: 0.0, drift_limit: 0.5 },
        may_over_cover: true,
        ..PLAIN
    },
    Mix {
        name: "irregular, missing",
        character: Character { wander: 0.1, ..WHITE_AND_WALK },
        sampling: Sampling { hz: 100.0, jitter: 0.4, lost: 0.2 },
        timing: Timing { opening_s: 4.0, run_s: 10.0, closing_s: 3.0 },
        ..PLAIN
    },
    Mix {
        name: "three resets",
        // The level comes to 0.5 V in 132 samples.
        resets: Some(Resets { at_v: 0.5, periods: 2 }),
        timing: Timing { opening_s: 5.0, run_s: 5.0, closing_s: 5.0 },
        counts_per_s: 5000.0,
        ..PLAIN
    },
];

/// An estimate's score, that of the best linear estimate, and those of firmware's usual ones.
#[derive(Clone, Debug, Default)]
struct Row {
    ours: Tally,
    best: Tally,
    line: Tally,
    two_points: Tally,
    uncorrected: Tally,
}

/// In the order of `WHAT`.
type Rows = [Row; 4];

const WHAT: [&str; 4] = ["at stop", "closed", "drift", "drift, closed"];

impl Mix {
    fn record(&self, board: &Board, seed: u64) -> Record {
        let input = Input::steady(self.counts_per_s * board.input_per_count());
        let record = Plant::new(board, input, self.sampling, seed).measure(&self.timing, self.resets.as_ref());
        assert_eq!(record.resets, self.resets.map_or(0, |_| 3), "{}, seed {seed}", self.name);
        record
    }

    /// The second value: which runs were not called good, and why.
    fn score(&self, trials: u64) -> (Rows, Vec<(u64, Option<Reason>)>) {
        let board = Board::current(true, &self.character);
        let setup = board.setup::<Charge>(Policy::DEFAULT);
        // On an even grid one set of weights serves all records.
        let even = self.sampling.jitter == 0.0 && self.sampling.lost == 0.0;
        let plans = (even && self.resets.is_none()).then(|| {
            let record = self.record(&board, 0);
            [Using::UntilStop, Using::BothZeros].map(|using| Plan::new(&board, &record, using))
        });
        let mut rows = Rows::default();
        let mut not_good = Vec::new();
        for seed in 0..trials {
            let record = self.record(&board, seed);
            let answer = answer(&setup, &record);
            // A drift that has wandered out of the data sheet's limits is rightly not called good.
            let drift = record.drift_opening.abs().max(record.drift_closing.abs());
            let within_limits = drift <= board.circuit.drift_limit_v_per_s();
            if answer.reading.trust != Trust::Good && within_limits {
                not_good.push((seed, answer.reading.reasons.iter().next()));
            }
            let truths = [record.integral, record.integral, record.drift_opening, record.drift_closing];
            let ours = [answer.at_stop, answer.closed, answer.drift_opening, answer.drift_closing];
            each(&mut rows, ours, truths, |row| &mut row.ours);
            if self.resets.is_none() {
                let [stop, closed] = match &plans {
                    Some(plans) => plans.each_ref().map(|plan| plan.apply(&record)),
                    None => [Using::UntilStop, Using::BothZeros].map(|using| optimum(&board, &record, using)),
                };
                let best = [stop.integral, closed.integral, stop.drift, closed.drift];
                each(&mut rows, best, truths, |row| &mut row.best);
                let [at_stop, _, drift, _] = &mut rows;
                at_stop.line.add(certain(textbook::ordinary_line(&board, &record)), record.integral);
                at_stop.two_points.add(textbook::two_points(&board, &record), record.integral);
                at_stop.uncorrected.add(textbook::uncorrected(&board, &record), record.integral);
                drift.line.add(certain(textbook::ordinary_drift(&board, &record)), record.drift_opening);
                drift.two_points.add(textbook::two_point_drift(&board, &record), record.drift_opening);
            }
        }
        (rows, not_good)
    }
}

fn each(rows: &mut Rows, claims: [Claim; 4], truths: [f64; 4], of: impl Fn(&mut Row) -> &mut Tally) {
    for ((row, claim), truth) in rows.iter_mut().zip(claims).zip(truths) {
        of(row).add(claim, truth);
    }
}

/// A zero that stands on one code has no scatter: the textbook is certain then. Infinitely many `u` off is more than a
/// score sheet takes.
fn certain(claim: Claim) -> Claim {
    Claim { u: claim.u.max(1e-30), ..claim }
}

impl Row {
    fn row(&self, mix: &str, what: &str) -> String {
        let best = self.best.rms_error();
        let relative = |tally: &Tally| match self.best.trials() {
            0 => "–".to_owned(),
            _ => format!("{:.2}", tally.rms_error() / best),
        };
        let naive = |tally: &Tally| match tally.trials() {
            0 => "–".to_owned(),
            _ => format!("{:.0} %, {}", tally.coverage_95(), relative(tally)),
        };
        format!(
            "| {mix} | {what} | {:.1} % | {:.1} % | {:.2} | {} | {} | {} | {} |",
            self.ours.coverage_95(),
            self.ours.coverage_68(),
            self.ours.rms_z(),
            match self.best.trials() {
                0 => "–".to_owned(),
                _ => format!("{:.3}", self.ours.rms_error() / best),
            },
            naive(&self.line),
            naive(&self.two_points),
            naive(&self.uncorrected),
        )
    }

    /// At full size the bounds are those claimed. Fewer trials scatter more: then they are 3.5 standard errors of the
    /// share, and an rms error relative to the optimum's is allowed 2 % more.
    fn faults(&self, what: &str, may_over_cover: bool) -> Vec<String> {
        let n = f64::from(self.ours.trials());
        let (near_95, near_68, near_best) = match n < 2000.0 {
            true => (3.5 * (95.0 * 5.0 / n).sqrt(), 3.5 * (68.3 * 31.7 / n).sqrt(), 1.07),
            false => (2.0, 3.0, 1.05),
        };
        let (high, low, efficiency) =
            (self.ours.coverage_95(), self.ours.coverage_68(), self.ours.rms_error() / self.best.rms_error());
        let mut faults = Vec::new();
        if high < 95.0 - near_95 || (high > 95.0 + near_95 && !may_over_cover) {
            faults.push(format!("{what}: 1.96 u covers {high:.1} %"));
        }
        if low < 68.0 - near_68 || (low > 68.0 + near_68 && !may_over_cover) {
            faults.push(format!("{what}: u covers {low:.1} %"));
        }
        if self.best.trials() > 0 && efficiency > near_best {
            faults.push(format!("{what}: rms error is {efficiency:.3} of the optimum's"));
        }
        faults
    }
}

#[test]
fn intervals_hold_the_truth_as_often_as_they_say() {
    let trials = trials(500);
    let mut table = Table::new(
        "| noise | estimate | 95 % holds | 68 % holds | rms/u | rms/best | least squares | two points | none |",
    );
    let mut faults = Vec::new();
    for mix in &MIXES {
        let (rows, not_good) = mix.score(trials);
        if let Some((seed, why)) = not_good.first() {
            let share = 100.0 * not_good.len() as f64 / trials as f64;
            faults.push(format!("{}: {share:.1} % of sound runs are not good, seed {seed} for {why:?}", mix.name));
        }
        for (row, what) in rows.iter().zip(WHAT) {
            table.row(row.row(mix.name, what));
            faults.extend(row.faults(&format!("{}, {what}", mix.name), mix.may_over_cover));
        }
    }
    table.print();
    assert!(faults.is_empty(), "{faults:#?}");
}
