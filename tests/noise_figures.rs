//! Second differences and the noise figures fitted to them: published deviations, known noise, recorded traces.
//!
//! Simulated noise scatters: bounds are 4 standard errors of what so many trials or samples can show, unless they say
//! otherwise. `--nocapture` shows what was found.

#[path = "reference/direct_covariance.rs"]
mod direct_covariance;
#[path = "reference/ordinary_slope.rs"]
mod ordinary_slope;
#[path = "reference/power_law_noise.rs"]
mod power_law_noise;
mod reference;

use brimline::estimate::{Figure, NoiseFigures, Octave, Octaves};
use direct_covariance::direct_u;
use ordinary_slope::{implied_slope_u, ordinary_slope};
use power_law_noise::{Simulator, Truth};
use reference::{ROUNDING, close, close_by_roundings, prints_as, records};

const WHITE: Truth = Truth { readout_var: 400.0, level_walk: 0.0, rate_flicker: 0.0, rate_walk: 0.0 };

fn octaves(levels: impl IntoIterator<Item = i64>) -> Octaves<20> {
    let mut octaves = Octaves::new();
    levels.into_iter().for_each(|level| octaves.feed(level));
    octaves
}

fn found(octaves: &Octaves<20>) -> Vec<Octave> {
    (0..20).map_while(|k| octaves.octave(k)).collect()
}

#[track_caller]
fn fit(octaves: &Octaves<20>, sample_s: f64) -> NoiseFigures {
    let Some(figures) = NoiseFigures::fit(octaves, sample_s as f32) else { panic!("octaves to fit") };
    figures
}

fn list(figures: &NoiseFigures) -> [Figure; 4] {
    [figures.readout_var, figures.level_walk, figures.rate_flicker, figures.rate_walk]
}

/// A column of a published series as whole counts.
fn counts(text: &str, column: &str, per_unit: f64) -> Vec<i64> {
    let count = |value: f64| {
        close("a whole count", value.round() / per_unit, value / per_unit, 1e-9);
        value.round() as i64
    };
    records(text).iter().map(|record| count(record.number(column) * per_unit)).collect()
}

/// Published and recomputed Allan deviation at `tau` against `actual`; `digits` decimals are printed.
fn check_allan_deviation(text: &str, tau: u32, actual: f64, digits: i32) {
    let record = records(text).into_iter().find(|r| r.text("stat") == "adev" && r.text("tau") == tau.to_string());
    let Some(record) = record else { panic!("no deviation at {tau}") };
    let (published, exact) = (record.number("published"), record.number("recomputed_allantools"));
    prints_as("published", exact, published, digits);
    close_by_roundings("Allan deviation", actual, exact, 4.0);
}

/// NIST SP 1065 (Riley 2008), section 12.4, nine frequencies, printed results (verified: recomputed).
#[test]
fn deviations_are_those_of_the_nbs14_set() {
    let text = include_str!("reference/nbs14_10pt_allan.csv");
    let mut phase = 0;
    let rates = [0, 892, 809, 823, 798, 671, 644, 883, 903, 677];
    let octaves = octaves(rates.map(|rate| {
        phase += rate;
        phase
    }));
    for (octave, digits) in found(&octaves).iter().zip([5, 4]) {
        check_allan_deviation(text, octave.lag, octave.allan_deviation(1.0).into(), digits);
    }
    assert_eq!(found(&octaves).iter().map(|o| o.count).collect::<Vec<_>>(), [8, 3, 1]);
}

/// Same source: 1000 frequencies by its recurrence, here as whole multiples of 1 / 2147483647.
#[test]
fn deviations_are_those_of_the_1000_point_set() {
    let text = include_str!("reference/nist_sp1065_1000pt_allan.csv");
    const MODULUS: i64 = 2_147_483_647;
    let (mut rate, mut phase, mut phases) = (1_234_567_890_i64, 0, vec![0]);
    for _ in 0..1000 {
        phase += rate;
        phases.push(phase);
        rate = 16_807 * rate % MODULUS;
    }
    for (tau, digits) in [(1_u32, 7), (10, 8), (100, 8)] {
        let Some(shortest) = octaves(phases.iter().copied().step_by(tau as usize)).octave(0) else { panic!("triples") };
        let deviation = f64::from(shortest.allan_deviation(tau as f32)) / MODULUS as f64;
        check_allan_deviation(text, tau, deviation, digits);
    }
}

