//! Level and drift over long records and with extreme input. The bounds are the crate's own, no source.

use brimline::estimate::{Trend, Walk};
use libm::{round, sqrt};
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};

/// Ten million in an optimised build, where they take a second.
const UPDATES: u32 = if cfg!(debug_assertions) { 1_000_000 } else { 10_000_000 };

/// A level beyond 2^23, where `f32` holds whole counts only, drifting by half a count in a second; a sample each
/// millisecond with one count of noise. Rms errors over the second half.
fn long_record(walk: Walk) -> (f64, f64, Trend) {
    const START: i64 = 1 << 23;
    const DRIFT: f64 = 0.5;
    const DT: f64 = 1e-3;
    const READOUT: f32 = 1.0 + 1.0 / 12.0;
    let mut rng = ChaCha8Rng::seed_from_u64(23);
    let mut trend = Trend::new(START, READOUT, 0.0, 1e4);
    let (mut drift, mut level) = (0.0, 0.0);
    for k in 1..=UPDATES {
        trend.advance(DT as f32, walk);
        let truth = START as f64 + DRIFT * DT * f64::from(k);
        let noise: f64 = StandardNormal.sample(&mut rng);
        trend.update(round(truth + noise) as i64, 0.0, READOUT);
        assert!(trend.level_variance() > 0.0 && trend.rate_variance() > 0.0);
        if k > UPDATES / 2 {
            let off = (f64::from(trend.rate()) - DRIFT, trend.anchor() as f64 + f64::from(trend.residual()) - truth);
            drift += off.0 * off.0;
            level += off.1 * off.1;
        }
    }
    let rms = |sum: f64| sqrt(sum / f64::from(UPDATES / 2));
    (rms(drift), rms(level), trend)
}

#[test]
fn drift_of_a_long_record_without_walk_stays_within_1e_4() {
    let (drift, level, _) = long_record(Walk::default());
    println!("rms error of the drift {drift:e} counts/s, of the level {level:e} counts");
    assert!(drift <= 1e-4, "rms error of the drift {drift:e} counts/s");
    assert!(level <= 0.1, "rms error of the level {level:e} counts");
}

/// With a walk in the filter and none in the record, the errors must lie below what the filter states, but not so far
/// below that it had stopped to follow.
#[test]
fn drift_of_a_long_record_with_walk_stays_within_its_uncertainty() {
    for (level_walk, rate_walk) in [(1e-4, 0.0), (0.0, 1e-9), (1e-4, 1e-9)] {
        let (drift, level, trend) = long_record(Walk::over(1e-3, level_walk, rate_walk));
        let stated = (sqrt(f64::from(trend.rate_variance())), sqrt(f64::from(trend.level_variance())));
        println!("rms errors {drift:e} counts/s for {:e}, {level:e} counts for {:e}", stated.0, stated.1);
        assert!(drift > 0.01 * stated.0 && drift < stated.0, "{drift:e} counts/s for {:e}", stated.0);
        assert!(level > 0.1 * stated.1 && level < stated.1, "{level:e} counts for {:e}", stated.1);
    }
}

/// Every variance `f32` can hold as a normal number, steps from a microsecond to three years, and samples that jump
/// from one end of 32 bits to the other: never a NaN, an infinity or a variance below zero.
#[test]
fn extreme_input_leaves_numbers_finite_and_variances_positive() {
    const VARIANCES: [f32; 5] = [f32::MIN_POSITIVE, 1e-20, 1.0, 1e20, 1e30];
    const RATE_VARIANCES: [f32; 5] = [0.0, f32::MIN_POSITIVE, 1e-10, 1.0, 1e20];
    const WALKS: [(f32, f32); 4] = [(0.0, 0.0), (1e-30, 1e-30), (5e11, 0.0), (5e11, 1e12)];
    const STEPS: [f32; 4] = [1e-6, 1.0, 1e4, 1e8];
    for level_variance in VARIANCES {
        for rate_variance in RATE_VARIANCES {
            for (level_walk, rate_walk) in WALKS {
                for (step, variance) in STEPS.into_iter().flat_map(|s| VARIANCES.map(|v| (s, v))) {
                    let case = format!(
                        "{level_variance:e} {rate_variance:e} {level_walk:e} {rate_walk:e} {step} {variance:e}"
                    );
                    let mut trend = Trend::new(i64::MIN, level_variance, 0.0, rate_variance);
                    for counts in [i64::MAX, i64::MIN, 0, -1, i64::MAX, i64::MAX] {
                        trend.advance(step, Walk::over(step, level_walk, rate_walk));
                        let i = trend.update(counts, 0.0, variance);
                        for number in
                            [i.residual, i.precision, i.level_gain, i.rate_gain, trend.residual(), trend.rate()]
                        {
                            assert!(number.is_finite(), "{case}: {i:?} {trend:?}");
                        }
                        for number in [trend.level_variance(), trend.rate_variance(), trend.covariance()] {
                            assert!(number.is_finite() && number >= 0.0, "{case}: {trend:?}");
                        }
                        assert!((0.0..=1.000_001).contains(&i.level_gain), "{case}: {i:?}");
                    }
                }
            }
        }
    }
}

/// A level at one end of 32 bits that is found at the other is there after one sample that outweighs it.
#[test]
fn level_follows_a_sample_from_one_end_of_the_counts_to_the_other() {
    const LOWEST: i64 = i32::MIN as i64;
    const HIGHEST: i64 = i32::MAX as i64;
    for (from, to) in [(LOWEST, HIGHEST), (HIGHEST, LOWEST)] {
        let mut trend = Trend::new(from, 1e12, 0.0, 0.0);
        let innovation = trend.update(to, 0.0, 1.0);
        assert_eq!(innovation.residual, (to - from) as f32);
        // `f32` resolves 2^32 counts to 256; the gain differs from 1 by 1e-12.
        let off = trend.anchor() as f64 + f64::from(trend.residual()) - to as f64;
        assert!(off.abs() <= 256.0, "{off} counts");
        trend.update(to, 0.0, 1.0);
        let off = trend.anchor() as f64 + f64::from(trend.residual()) - to as f64;
        assert!(off.abs() <= 128.0, "{off} counts");
    }
}
