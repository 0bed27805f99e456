//! Physical quantities with the unit in each constructor's and accessor's name, and a value with its uncertainty.

/// Declares a quantity: one SI value inside, unit-named ways in and out.
macro_rules! quantity {
    ($(#[$doc:meta])* $name:ident, $unit:literal, $from:ident, $as:ident) => {
        $(#[$doc])*
        #[derive(Clone, Copy, Debug, Default, PartialEq, PartialOrd)]
        #[cfg_attr(feature = "defmt", derive(defmt::Format))]
        pub struct $name(f64);

        impl $name {
            #[doc = concat!("From a value in ", $unit, ".")]
            pub const fn $from(value: f64) -> Self {
                Self(value)
            }

            #[doc = concat!("The value in ", $unit, ".")]
            pub const fn $as(self) -> f64 {
                self.0
            }
        }

        impl sealed::Si for $name {
            const UNIT: &'static str = $unit;
            fn from_si_value(value: f64) -> Self {
                Self(value)
            }
            fn si_value(self) -> f64 {
                self.0
            }
        }
    };
}

pub(crate) mod sealed {
    /// A quantity as a bare number in its SI unit, for the conversions inside the crate.
    pub trait Si: Copy + core::fmt::Debug + PartialEq {
        /// The unit's symbol.
        const UNIT: &'static str;
        /// From a bare number in the SI unit.
        fn from_si_value(value: f64) -> Self;
        /// As a bare number in the SI unit.
        fn si_value(self) -> f64;
    }
}
use sealed::Si;

quantity!(
    /// Electric charge: what an integrator with a current input has collected.
    Charge, "C", from_coulombs, as_coulombs
);
quantity!(
    /// Voltage times time (flux linkage, 1 V s = 1 Wb): what an integrator behind a resistor has collected.
    Flux, "V s", from_volt_seconds, as_volt_seconds
);
quantity!(
    /// Voltage: the amplifier's offset, referred to the input.
    Voltage, "V", from_volts, as_volts
);
quantity!(
    /// Current: the amplifier's bias, referred to the input.
    Current, "A", from_amperes, as_amperes
);
quantity!(
    /// Rate of change of the integrator's output voltage: the drift.
    VoltageRate, "V/s", from_volts_per_second, as_volts_per_second
);
quantity!(
    /// Radiant exposure (often called fluence or dose in ultraviolet disinfection); 1 mJ/cm^2 = 10 J/m^2.
    RadiantExposure, "J/m^2", from_joules_per_square_metre, as_joules_per_square_metre
);

/// A temperature in whole thousandths of a degree Celsius, so that samples stay integers.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Temperature(i32);

impl Temperature {
    /// From thousandths of a degree Celsius.
    pub const fn from_millidegrees_celsius(value: i32) -> Self {
        Self(value)
    }

    /// The temperature in thousandths of a degree Celsius.
    pub const fn as_millidegrees_celsius(self) -> i32 {
        self.0
    }

    /// How much warmer this is than `earlier`, mK; saturating.
    pub const fn since(self, earlier: Self) -> i32 {
        self.0.saturating_sub(earlier.0)
    }
}

/// What an integrator collects: [`Charge`] for a current input, [`Flux`] for a voltage input. Sealed.
pub trait Integral: Si {
    /// The unit's symbol: `C` or `V s`.
    const SYMBOL: &'static str = Self::UNIT;
    /// Whether the input is a voltage across an input resistor.
    const VOLTAGE_INPUT: bool;
}

impl Integral for Charge {
    const VOLTAGE_INPUT: bool = false;
}

impl Integral for Flux {
    const VOLTAGE_INPUT: bool = true;
}

/// A value with its standard uncertainty (JCGM 100:2008, 2.3.1): one standard deviation, same unit.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Measured<Q> {
    /// The best estimate.
    pub value: Q,
    /// Its standard uncertainty, never negative.
    pub u: Q,
}

impl<Q: Si> Measured<Q> {
    /// A value with its standard uncertainty.
    pub const fn new(value: Q, u: Q) -> Self {
        Self { value, u }
    }

    /// The expanded uncertainty `U = k u`; `k = 2` covers about 95 %.
    pub fn expanded(&self, k: f64) -> Q {
        Q::from_si_value(k * self.u.si_value())
    }
}