#[test]
fn sums_are_those_of_the_definition_over_several_zeros() {
    let zeros: Vec<_> = [5_usize, 700, 2, 64, 65].map(|n| Simulator::new(n as u64).level(&WHITE, n, 1.0)).to_vec();
    let mut octaves = Octaves::<20>::new();
    for zero in &zeros {
        zero.iter().for_each(|level| octaves.feed(*level));
        octaves.break_chain();
    }
    let found = found(&octaves);
    assert_eq!(found.len(), 9, "700 samples hold three that are 256 apart");
    for octave in found {
        let thinned = |zero: &Vec<i64>| zero.iter().copied().step_by(octave.lag as usize).collect::<Vec<_>>();
        let squares: Vec<i64> = zeros
            .iter()
            .flat_map(|zero| thinned(zero).windows(3).map(|x| (x[0] - 2 * x[1] + x[2]).pow(2)).collect::<Vec<_>>())
            .collect();
        assert_eq!(octave.count as usize, squares.len());
        let mean = squares.iter().sum::<i64>() as f64 / squares.len() as f64;
        close_by_roundings("mean square", octave.mean_square, mean, 2.0);
    }
}

/// `E[D^2] = 2 tau^2 sigma^2(tau)` with the Allan variance as the integral of the rate's one-sided spectral density
/// over its transfer function `2 sin^4(pi tau f) / (pi tau f)^2` (IEEE Std 1139-2008; NIST SP 1065, section 3.3): `2
/// q_w` for white rate noise, `K / f`, and `2 q_d / (2 pi f)^2`.
#[test]
fn coefficients_are_the_integrals_of_the_spectral_densities() {
    use core::f64::consts::PI;
    const TAU: f64 = 3.0;
    let one_noise = |noise: usize| {
        let figure = |n: usize| Figure { value: f32::from(u8::from(n == noise)), u: 0.0, low: 0.0, high: 0.0 };
        let [readout_var, level_walk, rate_flicker, rate_walk] = [0, 1, 2, 3].map(figure);
        let figures = NoiseFigures { readout_var, level_walk, rate_flicker, rate_walk, chi_squared: 0.0 };
        f64::from(figures.mean_square_at(TAU as f32))
    };
    let integral = |density: fn(f64) -> f64, power: i32| {
        let (step, steps) = (1e-3, 2_000_000); // in pi tau f; sin^4 averages 3/8 beyond
        let f = |u: f64| u / (PI * TAU);
        let term = |u: f64| density(f(u)) * 2.0 * u.sin().powi(4) / (u * u);
        let sum: f64 = (0..steps).map(|k| term((f64::from(k) + 0.5) * step) * step).sum();
        let end = f64::from(steps) * step;
        let tail = 0.75 * density(f(end)) / end / f64::from(power - 1);
        2.0 * TAU * TAU * (sum + tail) / (PI * TAU)
    };
    close("readout", one_noise(0), 6.0, 0.0);
    close("level walk", one_noise(1), integral(|_| 2.0, 2), 1e-6 * 6.0);
    close("flicker", one_noise(2), integral(|f| 1.0 / f, 3), 1e-6 * 25.0);
    close("rate walk", one_noise(3), integral(|f| 2.0 / (2.0 * PI * f).powi(2), 4), 1e-6 * 18.0);
}

