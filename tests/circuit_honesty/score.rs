//! A case: a board, how the true circuit differs from it, and a script; and what its trials come to.

use brimline::{Channel, Charge, Circuit, Event, Mode, Policy, Reading, Reason, SoakageBranch};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;

use crate::common::Claim;
use crate::common::board::Board;
use crate::common::plant::Input;
use crate::common::plant::bench::{Bench, Flaws, Play, Stay};
use crate::common::tally::Tally;

/// What is scored, and which coverage is asked of it.
pub(crate) const WHAT: [&str; 7] = ["at stop", "closed", "drift, opening", "drift, closing", "droop", "offset", "bias"];

pub(crate) struct Case {
    pub(crate) name: String,
    pub(crate) board: Board,
    pub(crate) policy: Policy,
    pub(crate) script: Vec<Stay>,
    /// Counts/s, without sign.
    pub(crate) counts_per_s: f64,
    /// Samples in a second.
    pub(crate) hz: f64,
    /// The true circuit's, drawn anew for each trial.
    pub(crate) flaws: Draw,
    pub(crate) asked: Asked,
}

/// Draws the flaws of a trial.
pub(crate) type Draw = Box<dyn Fn(&mut ChaCha8Rng) -> Flaws>;

/// The score of a case, in the order of `WHAT`; what the script does not tell of has no trials.
#[derive(Clone, Debug, Default)]
pub(crate) struct Score {
    pub(crate) rows: [Tally; 7],
    /// At stop and closed, by a set-up that knows nothing of leak, soakage and pedestal.
    pub(crate) uncorrected: [Tally; 2],
    /// Runs of a sound circuit that are not called good, and why the first is not.
    pub(crate) not_good: u32,
    pub(crate) why: Option<(u64, Vec<Reason>)>,
    /// Runs with that notice or reason.
    pub(crate) onsets: u32,
    pub(crate) inconsistent: u32,
    /// Samples taken for spikes.
    pub(crate) spikes: u32,
}

/// What a channel says of a play.
struct Answer {
    reading: Reading<Charge>,
    claims: [Option<(Claim, f64)>; 7],
    onset: bool,
    spikes: u32,
}

fn answer(board: &Board, policy: Policy, play: &Play) -> Answer {
    let setup = board.setup::<Charge>(policy);
    let mut channel = Channel::new(&setup);
    let (mut at_stop, mut drift_opening, mut onset, mut spikes) = (None, None, false, 0);
    for (index, &sample) in play.samples.iter().enumerate() {
        let step = channel.feed(sample);
        onset |= step.notices.iter().any(|notice| notice.event == Event::InputInZero);
        spikes += step.notices.iter().filter(|notice| notice.event == Event::Spike).count() as u32;
        if index == play.opening_end && sample.mode == Mode::Zero {
            drift_opening = Some(Claim::of_drift(&channel.drift()));
        }
        if index == play.run_end {
            at_stop = channel.reading().map(|reading| reading.at_stop);
        }
    }
    let (Some(reading), Some(at_stop)) = (channel.reading(), at_stop) else { panic!("the script holds a run") };
    assert_eq!(reading.at_stop, at_stop, "the value at stop does not change when the zero begins");
    let closed = reading.closed.map(|closed| (Claim::of(&closed.integral), play.integral));
    let held = play.samples.iter().any(|sample| sample.mode == Mode::Hold);
    let droop = held.then(|| (Claim::of_drift(&channel.droop()), play.droop));
    let (offset, bias) = channel
        .offset_and_bias()
        .map(|(offset, bias)| {
            let offset = Claim { value: offset.value.as_volts(), u: offset.u.as_volts() };
            let bias = Claim { value: bias.value.as_amperes(), u: bias.u.as_amperes() };
            ((offset, play.offset_v), (bias, play.bias_a))
        })
        .unzip();
    let claims = [
        Some((Claim::of(&at_stop.integral), play.integral)),
        closed,
        drift_opening.map(|claim| (claim, play.drift_opening)),
        closed.map(|_| (Claim::of_drift(&channel.drift()), play.drift_closing)),
        droop,
        offset,
        bias,
    ];
    Answer { reading, claims, onset, spikes }
}

impl Case {
    /// A board as its set-up says, sampled 100 times a second.
    pub(crate) fn new(name: impl Into<String>, board: Board, script: Vec<Stay>, counts_per_s: f64) -> Self {
        Self {
            name: name.into(),
            board,
            policy: Policy::DEFAULT,
            script,
            counts_per_s,
            hz: 100.0,
            flaws: Box::new(|_| Flaws::default()),
            asked: Asked::Right,
        }
    }

    /// A trial, and whether its circuit is what the set-up says: a figure that is off by more than 2.5 of its
    /// uncertainties may rightly raise an alarm.
    fn play(&self, seed: u64) -> (Play, bool) {
        // Apart from the trial's own numbers, so that noise and offsets are the same whatever the flaws.
        let mut rng = ChaCha8Rng::seed_from_u64(!seed);
        let flaws = (self.flaws)(&mut rng);
        let circuit = &self.board.circuit;
        let sound = flaws.leak.abs() <= 2.5 * circuit.leak_u_rel && flaws.shares.abs() <= 2.5 * circuit.soakage_u_rel;
        let input = Input::steady(self.counts_per_s * self.board.input_per_count());
        (Bench::new(&self.board, input, self.hz, &flaws, seed).play(&self.script), sound)
    }

