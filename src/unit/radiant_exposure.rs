//! Charge of a photodetector to radiant exposure.

use crate::error::{SetupError, check};
use crate::math;
use crate::quantity::{Charge, Measured, RadiantExposure};

/// A photodetector: what turns radiant exposure on its aperture into charge.
///
/// `H = Q / (R A)`, with the relative uncertainties added in squares (JCGM 100:2008, 5.1.6).
///
/// Ultraviolet radiation injures eyes and skin: a computed exposure is an aid, never the only protection.
///
/// ```
/// use brimline::{Charge, Measured, unit::Photodetector};
///
/// // Ideal detector at 253.7 nm (0.204623 A/W) behind 1 cm^2.
/// const DETECTOR: Photodetector = Photodetector::new(0.204_622_85, 0.05, 1e-4, 0.01);
/// let charge = Measured::new(Charge::from_coulombs(8.184_914e-3), Charge::from_coulombs(1e-6));
/// let exposure = DETECTOR.radiant_exposure(charge);
/// assert!((exposure.value.as_joules_per_square_metre() - 400.0).abs() < 1e-3);
/// assert!((exposure.u.as_joules_per_square_metre() - 20.4).abs() < 0.1);
/// ```
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Photodetector {
    exposure_per_charge: f64,
    relative_variance: f64,
}

impl Photodetector {
    /// A detector of `responsivity_a_per_w` (above 0, 1e-30 to 1e3 A/W) behind an aperture of `area_m2` (above 0, 1e-30
    /// to 1e4 m^2), each with a relative standard uncertainty of 0 to 1.
    ///
    /// # Errors
    ///
    /// The parameter that is out of its range.
    pub const fn try_new(
        responsivity_a_per_w: f64,
        responsivity_u_rel: f64,
        area_m2: f64,
        area_u_rel: f64,
    ) -> Result<Self, SetupError> {
        check!(
            responsivity_a_per_w >= 1e-30 && responsivity_a_per_w <= 1e3,
            "responsivity_a_per_w",
            "above 0, from 1e-30 to 1000 (ampere per watt)"
        );
        check!(responsivity_u_rel >= 0.0 && responsivity_u_rel <= 1.0, "responsivity_u_rel", "0 to 1");
        check!(area_m2 >= 1e-30 && area_m2 <= 1e4, "area_m2", "above 0, from 1e-30 to 10000 (square metre)");
        check!(area_u_rel >= 0.0 && area_u_rel <= 1.0, "area_u_rel", "0 to 1");
        Ok(Self {
            exposure_per_charge: 1.0 / (responsivity_a_per_w * area_m2),
            relative_variance: responsivity_u_rel * responsivity_u_rel + area_u_rel * area_u_rel,
        })
    }

    /// The same; in a `const` a bad value fails the build.
    ///
    /// # Panics
    ///
    /// When [`try_new`](Self::try_new) would return an error.
    pub const fn new(responsivity_a_per_w: f64, responsivity_u_rel: f64, area_m2: f64, area_u_rel: f64) -> Self {
        match Self::try_new(responsivity_a_per_w, responsivity_u_rel, area_m2, area_u_rel) {
            Ok(detector) => detector,
            Err(e) => panic!("{}", e.parameter),
        }
    }

    /// The radiant exposure that collected `charge`; a negative charge gives a negative exposure.
    pub fn radiant_exposure(&self, charge: Measured<Charge>) -> Measured<RadiantExposure> {
        let exposure = charge.value.as_coulombs() * self.exposure_per_charge;
        let from_charge = charge.u.as_coulombs() * self.exposure_per_charge;
        let variance = from_charge * from_charge + exposure * exposure * self.relative_variance;
        Measured::new(
            RadiantExposure::from_joules_per_square_metre(exposure),
            RadiantExposure::from_joules_per_square_metre(math::sqrt_f64(variance)),
        )
    }
}
