//! What an f64 estimator that knows the circuit's figures makes of a recorded trace: power-up, opening zero, a run with
//! resets and holds, closing zero.
//!
//! Least squares in information form (Kay 1993, Fundamentals of Statistical Signal Processing: Estimation Theory, from
//! memory) run forwards through the opening zero and backwards through the closing one; over the run they are joined by
//! what the drift's wander allows. The run is one weighted sum of effective levels; its noise follows from the weights.
//! Left out: a bend of the input beside an interruption, flicker, temperature, the gain's uncertainty, saturation.

use std::ops::Range;

use brimline::{Mode, Sample};
use nalgebra::{Matrix2, Vector2};

use super::Claim;

/// The circuit in counts and seconds.
#[derive(Clone, Debug)]
pub(crate) struct Figures {
    /// C or V s that move the level up by one count; negative where a positive input moves it down.
    pub(crate) input_per_count: f64,
    /// Variance of one reading, counts^2, rounding (1/12) included.
    pub(crate) readout_var: f64,
    /// Variance that the level gains by white input noise, counts^2/s: half the square of the one-sided density.
    pub(crate) level_walk: f64,
    /// Variance that the drift gains, (counts/s)^2/s.
    pub(crate) rate_walk: f64,
    /// Variance of the drift before anything was measured, (counts/s)^2.
    pub(crate) rate_prior_var: f64,
    /// Code of the level while the switch is closed.
    pub(crate) reset_counts: f64,
    /// Time constant with which the level leaks to the reset level.
    pub(crate) leak_tau_s: Option<f64>,
    /// Branches of dielectric absorption: share of the capacitance, time constant in seconds.
    pub(crate) soakage: Vec<(f64, f64)>,
    /// Code and by how much it is above the ideal one, by ascending code: straight between, constant beyond.
    pub(crate) nonlinearity: Vec<(f64, f64)>,
    pub(crate) tick_hz: f64,
    /// Readings in the straight line on each side of an interruption.
    pub(crate) edge_samples: usize,
}

/// The integral of the run, C or V s: with the opening zero alone, and with both zeros.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Attained {
    pub(crate) at_stop: Claim,
    pub(crate) closed: Option<Claim>,
}

pub(crate) fn attained(figures: &Figures, samples: &[Sample]) -> Attained {
    let rows = effective_levels(figures, samples);
    let run = Run::find(&rows);
    let outlook = Outlook::of(figures, &rows, &run);
    let closing = &rows[run.end + 1..];
    Attained {
        at_stop: outlook.integral(figures, &[]),
        closed: (!closing.is_empty()).then(|| outlook.integral(figures, closing)),
    }
}

/// A sample with its time, the time since the sample before, s, and the effective level above the reset level, counts.
struct Row {
    mode: Mode,
    time: f64,
    step: f64,
    level: f64,
}

/// The level freed from the converter's errors, from soakage and from leak: only input, drift and noise move it.
fn effective_levels(figures: &Figures, samples: &[Sample]) -> Vec<Row> {
    let reset = figures.reset_counts;
    let mut before: Option<(u32, f64)> = None;
    let (mut time, mut leaked) = (0.0, 0.0);
    let mut soaked: Vec<f64> = Vec::new();
    let row = |sample: &Sample| {
        let closed = sample.mode == Mode::Reset;
        let reading = ideal_code(&figures.nonlinearity, f64::from(sample.counts));
        // With the switch closed the level is known better than it is read.
        let end = if closed { reset } else { reading };
        let (last_tick, last_level) = before.unwrap_or((sample.tick, end));
        let start = if closed { reset } else { last_level };
        let step = f64::from(sample.tick.wrapping_sub(last_tick)) / figures.tick_hz;
        assert!(step > 0.0 || before.is_none(), "every sample has a tick of its own");
        // Before the first sample the branches were at rest at its level.
        soaked.resize(figures.soakage.len(), end);
        for (&(_, tau), held) in figures.soakage.iter().zip(&mut soaked).filter(|_| step > 0.0) {
            // Exact where the level is straight: far on, the branch trails it by slope times time constant.
            let trail = (end - start) / step * tau;
            *held = end - trail + (*held - start + trail) * (-step / tau).exp();
        }
        // While the switch is closed, start and end are the reset level.
        leaked += figures.leak_tau_s.map_or(0.0, |tau| (0.5 * (start + end) - reset) * step / tau);
        before = Some((sample.tick, end));
        time += step;
        let absorbed: f64 = figures.soakage.iter().zip(&soaked).map(|(&(share, _), held)| share * (held - reset)).sum();
        Row { mode: sample.mode, time, step, level: reading - reset + absorbed + leaked }
    };
    samples.iter().map(row).collect()
}