    /// The board as if nothing leaked or soaked and the pedestal were unknown.
    fn simple(&self) -> Board {
        let circuit = Circuit {
            leak_time_constant_s: None,
            soakage: [SoakageBranch::NONE; 4],
            pedestal_u_v: None,
            ..self.board.circuit
        };
        Board { circuit, ..self.board }
    }

    pub(crate) fn score(&self, trials: u64) -> Score {
        let simple = self.simple();
        let mut score = Score::default();
        for seed in 0..trials {
            let (play, sound) = self.play(seed);
            let answer_ = answer(&self.board, self.policy, &play);
            for (tally, claim) in score.rows.iter_mut().zip(answer_.claims) {
                if let Some((claim, truth)) = claim {
                    tally.add(claim, truth);
                }
            }
            let plain = answer(&simple, self.policy, &play);
            for (tally, claim) in score.uncorrected.iter_mut().zip(plain.claims) {
                if let Some((claim, truth)) = claim {
                    tally.add(claim, truth);
                }
            }
            let reasons = answer_.reading.reasons;
            if sound && !reasons.is_empty() {
                score.not_good += 1;
                score.why.get_or_insert_with(|| (seed, reasons.iter().collect()));
            }
            score.onsets += u32::from(answer_.onset);
            score.inconsistent += u32::from(reasons.contains(Reason::Inconsistent));
            score.spikes += answer_.spikes;
        }
        score
    }
}

/// What is asked of the coverages.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Asked {
    Right,
    /// That they are no less than right.
    AtLeast,
    /// Right, but no less than right for droop, offset and bias: of several holds the former count for little, since
    /// the bias may have changed, and here it has not.
    SeveralHolds,
}

impl Score {
    /// Rows of the table: case, estimate, coverages, errors over `u`, mean `u` in counts or counts/s (volts and amperes
    /// for offset and bias: not printed), and the rms error of the simple set-up over ours.
    pub(crate) fn rows(&self, case: &Case) -> String {
        let (count, lsb_v) = (case.board.input_per_count(), case.board.converter.lsb_v);
        let units = [count, count, lsb_v, lsb_v, lsb_v, 1e-6, 1e-12];
        let mut text = String::new();
        for (index, ((tally, what), unit)) in self.rows.iter().zip(WHAT).zip(units).enumerate() {
            if tally.trials() == 0 {
                continue;
            }
            let ratio = match self.uncorrected.get(index) {
                Some(simple) => format!("{:.3}", simple.rms_error() / tally.rms_error()),
                None => "–".to_owned(),
            };
            text.push_str(&format!(
                "| {} | {what} | {:.1} % | {:.1} % | {:+.2} | {:.3} | {:.3} | {ratio} |\n",
                case.name,
                tally.coverage_95(),
                tally.coverage_68(),
                tally.mean_z(),
                tally.rms_z(),
                tally.mean_u() / unit,
            ));
        }
        if let Some((seed, why)) = &self.why {
            text.push_str(&format!("| {} | not good | {} | seed {seed} | {why:?} | | | |\n", case.name, self.not_good));
        }
        text
    }

    /// Coverages are to be 95 and 68.3 % within half a point and one, and 3.5 standard errors of the share; the rms
    /// error is to be `u` within 3 % and 3.5 of its standard errors, `1/sqrt(2 n)`.
    pub(crate) fn faults(&self, case: &Case) -> Vec<String> {
        let mut faults = Vec::new();
        for (index, (tally, what)) in self.rows.iter().zip(WHAT).enumerate().filter(|(_, (row, _))| row.trials() > 0) {
            let n = f64::from(tally.trials());
            let near_95 = 0.5 + 3.5 * (95.0 * 5.0 / n).sqrt();
            let near_68 = 1.0 + 3.5 * (68.3 * 31.7 / n).sqrt();
            let near_rms = 0.03 + 3.5 / (2.0 * n).sqrt();
            let two_sided = match case.asked {
                Asked::Right => true,
                Asked::AtLeast => false,
                Asked::SeveralHolds => index < 4,
            };
            let mut ask = |name: &str, value: f64, right: f64, below: f64, above: f64| {
                let too_much = value > right + above && two_sided;
                if value < right - below || too_much {
                    faults.push(format!("{}, {what}: {name} is {value:.3}", case.name));
                }
            };
            ask("coverage of 1.96 u", tally.coverage_95(), 95.0, near_95, near_95);
            ask("coverage of u", tally.coverage_68(), 68.3, near_68, near_68);
            ask("1 less rms error over u", -tally.rms_z(), -1.0, near_rms, near_rms);
        }
        if let Some((seed, why)) = &self.why {
            let share = 100.0 * f64::from(self.not_good) / f64::from(self.rows[0].trials());
            faults.push(format!("{}: {share:.1} % of sound runs are not good, seed {seed} for {why:?}", case.name));
        }
        faults
    }
}

/// Scores cases one after another, prints them as a table in one piece, since tests run side by side, and gives the
/// scores with all that is wrong.
pub(crate) fn table(cases: &[Case], trials: u64) -> (Vec<Score>, Vec<String>) {
    let mut text =
        "\n| case | estimate | 95 % holds | 68 % holds | mean/u | rms/u | mean u | simple/ours |\n".to_owned();
    text.push_str("|---|---|--:|--:|--:|--:|--:|--:|\n");
    let (mut scores, mut faults) = (Vec::new(), Vec::new());
    for case in cases {
        let score = case.score(trials);
        text.push_str(&score.rows(case));
        faults.extend(score.faults(case));
        scores.push(score);
    }
    println!("{text}");
    (scores, faults)
}
