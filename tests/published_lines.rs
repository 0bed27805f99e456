//! The straight-line fit against published calibrations and certified regressions.

mod reference;
#[path = "reference/rounding.rs"]
mod rounding;

use brimline::estimate::{Line, Point};
use libm::sqrt;
use reference::{Figures, ROUNDING, Record, close, prints_as, records};
use rounding::Rounding;

fn points(x: &[f64], y: &[f64], variance: impl Fn(usize) -> f64) -> Vec<Point> {
    assert_eq!(x.len(), y.len());
    x.iter()
        .zip(y)
        .enumerate()
        .map(|(i, (&x, &y))| Point { x: x as f32, y: y as f32, weight: (1.0 / variance(i)) as f32 })
        .collect()
}

fn fit(points: &[Point]) -> Line {
    let Some(line) = Line::fit(points.iter().copied()) else { panic!("two abscissas differ") };
    assert_eq!(usize::from(line.points), points.len());
    line
}

/// Ordinate at `x` with its standard uncertainty.
fn at(line: &Line, x: f64) -> (f64, f64) {
    (f64::from(line.at(x as f32)), sqrt(f64::from(line.variance_at(x as f32))))
}

fn slope(line: &Line) -> (f64, f64) {
    (f64::from(line.slope), sqrt(f64::from(line.slope_variance)))
}

fn correlation(line: &Line, x: f64) -> f64 {
    f64::from(line.covariance_at(x as f32)) / (at(line, x).1 * slope(line).1)
}

/// Standard deviation of the residuals.
fn scatter(line: &Line, dof: f64) -> f64 {
    sqrt(f64::from(line.chi_squared) / dof)
}

/// JCGM 100:2008 (GUM), Annex H.3, Table H.6 and H.3.3 to H.3.5 (verified: recomputed to 40 digits; the printed
/// uncertainties are from memory and agree with the recomputed ones).
#[test]
fn thermometer_line_is_gum_h3() {
    let gum = Figures::of(include_str!("reference/gum_h3_thermometer.toml"));
    let (printed, exact) = (gum.section("printed"), gum.section("recomputed"));
    let t0 = gum.number("t0_degC");
    let points = points(&gum.list("t_degC"), &gum.list("b_degC"), |_| 1.0);
    let line = fit(&points);
    let rounding = Rounding::of(&points, &line);

    let s = scatter(&line, printed.number("dof"));
    prints_as("s", s, printed.number("s_residual"), 4);
    close("s", s, exact.number("s_residual"), rounding.scatter());
    close("sum of squares", line.chi_squared, exact.number("sum_sq_residual"), rounding.chi_squared(&line));
    close("mean t", line.centre, exact.number("mean_t"), rounding.abscissa);

    let (y1, u_y1) = at(&line, t0);
    prints_as("y1", y1, printed.number("y1"), 4);
    close("y1", y1, exact.number("y1"), rounding.at(t0));
    prints_as("s(y1)", s * u_y1, printed.number("s_y1"), 4);
    // The residuals' scatter is off by up to `ordinate`, so every uncertainty that contains it is, in proportion.
    let u_tolerance = |u: f64| rounding.u(u) + u / s * rounding.scatter();
    let compare_u = |what: &str, actual: f64, name: &str| {
        close(what, actual, exact.number(name), u_tolerance(exact.number(name)));
    };
    compare_u("u(y1)", s * u_y1, "u_y1");

    let (y2, u_y2) = slope(&line);
    prints_as("y2", y2, printed.number("y2"), 5);
    close("y2", y2, exact.number("y2"), rounding.slope());
    prints_as("s(y2)", s * u_y2, printed.number("s_y2"), 5);
    compare_u("u(y2)", s * u_y2, "u_y2");

    prints_as("r", correlation(&line, t0), printed.number("r_y1_y2"), 3);
    close("r", correlation(&line, t0), exact.number("r_y1_y2"), rounding.correlation());
    let covariance = s * s * f64::from(line.covariance_at(t0 as f32));
    let expected = exact.number("cov_y1_y2");
    close("cov", covariance, expected, 2.0 * u_tolerance(expected.abs()));

    let (b30, u_b30) = at(&line, 30.0);
    prints_as("b(30 degC)", b30, printed.number("b_at_30_degC"), 4);
    close("b(30 degC)", b30, exact.number("b_at_30_degC"), rounding.at(30.0));
    prints_as("u(b(30 degC))", s * u_b30, printed.number("u_b_at_30_degC"), 4);
    compare_u("u(b(30 degC))", s * u_b30, "u_b_at_30_degC");
    let single = s * sqrt(1.0 + u_b30 * u_b30);
    compare_u("u of one new reading", single, "u_single_new_observation_at_30_degC");

    let (b0, u_b0) = at(&line, 0.0);
    close("y1 for t0 = 0", b0, exact.number("y1_if_t0_is_0"), rounding.at(0.0));
    compare_u("u(y1) for t0 = 0", s * u_b0, "u_y1_if_t0_is_0");
    close("r for t0 = 0", correlation(&line, 0.0), exact.number("r_if_t0_is_0"), rounding.correlation());
}

