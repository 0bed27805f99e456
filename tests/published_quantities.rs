//! Units, noise and drift figures against physics and the circuit handbook.

mod reference;

use brimline::unit::Photodetector;
use brimline::{Channel, Charge, Circuit, Converter, Flux, Integral, Measured, Mode, Noise, Policy, Sample, Setup};
use libm::sqrt;
use reference::{Figures, close, close_by_roundings, prints_as, records};

/// Relative error of a few roundings to `f64`, and of figures printed to 15 digits.
const PRINTED_15_DIGITS: f64 = 5e-15;

fn exact(coulombs: f64) -> Measured<Charge> {
    Measured::new(Charge::from_coulombs(coulombs), Charge::default())
}

fn exposure(detector: &Photodetector, charge: Measured<Charge>) -> (f64, f64) {
    let exposure = detector.radiant_exposure(charge);
    (exposure.value.as_joules_per_square_metre(), exposure.u.as_joules_per_square_metre())
}

fn detector(responsivity: f64, responsivity_u: f64, area: f64, area_u: f64) -> Photodetector {
    match Photodetector::try_new(responsivity, responsivity_u, area, area_u) {
        Ok(detector) => detector,
        Err(e) => panic!("{e}"),
    }
}

/// Responsivity `e lambda / (h c)` of an ideal photodiode at 21 wavelengths, from CODATA's exact constants (verified).
/// The charge is counted in photons, an independent route: one electron for each photon energy that arrives.
#[test]
fn radiant_exposure_of_an_ideal_photodiode_is_its_photons_times_their_energy() {
    let electron = Figures::of(include_str!("reference/constants_codata.toml")).number("e_C");
    let lines = records(include_str!("reference/photodiode_responsivity.csv"));
    assert_eq!(lines.len(), 21);
    for line in &lines {
        let (expected, area) = (400.0, 2.5e-4);
        let photons = expected * area / line.number("photon_energy_J");
        let detector = detector(line.number("responsivity_A_per_W_QE1"), 0.0, area, 0.0);
        let (value, u) = exposure(&detector, exact(photons * electron));
        close(line.text("lambda_nm"), value, expected, PRINTED_15_DIGITS * expected);
        assert_eq!(u, 0.0);
    }
}

/// Ultraviolet disinfection of drinking water at 400 J/m^2 (40 mJ/cm^2): DVGW W 294 and Codex B1 4.15 (verified); the
/// charge that an ideal detector of 1 cm^2 collects meanwhile at the mercury line, 253.7 nm (verified, 12 digits).
#[test]
fn radiant_exposure_of_the_disinfection_charge_is_400_joules_per_square_metre() {
    const PRINTED_12_DIGITS: f64 = 1e-12;
    let uv = Figures::of(include_str!("reference/uv_dose.toml"));
    let (rule, worked) = (uv.section("disinfection"), uv.section("worked"));
    let expected = rule.number("red_J_per_m2");
    // 1 mJ/cm^2 is 10 J/m^2.
    close("mJ/cm^2", 10.0 * rule.number("red_mJ_per_cm2"), expected, 0.0);
    let lines = records(include_str!("reference/photodiode_responsivity.csv"));
    let Some(mercury) = lines.iter().find(|line| line.number("lambda_nm") == rule.number("mercury_line_nm")) else {
        panic!("no mercury line")
    };
    let responsivity = mercury.number("responsivity_A_per_W_QE1");
    let detector = detector(responsivity, 0.0, 1e-4, 0.0);
    let charge = worked.number("charge_C_at_QE1_1cm2_253_7nm_400J_per_m2");
    close("J/m^2", exposure(&detector, exact(charge)).0, expected, PRINTED_12_DIGITS * expected);

    // 100 W/m^2 on the same detector collect it in 4 s.
    let current = responsivity * 1e-4 * 100.0;
    let time = worked.number("time_to_400_J_per_m2_at_100_W_per_m2_s");
    close("J/m^2", exposure(&detector, exact(current * time)).0, expected, PRINTED_15_DIGITS * expected);
}

