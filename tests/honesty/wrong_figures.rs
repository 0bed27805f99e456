//! A set-up whose noise figures are a factor 3 off: what the intervals are still worth, and whether anybody is told.

use brimline::{Channel, Charge, Event, Noise, Policy, Reason};

use crate::common::board::{Board, Character};
use crate::common::plant::{Input, Plant, Sampling, Timing};
use crate::common::tally::Tally;
use crate::common::{Claim, answer_with_notices};
use crate::{Table, WHITE_AND_WALK, percent, trials};

const RUN_S: f64 = 30.0;
const TRUE_CHARACTER: Character = Character { wander: 0.1, ..WHITE_AND_WALK };

#[derive(Clone, Copy, Debug)]
enum Figure {
    Readout,
    InputDensity,
    OffsetWander,
}

impl Figure {
    fn scaled(self, noise: Noise, factor: f64) -> Noise {
        match self {
            Self::Readout => Noise { readout_counts: noise.readout_counts * factor, ..noise },
            Self::InputDensity => Noise { input_density: noise.input_density * factor, ..noise },
            Self::OffsetWander => Noise { offset_wander: noise.offset_wander * factor, ..noise },
        }
    }

    fn name(self) -> &'static str {
        match self {
            Self::Readout => "readout_counts",
            Self::InputDensity => "input_density",
            Self::OffsetWander => "offset_wander",
        }
    }
}

#[derive(Clone, Debug, Default)]
struct Outcome {
    at_stop: Tally,
    closed: Tally,
    drift: Tally,
    /// Runs with such a notice or reason.
    told: u32,
    onsets: u32,
    inconsistent: u32,
}

fn outcome(figure: Figure, factor: f64, zero_s: f64, trials: u64) -> Outcome {
    let timing = Timing { opening_s: zero_s, run_s: RUN_S, closing_s: zero_s };
    let board = Board::current(true, &TRUE_CHARACTER);
    let believed = Board { noise: figure.scaled(board.noise, factor), ..board };
    let setup = believed.setup::<Charge>(Policy::DEFAULT);
    let mut outcome = Outcome::default();
    for seed in 0..trials {
        let input = Input::steady(500.0 * board.input_per_count());
        let record = Plant::new(&board, input, Sampling::even(100.0), seed).measure(&timing, None);
        let (answer, notices) = answer_with_notices(&setup, &record);
        outcome.at_stop.add(answer.at_stop, record.integral);
        outcome.closed.add(answer.closed, record.integral);
        outcome.drift.add(answer.drift_opening, record.drift_opening);
        let brought = |event: fn(Event) -> bool| u32::from(notices.iter().any(|(_, notice)| event(notice.event)));
        outcome.told += brought(|event| matches!(event, Event::NoiseFigures { .. }));
        outcome.onsets += brought(|event| event == Event::InputInZero);
        outcome.inconsistent += u32::from(answer.reading.reasons.contains(Reason::Inconsistent));
    }
    outcome
}

/// A factor on a figure, zeros of so many seconds, and how often, in per cent, the 95 % intervals at stop and closed
/// must hold the truth at least. Where a wrong figure is to be borne, that is 85.
struct Case {
    figure: Figure,
    factor: f64,
    zero_s: f64,
    at_stop: f64,
    closed: f64,
}

const fn case(figure: Figure, factor: f64, zero_s: f64) -> Case {
    Case { figure, factor, zero_s, at_stop: 85.0, closed: 85.0 }
}

const CASES: [Case; 12] = [
    case(Figure::Readout, 1.0, 20.0),
    case(Figure::Readout, 3.0, 20.0),
    case(Figure::Readout, 1.0 / 3.0, 20.0),
    case(Figure::InputDensity, 3.0, 20.0),
    case(Figure::InputDensity, 1.0 / 3.0, 20.0),
    case(Figure::OffsetWander, 3.0, 20.0),
    // Falls short of 85 %: block by block the wander hides below the walk, and a single run has but two zeros to
    // compare.
    // Measured, of 2,000: 65 and 72 %.
    Case { at_stop: 61.0, closed: 68.0, ..case(Figure::OffsetWander, 1.0 / 3.0, 20.0) },
    case(Figure::InputDensity, 3.0, 120.0),
    case(Figure::InputDensity, 1.0 / 3.0, 120.0),
    case(Figure::OffsetWander, 3.0, 120.0),
    // Nor do longer zeros help: 61 and 66 %, 58 and 68 %.
    Case { at_stop: 58.0, closed: 63.0, ..case(Figure::OffsetWander, 1.0 / 3.0, 120.0) },
    Case { at_stop: 55.0, closed: 64.0, ..case(Figure::OffsetWander, 1.0 / 3.0, 300.0) },
];