/// Variances given as such, not with a factor afterwards, lead to the same uncertainties (same source).
#[test]
fn thermometer_line_with_the_residual_variance_has_chi_squared_equal_to_its_degrees_of_freedom() {
    let gum = Figures::of(include_str!("reference/gum_h3_thermometer.toml"));
    let exact = gum.section("recomputed");
    let s = exact.number("s_residual");
    let points = points(&gum.list("t_degC"), &gum.list("b_degC"), |_| s * s);
    let line = fit(&points);
    let rounding = Rounding::of(&points, &line);
    close("chi squared", line.chi_squared, 9.0, rounding.chi_squared(&line));
    for (what, u, name) in [("u(y1)", at(&line, 20.0).1, "u_y1"), ("u(y2)", slope(&line).1, "u_y2")] {
        close(what, u, exact.number(name), rounding.u(exact.number(name)));
    }
}

/// What the two examples of ISO/TS 28037:2010, clause 6.3, have in common.
fn calibration_line(example: &Figures) -> Line {
    let u_y = example.list("u_y");
    let variance = |i: usize| u_y.get(i).map_or(f64::NAN, |u| u * u);
    let points = points(&example.list("x"), &example.list("y"), variance);
    let line = fit(&points);
    let rounding = Rounding::of(&points, &line);

    let ((a, u_a), (b, u_b)) = (at(&line, 0.0), slope(&line));
    let cov = f64::from(line.covariance_at(0.0));
    for (what, value, tolerance) in [
        ("a", a, rounding.at(0.0)),
        ("u_a", u_a, rounding.u(u_a)),
        ("b", b, rounding.slope()),
        ("u_b", u_b, rounding.u(u_b)),
        ("cov_ab", cov, rounding.u(2.0 * cov.abs())),
        ("chi2", f64::from(line.chi_squared), rounding.chi_squared(&line)),
    ] {
        prints_as(what, value, example.number(&format!("printed_{what}")), 3);
        close(what, value, example.number(what), tolerance);
    }

    // Inverse evaluation: the abscissa that an observed ordinate means.
    let (observed, u_observed) = (example.number("inverse_y"), example.number("inverse_u_y"));
    let x = f64::from(line.centre) + (observed - f64::from(line.level)) / b;
    let (_, u_line) = at(&line, x);
    let u_x = sqrt(u_observed * u_observed + u_line * u_line) / b;
    prints_as("inverse x", x, example.number("printed_inverse_x"), 3);
    close("inverse x", x, example.number("inverse_x"), rounding.at(x) / b);
    prints_as("inverse u(x)", u_x, example.number("printed_inverse_u_x"), 3);
    close("inverse u(x)", u_x, example.number("inverse_u_x"), rounding.u(u_x) + u_x * rounding.slope() / b);
    line
}

/// ISO/TS 28037:2010, clause 6.3, example 1 (equal weights), with its inverse and forward evaluation (verified:
/// recomputed to 40 digits, the printed values agree).
#[test]
fn line_with_equal_weights_is_iso_ts_28037_example_1() {
    let iso = Figures::of(include_str!("reference/iso_ts_28037_lines.toml"));
    let example = iso.section("clause_6_3_example_1_equal_weights");
    let line = calibration_line(&example);

    // Forward evaluation: the ordinate at an abscissa that has an uncertainty of its own.
    let (x, u_x) = (example.number("forward_x"), example.number("forward_u_x"));
    let (y, u_line) = at(&line, x);
    let u_y = sqrt(u_line * u_line + f64::from(line.slope * line.slope) * u_x * u_x);
    reference::close_by_roundings("forward y", y, example.number("forward_y"), 2.0);
    reference::close_by_roundings("forward u(y)", u_y, example.number("forward_u_y"), 3.0);
}

/// ISO/TS 28037:2010, clause 6.3, example 2 (unequal weights), with its inverse evaluation (verified: recomputed to 40
/// digits, the printed values agree).
#[test]
fn line_with_unequal_weights_is_iso_ts_28037_example_2() {
    let iso = Figures::of(include_str!("reference/iso_ts_28037_lines.toml"));
    calibration_line(&iso.section("clause_6_3_example_2_unequal_weights"));
}

