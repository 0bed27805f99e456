//! The reference estimator for recorded traces, itself judged: against traces with known truth from an independent
//! circuit simulation (see `traces/README.md`), and against simulated runs, in which its uncertainty must be true.

mod common;
#[path = "../examples/replay/trace_file.rs"]
mod trace_file;

use std::fs::File;
use std::io::BufReader;
use std::ops::RangeInclusive;
use std::path::PathBuf;

use brimline::{Mode, Sample};
use common::recorded::{Attained, Figures, attained};
use rand::{RngExt, SeedableRng};
use rand_chacha::ChaCha8Rng;
use rand_distr::StandardNormal;
use serde_json::Value;

/// A trace's name, the standard uncertainties at stop and closed that `traces/README.md` prints to one or two digits,
/// and what ours may be relative to them. With resets ours is larger by what the lines beside them add. In `held` it is
/// smaller: the drift's share does not grow through the hold, and the printed one is near to what it is if it does.
const TRACES: [(&str, [f64; 2], RangeInclusive<f64>); 8] = [
    ("hatchery", [0.6e-10, 0.5e-10], 0.9..=1.25),
    ("dim_lamp", [2.6e-12, 1.3e-12], 0.93..=1.07),
    ("wandering_offset", [1.1e-3, 5.3e-4], 0.93..=1.07),
    ("search_coil", [1.3e-6, 3.7e-7], 0.93..=1.07),
    ("leaky", [1.2e-6, 0.9e-6], 0.93..=1.07),
    ("soakage", [0.4e-10, 0.3e-10], 0.9..=1.25),
    ("held", [2.5e-5, 2.1e-5], 0.65..=0.85),
    ("tick_wrap", [0.6e-10, 0.5e-10], 0.9..=1.25),
];

fn path(file: &str) -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/traces").join(file)
}

fn number(object: &Value, key: &str) -> f64 {
    object[key].as_f64().unwrap_or_else(|| panic!("{key} is a number"))
}

/// From the circuit that the trace was simulated with. The drift's prior is a loose data sheet: 2 mV and 200 pA.
fn figures(plant: &Value) -> Figures {
    let (capacitance, lsb, input_ohm) = (number(plant, "c_f"), number(plant, "lsb_v"), plant["r_in"].as_f64());
    let per_count = capacitance * lsb * input_ohm.unwrap_or(1.0);
    let drift_limit = (2e-3 / input_ohm.unwrap_or(number(plant, "r_shunt")) + 200e-12) / (capacitance * lsb);
    let branches = plant["da"].as_array().expect("a list of branches");
    let inverting = plant["inverting"].as_bool().expect("yes or no");
    Figures {
        input_per_count: if inverting { -per_count } else { per_count },
        readout_var: number(plant, "adc_noise_lsb").powi(2) + 1.0 / 12.0,
        level_walk: 0.5 * (number(plant, "in_noise") / per_count).powi(2),
        rate_walk: (number(plant, "vos_rw") / per_count).powi(2),
        rate_prior_var: drift_limit * drift_limit / 3.0,
        reset_counts: (number(plant, "v_reset") - number(plant, "adc_lo")) / lsb,
        leak_tau_s: plant["leak_tau"].as_f64(),
        soakage: branches.iter().map(|b| (b[0].as_f64().expect("share"), b[1].as_f64().expect("time"))).collect(),
        nonlinearity: Vec::new(),
        tick_hz: number(plant, "tick_hz"),
        edge_samples: 16,
    }
}

#[test]
fn traces_with_known_truth_are_met_with_the_uncertainty_that_an_independent_reference_states() {
    println!("| trace | | error | u | error/u | u / printed u |\n| --- | --- | --- | --- | --- | --- |");
    for (name, printed, allowed) in TRACES {
        let text = std::fs::read_to_string(path(&format!("{name}.truth.json"))).expect("the truth is readable");
        let known: Value = serde_json::from_str(&text).expect("the truth is JSON");
        let file = BufReader::new(File::open(path(&format!("{name}.csv"))).expect("the trace is readable"));
        let trace = trace_file::TraceFile::new(file, name, 0..=1 << 18).expect("the trace has a header");
        let samples: Vec<Sample> = trace.map(|row| row.expect("a whole row")).collect();
        let found = attained(&figures(&known["plant"]), &samples);
        let truth = number(&known["truth"]["runs"][0], "integral");
        let closed = found.closed.expect("the trace has a closing zero");
        for ((stage, claim), printed) in [("at stop", found.at_stop), ("closed", closed)].iter().zip(printed) {
            let (error, ratio) = (claim.value - truth, claim.u / printed);
            println!("| {name} | {stage} | {error:.2e} | {:.2e} | {:.2} | {ratio:.2} |", claim.u, error / claim.u);
            assert!(error.abs() <= 3.0 * claim.u, "{name} {stage}: {error:e}, u {:e}", claim.u);
            assert!(allowed.contains(&ratio), "{name} {stage}: {:e} against {printed:e}", claim.u);
        }
    }
}

