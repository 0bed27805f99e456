//! What the board is: validated once, usually at compile time, and kept in flash.

mod circuit;
mod converter;
mod derived;
mod linearity;
mod noise;
mod policy;
mod soakage;
mod temperature;
mod working_out;

use core::marker::PhantomData;

pub use circuit::Circuit;
pub use converter::Converter;
pub(crate) use derived::{Derived, QUANTISATION_VAR, WarmthLaw};
pub use linearity::Linearity;
pub use noise::Noise;
pub(crate) use policy::EDGE_SAMPLES_MAX;
pub use policy::Policy;
pub(crate) use soakage::SOAKAGE_BRANCHES;
pub use soakage::{Absorption, SoakageBranch};
pub use temperature::TemperatureLaw;

use crate::error::SetupError;
use crate::quantity::Integral;

/// A validated board description; `Q` is what it measures, [`Charge`](crate::Charge) or [`Flux`](crate::Flux).
///
/// ```
/// use brimline::{Charge, Circuit, Converter, Noise, Policy, Setup};
///
/// const LAMP_MONITOR: Setup<Charge> = Setup::new(
///     Circuit { capacitance_f: 470e-9, rail_low_v: -2.4, rail_high_v: 2.4, ..Circuit::DEFAULT },
///     Converter { code_zero_v: -2.5, lsb_v: 5.0 / 65536.0, ..Converter::DEFAULT },
///     Noise { readout_counts: 0.9, input_density: 1.5e-12, offset_wander: 0.0, ..Noise::NONE },
///     Policy { worst_input: Some(0.5e-6), ..Policy::DEFAULT },
/// );
/// assert_eq!(LAMP_MONITOR.circuit().capacitance_f, 470e-9);
/// ```
#[repr(C)]
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Setup<Q> {
    derived: Derived,
    circuit: Circuit,
    converter: Converter,
    noise: Noise,
    policy: Policy,
    measures: PhantomData<Q>,
}

impl<Q: Integral> Setup<Q> {
    /// Validates a board description.
    ///
    /// # Errors
    ///
    /// The first parameter that is out of its range, with what is allowed there.
    pub const fn try_new(
        circuit: Circuit,
        converter: Converter,
        noise: Noise,
        policy: Policy,
    ) -> Result<Self, SetupError> {
        if let Err(e) = circuit.validate(Q::VOLTAGE_INPUT) {
            return Err(e);
        }
        if let Err(e) = converter.validate() {
            return Err(e);
        }
        if let Err(e) = noise.validate() {
            return Err(e);
        }
        if let Err(e) = policy.validate(converter.tick_hz) {
            return Err(e);
        }
        match Derived::new(&circuit, &converter, &noise, &policy) {
            Ok(derived) => Ok(Self { circuit, converter, noise, policy, derived, measures: PhantomData }),
            Err(e) => Err(e),
        }
    }

    /// Validates a board description; in a `const` a bad one fails the build.
    ///
    /// # Panics
    ///
    /// When [`try_new`](Self::try_new) would return an error.
    pub const fn new(circuit: Circuit, converter: Converter, noise: Noise, policy: Policy) -> Self {
        match Self::try_new(circuit, converter, noise, policy) {
            Ok(setup) => setup,
            Err(e) => panic!("{}", e.parameter),
        }
    }

    /// How long the reset switch has to stay closed so that less than half a code is left of the widest swing, s:
    /// settling of the amplifier, slewing, and `R_on C ln(range / half a code)`.
    pub const fn min_on_time_s(&self) -> f64 {
        self.derived.min_on_time_s
    }

    /// The circuit as given.
    pub const fn circuit(&self) -> &Circuit {
        &self.circuit
    }

    /// The converter as given.
    pub const fn converter(&self) -> &Converter {
        &self.converter
    }

    /// The noise figures as given.
    pub const fn noise(&self) -> &Noise {
        &self.noise
    }

    /// The policy as given.
    pub const fn policy(&self) -> &Policy {
        &self.policy
    }

    pub(crate) const fn derived(&self) -> &Derived {
        &self.derived
    }
}