/// ISO/TS 28037:2010, Annex E: unknown weights, the residuals tell sigma (verified: recomputed to 40 digits).
#[test]
fn line_with_unknown_weights_is_iso_ts_28037_annex_e() {
    let iso = Figures::of(include_str!("reference/iso_ts_28037_lines.toml"));
    let example = iso.section("annex_E_unknown_weights");
    let points = points(&example.list("x"), &example.list("y"), |_| 1.0);
    let line = fit(&points);
    let rounding = Rounding::of(&points, &line);
    let s = scatter(&line, 4.0);
    let ((a, u_a), (b, u_b)) = (at(&line, 0.0), slope(&line));
    let cov = s * s * f64::from(line.covariance_at(0.0));
    let of_s = rounding.scatter() / s;
    for (what, value, tolerance) in [
        ("a", a, rounding.at(0.0)),
        ("u_a", s * u_a, rounding.u(s * u_a) + s * u_a * of_s),
        ("b", b, rounding.slope()),
        ("u_b", s * u_b, rounding.u(s * u_b) + s * u_b * of_s),
        ("cov_ab", cov, 2.0 * (rounding.u(cov.abs()) + cov.abs() * of_s)),
    ] {
        prints_as(what, value, example.number(&format!("printed_{what}")), 3);
        close(what, value, example.number(what), tolerance);
    }
    close("s", s, example.number("s"), rounding.scatter());
    close("ss", line.chi_squared, example.number("ss"), rounding.chi_squared(&line));

    let x = example.number("forward_x");
    let (y, u) = at(&line, x);
    close("forward y", y, example.number("forward_y"), rounding.at(x));
    for (name, u) in [("forward_u_mean", s * u), ("forward_u_single", s * sqrt(1.0 + u * u))] {
        close(name, u, example.number(name), rounding.u(u) + u * of_s);
    }
}

/// Pearson's (1901) data with York's (1966) weights of the ordinate only; weights from 1 to 1000 (verified: recomputed
/// to 40 digits, and quoted from another implementation to 5 digits).
#[test]
fn line_with_weights_over_three_decades_is_pearson_york() {
    let iso = Figures::of(include_str!("reference/iso_ts_28037_lines.toml"));
    let example = iso.section("pearson_york_y_weights_only");
    let weights = example.list("weight");
    let variance = |i: usize| weights.get(i).map_or(f64::NAN, |weight| 1.0 / weight);
    let points = points(&example.list("x"), &example.list("y"), variance);
    let line = fit(&points);
    let rounding = Rounding::of(&points, &line);
    let relative = |expected: f64| rounding.u(2.0 * expected.abs());
    close("a", line.at(0.0), example.number("a"), rounding.at(0.0));
    close("b", line.slope, example.number("b"), rounding.slope());
    close("var_a", line.variance_at(0.0), example.number("var_a"), relative(example.number("var_a")));
    close("var_b", line.slope_variance, example.number("var_b"), relative(example.number("var_b")));
    close("cov", line.covariance_at(0.0), example.number("cov_ab"), relative(example.number("cov_ab")));
}

/// EURACHEM/CITAC Guide CG 4 (QUAM), Example A5, Tables A5.2 and A5.3: calibration of cadmium in three replicates
/// (verified: recomputed to 40 digits; the printed values are from memory and agree).
#[test]
fn calibration_in_replicates_is_eurachem_a5() {
    let quam = Figures::of(include_str!("reference/eurachem_quam_a5_calibration.toml"));
    let points = points(&quam.list("x_mg_per_l"), &quam.list("y_absorbance"), |_| 1.0);
    let line = fit(&points);
    let rounding = Rounding::of(&points, &line);
    let s = scatter(&line, 13.0);
    let of_s = rounding.scatter() / s;
    let ((b0, u_b0), (b1, u_b1)) = (at(&line, 0.0), slope(&line));

    prints_as("S", s, quam.number("printed_S"), 6);
    close("S", s, quam.number("S"), rounding.scatter());
    prints_as("Sxx", 1.0 / f64::from(line.slope_variance), quam.number("printed_Sxx"), 1);
    close("Sxx", 1.0 / f64::from(line.slope_variance), quam.number("Sxx"), rounding.u(2.0 * quam.number("Sxx")));
    for (what, printed, decimals, value, tolerance) in [
        ("B0", "printed_B0", 4, b0, rounding.at(0.0)),
        ("B1", "printed_B1", 4, b1, rounding.slope()),
        ("u_B0", "printed_s_B0", 4, s * u_b0, rounding.u(s * u_b0) + s * u_b0 * of_s),
        ("u_B1", "printed_s_B1", 4, s * u_b1, rounding.u(s * u_b1) + s * u_b1 * of_s),
    ] {
        prints_as(what, value, quam.number(printed), decimals);
        close(what, value, quam.number(what), tolerance);
    }

    // The sample's concentration, from the mean of two readings.
    let readings = quam.list("y_sample_readings");
    let count = readings.len() as f64;
    let mean = readings.iter().sum::<f64>() / count;
    let c0 = f64::from(line.centre) + (mean - f64::from(line.level)) / b1;
    let (_, u_line) = at(&line, c0);
    let u_c0 = s / b1 * sqrt(1.0 / count + u_line * u_line);
    prints_as("c0", c0, quam.number("printed_c0"), 2);
    close("c0", c0, quam.number("c0"), rounding.at(c0) / b1);
    prints_as("u(c0)", u_c0, quam.number("printed_u_c0"), 3);
    close("u(c0)", u_c0, quam.number("u_c0"), rounding.u(u_c0) + u_c0 * (of_s + rounding.slope() / b1));
}