#[test]
fn wrong_figures_are_noticed_or_bearable() {
    let trials = trials(300);
    let mut table = Table::new(
        "| figure in the set-up | zeros | at stop, 95 % holds | rms/u | closed, 95 % holds | rms/u | drift, 95 % holds | NoiseFigures | InputInZero | Inconsistent |",
    );
    let outcomes = CASES.map(|case| {
        let outcome = outcome(case.figure, case.factor, case.zero_s, trials);
        let name = match case.factor {
            1.0 => "all right".to_owned(),
            factor if factor > 1.0 => format!("{} three times too large", case.figure.name()),
            _ => format!("{} three times too small", case.figure.name()),
        };
        let share = |n: u32| percent(n, trials as u32);
        table.row(format!(
            "| {name} | {} s | {:.1} % | {:.2} | {:.1} % | {:.2} | {:.1} % | {:.0} % | {:.1} % | {:.1} % |",
            case.zero_s,
            outcome.at_stop.coverage_95(),
            outcome.at_stop.rms_z(),
            outcome.closed.coverage_95(),
            outcome.closed.rms_z(),
            outcome.drift.coverage_95(),
            share(outcome.told),
            share(outcome.onsets),
            share(outcome.inconsistent),
        ));
        (name, outcome, case)
    });
    table.print();
    for (name, outcome, case) in &outcomes {
        let (at_stop, closed) = (outcome.at_stop.coverage_95(), outcome.closed.coverage_95());
        assert!(at_stop >= case.at_stop, "{name}, zeros of {} s: at stop 1.96 u covers {at_stop:.1} %", case.zero_s);
        assert!(closed >= case.closed, "{name}, zeros of {} s: closed 1.96 u covers {closed:.1} %", case.zero_s);
    }
}

/// A group of runs of a series: from which on, and how many.
const SPANS: [(usize, usize); 4] = [(0, 2), (2, 4), (6, 8), (14, 16)];
const RUNS: usize = 30;
const SERIES_ZERO_S: f64 = 20.0;

#[derive(Clone, Copy, Debug, Default)]
struct Span {
    at_stop: Tally,
    closed: Tally,
    not_good: u32,
}

/// Coverage in each span of a series, and the number of series in which a notice told of wander.
fn series(figure: Figure, factor: f64, trials: u64) -> ([Span; 4], u32) {
    // A drift that leaves the level within the rails for half an hour.
    let board = Board::current(true, &Character { drift_limit: 5.0, ..TRUE_CHARACTER });
    let believed = Board { noise: figure.scaled(board.noise, factor), ..board };
    let setup = believed.setup::<Charge>(Policy::DEFAULT);
    let timing = Timing { opening_s: SERIES_ZERO_S, run_s: RUN_S, closing_s: SERIES_ZERO_S };
    let (mut spans, mut told) = ([Span::default(); 4], 0);
    for seed in 0..trials {
        let input = Input::steady(5.0 * board.input_per_count());
        let series = Plant::new(&board, input, Sampling::even(100.0), seed).measure_series(&timing, RUNS);
        let mut channel = Channel::new(&setup);
        let mut readings = Vec::new();
        let mut wander_told = false;
        let mut ends = series.runs.iter().map(|run| run.closing_end).peekable();
        for (index, &sample) in series.samples.iter().enumerate() {
            let step = channel.feed(sample);
            wander_told |= step.notices.iter().any(|notice| matches!(notice.event, Event::DriftWander { .. }));
            if ends.next_if_eq(&index).is_some() {
                readings.extend(channel.reading());
            }
        }
        told += u32::from(wander_told);
        assert_eq!(readings.len(), RUNS);
        for ((from, runs), span) in SPANS.iter().zip(&mut spans) {
            for (reading, run) in readings.iter().zip(&series.runs).skip(*from).take(*runs) {
                let Some(closed) = reading.closed else { panic!("a run without a zero after it") };
                span.at_stop.add(Claim::of(&reading.at_stop.integral), run.integral);
                span.closed.add(Claim::of(&closed.integral), run.integral);
                // In half an hour the drift may wander out of the data sheet's limits, and is rightly not called good.
                let others = reading.reasons.iter().any(|reason| reason != Reason::DriftOutsideLimits);
                span.not_good += u32::from(others);
            }
        }
    }
    (spans, told)
}

/// The drifts of successive zeros tell of a wander that no single zero shows.
#[test]
fn an_understated_wander_shows_from_zero_to_zero() {
    let trials = trials(100).min(500);
    let mut table = Table::new(
        "| figure in the set-up | runs | at stop, 95 % holds | rms/u | closed, 95 % holds | rms/u | not good | DriftWander in series |",
    );
    let mut found = Vec::new();
    for (figure, factor, name) in [
        (Figure::OffsetWander, 1.0, "all right"),
        (Figure::OffsetWander, 1.0 / 3.0, "offset_wander three times too small"),
        (Figure::InputDensity, 1.0 / 3.0, "input_density three times too small"),
    ] {
        let (spans, told) = series(figure, factor, trials);
        for ((from, runs), span) in SPANS.iter().zip(&spans) {
            table.row(format!(
                "| {name} | {} to {} | {:.1} % | {:.2} | {:.1} % | {:.2} | {:.1} % | {:.0} % |",
                from + 1,
                from + runs,
                span.at_stop.coverage_95(),
                span.at_stop.rms_z(),
                span.closed.coverage_95(),
                span.closed.rms_z(),
                percent(span.not_good, span.closed.trials()),
                percent(told, trials as u32),
            ));
        }
        found.push((name, spans));
    }
    table.print();
    for (name, [.., last]) in found {
        let (at_stop, closed) = (last.at_stop.coverage_95(), last.closed.coverage_95());
        assert!(at_stop >= 85.0 && closed >= 85.0, "{name}: 1.96 u covers {at_stop:.1} and {closed:.1} % in the end");
    }
}
