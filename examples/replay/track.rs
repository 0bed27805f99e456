//! What a plot needs of every row, thinned so that memory does not grow with the trace.

use brimline::{Mode, Sample, Setup};

use crate::replay::{Amount, Replay};

/// Buckets that a track may hold; each keeps up to six rows.
const BUCKETS: usize = 400;

/// Stretches of one mode that can be told apart in a plot.
const STRETCHES: usize = 150;

/// One row as it is drawn.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Point {
    row: u64,
    /// Seconds since the first row.
    pub(crate) time_s: f64,
    pub(crate) level_v: f64,
    /// The level with its resets taken out, V; `None` while the switch is closed or the input open.
    pub(crate) effective_v: Option<f64>,
    pub(crate) drift_v_per_s: f64,
    pub(crate) drift_u: f64,
    pub(crate) run: Option<RunPoint>,
}

/// One row of a run as it is drawn.
#[derive(Clone, Copy, Debug)]
pub(crate) struct RunPoint {
    /// Tells runs apart.
    pub(crate) number: u32,
    /// Where the level would be with no input, V.
    pub(crate) baseline_v: f64,
    /// The integral so far, C or V s, and its standard uncertainty.
    pub(crate) value: f64,
    pub(crate) u: f64,
    pub(crate) uncorrected: f64,
}

/// From, to, in seconds since the first row.
pub(crate) type Stretch = (f64, f64);

/// Everything to be drawn.
#[derive(Debug, Default)]
pub(crate) struct Track {
    buckets: Vec<Bucket>,
    rows_per_bucket: u64,
    rows: u64,
    zeros: Stretches,
    resets: Stretches,
    /// What resets have taken from the level so far, V.
    offset_v: f64,
    last_effective_v: Option<f64>,
    last_time_s: f64,
    /// Whether a reset or hold lies between the latest effective level and now.
    interrupted: bool,
    run: u32,
    /// Of the running run: the effective level at its start.
    baseline_start_v: Option<f64>,
}

impl Track {
    /// Takes the row that `replay` was just fed.
    pub(crate) fn observe<Q: Amount>(&mut self, replay: &Replay<'_, Q>, setup: &Setup<Q>, sample: &Sample) {
        let time_s = replay.now_s();
        let level_v = setup.converter().volts(sample.counts);
        let since = if self.rows == 0 { time_s } else { self.last_time_s };
        match sample.mode {
            Mode::Zero => self.zeros.extend(since, time_s),
            Mode::Reset => self.resets.extend(since, time_s),
            _ => {}
        }
        let run = match sample.mode {
            Mode::Integrate => self.in_run(replay, setup.circuit().gain(), level_v),
            Mode::Zero => {
                self.baseline_start_v = None;
                self.bridge(level_v);
                None
            }
            Mode::Hold | Mode::Reset => {
                self.interrupted = true;
                None
            }
        };
        let effective_v = matches!(sample.mode, Mode::Zero | Mode::Integrate).then_some(level_v + self.offset_v);
        self.last_effective_v = effective_v.or(self.last_effective_v);
        self.last_time_s = time_s;
        let drift = replay.channel().drift();
        self.push(Point {
            row: self.rows,
            time_s,
            level_v,
            effective_v,
            drift_v_per_s: drift.value.as_volts_per_second(),
            drift_u: drift.u.as_volts_per_second(),
            run,
        });
    }

    /// The rows kept, oldest first.
    pub(crate) fn points(&self) -> Vec<Point> {
        self.buckets.iter().flat_map(Bucket::points).collect()
    }

    pub(crate) fn zeros(&self) -> &[Stretch] {
        &self.zeros.stretches
    }

    pub(crate) fn resets(&self) -> &[Stretch] {
        &self.resets.stretches
    }