/// Slope of the log of the Allan deviation, weighted; octaves with under 10 degrees of freedom tell little.
fn slope(octaves: &[Octave]) -> (f64, f64) {
    let (mut w, mut x, mut y, mut xx, mut xy) = (0.0, 0.0, 0.0, 0.0, 0.0);
    for octave in octaves.iter().filter(|octave| octave.dof() >= 10.0) {
        let weight = 2.0 * f64::from(octave.dof()); // a deviation's relative variance is 1 / (2 dof)
        let (tau, deviation) = (f64::from(octave.lag).ln(), f64::from(octave.allan_deviation(1.0)).ln());
        w += weight;
        x += weight * tau;
        y += weight * deviation;
        xx += weight * tau * tau;
        xy += weight * tau * deviation;
    }
    ((xy - x * y / w) / (xx - x * x / w), 1.0 / (xx - x * x / w).sqrt())
}

/// IEEE Std 1139-2008, NIST SP 1065 table 3: white phase, white, flicker and random-walk frequency noise. The
/// simulations share the definition of the noises with the fit; the last one shares nothing else.
#[test]
fn deviations_have_the_slopes_of_the_standard() {
    const N: usize = 1 << 16;
    let mut simulator = Simulator::new(1);
    let mut sum = 0.0;
    let fractional: Vec<i64> = simulator
        .fractional_flicker(N)
        .iter()
        .map(|rate| {
            sum += 1e4 * rate;
            sum.round() as i64
        })
        .collect();
    let none = Truth { readout_var: 0.0, ..WHITE };
    let simulated = [
        (WHITE, -1.0),
        (Truth { level_walk: 1e6, ..none }, -0.5),
        (Truth { rate_flicker: 1e6, ..none }, 0.0),
        (Truth { rate_walk: 1e6, ..none }, 0.5),
    ];
    let levels = simulated.map(|(truth, expected)| (simulator.level(&truth, N, 1.0), 0, expected));
    // Differencing in steps of a sample is flicker noise at lags well above one sample only.
    for (level, skip, expected) in levels.into_iter().chain([(fractional.clone(), 3, 0.0)]) {
        let (slope, u) = slope(found(&octaves(level)).get(skip..).unwrap_or_default());
        close("slope", slope, expected, 4.0 * u);
    }
    // White noise of variance s^2 through (1 - z^-1)^(-1/2) has the density 2 s^2 / (2 sin(pi f)): K = s^2 / pi.
    for octave in found(&octaves(fractional)).iter().filter(|o| o.lag >= 8 && o.dof() >= 10.0) {
        let expected = 1e4 * (2.0 * core::f64::consts::LN_2 / core::f64::consts::PI).sqrt();
        let tolerance = 4.0 * expected / (2.0 * f64::from(octave.dof())).sqrt();
        close("flicker floor", octave.allan_deviation(1.0), expected, tolerance);
    }
}

const TRIALS: u32 = 200;

/// Fits `TRIALS` simulated traces of several zeros. Each figure that is present has intervals that cover it as often as
/// they say, and errors as large as its uncertainty; one that is absent is not claimed.
fn check_recovery(what: &str, truth: Truth, zeros: usize, samples: usize, dt: f64) {
    let true_figures = [truth.readout_var + 1.0 / 12.0, truth.level_walk, truth.rate_flicker, truth.rate_walk];
    let mut covered = [0_u32; 4];
    let (mut squares, mut variances) = ([0.0; 4], [0.0; 4]);
    let mut simulator = Simulator::new(samples as u64);
    for _ in 0..TRIALS {
        let mut octaves = Octaves::<20>::new();
        for _ in 0..zeros {
            simulator.level(&truth, samples, dt).into_iter().for_each(|level| octaves.feed(level));
            octaves.break_chain();
        }
        for (i, (figure, expected)) in list(&fit(&octaves, dt)).iter().zip(true_figures).enumerate() {
            covered[i] += u32::from((f64::from(figure.low)..=f64::from(figure.high)).contains(&expected));
            squares[i] += (f64::from(figure.value) - expected).powi(2);
            variances[i] += f64::from(figure.u).powi(2);
        }
    }
    for (i, name) in ["r", "q_w", "K", "q_d"].iter().enumerate() {
        let (percent, ratio) = (100.0 * f64::from(covered[i]) / f64::from(TRIALS), (squares[i] / variances[i]).sqrt());
        let relative = (variances[i] / f64::from(TRIALS)).sqrt() / true_figures[i];
        println!("{what}: {name} covered {percent} %, rms error {ratio:.3} u, u {relative:.3} of the figure");
        if true_figures[i] > 0.0 {
            assert!((90.0..=99.0).contains(&percent), "{what}: the interval of {name} covers {percent} %");
            let scatter = 4.0 / (2.0 * f64::from(TRIALS)).sqrt();
            assert!((ratio - 1.0).abs() < scatter, "{what}: the error of {name} is {ratio} u");
        } else {
            assert!(percent >= 90.0, "{what}: {name} is claimed in {} %", 100.0 - percent);
            assert!(ratio < 1.2, "{what}: the error of {name} is {ratio} u");
        }
    }
}