/// JCGM 100:2008 (GUM), 5.1.6: in a product of powers, squares of relative uncertainties add (from memory). Figures of
/// our own, chosen so that the roots are whole.
#[test]
fn relative_uncertainty_of_a_radiant_exposure_adds_in_squares() {
    let charge = |u: f64| Measured::new(Charge::from_coulombs(2e-6), Charge::from_coulombs(2e-6 * u));
    for (of_charge, of_responsivity, of_area, expected) in [
        (0.0, 0.03, 0.0, 0.03),
        (0.0, 0.0, 0.04, 0.04),
        (0.12, 0.0, 0.0, 0.12),
        (0.0, 0.03, 0.04, 0.05),
        (0.12, 0.03, 0.04, 0.13),
        (0.02, 0.03, 0.06, 0.07),
    ] {
        let (value, u) = exposure(&detector(0.2, of_responsivity, 1e-4, of_area), charge(of_charge));
        close("H", value, 0.1, 0.1 * PRINTED_15_DIGITS);
        close("u(H)", u, value * expected, value * expected * PRINTED_15_DIGITS);
    }
    // A charge of zero leaves the uncertainty of the charge; a negative one has a positive uncertainty.
    let zero = Measured::new(Charge::default(), Charge::from_coulombs(1e-9));
    let (value, u) = exposure(&detector(0.2, 0.5, 1e-4, 0.5), zero);
    assert_eq!(value, 0.0);
    close("u(H)", u, 1e-9 / 2e-5, 5e-5 * PRINTED_15_DIGITS);
    let (value, u) = exposure(&detector(0.2, 0.03, 1e-4, 0.04), exact(-2e-6));
    close("H", value, -0.1, 0.1 * PRINTED_15_DIGITS);
    close("u(H)", u, 0.005, 0.005 * PRINTED_15_DIGITS);
}

/// An op amp without offset, bias or noise: what the converter adds is all there is.
fn noiseless<Q: Integral>(circuit: Circuit, lsb_v: f64) -> Setup<Q> {
    let circuit = Circuit { offset_limit_v: 0.0, bias_limit_a: 0.0, ..circuit };
    let converter = Converter {
        code_zero_v: -32768.0 * lsb_v,
        lsb_v,
        code_min: 0,
        code_max: 65535,
        tick_hz: 1e6,
        ..Converter::DEFAULT
    };
    let noise = Noise { readout_counts: 0.0, input_density: 0.0, offset_wander: 0.0, ..Noise::NONE };
    match Setup::try_new(circuit, converter, noise, Policy::DEFAULT) {
        Ok(setup) => setup,
        Err(e) => panic!("{e}"),
    }
}

/// A run of 1 ms that moves the converter by `moved` counts, after `zeros` samples of the zero.
fn run<'s, Q: Integral>(setup: &'s Setup<Q>, zeros: u32, moved: i32) -> Channel<'s, Q> {
    const MIDDLE: i32 = 32768;
    let mut channel = Channel::new(setup);
    for tick in 0..zeros {
        channel.feed(Sample { tick, counts: MIDDLE, mode: Mode::Zero, temperature: None });
    }
    let last = zeros - 1;
    channel.feed(Sample { tick: last + 500, counts: MIDDLE, mode: Mode::Integrate, temperature: None });
    channel.feed(Sample { tick: last + 1000, counts: MIDDLE + moved, mode: Mode::Integrate, temperature: None });
    channel
}

/// An ideal converter's rounding has the standard deviation `LSB / sqrt(12)` (IEEE Std 1241 and general textbooks;
/// verified): without other noise it is what the readout's share of a reading consists of, once for the sample at the
/// end and once for the zero, however many samples that has: without noise to dither them their rounding does not
/// average.
#[test]
fn readout_share_of_a_noiseless_converter_is_one_lsb_over_the_root_of_twelve() {
    let handbook = Figures::of(include_str!("reference/electronics_noise_and_drift.toml"));
    let quantisation = handbook.section("quantisation");
    for (lsb, sigma) in [("lsb_12bit_3V3_V", "sigma_12bit_3V3_V"), ("lsb_16bit_4V096_V", "sigma_16bit_4V096_V")] {
        let (lsb, sigma) = (quantisation.number(lsb), quantisation.number(sigma));
        let circuit = Circuit { rail_low_v: -1.0, rail_high_v: 1.0, ..Circuit::DEFAULT };
        let setup = noiseless::<Charge>(circuit, lsb);
        for zeros in [1, 2, 12] {
            let Some(reading) = run(&setup, zeros, 0).reading() else { panic!("no reading") };
            let expected = sigma * circuit.capacitance_f * sqrt(2.0);
            let at_stop = reading.at_stop;
            close_by_roundings("readout", at_stop.budget.readout.as_coulombs(), expected, 1.0);
            close_by_roundings("u", at_stop.integral.u.as_coulombs(), expected, 1.0);
        }
    }
}

/// Circuits of the handbook's examples: input resistance, capacitance, offset voltage, bias current.
fn voltage_input(resistance: f64, capacitance_f: f64, offset_limit_v: f64, bias_limit_a: f64) -> Circuit {
    let input_resistance_ohm = Some(resistance);
    Circuit { capacitance_f, input_resistance_ohm, offset_limit_v, bias_limit_a, ..Circuit::DEFAULT }
}

