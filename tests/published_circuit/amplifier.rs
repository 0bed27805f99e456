//! Offset voltage and bias current in published worked examples.

use brimline::{
    Circuit, Converter, Current, Event, Flux, Measured, Mode, Noise, Policy, Reason, Setup, Trust, Voltage, VoltageRate,
};

use crate::bench::{Bench, Drive, Network, output_v, valid};
use crate::reference::{Figures, close};

const HANDBOOK: &str = include_str!("../reference/electronics_noise_and_drift.toml");

/// 10 kHz.
const STEP_S: f64 = 1e-4;
const LSB_V: f64 = 10e-6;

pub(crate) fn steps(seconds: f64) -> u32 {
    (seconds / STEP_S).round() as u32
}

/// A 22-bit converter, zeros in blocks of 1 ms.
pub(crate) fn setup(circuit: Circuit) -> Setup<Flux> {
    valid(Setup::try_new(
        circuit,
        Converter {
            code_zero_v: 0.0,
            lsb_v: LSB_V,
            code_min: -(1 << 21),
            code_max: (1 << 21) - 1,
            ..Converter::DEFAULT
        },
        Noise { readout_counts: 1.0, ..Noise::NONE },
        Policy { zero_block_s: 1e-3, ..Policy::DEFAULT },
    ))
}

/// Input resistance, capacitance, offset voltage, bias current, and how far the output goes.
fn amplifier(resistance: f64, capacitance_f: f64, offset_limit_v: f64, bias_limit_a: f64, rail_v: f64) -> Circuit {
    Circuit {
        capacitance_f,
        input_resistance_ohm: Some(resistance),
        offset_limit_v,
        bias_limit_a,
        rail_low_v: -rail_v,
        rail_high_v: rail_v,
        ..Circuit::DEFAULT
    }
}

pub(crate) fn bench(setup: &Setup<Flux>, leak_s: Option<f64>, seed: u64) -> Bench<'_, Flux> {
    Bench::new(setup, Network { branches: Vec::new(), leak_s }, STEP_S, seed)
}

fn volts_per_second(rate: Measured<VoltageRate>) -> (f64, f64) {
    (rate.value.as_volts_per_second(), rate.u.as_volts_per_second())
}

/// Within three of its standard uncertainties, which are at most `most`.
#[track_caller]
fn tells(what: &str, (value, u): (f64, f64), expected: f64, most: f64) {
    close(what, value, expected, 3.0 * u);
    assert!(u <= most, "{what}: {u:e}");
}

fn tells_amplifier(bench: &Bench<'_, Flux>, offset_v: f64, bias_a: f64) {
    let (offset, bias) = bench.channel.offset_and_bias().expect("a zero and a hold");
    let volts = |v: Voltage| v.as_volts();
    let amperes = |a: Current| a.as_amperes();
    tells("offset", (volts(offset.value), volts(offset.u)), offset_v, 1e-3 * offset_v.abs());
    tells("bias", (amperes(bias.value), amperes(bias.u)), bias_a, 1e-2 * bias_a.abs());
}

/// Rashid, Microelectronic Circuits, eq. 14.14 (seen in one place, arithmetic verified): 6 mV on 1 kohm and 0.1 uF move
/// the output by 60 V/s, 200 nA by 2 V/s. Against each other they take it to 14 V in 0.2414 s, together in 0.2258 s.
#[test]
fn offset_and_bias_of_rashid_14_14_reach_14_volts_in_time_and_are_told_apart() {
    let drift = Figures::of(HANDBOOK).section("integrator_drift");
    let from_offset = drift.number("rashid_dvdt_from_vio_V_per_s");
    let from_bias = drift.number("rashid_dvdt_from_iio_V_per_s");
    let setup = setup(amplifier(1e3, 0.1e-6, 6e-3, 200e-9, 14.0));
    for (sign, time) in [(-1.0, "rashid_time_to_14V_vio_minus_iio_s"), (1.0, "rashid_time_to_14V_worst_case_sum_s")] {
        let mut bench = bench(&setup, None, 1);
        let rate = from_offset + sign * from_bias;
        bench.reset(20);
        let start = bench.tick;
        bench.play(Mode::Zero, steps(0.2), Drive::Free(rate));
        tells("V/s", volts_per_second(bench.channel.drift()), rate, 1e-4);
        bench.play(Mode::Zero, steps(0.1), Drive::Free(rate));
        let at_rail = bench.events.iter().find(|(_, event)| *event == Event::Fault(Reason::AtRail));
        let (tick, _) = *at_rail.expect("14 V are not usable");
        let taken = f64::from(tick - start) * 1e-6;
        // The first sample past it, and the noise of a count or two, which a few microseconds make up for.
        close("s", taken, drift.number(time) + 0.5 * STEP_S, 0.5 * STEP_S + 1e-6);

        // The input opens, and the offset moves nothing any more. The circuit inverts: a positive offset moves it down.
        bench.reset(20).play(Mode::Hold, steps(0.2), Drive::Free(sign * from_bias));
        tells("V/s", volts_per_second(bench.channel.droop()), sign * from_bias, 1e-4);
        tells_amplifier(&bench, -6e-3, -sign * 200e-9);
    }
}

