//! What rounding to `f32` may do to a straight-line fit.
//!
//! Storing a point moves it by up to 2^-24 of its size, and the roundings within the sums are no larger. `Rounding`
//! turns this into what a fit of these very points may be off by, when as much as one such rounding is left after the
//! points' errors have been averaged.

use brimline::estimate::{Line, Point};
use libm::sqrt;

use crate::reference::ROUNDING;

/// How far rounding may move the results of a fit.
pub(crate) struct Rounding {
    /// Error of a point, as an ordinate: that of `y`, and that of `x` times the slope.
    pub(crate) ordinate: f64,
    /// Error of an abscissa.
    pub(crate) abscissa: f64,
    centre: f64,
    range: f64,
    slope: f64,
    points: f64,
}

impl Rounding {
    pub(crate) fn of(points: &[Point], line: &Line) -> Self {
        let fold = |f: fn(&Point) -> f32, pick: fn(f32, f32) -> f32, start| points.iter().map(f).fold(start, pick);
        let largest_y = f64::from(fold(|p| p.y.abs(), f32::max, 0.0));
        let largest_x = f64::from(fold(|p| p.x.abs(), f32::max, 0.0));
        let range = f64::from(fold(|p| p.x, f32::max, f32::MIN) - fold(|p| p.x, f32::min, f32::MAX));
        Self {
            ordinate: ROUNDING * (largest_y + f64::from(line.slope).abs() * largest_x),
            abscissa: ROUNDING * largest_x,
            centre: f64::from(line.centre),
            range,
            slope: f64::from(line.slope).abs(),
            points: f64::from(line.points),
        }
    }

    /// Of the slope, which is itself rounded.
    pub(crate) fn slope(&self) -> f64 {
        self.ordinate / self.range + ROUNDING * self.slope
    }

    /// Of the standard deviation of the residuals: each is off by its own rounding.
    pub(crate) fn scatter(&self) -> f64 {
        self.ordinate / sqrt(self.points)
    }

    pub(crate) fn at(&self, x: f64) -> f64 {
        self.ordinate * (1.0 + (x - self.centre).abs() / self.range)
    }

    /// Of an uncertainty `u`: sums of squares of distances from the centre.
    pub(crate) fn u(&self, u: f64) -> f64 {
        u * (ROUNDING + self.abscissa / self.range)
    }

    /// Of a correlation coefficient.
    pub(crate) fn correlation(&self) -> f64 {
        ROUNDING + self.abscissa / self.range
    }

    /// Of chi-squared: each residual is off by its own rounding, the mean weight turns that into sigmas.
    pub(crate) fn chi_squared(&self, line: &Line) -> f64 {
        let chi_squared = f64::from(line.chi_squared);
        let mean_weight = 1.0 / (f64::from(line.level_variance) * self.points);
        2.0 * (ROUNDING * chi_squared + sqrt(chi_squared * mean_weight) * self.ordinate)
    }
}