/// Figures printed to 10 digits.
fn to_10_digits(what: &str, actual: f64, expected: f64) {
    close(what, actual, expected, 1e-10 * expected.abs());
}

/// Rashid, Microelectronic Circuits, eq. 14.14: 1 kohm, 0.1 uF, 6 mV offset, 200 nA offset current, 14 V to go (figures
/// seen in one place, the arithmetic verified).
#[test]
fn drift_limit_is_offset_over_rc_plus_bias_over_c_in_rashid_14_14() {
    let drift = Figures::of(include_str!("reference/electronics_noise_and_drift.toml")).section("integrator_drift");
    let (vio, iio) = (6e-3, 200e-9);
    let both = voltage_input(1e3, 0.1e-6, vio, iio);
    let from_offset = Circuit { bias_limit_a: 0.0, ..both };
    let from_current = Circuit { offset_limit_v: 0.0, ..both };
    to_10_digits("Vio", from_offset.drift_limit_v_per_s(), drift.number("rashid_dvdt_from_vio_V_per_s"));
    to_10_digits("Iio", from_current.drift_limit_v_per_s(), drift.number("rashid_dvdt_from_iio_V_per_s"));
    let time = 14.0 / both.drift_limit_v_per_s();
    to_10_digits("time to 14 V", time, drift.number("rashid_time_to_14V_worst_case_sum_s"));
    // The offset acts like an input: the gain carries it to the output, downward in an inverting integrator.
    to_10_digits("gain", both.gain() * vio, -drift.number("rashid_dvdt_from_vio_V_per_s"));
    to_10_digits("gain", Circuit { inverting: false, ..both }.gain() * vio, 60.0);
}

/// allaboutcircuits.com, thread 15174: 10 kohm, 10 nF, 2 mV, 100 nA give 20 V/s and 10 V/s (verified arithmetic).
#[test]
fn drift_limit_is_the_sum_of_offset_and_bias_in_a_worked_thread() {
    let drift = Figures::of(include_str!("reference/electronics_noise_and_drift.toml")).section("integrator_drift");
    let both = voltage_input(10e3, 10e-9, 2e-3, 100e-9);
    let offset = Circuit { bias_limit_a: 0.0, ..both }.drift_limit_v_per_s();
    let bias = Circuit { offset_limit_v: 0.0, ..both }.drift_limit_v_per_s();
    to_10_digits("offset", offset, drift.number("aac_dvdt_vio_V_per_s"));
    to_10_digits("bias", bias, drift.number("aac_dvdt_ib_V_per_s"));
    to_10_digits("sum", both.drift_limit_v_per_s(), offset + bias);
    // The same current input: the offset acts through the source's resistance instead, and 1 A moves 1/C.
    let current = Circuit { input_resistance_ohm: None, source_resistance_ohm: 10e3, ..both };
    to_10_digits("current input", current.drift_limit_v_per_s(), offset + bias);
    to_10_digits("gain", current.gain(), -1.0 / 10e-9);
}

/// Facts of the trade (common practice, no source): the integrator of 51 kohm and 4.7 nF.
#[test]
fn integrator_of_51_kohm_and_4_7_nf_is_as_the_trade_knows_it() {
    let circuit = voltage_input(51e3, 4.7e-9, 13e-3, 0.0);
    // 1 V in moves the output by about 4 V in a millisecond.
    prints_as("V/ms", -circuit.gain() * 1e-3, 4.0, 0);
    // A drift of 1.6 V/s there means about 0.38 mV of offset.
    prints_as("mV", -1.6 / circuit.gain() * 1e3, 0.38, 2);
    // 13 mV of offset run the output into a rail of 12 V in under a quarter of a second, but not in under a fifth.
    let time = 12.0 / circuit.drift_limit_v_per_s();
    assert!(time < 0.25 && time > 0.2, "{time} s");
}

/// The same integrator in use (common practice, no source): 1 V for 1 ms is 1 mV s.
#[test]
fn one_volt_for_one_millisecond_reads_as_one_millivolt_second() {
    const LSB: f64 = 1e-3;
    let circuit = voltage_input(51e3, 4.7e-9, 0.0, 0.0);
    let setup = noiseless::<Flux>(circuit, LSB);
    // 4171.88 V/s; the output goes down, and the converter gives whole codes.
    let moved = 1e-3 / (51e3 * 4.7e-9) / LSB;
    let Some(reading) = run(&setup, 8, -(libm::round(moved) as i32)).reading() else { panic!("no reading") };
    close("V s", reading.at_stop.integral.value.as_volt_seconds(), 1e-3, 1e-3 * 0.5 / moved);
    close("s", reading.elapsed_s, 1e-3, 1e-15);
}