/// allaboutcircuits.com, thread 15174 (verified arithmetic): 10 kohm, 10 nF, 2 mV and 100 nA: 20 V/s and 10 V/s.
#[test]
fn offset_and_bias_of_a_worked_thread_are_told_apart() {
    let drift = Figures::of(HANDBOOK).section("integrator_drift");
    let from_offset = drift.number("aac_dvdt_vio_V_per_s");
    let from_bias = drift.number("aac_dvdt_ib_V_per_s");
    let setup = setup(amplifier(10e3, 10e-9, 2e-3, 100e-9, 14.0));
    let mut bench = bench(&setup, None, 2);
    bench.reset(20).play(Mode::Zero, steps(0.3), Drive::Free(-from_offset - from_bias));
    tells("V/s", volts_per_second(bench.channel.drift()), -setup.circuit().drift_limit_v_per_s(), 1e-4);
    bench.reset(20).play(Mode::Hold, steps(0.3), Drive::Free(-from_bias));
    tells_amplifier(&bench, 2e-3, 100e-9);
    assert!(!bench.events.iter().any(|(_, event)| matches!(event, Event::Fault(_))), "{:?}", bench.events);
}

/// Sedra and Smith, Microelectronic Circuits, problem 2.106 (seen in one place, arithmetic verified): 10 kohm, 10 nF,
/// 1 Mohm across it, 2 mV, and 20 nA left of the bias by the compensating resistor: at worst 0.222 V at the output.
///
/// The drift is what this output leaks: offset through the input resistor, bias, and the offset through the 1 Mohm.
#[test]
fn integrator_of_sedra_and_smith_2_106_settles_at_its_worst_output_and_reads_nothing() {
    let (resistance, feedback, capacitance_f, offset_v, bias_a) = (10e3, 1e6, 10e-9, 2e-3, 20e-9);
    let worst = Figures::of(HANDBOOK).section("integrator_drift").number("sedra_worst_dc_output_V");
    let tau = feedback * capacitance_f;
    let circuit = amplifier(resistance, capacitance_f, offset_v, bias_a, 14.0);
    let setup = setup(Circuit { leak_time_constant_s: Some(tau), ..circuit });
    let of_input = setup.circuit().drift_limit_v_per_s();
    let drift = of_input + offset_v / tau;
    close("V/s", of_input, 22.0, 1e-9);
    close("V", drift * tau, worst, 1e-9);

    let mut bench = bench(&setup, Some(tau), 3);
    let idle = Drive::Free(drift);
    bench.reset(20).play(Mode::Zero, steps(50.0 * tau), idle);
    close("V", bench.shown_v(100), worst, 3.0 * LSB_V / 10.0);
    tells("V/s", volts_per_second(bench.channel.drift()), drift, 1e-4);

    // Twenty time constants without input.
    bench.play(Mode::Integrate, steps(20.0 * tau), idle);
    bench.play(Mode::Zero, steps(50.0 * tau), idle);
    let reading = bench.reading();
    assert_eq!(reading.trust, Trust::Good, "{:?}", bench.events);
    for estimate in [Some(&reading.at_stop), reading.closed.as_ref()] {
        // An ideal integrator would have gone 4.4 V.
        tells("V", output_v(&setup, estimate.expect("closed")), 0.0, 1e-5 * drift * 20.0 * tau);
    }
    let removed = reading.drift_removed.as_volt_seconds() * setup.circuit().gain();
    close("V", removed, drift * 20.0 * tau, 1e-5 * drift * 20.0 * tau);
}
