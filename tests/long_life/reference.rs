//! The filter's model once more, as the textbooks have it and in f64: level, drift and baseline with their full
//! covariance matrix.

/// Level, drift and baseline, counts and seconds. The baseline is the level that there would be without the input of
/// the run that is going on, or that went on last.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Reference {
    readout_var: f64,
    level_walk: f64,
    rate_walk: f64,
    x: [f64; 3],
    p: [[f64; 3]; 3],
}

/// Of the drift's variance, which a sample has to take off at least.
const LEAST_SHARE: f64 = 1.0 / 262_144.0;

const LEVEL: usize = 0;
const RATE: usize = 1;
const BASELINE: usize = 2;

impl Reference {
    /// Begins with the first sample of a zero.
    pub(crate) fn new(first: f64, readout_var: f64, (level_walk, rate_walk): (f64, f64), rate_prior_var: f64) -> Self {
        let p = [[readout_var, 0.0, 0.0], [0.0, rate_prior_var, 0.0], [0.0; 3]];
        Self { readout_var, level_walk, rate_walk, x: [first, 0.0, 0.0], p }
    }

    /// `F P F^T + Q` over `t` seconds of a zero: level and baseline move alike.
    pub(crate) fn advance(&mut self, t: f64) {
        let levels = [LEVEL, BASELINE];
        let (p, rate_var) = (self.p, self.p[RATE][RATE]);
        let level_var = self.level_walk * t + self.rate_walk * t * t * t / 3.0;
        for a in levels {
            self.x[a] += t * self.x[RATE];
            for b in levels {
                self.p[a][b] += t * (p[a][RATE] + p[b][RATE]) + t * t * rate_var + level_var;
            }
            let shared = p[a][RATE] + t * rate_var + self.rate_walk * t * t / 2.0;
            (self.p[a][RATE], self.p[RATE][a]) = (shared, shared);
        }
        self.p[RATE][RATE] += self.rate_walk * t;
    }

    /// The drift goes on wandering while nothing follows it.
    pub(crate) fn rest(&mut self, t: f64) {
        self.p[RATE][RATE] += self.rate_walk * t;
    }

    /// A zero's sample. One that would take less than a share of 2^-18 off the drift's variance takes nothing off: the
    /// filter holds no drift for constant over more samples. The variance is left in where it was, in the drift and in
    /// what the drift has moved.
    pub(crate) fn update(&mut self, sample: f64) {
        let (row, rate_var) = (self.p[LEVEL], self.p[RATE][RATE]);
        let scale = 1.0 / (row[LEVEL] + self.readout_var);
        let residual = sample - self.x[LEVEL];
        for a in 0..3 {
            let gain = row[a] * scale;
            self.x[a] += gain * residual;
            for (shared, with) in self.p[a].iter_mut().zip(row) {
                *shared -= gain * with;
            }
        }
        let taken = row[RATE] * row[RATE] * scale;
        if taken < LEAST_SHARE * rate_var {
            let moved = self.p[LEVEL][RATE] / self.p[RATE][RATE];
            let lever = [moved, 1.0, moved];
            for a in 0..3 {
                for b in 0..3 {
                    self.p[a][b] += taken * lever[a] * lever[b];
                }
            }
        }
    }

    /// The input is connected.
    pub(crate) fn start_run(&mut self) {
        self.x[BASELINE] = self.x[LEVEL];
        for a in 0..3 {
            self.p[BASELINE][a] = self.p[LEVEL][a];
        }
        for a in 0..3 {
            self.p[a][BASELINE] = self.p[a][LEVEL];
        }
        self.p[BASELINE][BASELINE] = self.p[LEVEL][LEVEL];
    }

    /// A zero begins with `sample`: all that is known of the level.
    pub(crate) fn find_level(&mut self, sample: f64) {
        self.x[LEVEL] = sample;
        for a in 0..3 {
            (self.p[LEVEL][a], self.p[a][LEVEL]) = (0.0, 0.0);
        }
        self.p[LEVEL][LEVEL] = self.readout_var;
    }

    /// The run's movement if it ended at `last`, and its variance.
    pub(crate) fn at_stop(&self, last: f64) -> (f64, f64) {
        (last - self.x[BASELINE], self.readout_var + self.p[BASELINE][BASELINE])
    }

    /// The run's movement as the zero after it knows it, and its variance.
    pub(crate) fn closed(&self) -> (f64, f64) {
        let p = &self.p;
        (self.x[LEVEL] - self.x[BASELINE], p[LEVEL][LEVEL] - 2.0 * p[LEVEL][BASELINE] + p[BASELINE][BASELINE])
    }

    /// Drift and its variance.
    pub(crate) fn rate(&self) -> (f64, f64) {
        (self.x[RATE], self.p[RATE][RATE])
    }

    /// Level and its variance.
    pub(crate) fn level(&self) -> (f64, f64) {
        (self.x[LEVEL], self.p[LEVEL][LEVEL])
    }

    /// Square of the correlation of level and drift.
    pub(crate) fn correlation_squared(&self) -> f64 {
        let p = &self.p;
        p[LEVEL][RATE] * p[LEVEL][RATE] / (p[LEVEL][LEVEL] * p[RATE][RATE])
    }
}
