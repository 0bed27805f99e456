//! Level and drift by recursive least squares against published filters and closed forms.
//!
//! The variance recursions add positive numbers and contract, so that a few roundings to `f32` (2^-24 each) are all
//! that they may be off by. Levels are kept against an integer anchor no further away than 1024 counts, which `f32`
//! resolves to 2^-14 count.

mod reference;

use brimline::estimate::{Innovation, Trend, Walk};
use libm::{log, sqrt};
use reference::{Figures, ROUNDING, Record, close, close_by_roundings, prints_as, records};

/// The level, counts.
fn level(trend: &Trend) -> f64 {
    trend.anchor() as f64 + f64::from(trend.residual())
}

/// Measurement and level variance of the Nile model (Durbin & Koopman 2012, p. 37).
const NILE: (f32, f32) = (15099.0, 1469.1);

/// Runs the Nile filter: for each year from the second, the published line, the prediction, the innovation and the
/// state. An exact diffuse start is the first sample itself.
fn nile() -> Vec<(Record, Trend, Innovation, Trend)> {
    let (readout, walk) = NILE;
    let mut years = records(include_str!("reference/nile_local_level_filter.csv")).into_iter();
    let Some(first) = years.next() else { panic!("no years") };
    let mut trend = Trend::new(first.number("volume") as i64, readout, 0.0, 0.0);
    close("level of 1871", level(&trend), first.number("filtered_level"), 0.0);
    close("variance of 1871", trend.level_variance(), first.number("filtered_var"), 0.0);
    let mut before = first;
    let mut steps = Vec::new();
    for year in years {
        trend.advance(1.0, Walk { level: walk, ..Walk::default() });
        let predicted = trend;
        close("prediction", level(&predicted), before.number("predicted_next_level"), LEVEL);
        close_by_roundings("its variance", predicted.level_variance(), before.number("predicted_next_var"), 3.0);
        let innovation = trend.update(year.number("volume") as i64, 0.0, readout);
        before = Record::clone(&year);
        steps.push((year, predicted, innovation, trend));
    }
    steps
}

/// Tolerance of a level near its anchor: the volumes differ by less than 1024, a few roundings may add up.
const LEVEL: f64 = 1024.0 * ROUNDING;

/// Durbin & Koopman 2012, Time Series Analysis by State Space Methods, 2nd ed., local level model of the Nile's flow
/// with the variances of p. 37 (verified: recomputed to 40 digits and against statsmodels).
#[test]
fn level_filter_is_the_nile_filter_at_every_step() {
    let steps = nile();
    assert_eq!(steps.len(), 99);
    for (year, _, innovation, trend) in &steps {
        close("level", level(trend), year.number("filtered_level"), LEVEL);
        close_by_roundings("variance", trend.level_variance(), year.number("filtered_var"), 4.0);
        close("innovation", innovation.residual, year.number("innovation"), LEVEL);
        close_by_roundings("precision", innovation.precision, 1.0 / year.number("innovation_var"), 3.0);
        close_by_roundings("gain", innovation.level_gain, year.number("gain"), 4.0);
        assert_eq!((trend.rate(), trend.rate_variance(), innovation.rate_gain), (0.0, 0.0, 0.0));
    }
}

/// Same source; steady state `P = r (q + sqrt(q^2 + 4 q)) / 2` with `q` the ratio of the variances.
#[test]
fn level_filter_reaches_the_nile_steady_state() {
    let steps = nile();
    let Some((_, predicted, innovation, trend)) = steps.last() else { panic!("no steps") };
    close_by_roundings("predicted variance", predicted.level_variance(), 5_501.257_941_808_476, 3.0);
    close_by_roundings("filtered variance", trend.level_variance(), 4_032.157_941_808_476, 4.0);
    close_by_roundings("gain", innovation.level_gain, 0.267_048_012_570_930_3, 4.0);
}

/// Same source: log-likelihood of 1872 to 1970 (verified).
#[test]
fn innovations_give_the_nile_log_likelihood() {
    let log_likelihood: f64 = nile()
        .iter()
        .map(|(_, _, innovation, _)| {
            let (v, precision) = (f64::from(innovation.residual), f64::from(innovation.precision));
            -0.5 * (log(2.0 * core::f64::consts::PI / precision) + v * v * precision)
        })
        .sum();
    // 99 terms of about 6.4, each off by one rounding of a precision (0.5 of it) and two of v^2 (0.5 to 3).
    close("log-likelihood", log_likelihood, -632.545_625_115_674, 99.0 * ROUNDING);
}