/// A circuit in counts and seconds, simulated in steps far shorter than a sample. Levels count from the reset level.
struct Simulation {
    figures: Figures,
    /// Input in counts/s: steady, and its growth per second.
    input: (f64, f64),
    rng: ChaCha8Rng,
    level: f64,
    soaked: Vec<f64>,
    drift: f64,
    seconds: f64,
    truth: f64,
    samples: Vec<Sample>,
}

const SAMPLE_S: f64 = 0.02;
const SUBSTEPS: u32 = 4;
/// A bent converter: its code is above the ideal one by so much at mid-scale, as far below it from the knee on.
const BEND: f64 = 30.0;
const MIDDLE: f64 = 32768.0;
const KNEE: f64 = 45000.0;

fn bend(code: f64) -> f64 {
    BEND * if code < MIDDLE { code / MIDDLE } else { (1.0 - 2.0 * (code - MIDDLE) / (KNEE - MIDDLE)).max(-1.0) }
}

impl Simulation {
    fn normal(&mut self) -> f64 {
        self.rng.sample(StandardNormal)
    }

    /// Rate of change of the level, and of each branch, for charge that arrives at `inflow` counts/s.
    fn rates(&self, level: f64, soaked: &[f64], inflow: f64) -> (f64, Vec<f64>) {
        let branches = self.figures.soakage.iter().zip(soaked);
        let into: Vec<f64> = branches.map(|(&(_, tau), held)| (level - held) / tau).collect();
        let absorbed: f64 = self.figures.soakage.iter().zip(&into).map(|(&(share, _), rate)| share * rate).sum();
        (inflow - absorbed - self.figures.leak_tau_s.map_or(0.0, |tau| level / tau), into)
    }

    fn step(&mut self, mode: Mode, dt: f64) {
        let rate = self.input.0 + self.input.1 * (self.seconds + 0.5 * dt);
        let signal = if matches!(mode, Mode::Integrate | Mode::Reset) { rate } else { 0.0 };
        // Bias alone drives the level in a hold.
        let drift = if mode == Mode::Hold { 0.3 * self.drift } else { self.drift };
        let flows = if mode == Mode::Integrate { signal } else { 0.0 };
        let inflow = flows + drift + (self.figures.level_walk / dt).sqrt() * self.normal();
        self.truth += signal * dt * self.figures.input_per_count;
        self.drift += (self.figures.rate_walk * dt).sqrt() * self.normal();
        self.seconds += dt;
        let moved = |from: &[f64], rates: &[f64], dt: f64| -> Vec<f64> {
            from.iter().zip(rates).map(|(value, rate)| value + rate * dt).collect()
        };
        if mode == Mode::Reset {
            self.level = 0.0;
        }
        let (rate, into) = self.rates(self.level, &self.soaked, inflow);
        let halfway = (self.level + 0.5 * dt * rate, moved(&self.soaked, &into, 0.5 * dt));
        let (rate, into) = if mode == Mode::Reset { (0.0, into) } else { self.rates(halfway.0, &halfway.1, inflow) };
        self.level += rate * dt;
        self.soaked = moved(&self.soaked, &into, dt);
    }

    fn dwell(&mut self, mode: Mode, periods: u32) {
        if self.samples.last().is_some_and(|last| last.mode == Mode::Reset) && mode != Mode::Reset {
            self.level += self.rng.random_range(-8.0..=8.0);
        }
        for _ in 0..periods {
            for _ in 0..SUBSTEPS {
                self.step(mode, SAMPLE_S / f64::from(SUBSTEPS));
            }
            let ideal = self.level + self.figures.reset_counts;
            let readout = (self.figures.readout_var - 1.0 / 12.0).sqrt() * self.normal();
            let bent = !self.figures.nonlinearity.is_empty();
            // The bend belongs to the code that is given.
            let shift = if bent { bend(ideal + bend(ideal)) } else { 0.0 };
            let counts = (ideal + shift + readout).round() as i32;
            let tick = ((self.seconds * self.figures.tick_hz).round() as u64 + 0xFFF0_0000) as u32;
            self.samples.push(Sample { tick, counts, mode, temperature: None });
        }
    }
}

/// Simulates a script of modes and sample periods, and gives what the reference makes of it, with the truth.
fn trial(figures: &Figures, rate: f64, script: &[(Mode, u32)], seed: u64) -> (Attained, f64) {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let drift = figures.rate_prior_var.sqrt() * rng.sample::<f64, _>(StandardNormal);
    let input = (rate * rng.random_range(0.8..=1.2), 0.02 * rate);
    let soaked = vec![0.0; figures.soakage.len()];
    let figures = figures.clone();
    let samples = Vec::new();
    let mut plant = Simulation { figures, input, rng, level: 0.0, soaked, drift, seconds: 0.0, truth: 0.0, samples };
    for (index, &(mode, periods)) in script.iter().enumerate() {
        plant.dwell(mode, periods);
        if index == 0 {
            // The reset at power-up is no dead time.
            plant.truth = 0.0;
        }
    }
    (attained(&plant.figures, &plant.samples), plant.truth)
}

