//! Weighted straight-line fit.

/// One point of a straight-line fit: the abscissa is exact, the ordinate has a weight.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Point {
    /// Abscissa.
    pub x: f32,
    /// Ordinate.
    pub y: f32,
    /// One over the variance of the ordinate, above 0.
    pub weight: f32,
}

/// A straight line `y = level + slope (x - centre)` fitted by weighted least squares.
///
/// Written about the weighted centre of the abscissas, level and slope are uncorrelated, and nothing large is
/// subtracted from anything large. Method: ISO/TS 28037:2010, clause 6 (uncertainties in y only).
///
/// ```
/// use brimline::estimate::{Line, Point};
///
/// let points = [(0.0, 1.0), (1.0, 3.0), (2.0, 5.0)].map(|(x, y)| Point { x, y, weight: 4.0 });
/// let line = Line::fit(points.iter().copied()).expect("two abscissas differ");
/// assert_eq!(line.at(10.0), 21.0);
/// assert!(line.variance_at(10.0) > line.variance_at(1.0));
/// ```
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Line {
    /// Weighted mean of the abscissas.
    pub centre: f32,
    /// Ordinate at the centre: the weighted mean of the ordinates.
    pub level: f32,
    /// Slope.
    pub slope: f32,
    /// Variance of `level`.
    pub level_variance: f32,
    /// Variance of `slope`; the covariance with `level` is 0.
    pub slope_variance: f32,
    /// Sum of squared weighted residuals; about `points - 2` where the weights are true.
    pub chi_squared: f32,
    /// Number of points.
    pub points: u16,
}

impl Line {
    /// Fits a line; `None` with fewer than two different abscissas. Three passes over the points, O(n).
    ///
    /// The means are formed about the first point: where the weights differ by many decades, put the heaviest point
    /// first.
    pub fn fit(points: impl Iterator<Item = Point> + Clone) -> Option<Self> {
        let (mut count, mut weights, mut x_sum, mut y_sum) = (0_u16, 0.0_f32, 0.0_f32, 0.0_f32);
        let origin = points.clone().next()?;
        for p in points.clone() {
            count = count.saturating_add(1);
            weights += p.weight;
            x_sum += p.weight * (p.x - origin.x);
            y_sum += p.weight * (p.y - origin.y);
        }
        let centre = origin.x + x_sum / weights;
        let level = origin.y + y_sum / weights;

        let (mut xx, mut xy) = (0.0_f32, 0.0_f32);
        for p in points.clone() {
            let x = (p.x - centre) * p.weight;
            xx += x * (p.x - centre);
            xy += x * (p.y - level);
        }
        if xx <= 0.0 {
            return None;
        }
        let slope = xy / xx;

        let mut chi_squared = 0.0_f32;
        for p in points {
            let residual = p.y - level - slope * (p.x - centre);
            chi_squared += residual * residual * p.weight;
        }
        Some(Self {
            centre,
            level,
            slope,
            level_variance: 1.0 / weights,
            slope_variance: 1.0 / xx,
            chi_squared,
            points: count,
        })
    }

    /// The line's ordinate at `x`.
    pub fn at(&self, x: f32) -> f32 {
        self.level + self.slope * (x - self.centre)
    }

    /// Variance of [`at`](Self::at): `level_variance + (x - centre)^2 slope_variance`.
    pub fn variance_at(&self, x: f32) -> f32 {
        let lever = x - self.centre;
        self.level_variance + lever * lever * self.slope_variance
    }

    /// Covariance of the ordinate at `x` with the slope.
    pub fn covariance_at(&self, x: f32) -> f32 {
        (x - self.centre) * self.slope_variance
    }
}