/// Durbin & Koopman 2012, p. 40: diagnostics of the standardised one-step errors, as printed (seen in the tests of
/// statsmodels).
#[test]
fn standardised_innovations_have_the_nile_diagnostics() {
    let errors: Vec<f64> =
        nile().iter().map(|(_, _, i, _)| f64::from(i.residual) * sqrt(f64::from(i.precision))).collect();
    let n = errors.len() as f64;
    let mean = errors.iter().sum::<f64>() / n;
    let moment = |order: i32| errors.iter().map(|e| (0..order).map(|_| e - mean).product::<f64>()).sum::<f64>() / n;
    let variance = moment(2);
    let skewness = moment(3) / (variance * sqrt(variance));
    let kurtosis = moment(4) / (variance * variance);
    let excess = kurtosis - 3.0;
    let autocorrelation = |lag: usize| {
        errors.iter().zip(errors.iter().skip(lag)).map(|(a, b)| (a - mean) * (b - mean)).sum::<f64>() / (n * variance)
    };
    let portmanteau: f64 = (1..=9).map(|lag| autocorrelation(lag) * autocorrelation(lag) / (n - lag as f64)).sum();
    let squares = |errors: &mut dyn Iterator<Item = &f64>| errors.take(33).map(|e| e * e).sum::<f64>();
    prints_as("skewness", skewness, -0.03, 2);
    prints_as("kurtosis", kurtosis, 3.09, 2);
    prints_as("Jarque-Bera", n / 6.0 * (skewness * skewness + excess * excess / 4.0), 0.05, 2);
    prints_as("Q(9)", n * (n + 2.0) * portmanteau, 8.84, 2);
    prints_as("H(33)", squares(&mut errors.iter().rev()) / squares(&mut errors.iter()), 0.61, 2);
}

/// Koopman 1997, Exact initial Kalman filtering and smoothing, JASA 92; series, variances and filtered states as in the
/// file (verified: own recursion, statsmodels, and another package's smoothed states). The noise is discrete: the level
/// and the slope each take a step of their own. Data in millionths, so that they are whole counts.
#[test]
fn trend_filter_with_a_diffuse_start_is_the_exact_diffuse_filter() {
    const SCALE: f64 = 1e6;
    let readout = 1.993 * SCALE * SCALE;
    let (level_step, slope_step) = (8.253 * SCALE * SCALE, 2.334 * SCALE * SCALE);
    let walk = Walk { level: level_step as f32, cross: 0.0, rate: slope_step as f32 };
    let lines = records(include_str!("reference/local_linear_trend_exact_diffuse.csv"));
    let counts: Vec<i64> = lines.iter().map(|line| libm::round(line.number("y") * SCALE) as i64).collect();
    let (Some(&y1), Some(&y2)) = (counts.first(), counts.get(1)) else { panic!("no samples") };

    // The largest variance that a trend keeps; the first difference has 1.2e13, which shows in the results as 1.2e-7.
    let mut trend = Trend::new(y1, readout as f32, 0.0, 1e20);
    trend.advance(1.0, walk);
    trend.update(y2, 0.0, readout as f32);
    trend.advance(1.0, walk);
    // Prediction after two samples in closed form (Koopman 1997).
    let (y1, y2) = (y1 as f64, y2 as f64);
    let (qm, qb) = (level_step / readout, slope_step / readout);
    close("a3 level", level(&trend), 2.0 * y2 - y1, 4.0 * FILTERED);
    close_by_roundings("a3 slope", trend.rate(), y2 - y1, 4.0);
    close_by_roundings("P3 level", trend.level_variance(), readout * (5.0 + 2.0 * qm + qb), 3.0);
    close_by_roundings("P3 covariance", trend.covariance(), readout * (3.0 + qm + qb), 3.0);
    close_by_roundings("P3 slope", trend.rate_variance(), readout * (2.0 + qm + 2.0 * qb), 3.0);

    for (line, &counts) in lines.iter().zip(&counts).skip(2) {
        trend.update(counts, 0.0, readout as f32);
        let figure = |column: &str, power: i32| line.number(column) * if power == 2 { SCALE * SCALE } else { SCALE };
        close("level", level(&trend), figure("filtered_level", 1), FILTERED);
        close("slope", trend.rate(), figure("filtered_slope", 1), FILTERED);
        close_by_roundings("P11", trend.level_variance(), figure("P11", 2), 4.0);
        close_by_roundings("P12", trend.covariance(), figure("P12", 2), 4.0);
        close_by_roundings("P22", trend.rate_variance(), figure("P22", 2), 4.0);
        trend.advance(1.0, walk);
    }
}