/// Own simulation. The mixtures are such that each noise leads in at least two octaves.
#[test]
fn intervals_cover_the_figures_of_mixtures() {
    const DT: f64 = 0.25;
    // Given per readout variance and sample.
    let mixture = |walk: f64, flicker: f64, wander: f64| Truth {
        readout_var: 400.0,
        level_walk: 400.0 * walk / DT,
        rate_flicker: 400.0 * flicker / DT.powi(2),
        rate_walk: 400.0 * wander / DT.powi(3),
    };
    check_recovery("all four", mixture(0.75, 0.017, 2.7e-4), 1, 1 << 15, DT);
    check_recovery("walks, 8 zeros", mixture(0.1, 0.0, 1e-4), 8, 1 << 11, DT);
    check_recovery("readout, flicker", mixture(0.0, 0.003, 0.0), 1, 1 << 13, DT);
    check_recovery("readout, walk, 64 zeros", mixture(0.1, 0.0, 0.0), 64, 1 << 8, DT);
}

/// Oracle: all pairs of differences, with the ends of the trace as they are.
#[test]
fn uncertainties_are_those_of_a_direct_sum() {
    let mut simulator = Simulator::new(3);
    // The ends of the trace are left out of the fit. They matter least where a walk leads.
    for (samples, readout_var, level_walk, rate_walk, tolerance) in [
        (1025, 400.0, 40.0, 0.1, 0.002),
        (1025, 0.0, 0.0, 1e4, 0.006),
        (1025, 400.0, 0.0, 0.0, 0.08),
        (65, 400.0, 0.0, 0.0, 0.08),
        (17, 400.0, 0.0, 0.0, 0.08),
    ] {
        let truth = Truth { readout_var, level_walk, rate_flicker: 1e-3 * rate_walk, rate_walk };
        let figures = list(&fit(&octaves(simulator.level(&truth, samples, 1.0)), 1.0));
        let values = figures.map(|figure| f64::from(figure.value));
        for (noise, figure) in figures.iter().enumerate() {
            let free: Vec<usize> = (0..4).filter(|p| values[*p] > 0.0 || *p == noise).collect();
            let direct = direct_u(&values, samples, noise, &free);
            close("u", figure.u, direct, tolerance * direct);
        }
    }
}

/// Durbin & Koopman 2012, p. 37: a local level model of the Nile, maximum likelihood 15099 and 1469.1 (verified). The
/// fit is free to find flicker and wander as well and has but 100 values.
#[test]
fn nile_agrees_with_maximum_likelihood_within_uncertainty() {
    let figures = fit(&octaves(counts(include_str!("reference/nile_local_level_filter.csv"), "volume", 1.0)), 1.0);
    println!("{figures:#?}");
    for (figure, likely) in [(figures.readout_var, 15_099.0), (figures.level_walk, 1_469.1)] {
        println!("off by {:.2} u", (f64::from(figure.value) - likely) / f64::from(figure.u));
        close("likely", figure.value, likely, figure.u.into());
        assert!((f64::from(figure.low)..=f64::from(figure.high)).contains(&likely), "{figure:?}");
    }
    // It is no empty agreement: to a third, and no walk as large as the readout noise.
    assert!(figures.readout_var.u < 0.33 * figures.readout_var.value && figures.level_walk.high < 15_099.0);
    assert!(figures.chi_squared < 6.0, "six octaves");
}

