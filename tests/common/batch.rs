//! The best linear estimate of a run without resets, from all its samples at once: generalised least squares with the
//! full covariance matrix of the noise (Rao 1973, Linear Statistical Inference, section 4a, from memory), and for the
//! drift at the end the best linear prediction (Goldberger 1962, from memory). No recursion, no f32.

use brimline::{Mode, Sample};
use nalgebra::{DMatrix, DVector, Matrix3, Vector3};

use super::Claim;
use super::board::Board;
use super::plant::Record;

/// Which samples the estimate may use. Of the run itself only the last sample tells anything.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Using {
    /// The opening zero and the run's last sample.
    UntilStop,
    /// Both zeros.
    BothZeros,
    /// Both zeros and the run's last sample: all there is.
    Everything,
}

/// The integral, C or V s, the drift, V/s, at the last zero sample used, and what the level at that sample is known to,
/// C or V s.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Optimum {
    pub(crate) integral: Claim,
    pub(crate) drift: Claim,
    pub(crate) level_u: f64,
}

/// The noise in counts and seconds.
struct Model {
    readout_var: f64,
    level_walk: f64,
    rate_walk: f64,
    rate_prior_var: f64,
}

impl Model {
    /// From the data sheet: rounding adds 1/12 count^2; the drift is anywhere within its limit at power-up.
    fn of(board: &Board) -> Self {
        let circuit = &board.circuit;
        let per_count = board.input_per_count();
        let ohm = circuit.input_resistance_ohm.unwrap_or(circuit.source_resistance_ohm);
        let limit_a = circuit.offset_limit_v / ohm + circuit.bias_limit_a;
        let limit = limit_a / circuit.capacitance_f / board.converter.lsb_v;
        Self {
            readout_var: board.noise.readout_counts.powi(2) + 1.0 / 12.0,
            level_walk: 0.5 * (board.noise.input_density / per_count).powi(2),
            rate_walk: (board.noise.offset_wander / per_count).powi(2),
            rate_prior_var: limit * limit / 3.0,
        }
    }

    /// Covariance of the level's wandering at two instants, both counted from the first zero sample.
    fn level_covariance(&self, a: f64, b: f64) -> f64 {
        let (early, late) = if a < b { (a, b) } else { (b, a) };
        self.level_walk * early + self.rate_walk * early * early * (3.0 * late - early) / 6.0
    }

    /// Covariance of the level's wandering at `level_at` with the drift's at `rate_at`.
    fn level_rate_covariance(&self, level_at: f64, rate_at: f64) -> f64 {
        let common = level_at.min(rate_at);
        self.rate_walk * (rate_at.min(level_at) * level_at - 0.5 * common * common)
    }
}

pub(crate) fn optimum(board: &Board, record: &Record, using: Using) -> Optimum {
    Plan::new(board, record, using).apply(record)
}

/// The estimate as the linear function of the samples that it is. Records with the same instants share it.
#[derive(Clone, Debug)]
pub(crate) struct Plan {
    /// Indices of the samples used.
    used: Vec<usize>,
    first: usize,
    /// What a sample adds to the integral, C or V s, and the drift, V/s, per count above the first zero sample.
    integral: DVector<f64>,
    drift: DVector<f64>,
    integral_u: f64,
    drift_u: f64,
    level_u: f64,
}

impl Plan {
    pub(crate) fn apply(&self, record: &Record) -> Optimum {
        let counts = |index: usize| record.samples.get(index).map_or(f64::NAN, |sample| f64::from(sample.counts));
        let levels = DVector::from_iterator(self.used.len(), self.used.iter().map(|&i| counts(i) - counts(self.first)));
        Optimum {
            integral: Claim { value: self.integral.dot(&levels), u: self.integral_u },
            drift: Claim { value: self.drift.dot(&levels), u: self.drift_u },
            level_u: self.level_u,
        }
    }

    pub(crate) fn new(board: &Board, record: &Record, using: Using) -> Self {
        plan(board, record, using)
    }
}

