//! A channel too quiet to dither: rounding errors neither average nor change from sample to sample.

use brimline::{Noise, Setup};

use crate::script::{CIRCUIT, CONVERTER, NOISE, POLICY, Script};
use crate::{assert_near, counts, drift};

/// Variance of rounding (IEEE Std 1241).
const ROUNDING: f64 = 1.0 / 12.0;

/// What rounding at both ends of a zero of `zero_s` seconds leaves of its drift, (counts/s)^2.
fn rounded_rate(zero_s: f64) -> f64 {
    2.0 * ROUNDING / (zero_s * zero_s)
}

/// The slope of a line through `n` blocks in `zero_s` seconds, whose rounding is taken for noise of twice its size
/// because it keeps its sign over many blocks: `12 s^2 / (n T^2)` (Draper & Smith, from memory).
fn fitted_rate(readout: f64, zero_s: f64) -> f64 {
    let blocks = zero_s / 0.1;
    12.0 * 4.0 * (readout * readout + ROUNDING) / (blocks * zero_s * zero_s)
}

#[test]
fn the_uncertainties_are_those_of_rounding() {
    let setup = Setup::new(CIRCUIT, CONVERTER, Noise { readout_counts: 0.1, ..NOISE }, POLICY);
    let mut script = Script::new(&setup);
    (script.noisy, script.drift) = (false, 0.0);
    let (zero_s, run_s) = (30.0, 60.0);
    script.zero(3000);
    assert_near(drift(&script).1, (rounded_rate(zero_s) + fitted_rate(0.1, zero_s)).sqrt(), 0.02);
    script.integrate(6000, 0.0);
    let budget = script.reading().at_stop.budget;
    // Both ends are rounded.
    assert_near(counts(budget.readout), (2.0 * ROUNDING).sqrt(), 0.02);
    let rate = rounded_rate(zero_s) + fitted_rate(0.1, zero_s);
    // The level at the start is correlated with the drift: its share is the extrapolation's from the middle of the
    // zero.
    assert!(counts(budget.drift) > 0.98 * rate.sqrt() * run_s, "{budget:?}");
    assert!(counts(budget.drift) < 1.1 * rate.sqrt() * run_s, "{budget:?}");
    script.zero(3000);
    // The drift rests on both zeros; the run's ends are two lines at their ends.
    let ends = 2.0 * ROUNDING;
    let closed = counts(script.reading().closed.expect("closed").integral.u);
    let rounded = 0.5 * rounded_rate(zero_s) * run_s * run_s + ends;
    let fitted = 0.5 * fitted_rate(0.1, zero_s) * (run_s + zero_s) * (run_s + zero_s);
    assert!(
        closed > (rounded + fitted).sqrt() && closed < 1.15 * (rounded + fitted).sqrt(),
        "{closed} {rounded} {fitted}"
    );
}