fn ideal_code(nonlinearity: &[(f64, f64)], code: f64) -> f64 {
    let above = nonlinearity.partition_point(|&(at, _)| at <= code);
    let error = match (above.checked_sub(1).map(|below| nonlinearity[below]), nonlinearity.get(above)) {
        (Some((a, low)), Some(&(b, high))) => low + (high - low) * (code - a) / (b - a),
        (Some((_, error)), None) | (None, Some(&(_, error))) => error,
        (None, None) => 0.0,
    };
    code - error
}

/// Where the run lies. The switches move right after a row: the run begins with the row before its first.
struct Run {
    /// The opening zero's rows.
    opening: Range<usize>,
    first: usize,
    end: usize,
    /// No interruption lies between zero and run, at either end.
    from_zero: bool,
    to_zero: bool,
}

impl Run {
    fn find(rows: &[Row]) -> Self {
        let position = |from: usize, mode: Mode| (from..rows.len()).find(|&i| rows[i].mode == mode);
        let zero = position(0, Mode::Zero).expect("the record has an opening zero");
        let first = position(zero, Mode::Integrate).expect("the record has a run");
        let last_zero = (zero..first).rfind(|&i| rows[i].mode == Mode::Zero).expect("a zero precedes the run");
        let opening = (zero..=last_zero).rfind(|&i| i == zero || rows[i - 1].mode != Mode::Zero).unwrap_or(zero);
        let end = position(first, Mode::Zero).unwrap_or(rows.len()) - 1;
        let closing = &rows[end + 1..];
        assert!(closing.iter().all(|row| row.mode == Mode::Zero), "the record ends with the run or its closing zero");
        let (from_zero, to_zero) = (last_zero + 1 == first, rows[end].mode == Mode::Integrate);
        Self { opening: opening..last_zero + 1, first, end, from_zero, to_zero }
    }

    /// First and last row of each stretch of `Integrate`.
    fn stretches(&self, rows: &[Row]) -> Vec<(usize, usize)> {
        let on = |i: usize| (self.first..=self.end).contains(&i) && rows[i].mode == Mode::Integrate;
        let starts = (self.first..=self.end).filter(|&i| on(i) && (i == self.first || !on(i - 1)));
        let ends = (self.first..=self.end).filter(|&i| on(i) && !on(i + 1));
        starts.zip(ends).collect()
    }
}

/// Each level's weight in the run's movement, drift included, but for the levels at ends that border on a zero.
fn weights(figures: &Figures, rows: &[Row], run: &Run) -> Vec<f64> {
    let mut weights = vec![0.0; rows.len()];
    let stretches = run.stretches(rows);
    for (index, &(from, to)) in stretches.iter().enumerate() {
        // The input flows on while the switch is closed, at the mean of the rates on both sides.
        let closed_before = if index > 0 { 0.5 * closed_time(rows, stretches[index - 1].1, from) } else { 0.0 };
        let closed_after = match stretches.get(index + 1) {
            Some(&(next, _)) => 0.5 * closed_time(rows, to, next),
            None => closed_time(rows, to, run.end + 1),
        };
        let level_before = if index > 0 || !run.from_zero { -1.0 } else { 0.0 };
        let level_after = if to < run.end { 1.0 } else { 0.0 };
        let longest = figures.edge_samples.min(to + 1 - from);
        add_line(rows, from..from + longest, rows[from - 1].time, level_before, closed_before, &mut weights);
        add_line(rows, to + 1 - longest..to + 1, rows[to].time, level_after, closed_after, &mut weights);
    }
    weights
}