/// The points and certified values of one of NIST's Statistical Reference Datasets.
struct Dataset {
    x: Vec<f64>,
    y: Vec<f64>,
    certified: Vec<Record>,
}

impl Dataset {
    fn new(name: &str) -> Self {
        let of = |text| records(text).into_iter().filter(|r| r.text("dataset") == name);
        let data: Vec<Record> = of(include_str!("reference/nist_strd_linear_data.csv")).collect();
        let column = |column| data.iter().map(|r| r.number(column)).collect();
        let certified = of(include_str!("reference/nist_strd_linear_certified.csv")).collect();
        Self { x: column("x1"), y: column("y"), certified }
    }

    fn item(&self, item: &str) -> &Record {
        let Some(record) = self.certified.iter().find(|r| r.text("item") == item) else { panic!("no item {item}") };
        record
    }

    fn value(&self, item: &str) -> f64 {
        self.item(item).number("certified")
    }

    fn sd(&self, item: &str) -> f64 {
        self.item(item).number("sd_certified")
    }
}

/// NIST StRD, linear regression, Norris (certified; verified by a 60-digit refit): ozone monitors, 0 to 1000.
#[test]
fn line_is_nist_norris() {
    let norris = Dataset::new("Norris");
    let points = points(&norris.x, &norris.y, |_| 1.0);
    let line = fit(&points);
    assert_eq!(f64::from(line.points), norris.value("n"));
    let rounding = Rounding::of(&points, &line);
    let s = scatter(&line, 34.0);
    close("residual sd", s, norris.value("residual_sd"), rounding.scatter());
    close("ss", line.chi_squared, norris.value("resid_ss_recomputed"), rounding.chi_squared(&line));
    let of_s = rounding.scatter() / s;
    let ((b0, u_b0), (b1, u_b1)) = (at(&line, 0.0), slope(&line));
    close("B0", b0, norris.value("B0"), rounding.at(0.0));
    close("sd(B0)", s * u_b0, norris.sd("B0"), rounding.u(s * u_b0) + s * u_b0 * of_s);
    close("B1", b1, norris.value("B1"), rounding.slope());
    close("sd(B1)", s * u_b1, norris.sd("B1"), rounding.u(s * u_b1) + s * u_b1 * of_s);
    close("r", correlation(&line, 0.0), norris.value("corr_B0_B1_recomputed"), rounding.correlation());
}

/// NIST StRD, linear regression, NoInt1 and NoInt2 (certified; verified by a 60-digit refit): lines through the
/// origin. A point known exactly is one with a tiny variance: at a billionth of the others', the line differs from one
/// without intercept by less than 2e-8 of itself. The point comes first: the sums are formed about the first point.
#[test]
fn line_through_a_point_known_exactly_is_nist_no_int() {
    for (name, dof) in [("NoInt1", 10.0), ("NoInt2", 2.0)] {
        let set = Dataset::new(name);
        assert_eq!(set.x.len() as f64, set.value("n"));
        let mut points = points(&set.x, &set.y, |_| 1.0);
        points.insert(0, Point { x: 0.0, y: 0.0, weight: 1e9 });
        let line = fit(&points);
        let rounding = Rounding::of(&points, &line);
        let s = scatter(&line, dof);
        let (b1, u_b1) = slope(&line);
        close("B1", b1, set.value("B1"), rounding.slope());
        close("sd(B1)", s * u_b1, set.sd("B1"), rounding.u(s * u_b1) + u_b1 * rounding.scatter());
        close("residual sd", s, set.value("residual_sd"), rounding.scatter());
        close("sum of squares", line.chi_squared, set.value("resid_ss_recomputed"), rounding.chi_squared(&line));
        close("intercept", line.at(0.0), 0.0, ROUNDING);
    }
}