/// One rounding of the largest innovation, 8e6 counts. The prediction after two samples takes four: the start is not
/// quite diffuse.
const FILTERED: f64 = 8e6 * ROUNDING;

/// A line through samples of unit variance, one a second, with a slope of which nothing is known beforehand:
/// `x[k] = 7 k + (k mod 3)`.
fn regression(n: usize) -> Trend {
    let mut trend = Trend::new(0, 1.0, 0.0, DIFFUSE);
    for k in 1..n {
        trend.advance(1.0, Walk::default());
        trend.update(ramp(k), 0.0, 1.0);
    }
    trend
}

/// Variance of an unknown slope; the closed forms leave out its reciprocal, here 1e-12.
const DIFFUSE: f32 = 1e12;

fn ramp(k: usize) -> i64 {
    7 * k as i64 + (k % 3) as i64
}

/// `[n, slope, intercept, covariance, slope by OLS of a random walk, by BLUE, prediction at index 2 n]`: regression
/// theory, e.g. Draper & Smith; Kay 1993, example 3.7 (clause from memory; verified by least squares in `f64`).
fn limits() -> Vec<[f64; 7]> {
    Figures::of(include_str!("reference/estimation_limits.toml")).rows("rows")
}

#[test]
fn trend_of_white_samples_has_the_variances_of_the_regression_line() {
    for [n, slope, end, covariance, _, _, prediction] in limits() {
        let mut trend = regression(n as usize);
        let roundings = 2.0 + 2.0 * sqrt(n);
        close_by_roundings("var(slope)", trend.rate_variance(), slope, roundings);
        // At the last sample as at the first, with the opposite sign of the covariance.
        close_by_roundings("var(level)", trend.level_variance(), end, roundings);
        close_by_roundings("cov", trend.covariance(), -covariance, roundings);
        // From the last index, n - 1, on to index 2 n.
        trend.advance((n + 1.0) as f32, Walk::default());
        close_by_roundings("var(prediction)", trend.level_variance(), prediction, roundings);
    }
}

/// The estimates themselves, against the same regression worked out in `f64` (normal equations, common knowledge).
#[test]
fn trend_of_white_samples_is_the_regression_line() {
    for [n, ..] in limits() {
        let trend = regression(n as usize);
        let samples = || (0..n as usize).map(|k| (k as f64 - (n - 1.0) / 2.0, ramp(k) as f64));
        let (xx, xy) = samples().fold((0.0, 0.0), |(xx, xy), (x, y)| (xx + x * x, xy + x * y));
        let mean = samples().map(|(_, y)| y).sum::<f64>() / n;
        let slope = xy / xx;
        close("slope", trend.rate(), slope, SLOPE);
        close("level", level(&trend), mean + slope * (n - 1.0) / 2.0, 0.6 * sqrt(n) * LEVEL);
    }
}

const SLOPE: f64 = 7.0 * 16.0 * ROUNDING;

/// Expanding-memory line filter: `a_n = 2 (2n - 1) / (n (n + 1))`, `b_n = 6 / (n (n + 1))` (regression theory, same
/// file, verified).
#[test]
fn trend_gains_are_those_of_the_expanding_memory_line() {
    let mut trend = Trend::new(0, 1.0, 0.0, DIFFUSE);
    for n in 2..=1000 {
        trend.advance(1.0, Walk::default());
        let innovation = trend.update(ramp(n), 0.0, 1.0);
        let n = n as f64;
        close_by_roundings("a_n", innovation.level_gain, 2.0 * (2.0 * n - 1.0) / (n * (n + 1.0)), 2.0 + 2.0 * sqrt(n));
        close_by_roundings("b_n", innovation.rate_gain, 6.0 / (n * (n + 1.0)), 2.0 + 2.0 * sqrt(n));
    }
}

/// The best slope of a random walk is the difference of its ends: variance `sw^2 / (n - 1)` (textbook; clause from
/// memory; verified by generalised least squares in `f64`).
#[test]
fn trend_of_a_random_walk_is_the_difference_of_its_ends() {
    const NO_READOUT: f32 = 1e-9;
    for [n, .., blue, _] in limits() {
        let mut trend = Trend::new(ramp(0), NO_READOUT, 0.0, DIFFUSE);
        for k in 1..n as usize {
            trend.advance(1.0, Walk { level: 1.0, ..Walk::default() });
            trend.update(ramp(k), 0.0, NO_READOUT);
        }
        let ends = ramp(n as usize - 1) as f64 / (n - 1.0);
        close_by_roundings("var(slope)", trend.rate_variance(), blue, 2.0 + 2.0 * sqrt(n));
        close("slope", trend.rate(), ends, SLOPE);
        close("level", level(&trend), ramp(n as usize - 1) as f64, LEVEL);
    }
}