#[test]
fn implied_uncertainty_is_the_scatter_of_slopes() {
    let (truth, n) = (Truth { readout_var: 9_500.0, level_walk: 300.0, ..WHITE }, 1000);
    let mut simulator = Simulator::new(5);
    let slopes: Vec<_> = (0..TRIALS).map(|_| ordinary_slope(&simulator.level(&truth, n, 1.0))).collect();
    let rms =
        |f: fn(&(f64, f64)) -> f64| (slopes.iter().map(f).map(|v| v * v).sum::<f64>() / slopes.len() as f64).sqrt();
    let implied = implied_slope_u(truth.readout_var, truth.level_walk, n as f64);
    close("scatter", rms(|s| s.0), implied, 4.0 * implied / (2.0 * f64::from(TRIALS)).sqrt());
    println!("textbook standard error {} of {implied}", rms(|s| s.1));
    assert!(rms(|s| s.1) < 0.1 * implied);
}

/// Records of NIST (e-Handbook 1.4.2.4, 1.4.2.6, 1.4.2.7; readings taken as equally spaced, as its regressions do). The
/// textbook standard errors are the published (dziuba1: 2.092e-6 ohm) or recomputed ones of the files.
#[test]
fn textbook_slope_errors_understate_on_recorded_traces() {
    let dziuba = include_str!("reference/nist_dziuba1_standard_resistor.csv");
    let mavro = include_str!("reference/nist_mavro.csv");
    let soulen = include_str!("reference/nist_soulen.csv");
    let traces = [
        ("dziuba1", counts(dziuba, "resistance_ohm", 1e4), 1e4, 2.092e-6, 5e-10, 10.0, 1.76),
        // Flicker, which the implied uncertainty leaves out, leads here.
        ("mavro", counts(mavro, "transmittance", 1e5), 1e5, 3.308_763_264e-6, 1e-14, 2.0, f64::INFINITY),
        ("soulen", counts(soulen, "voltage_counts", 1.0), 1.0, 2.408_758_504_7e-4, 1e-13, 10.0, 1.76),
    ];
    for (name, levels, per_unit, published, half_digit, at_least, at_most_implied) in traces {
        let (_, textbook) = ordinary_slope(&levels);
        close("standard error", textbook / per_unit, published, half_digit);
        let octaves = octaves(levels.iter().copied());
        let figures = fit(&octaves, 1.0);
        let (r, walk) = (f64::from(figures.readout_var.value), f64::from(figures.level_walk.value));
        let implied = implied_slope_u(r, walk, levels.len() as f64);
        println!("{name}, in counts of {:e}: {figures:#?}", 1.0 / per_unit);
        println!("{name}: slope +- {:e} implied, {:.1} times the textbook", implied / per_unit, implied / textbook);
        assert!(implied > at_least * textbook, "{name}");
        // No model: the slopes of ten parts of the trace scatter by what the figures imply for so short a part, not by
        // their textbook errors (square root of chi-squared over 9 degrees of freedom: 0.36 to 1.76 in 99.8 %).
        let parts: Vec<_> = levels.chunks_exact(levels.len() / 10).map(ordinary_slope).collect();
        let mean = parts.iter().map(|part| part.0).sum::<f64>() / 10.0;
        let scatter = (parts.iter().map(|part| (part.0 - mean).powi(2)).sum::<f64>() / 9.0).sqrt();
        let textbook = (parts.iter().map(|part| part.1.powi(2)).sum::<f64>() / 10.0).sqrt();
        let implied = implied_slope_u(r, walk, (levels.len() / 10) as f64);
        let (ratio, of_implied) = (scatter / textbook, scatter / implied);
        println!("{name}: slopes of parts scatter by {ratio:.2} textbook, {of_implied:.2} implied");
        assert!(ratio > 1.76 && (0.36..at_most_implied).contains(&of_implied), "{name}");
        // The figures describe the trace: what they predict is what was found, within 4 of its own scatters.
        for octave in found(&octaves) {
            let expected = f64::from(figures.mean_square_at(octave.lag as f32));
            let scatter = expected * (2.0 / f64::from(octave.dof())).sqrt();
            close("mean square", octave.mean_square, expected, 4.0 * scatter);
        }
    }
}