    /// A row of a run: the run's integral tells what the resets took from the level.
    fn in_run<Q: Amount>(&mut self, replay: &Replay<'_, Q>, gain: f64, level_v: f64) -> Option<RunPoint> {
        let reading = replay.running()?;
        let integral = reading.at_stop.integral;
        let removed = reading.drift_removed.number();
        let moved_v = (integral.value.number() + removed) * gain;
        let start_v = match self.baseline_start_v {
            Some(start_v) => start_v,
            None => {
                self.run += 1;
                self.bridge(level_v);
                level_v + self.offset_v - moved_v
            }
        };
        self.baseline_start_v = Some(start_v);
        self.interrupted = false;
        self.offset_v = start_v + moved_v - level_v;
        Some(RunPoint {
            number: self.run,
            baseline_v: start_v + removed * gain,
            value: integral.value.number(),
            u: integral.u.number(),
            uncorrected: integral.value.number() + removed,
        })
    }

    /// Outside a run the effective level goes on after an interruption where it was before.
    fn bridge(&mut self, level_v: f64) {
        if std::mem::take(&mut self.interrupted)
            && let Some(effective_v) = self.last_effective_v
        {
            self.offset_v = effective_v - level_v;
        }
    }

    fn push(&mut self, point: Point) {
        self.rows_per_bucket = self.rows_per_bucket.max(1);
        if self.rows.is_multiple_of(self.rows_per_bucket) {
            if self.buckets.len() >= BUCKETS {
                self.halve();
            }
            // After halving the new row may belong to the last bucket still.
            if self.rows.is_multiple_of(self.rows_per_bucket) {
                self.buckets.push(Bucket::of(point));
                self.rows += 1;
                return;
            }
        }
        match self.buckets.last_mut() {
            Some(bucket) => bucket.join(&Bucket::of(point)),
            None => self.buckets.push(Bucket::of(point)),
        }
        self.rows += 1;
    }

    /// Joins buckets in pairs.
    fn halve(&mut self) {
        self.rows_per_bucket *= 2;
        let halved = self.buckets.chunks(2).filter_map(|pair| {
            let (first, rest) = pair.split_first()?;
            let mut joined = *first;
            rest.iter().for_each(|next| joined.join(next));
            Some(joined)
        });
        self.buckets = halved.collect();
    }
}

/// Neighbouring rows, of which the first, the last and the extremes of level and integral are kept.
#[derive(Clone, Copy, Debug)]
struct Bucket {
    first: Point,
    last: Point,
    lowest: Point,
    highest: Point,
    /// Rows of a run with the least and the most integral.
    least: Option<Point>,
    most: Option<Point>,
}

impl Bucket {
    fn of(point: Point) -> Self {
        let in_run = point.run.map(|_| point);
        Self { first: point, last: point, lowest: point, highest: point, least: in_run, most: in_run }
    }

    /// Takes in the rows of a later bucket.
    fn join(&mut self, later: &Self) {
        self.last = later.last;
        if later.lowest.level_v < self.lowest.level_v {
            self.lowest = later.lowest;
        }
        if later.highest.level_v > self.highest.level_v {
            self.highest = later.highest;
        }
        let integral = |point: &Option<Point>| point.and_then(|point| point.run).map(|run| run.value);
        if integral(&self.least).is_none_or(|own| integral(&later.least).is_some_and(|other| other < own)) {
            self.least = later.least;
        }
        if integral(&later.most) > integral(&self.most) {
            self.most = later.most;
        }
    }

    fn points(&self) -> Vec<Point> {
        let mut points = vec![self.first, self.last, self.lowest, self.highest];
        points.extend(self.least);
        points.extend(self.most);
        points.sort_by_key(|point| point.row);
        points.dedup_by_key(|point| point.row);
        points
    }
}

/// Stretches of time, joined where they touch; none once there are more than could be told apart.
#[derive(Debug, Default)]
struct Stretches {
    stretches: Vec<Stretch>,
    too_many: bool,
}

impl Stretches {
    fn extend(&mut self, from: f64, to: f64) {
        match self.stretches.last_mut() {
            _ if self.too_many => {}
            Some((_, end)) if *end >= from => *end = to,
            _ => self.stretches.push((from, to)),
        }
        if self.stretches.len() > STRETCHES {
            self.stretches.clear();
            self.too_many = true;
        }
    }
}