/// Kalata 1984, The tracking index (formula from memory; verified by solving the Riccati equation): steady gains for
/// process noise that enters as an acceleration held over each step, `G = [dt^2/2, dt]`; the level gets `alpha`, the
/// rate `beta / dt`.
#[test]
fn steady_gains_of_the_trend_are_alpha_and_beta() {
    const DT: f64 = 0.3;
    for [index, alpha, beta] in Figures::of(include_str!("reference/estimation_limits.toml")).rows("alpha_beta") {
        let sigma = index / (DT * DT);
        let step = [0.5 * DT * DT * sigma, DT * sigma];
        let [to_level, to_rate] = step;
        let walk = Walk {
            level: (to_level * to_level) as f32,
            cross: (to_level * to_rate) as f32,
            rate: (to_rate * to_rate) as f32,
        };
        let mut trend = Trend::new(0, 1.0, 0.0, DIFFUSE);
        let mut innovation = trend.update(0, 0.0, 1.0);
        for _ in 0..1000 {
            trend.advance(DT as f32, walk);
            innovation = trend.update(0, 0.0, 1.0);
        }
        close_by_roundings("alpha", innovation.level_gain, alpha, 4.0 + 2.0 / alpha);
        close_by_roundings("beta", f64::from(innovation.rate_gain) * DT, beta, 4.0 + 2.0 / alpha);
    }
}

/// Steady gain of a random-walk level, also the exponential-smoothing constant (textbook; verified by solving the
/// Riccati equation).
#[test]
fn steady_gain_of_the_level_is_that_of_exponential_smoothing() {
    for [ratio, gain] in Figures::of(include_str!("reference/estimation_limits.toml")).rows("local_level_gain") {
        let mut trend = Trend::new(0, 1.0, 0.0, 0.0);
        let mut innovation = trend.update(0, 0.0, 1.0);
        for _ in 0..20_000 {
            trend.advance(1.0, Walk { level: ratio as f32, ..Walk::default() });
            innovation = trend.update(0, 0.0, 1.0);
        }
        close_by_roundings("gain", innovation.level_gain, gain, 2.0 + 1.0 / gain);
    }
}

/// White noise that drives the rate and, integrated, the level: `[q_w t + q_d t^3/3, q_d t^2/2, q_d t]` (textbook, e.g.
/// Bar-Shalom, Li & Kirubarajan 2001, section 6.2; from memory).
#[test]
fn walk_over_a_time_is_that_of_integrated_white_noise() {
    for t in [1e-6, 0.02, 1.0, 3600.0] {
        for (qw, qd) in [(0.0, 2.5e-3), (4.0, 0.0), (0.3, 7.0), (1e9, 1e9)] {
            let walk = Walk::over(t as f32, qw as f32, qd as f32);
            close_by_roundings("level", walk.level, qw * t + qd * t * t * t / 3.0, 1.5);
            close_by_roundings("cross", walk.cross, qd * t * t / 2.0, 1.5);
            close_by_roundings("rate", walk.rate, qd * t, 1.5);
        }
    }
}

/// A step of `a + b` is a step of `a` and one of `b`: the property that makes the walk a process in continuous time
/// (identity, no source).
#[test]
fn advancing_by_a_then_b_is_advancing_by_their_sum() {
    for (qw, qd) in [(0.0, 0.5), (4.0, 0.0), (0.3, 7.0), (1e-3, 1e-6)] {
        for (a, b) in [(0.25_f32, 0.75_f32), (1e-3, 10.0), (100.0, 0.5)] {
            let start = {
                let mut trend = Trend::new(-40, 2.0, 3.0, 5.0);
                trend.advance(0.5, Walk::over(0.5, 1.0, 1.0));
                trend.update(-35, 0.0, 2.0);
                trend
            };
            let mut twice = start;
            twice.advance(a, Walk::over(a, qw, qd));
            twice.advance(b, Walk::over(b, qw, qd));
            let mut once = start;
            once.advance(a + b, Walk::over(a + b, qw, qd));
            close("level", level(&twice), level(&once), 2.0 * LEVEL);
            assert_eq!(twice.rate(), once.rate());
            for (what, twice, once) in [
                ("level variance", twice.level_variance(), once.level_variance()),
                ("covariance", twice.covariance(), once.covariance()),
                ("rate variance", twice.rate_variance(), once.rate_variance()),
            ] {
                close_by_roundings(what, twice, f64::from(once), 6.0);
            }
        }
    }
}