/// Errors over many trials must scatter by their uncertainty; gives that, counts, at stop and closed.
fn check(name: &str, figures: &Figures, rate: f64, script: &[(Mode, u32)]) -> [f64; 2] {
    const TRIALS: u32 = 400;
    let mut squares = [0.0; 2];
    let mut u = [0.0; 2];
    for seed in 0..TRIALS {
        let (found, truth) = trial(figures, rate, script, u64::from(seed));
        let claims = [found.at_stop, found.closed.expect("the script has a closing zero")];
        for ((square, u), claim) in squares.iter_mut().zip(&mut u).zip(claims) {
            *square += ((claim.value - truth) / claim.u).powi(2) / f64::from(TRIALS);
            *u = claim.u / figures.input_per_count.abs();
        }
    }
    let rms = squares.map(f64::sqrt);
    println!("{name}: rms of error/u {rms:.3?} at stop and closed; u {u:.2?} counts");
    assert!(rms.iter().all(|rms| (0.9..=1.1).contains(rms)), "{name}: {rms:?}");
    u
}

const PLAIN: Figures = Figures {
    input_per_count: -7.6e-12,
    readout_var: 0.81 + 1.0 / 12.0,
    level_walk: 0.5,
    rate_walk: 0.01,
    rate_prior_var: 400.0,
    reset_counts: 32767.6,
    leak_tau_s: None,
    soakage: Vec::new(),
    nonlinearity: Vec::new(),
    tick_hz: 1e6,
    edge_samples: 8,
};

const WITH_RESET: [(Mode, u32); 6] = [
    (Mode::Reset, 5),
    (Mode::Zero, 120),
    (Mode::Integrate, 200),
    (Mode::Reset, 2),
    (Mode::Integrate, 150),
    (Mode::Zero, 120),
];

#[test]
fn uncertainty_is_true_with_a_leak_and_a_reset() {
    let figures = Figures { input_per_count: 7.6e-6, leak_tau_s: Some(1.5), ..PLAIN };
    check("leak, voltage input", &figures, -5000.0, &WITH_RESET);
}

#[test]
fn uncertainty_is_true_where_the_leak_makes_noise_of_the_readout() {
    let figures = Figures { leak_tau_s: Some(0.2), readout_var: 400.0, level_walk: 0.1, rate_walk: 0.0, ..PLAIN };
    check("fast leak", &figures, 30000.0, &WITH_RESET);
}

#[test]
fn uncertainty_is_true_with_soakage_and_a_reset() {
    let soakage = vec![(0.003, 0.08), (0.008, 1.1)];
    let figures = Figures { soakage, ..PLAIN };
    check("soakage, current input", &figures, 4000.0, &WITH_RESET);
}

#[test]
fn uncertainty_is_true_with_a_bent_converter_a_reset_and_a_hold() {
    let nonlinearity = vec![(0.0, 0.0), (MIDDLE, BEND), (KNEE, -BEND)];
    let script = [
        (Mode::Reset, 5),
        (Mode::Zero, 120),
        (Mode::Integrate, 100),
        (Mode::Hold, 100),
        (Mode::Integrate, 100),
        (Mode::Reset, 3),
        (Mode::Integrate, 12),
        (Mode::Zero, 120),
    ];
    check("bend, hold", &Figures { nonlinearity, ..PLAIN }, 6000.0, &script);
}

#[test]
fn uncertainty_is_true_for_a_run_between_holds_after_a_zero_too_short_to_tell_the_drift() {
    let script = [
        (Mode::Reset, 5),
        (Mode::Zero, 3),
        (Mode::Hold, 20),
        (Mode::Integrate, 200),
        (Mode::Hold, 50),
        (Mode::Zero, 120),
    ];
    let [at_stop, _] = check("held at both ends, short zero", &PLAIN, 4000.0, &script);
    let by_data_sheet = PLAIN.rate_prior_var.sqrt() * 200.0 * SAMPLE_S;
    assert!(at_stop < by_data_sheet, "never worse than with no zero: {at_stop} {by_data_sheet}");
}

#[test]
fn uncertainty_is_true_where_the_last_line_reaches_the_last_reading() {
    let script = [
        (Mode::Reset, 5),
        (Mode::Zero, 120),
        (Mode::Integrate, 100),
        (Mode::Reset, 2),
        (Mode::Integrate, 5),
        (Mode::Zero, 120),
    ];
    let figures = Figures { readout_var: 400.0, level_walk: 0.1, rate_walk: 0.0, ..PLAIN };
    check("short end", &figures, 4000.0, &script);
}

#[test]
fn uncertainty_is_true_for_a_short_run_between_long_zeros_in_which_the_drift_wanders() {
    let script = [(Mode::Reset, 5), (Mode::Zero, 240), (Mode::Integrate, 50), (Mode::Zero, 240)];
    let figures = Figures { level_walk: 0.02, rate_walk: 4.0, ..PLAIN };
    check("wander", &figures, 4000.0, &script);
}