/// Adds so much of the value at an instant, and so much of the slope, of the least-squares line through some rows.
fn add_line(rows: &[Row], within: Range<usize>, at: f64, value: f64, slope: f64, weights: &mut [f64]) {
    if value == 0.0 && slope == 0.0 {
        return;
    }
    let count = within.len() as f64;
    assert!(count >= 2.0, "a line needs two samples between interruptions");
    let mean = rows[within.clone()].iter().map(|row| row.time).sum::<f64>() / count;
    let spread: f64 = rows[within.clone()].iter().map(|row| (row.time - mean).powi(2)).sum();
    for index in within {
        let in_slope = (rows[index].time - mean) / spread;
        weights[index] += value * (1.0 / count + (at - mean) * in_slope) + slope * in_slope;
    }
}

/// Seconds with the switch closed between two rows.
fn closed_time(rows: &[Row], after: usize, before: usize) -> f64 {
    rows[after + 1..before].iter().filter(|row| row.mode == Mode::Reset).map(|row| row.step).sum()
}

/// Variance of the weighted sum, and the weight that the last reading's noise has in it. What enters the level in a
/// step stays: it counts with all weights from there on, the end's own 1 among them. So does readout, by the leak's
/// correction.
fn noise(figures: &Figures, rows: &[Row], run: &Run, weights: &[f64]) -> (f64, f64) {
    let mut later = if run.to_zero { 1.0 } else { 0.0 };
    let (mut variance, mut last, mut leak_above) = (0.0, None, 0.0);
    for (index, row) in rows.iter().enumerate().take(run.end + 1).skip(run.first).rev() {
        later += weights[index];
        // With the switch closed nothing moves the level, and no reading of it is used.
        let step = if row.mode == Mode::Reset { 0.0 } else { row.step };
        let leak = figures.leak_tau_s.map_or(0.0, |tau| 0.5 * step / tau * later);
        let readout = if step > 0.0 { weights[index] + leak + leak_above } else { 0.0 };
        variance += figures.level_walk * step * later * later + figures.readout_var * readout * readout;
        last = last.or(Some(readout));
        leak_above = leak;
    }
    (variance, last.unwrap_or(0.0))
}

/// What a zero tells of level and drift at one instant: `information * state = vector`.
struct Knowledge {
    information: Matrix2<f64>,
    vector: Vector2<f64>,
}

impl Knowledge {
    fn of_drift(information: f64) -> Self {
        Self { information: Matrix2::new(0.0, 0.0, 0.0, information), vector: Vector2::zeros() }
    }

    fn read(&mut self, figures: &Figures, level: f64) {
        self.information.m11 += 1.0 / figures.readout_var;
        self.vector.x += level / figures.readout_var;
    }

    /// The same, told of an instant `step` seconds later; earlier if negative.
    fn carry(&mut self, figures: &Figures, step: f64) {
        let length = step.abs();
        // Readout noise that the leak's correction lets in walks too.
        let leak = figures.leak_tau_s.map_or(0.0, |tau| figures.readout_var * (length / tau).powi(2));
        let level = figures.level_walk * length + leak + figures.rate_walk * length.powi(3) / 3.0;
        let cross = 0.5 * figures.rate_walk * step * length;
        let noise = Matrix2::new(level, cross, cross, figures.rate_walk * length);
        let back = Matrix2::new(1.0, -step, 0.0, 1.0);
        let moved = back.transpose() * self.information * back;
        let Some(blur) = (Matrix2::identity() + moved * noise).try_inverse() else { panic!("noise is positive") };
        let information = blur * moved;
        self.information = 0.5 * (information + information.transpose());
        self.vector = blur * (back.transpose() * self.vector);
    }
}