#[test]
fn hostile_levels_end_in_numbers() {
    let extremes = |i: i64| if i % 2 == 0 { i64::MIN } else { i64::MAX };
    for hostile in [octaves((0..5000).map(extremes)), octaves((0..5000).map(|i| extremes(i / 7)))] {
        assert!(found(&hostile).iter().all(|o| o.mean_square.is_finite() && o.mean_square >= 0.0 && o.dof() >= 1.0));
        let figures = NoiseFigures::fit(&hostile, 1e-3).map(|figures| list(&figures));
        println!("{figures:?}");
        assert!(figures.is_none_or(|f| f.iter().all(|f| f.value >= 0.0 && f.low <= f.value && f.value <= f.high)));
    }
    let Some(saturated) = octaves((0..5000).map(extremes)).octave(0) else { panic!("triples") };
    assert_eq!(saturated.mean_square, f32::MAX / 4998.0);
    let converter = octaves((0..5000).map(|i| i64::from(if i % 2 == 0 { i32::MIN } else { i32::MAX })));
    let Some(shortest) = converter.octave(0) else { panic!("triples") };
    close("mean square", shortest.mean_square, (2.0_f64.powi(33) - 2.0).powi(2), 2.0 * ROUNDING * 2.0_f64.powi(66));
    assert_eq!(NoiseFigures::fit(&octaves([7; 5000]), 1.0), None, "nothing moved");
    assert_eq!(NoiseFigures::fit(&octaves(0..5000), 1.0), None, "a steady drift is no noise");
    assert_eq!(NoiseFigures::fit(&octaves((0..16).map(|i| i % 3)), 1.0), None, "three octaves");
    assert!(NoiseFigures::fit(&octaves((0..17).map(|i| i % 3)), 1.0).is_some(), "four octaves");
    for sample_s in [0.0, -1.0, f32::NAN, f32::INFINITY] {
        assert_eq!(NoiseFigures::fit(&octaves((0..5000).map(|i| i * i % 97)), sample_s), None);
    }
    assert_eq!(NoiseFigures::fit(&Octaves::<0>::new(), 1.0), None);
    let mut many = Octaves::<40>::default();
    (0..5000).for_each(|i| many.feed(i * i % 97));
    assert_eq!(NoiseFigures::fit(&many, 1.0), NoiseFigures::fit(&octaves((0..5000).map(|i| i * i % 97)), 1.0));
    assert!(size_of::<Octaves<16>>() <= 16 * 48 + 16, "48 bytes an octave");
}

#[test]
fn every_figure_of_a_short_trace_has_an_uncertainty() {
    let mut simulator = Simulator::new(9);
    for samples in (17..600).step_by(3) {
        for (readout_var, level_walk, rate_walk) in
            [(1.0, 0.0, 0.0), (0.0, 100.0, 0.0), (0.0, 0.0, 100.0), (100.0, 10.0, 1.0), (1e6, 0.0, 100.0)]
        {
            let truth = Truth { readout_var, level_walk, rate_flicker: 0.0, rate_walk };
            let figures = fit(&octaves(simulator.level(&truth, samples, 1.0)), 1.0);
            let honest = |f: &Figure| f.u > 0.0 && 0.0 <= f.low && f.low <= f.value && f.value < f.high;
            assert!(list(&figures).iter().all(|f| honest(f) && f.high.is_finite()), "{samples}: {figures:?}");
        }
    }
}
