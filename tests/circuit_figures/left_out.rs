//! Samples that are left out, and figures too small to be any.

use brimline::{Channel, Charge, Circuit, Converter, Mode, Noise, Policy, Sample, Setup, SoakageBranch};

/// What a run reads after a zero on a charged capacitor, perhaps with end codes among its last samples, a short reset and
/// a short zero: value and uncertainty, C.
fn after_a_zero_with(end_codes: u32) -> (f64, f64) {
    let mut soakage = [SoakageBranch::NONE; 4];
    soakage[0] = SoakageBranch { share: 0.01, time_constant_s: 0.2 };
    let circuit = Circuit {
        rail_low_v: -2.4,
        rail_high_v: 2.4,
        offset_limit_v: 0.0,
        bias_limit_a: 0.0,
        soakage,
        ..Circuit::DEFAULT
    };
    let converter = Converter { tick_hz: 1000.0, ..Converter::DEFAULT };
    let noise = Noise { readout_counts: 1.0, ..Noise::NONE };
    let setup: Setup<Charge> = Setup::new(circuit, converter, noise, Policy::DEFAULT);
    let mut channel = Channel::new(&setup);
    let mut tick = 0;
    for (mode, counts, samples) in [
        (Mode::Zero, 62_000, 300),
        (Mode::Zero, 65_535, end_codes),
        (Mode::Zero, 62_000, 20 - end_codes),
        (Mode::Zero, 65_535, end_codes),
        (Mode::Reset, 32_768, 2),
        (Mode::Zero, 32_800, 4),
        (Mode::Integrate, 32_800, 4),
    ] {
        for _ in 0..samples {
            tick += 10;
            channel.feed(Sample { tick, counts, mode, temperature: None });
        }
    }
    let integral = channel.reading().expect("a run").at_stop.integral;
    (integral.value.as_coulombs(), integral.u.as_coulombs())
}

#[test]
fn what_was_left_out_before_a_reset_is_no_part_of_the_reset() {
    let ((without, u), (with, _)) = (after_a_zero_with(0), after_a_zero_with(5));
    assert!((without - with).abs() < 0.1 * u, "{without:e}, with end codes before the reset {with:e}; u {u:e}");
}

/// Squared it is below the normal numbers of `f32`, and one over it infinite.
#[test]
fn a_flicker_too_small_for_f32_is_none() {
    let circuit = Circuit { offset_limit_v: 0.0, bias_limit_a: 0.0, ..Circuit::DEFAULT };
    let converter = Converter { code_zero_v: -5.0, lsb_v: 0.0390625, code_max: 255, ..Converter::DEFAULT };
    let noise = Noise { readout_counts: 1.0, input_flicker: 1e-30, ..Noise::NONE };
    let setup: Setup<Charge> = Setup::new(circuit, converter, noise, Policy::DEFAULT);
    let mut channel = Channel::new(&setup);
    let mut tick = 0;
    for (mode, samples) in [(Mode::Reset, 4), (Mode::Zero, 60), (Mode::Integrate, 30), (Mode::Zero, 60)] {
        for _ in 0..samples {
            tick += 10_000;
            channel.feed(Sample { tick, counts: 128 + (tick / 10_000 % 3) as i32, mode, temperature: None });
        }
    }
    let reading = channel.reading().expect("a run");
    let (stop, closed) = (reading.at_stop.integral.u, reading.closed.expect("a zero").integral.u);
    assert!(stop.as_coulombs() < 1e-7 && closed.as_coulombs() > 1e-10, "{stop:?} {closed:?}");
}