fn plan(board: &Board, record: &Record, using: Using) -> Plan {
    let model = Model::of(board);
    let tick_s = 1.0 / board.converter.tick_hz;
    let Some(power_up) = record.samples.first() else { panic!("an empty record") };
    let Some((first_index, first)) = record.samples.iter().enumerate().find(|(_, s)| s.mode == Mode::Zero) else {
        panic!("no zero")
    };
    let since = |sample: &Sample, origin: &Sample| f64::from(sample.tick.wrapping_sub(origin.tick)) * tick_s;

    let used = |index: usize, sample: &Sample| match sample.mode {
        Mode::Zero => index <= record.opening_end || using != Using::UntilStop,
        Mode::Integrate => index == record.run_end && using != Using::BothZeros,
        _ => false,
    };
    // Index, time, and whether the run's input is in it.
    let rows: Vec<(usize, f64, f64)> = record
        .samples
        .iter()
        .enumerate()
        .filter(|&(index, sample)| used(index, sample))
        .map(|(index, sample)| {
            let after_run = if index >= record.run_end { 1.0 } else { 0.0 };
            (index, since(sample, first), after_run)
        })
        .collect();
    let times: Vec<f64> = rows.iter().map(|row| row.1).collect();
    // Unknowns: level and drift at the first zero sample, movement by the run's input.
    let design = DMatrix::from_fn(rows.len(), 3, |row, unknown| match (rows.get(row), unknown) {
        (Some(row), 1) => row.1,
        (Some(row), 2) => row.2,
        _ => 1.0,
    });
    let time = |row: usize| times.get(row).copied().unwrap_or(f64::NAN);
    let covariance = DMatrix::from_fn(rows.len(), rows.len(), |a, b| {
        let readout = if a == b { model.readout_var } else { 0.0 };
        readout + model.level_covariance(time(a), time(b))
    });
    let Some(noise) = covariance.cholesky() else { panic!("the noise covariance is positive definite") };

    // The drift has had the time since power-up to wander off its data-sheet value.
    let prior_var = model.rate_prior_var + model.rate_walk * since(first, power_up);
    let weighted = noise.solve(&design);
    let mut information: Matrix3<f64> = (design.transpose() * &weighted).fixed_view::<3, 3>(0, 0).into_owned();
    information.m22 += 1.0 / prior_var;
    let Some(variance) = information.try_inverse() else { panic!("three unknowns are determined") };
    // Rows: unknowns; columns: samples.
    let unknowns = variance * weighted.transpose();

    let last_zero = if using == Using::UntilStop { record.opening_end } else { record.samples.len() - 1 };
    let Some(end) = record.samples.get(last_zero).map(|sample| since(sample, first)) else { panic!("no zero") };
    // Prediction of `share . unknowns` plus a wandering part of known variance and covariance with the samples' noise.
    let predict = |share: Vector3<f64>, own_var: f64, shared: DVector<f64>| {
        let whitened = noise.solve(&shared);
        let seen: Vector3<f64> = (weighted.transpose() * &shared).fixed_view::<3, 1>(0, 0).into_owned();
        let lever = share - seen;
        let var = own_var - shared.dot(&whitened) + (lever.transpose() * variance * lever).x;
        (unknowns.transpose() * lever + whitened, var.sqrt())
    };
    let with_rate = DVector::from_fn(rows.len(), |row, _| model.level_rate_covariance(time(row), end));
    let (drift, drift_u) = predict(Vector3::y(), model.rate_walk * end, with_rate);
    let with_level = DVector::from_fn(rows.len(), |row, _| model.level_covariance(time(row), end));
    let after_run = if using == Using::UntilStop { 0.0 } else { 1.0 };
    let (_, level_u) = predict(Vector3::new(1.0, end, after_run), model.level_covariance(end, end), with_level);

    let (per_count, lsb_v) = (board.input_per_count(), board.converter.lsb_v);
    let integral = unknowns.row(2).transpose() * (board.sign() * per_count);
    Plan {
        used: rows.iter().map(|row| row.0).collect(),
        first: first_index,
        integral,
        drift: drift * lsb_v,
        integral_u: variance.m33.sqrt() * per_count,
        drift_u: drift_u * lsb_v,
        level_u: level_u * per_count,
    }
}
