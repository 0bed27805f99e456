//! An integrator that a feedback resistor keeps from drifting away: it trades the drift for an offset of its output.
//!
//! Figures are facts of the trade (common practice, no source).

use brimline::{Circuit, Flux, Mode, Setup, Trust};

use crate::amplifier::{bench, setup, steps};
use crate::bench::{Drive, output_v};
use crate::reference::close;

const RESISTANCE: f64 = 51e3;
const CAPACITANCE_F: f64 = 4.7e-9;
/// Gain for direct current.
const DC_GAIN: f64 = 200.0;
const TAU_S: f64 = DC_GAIN * RESISTANCE * CAPACITANCE_F;
/// Output slope per volt at the input, 1/s.
const SLOPE: f64 = 1.0 / (RESISTANCE * CAPACITANCE_F);

fn stabilised() -> Setup<Flux> {
    setup(Circuit {
        capacitance_f: CAPACITANCE_F,
        input_resistance_ohm: Some(RESISTANCE),
        offset_limit_v: 13e-3,
        bias_limit_a: 0.0,
        leak_time_constant_s: Some(TAU_S),
        rail_low_v: -12.0,
        rail_high_v: 12.0,
        ..Circuit::DEFAULT
    })
}

/// What offset and input make of the output of an ideal capacitor; the circuit inverts.
///
/// The offset acts through both resistors: at rest it appears at the output times noise gain, `1 + 200`.
fn drive(offset_v: f64, input_v: f64) -> Drive {
    Drive::Free(offset_v * (1.0 + DC_GAIN) / TAU_S - input_v * SLOPE)
}

/// 0.38 mV of offset become about 77 mV at the output, 13 mV about 2.5 V, either way. A known input is read right all
/// the same: 10 mV for 1 s, more than twenty time constants, of which the output remembers the last one.
#[test]
fn input_is_read_right_although_the_output_carries_two_hundred_and_one_offsets() {
    const INPUT_V: f64 = 10e-3;
    let setup = stabilised();
    for (offset_v, about_v, exact_v) in [(0.38e-3, 0.077, 0.07638), (13e-3, 2.5, 2.613), (-13e-3, -2.5, -2.613)] {
        let mut bench = bench(&setup, Some(TAU_S), 4);
        bench.reset(20).play(Mode::Zero, steps(2.0), drive(offset_v, 0.0));
        let output = bench.shown_v(100);
        close("V", output, about_v, 0.05 * f64::abs(about_v));
        // What the readings know of the mean of 100 counts, three times.
        close("V", output, exact_v, 3e-6);
        bench.play(Mode::Integrate, steps(1.0), drive(offset_v, INPUT_V));
        close("V", bench.shown_v(100), exact_v - DC_GAIN * INPUT_V, 5e-6);
        bench.play(Mode::Zero, steps(2.0), drive(offset_v, 0.0));
        let reading = bench.reading();
        assert_eq!(reading.trust, Trust::Good, "{:?}", bench.events);
        for estimate in [Some(&reading.at_stop), reading.closed.as_ref()] {
            let integral = estimate.expect("closed").integral;
            let (value, u) = (integral.value.as_volt_seconds(), integral.u.as_volt_seconds());
            close("V s", value, INPUT_V, 3.0 * u);
            assert!(u < 1e-5 * INPUT_V, "{u:e} V s");
        }
    }
}

/// What a run of 1 s without input reads at stop, and its uncertainty, as movement of an ideal output, V. The
/// converter's own offset is `before_v` in the zero and `after_v` in the run.
fn run_with_converter_offset(setup: &Setup<Flux>, before_v: f64, after_v: f64) -> (f64, f64) {
    let idle = drive(0.38e-3, 0.0);
    let mut bench = bench(setup, Some(TAU_S), 5);
    bench.converter_offset_v = before_v;
    bench.reset(20).play(Mode::Zero, steps(2.0), idle);
    bench.converter_offset_v = after_v;
    bench.play(Mode::Integrate, steps(1.0), idle);
    output_v(setup, &bench.reading().at_stop)
}

/// The limit: what the converter's own offset has moved by since the zero is taken for a level, and a level leaks. A
/// change by `d` counts as input that moves the output by `d / tau`, besides the step itself. What was there in the
/// zero already does no harm.
#[test]
fn change_of_the_converter_s_offset_counts_as_input_and_a_constant_one_does_not() {
    let setup = stabilised();
    // Between the last sample before the change and the first one after it lies a step, of which half counts.
    let changed_s = 1.0 - 0.5e-4;
    for constant_v in [0.0, 5e-3, -5e-3] {
        let (value, u) = run_with_converter_offset(&setup, constant_v, constant_v);
        close("V", value, 0.0, 3.0 * u);
        for change_v in [1e-3, -1e-3] {
            let (value, u) = run_with_converter_offset(&setup, constant_v, constant_v + change_v);
            close("V", value, change_v + change_v / TAU_S * changed_s, 3.0 * u);
        }
    }
}
