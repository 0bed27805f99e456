//! What an opening switch leaves on a capacitor.

use brimline::{Channel, Charge, Circuit, Converter, Mode, Noise, Policy, Sample, Setup};

use crate::bench::{output_v, valid};
use crate::reference::{Figures, close};

const HANDBOOK: &str = include_str!("../reference/electronics_noise_and_drift.toml");
const CONSTANTS: &str = include_str!("../reference/constants_codata.toml");

/// A single reading's noise in these tests, counts; it is much more than kTC noise, so that the reset level is better
/// known from the closed switch than from the samples after it.
const READOUT: f64 = 100.0;
/// Samples with the switch closed.
const CLOSED: u32 = 10_000;

/// Variance of the level at which a run began, V^2: a reset of a switch without charge injection, and two samples.
fn variance_after_a_reset(setup: &Setup<Charge>) -> f64 {
    let mut channel = Channel::new(setup);
    let modes = [(Mode::Reset, CLOSED), (Mode::Integrate, 3)];
    let modes = modes.into_iter().flat_map(|(mode, samples)| (0..samples).map(move |_| mode));
    for (tick, mode) in (0..).map(|k| 1000 * k).zip(modes) {
        channel.feed(Sample { tick, counts: 0, mode, temperature: None });
    }
    let at_stop = channel.reading().expect("a run has started").at_stop;
    let (_, u) = output_v(setup, &at_stop);
    let lsb_v = setup.converter().lsb_v;
    // The last sample has its noise as well, rounding included (IEEE Std 1241).
    u * u - (READOUT * READOUT + 1.0 / 12.0) * lsb_v * lsb_v
}

fn setup(capacitance_f: f64, lsb_v: f64, pedestal_u_v: Option<f64>) -> Setup<Charge> {
    valid(Setup::try_new(
        Circuit {
            capacitance_f,
            offset_limit_v: 0.0,
            bias_limit_a: 0.0,
            switch_resistance_ohm: 0.0,
            pedestal_u_v,
            rail_low_v: -1e6 * lsb_v,
            rail_high_v: 1e6 * lsb_v,
            ..Circuit::DEFAULT
        },
        Converter { code_zero_v: 0.0, lsb_v, code_min: -(1 << 20), code_max: 1 << 20, ..Converter::DEFAULT },
        Noise { readout_counts: READOUT, ..Noise::NONE },
        Policy { edge_samples: 2, settling_s: 0.0, frozen_samples: 0, ..Policy::DEFAULT },
    ))
}

/// kTC noise at 300 K of ten capacitors from 1 fF to 1 uF, as voltage, charge and electrons (verified from exact
/// constants; 64 uV and 400 electrons for 1 pF are also seen in print).
///
/// A straight line through two samples, extrapolated by one step to the instant before them, has 5 times a sample's
/// variance; the other estimate has that of the mean with the switch closed and kTC noise. The best of both has the
/// reciprocal of the sum of the reciprocals.
#[test]
fn ktc_noise_of_tabulated_capacitors_is_what_a_known_reset_level_lacks() {
    let electron = Figures::of(CONSTANTS).number("e_C");
    let table = Figures::of(HANDBOOK).section("ktc_noise_300K").rows::<4>("rows");
    assert_eq!(table.len(), 10);
    for [capacitance_f, volts, coulombs, electrons] in table {
        let lsb_v = volts / 10.0;
        let sample_var = (READOUT * READOUT + 1.0 / 12.0) * lsb_v * lsb_v;
        let line_var = 5.0 * sample_var;
        let alone = variance_after_a_reset(&setup(capacitance_f, lsb_v, None));
        close("without a known pedestal, V^2", alone, line_var, 1e-6 * line_var);

        let both = variance_after_a_reset(&setup(capacitance_f, lsb_v, Some(0.0)));
        let opened_var = line_var * both / (line_var - both);
        let ktc = (opened_var - sample_var / f64::from(CLOSED)).sqrt();
        // The rounding of `f32` variances a hundred times larger than what is sought.
        close("V", ktc, volts, 1e-5 * volts);
        close("C", ktc * capacitance_f, coulombs, 1e-5 * coulombs);
        close("electrons", ktc * capacitance_f / electron, electrons, 1e-5 * electrons);
    }
}
