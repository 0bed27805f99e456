//! Boards for the statistical tests, described by what their noise does to the level.

use brimline::{Circuit, Converter, Integral, Noise, Policy, Setup};

/// A channel's noise as the converter sees it.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Character {
    /// Readout noise of one sample, rms counts.
    pub(crate) readout: f64,
    /// Random walk of the level, counts per square root of second.
    pub(crate) walk: f64,
    /// Random walk of the drift, counts/s per square root of second.
    pub(crate) wander: f64,
    /// Limit of the drift by the data sheet, counts/s; half of it from the offset voltage, half from the bias current.
    pub(crate) drift_limit: f64,
}

#[derive(Clone, Copy, Debug)]
pub(crate) struct Board {
    pub(crate) circuit: Circuit,
    pub(crate) converter: Converter,
    pub(crate) noise: Noise,
}

/// A 16-bit converter over +-2.5 V, stamped at 1 MHz.
const CONVERTER: Converter = Converter { code_zero_v: -2.5, lsb_v: 5.0 / 65536.0, ..Converter::DEFAULT };
const CAPACITANCE_F: f64 = 100e-9;
const SOURCE_OHM: f64 = 1e9;
const INPUT_OHM: f64 = 1e6;

impl Board {
    /// 100 nF behind a current source of 1 Gohm: 1 count is 7.6 pC.
    pub(crate) fn current(inverting: bool, character: &Character) -> Self {
        Self::new(None, inverting, character)
    }

    /// 100 nF behind 1 Mohm: 1 count is 7.6 uV s.
    pub(crate) fn voltage(inverting: bool, character: &Character) -> Self {
        Self::new(Some(INPUT_OHM), inverting, character)
    }

    fn new(input_ohm: Option<f64>, inverting: bool, character: &Character) -> Self {
        let input_per_count = CONVERTER.lsb_v * CAPACITANCE_F * input_ohm.unwrap_or(1.0);
        let half_limit_a = 0.5 * character.drift_limit * CONVERTER.lsb_v * CAPACITANCE_F;
        Self {
            circuit: Circuit {
                capacitance_f: CAPACITANCE_F,
                input_resistance_ohm: input_ohm,
                inverting,
                rail_low_v: -2.4,
                rail_high_v: 2.4,
                offset_limit_v: half_limit_a * input_ohm.unwrap_or(SOURCE_OHM),
                bias_limit_a: half_limit_a,
                source_resistance_ohm: SOURCE_OHM,
                pedestal_v: -0.8e-3,
                pedestal_u_v: Some(0.1e-3),
                ..Circuit::DEFAULT
            },
            converter: CONVERTER,
            noise: Noise {
                readout_counts: character.readout,
                // One-sided: the walk's variance in a second is half the density squared.
                input_density: character.walk * input_per_count * 2.0_f64.sqrt(),
                offset_wander: character.wander * input_per_count,
                input_flicker: 0.0,
            },
        }
    }

    pub(crate) fn setup<Q: Integral>(&self, policy: Policy) -> Setup<Q> {
        match Setup::try_new(self.circuit, self.converter, self.noise, policy) {
            Ok(setup) => setup,
            Err(e) => panic!("{e}"),
        }
    }

    /// Input that moves the output by one count, A s or V s, without sign.
    pub(crate) fn input_per_count(&self) -> f64 {
        self.converter.lsb_v * self.circuit.capacitance_f * self.circuit.input_resistance_ohm.unwrap_or(1.0)
    }

    /// -1 where a positive input moves the output down.
    pub(crate) fn sign(&self) -> f64 {
        if self.circuit.inverting { -1.0 } else { 1.0 }
    }
}