/// The drift where the run ends, and the run's input in counts but for the level at the end if that borders on a zero:
/// what the opening zero and the run tell of them, with their covariance.
struct Outlook {
    state: Vector2<f64>,
    spread: Matrix2<f64>,
    /// The run's last level if it borders on a zero, and the weight that its noise has in the input beside it.
    last: Option<(f64, f64)>,
}

impl Outlook {
    fn of(figures: &Figures, rows: &[Row], run: &Run) -> Self {
        let opening = &rows[run.opening.clone()];
        let mut ahead = Knowledge::of_drift(1.0 / (figures.rate_prior_var + figures.rate_walk * opening[0].time));
        ahead.read(figures, opening[0].level);
        for row in &opening[1..] {
            ahead.carry(figures, row.step);
            ahead.read(figures, row.level);
        }
        let Some(known) = ahead.information.try_inverse() else { panic!("a zero tells of level and drift") };
        let weights = weights(figures, rows, run);
        let moved = rows.iter().zip(&weights).map(|(row, weight)| weight * row.level).sum();
        let (moved_var, last_weight) = noise(figures, rows, run, &weights);
        let from_level = Matrix2::new(0.0, 1.0, if run.from_zero { -1.0 } else { 0.0 }, 0.0);
        let mut state = from_level * known * ahead.vector + Vector2::new(0.0, moved);
        let mut spread = from_level * known * from_level.transpose() + Matrix2::new(0.0, 0.0, 0.0, moved_var);
        for (index, row) in rows.iter().enumerate().take(run.end + 1).skip(run.opening.end) {
            // The input's drift wanders on in a hold, and before the run, but moves nothing that counts.
            let acts = if index >= run.first && row.mode != Mode::Hold { row.step } else { 0.0 };
            let pass = Matrix2::new(1.0, 0.0, -acts, 1.0);
            let noise = Matrix2::new(row.step, -0.5 * acts * row.step, -0.5 * acts * row.step, acts.powi(3) / 3.0);
            state = pass * state;
            spread = pass * spread * pass.transpose() + figures.rate_walk * noise;
        }
        Self { state, spread, last: run.to_zero.then_some((rows[run.end].level, last_weight)) }
    }

    /// The run's input, with the level at its end and what the closing zero tells.
    fn integral(&self, figures: &Figures, closing: &[Row]) -> Claim {
        let mut behind = Knowledge::of_drift(0.0);
        for row in closing.iter().rev() {
            behind.read(figures, row.level);
            behind.carry(figures, -row.step);
        }
        if let Some((level, _)) = self.last {
            behind.read(figures, level);
        }
        // What it tells of the drift whatever the level, and of the level for a given drift.
        let seen = behind.information.m11;
        let per_level = if seen > 0.0 { behind.information.m12 / seen } else { 0.0 };
        let about_drift = behind.information.m22 - per_level * behind.information.m12;
        let surprise = behind.vector.y - per_level * behind.vector.x - about_drift * self.state.x;
        let toward = self.spread.column(0).into_owned();
        let damping = 1.0 + about_drift * toward.x;
        let state = self.state + toward * (surprise / damping);
        let spread = self.spread - toward * toward.transpose() * (about_drift / damping);

        // The last reading is in the level at the end and, where a line reaches so far, in the movement too.
        let with_end = |(_, weight)| (-per_level, behind.vector.x / seen, (1.0 + 2.0 * weight) / seen);
        let (on_drift, level, level_var) = self.last.map_or((0.0, 0.0, 0.0), with_end);
        let on = Vector2::new(on_drift, 1.0);
        let (value, variance) = (level + on.dot(&state), level_var + on.dot(&(spread * on)));
        Claim { value: value * figures.input_per_count, u: variance.sqrt() * figures.input_per_count.abs() }
    }
}
