//! Any numbers in every field of a set-up: what is accepted must carry a channel through a fixed drill.

use brimline::unit::Photodetector;
use brimline::{
    Absorption, Channel, Charge, Circuit, Flux, Linearity, Measured, Mode, Policy, Sample, Setup, SoakageBranch,
    TemperatureLaw, Trust,
};

use crate::board::{AnySetup, Parts, Plain, parts};
use crate::draw::{Dice, Draw};
use crate::show;
use crate::sound::assert_sound;

pub fn run(bytes: &[u8]) {
    let mut draw = Draw::new(bytes);
    match draw.byte() % 8 {
        6 => table(&mut draw),
        7 => formulas(&mut draw),
        _ => {
            let mut parts = parts(&mut draw);
            spoil(&mut draw, &mut parts);
            show(|| format!("{parts:#?}"));
            set_up(&parts, &mut draw);
        }
    }
}

/// Replaces a few fields by any numbers.
fn spoil(draw: &mut Draw, parts: &mut Parts) {
    for _ in 0..draw.count(12) {
        let Parts { circuit: c, converter: v, noise: n, policy: p } = parts;
        let x = draw.any_number();
        let some = draw.flag(200).then_some(x);
        match draw.byte() % 45 {
            0 => c.capacitance_f = x,
            1 => c.input_resistance_ohm = some,
            2 => c.reset_level_v = x,
            3 => c.rail_low_v = x,
            4 => c.rail_high_v = x,
            5 => c.offset_limit_v = x,
            6 => c.bias_limit_a = x,
            7 => c.source_resistance_ohm = x,
            8 => c.leak_time_constant_s = some,
            9 => c.leak_u_rel = x,
            10 => c.soakage[usize::from(draw.byte() % 4)].share = x,
            11 => c.soakage[usize::from(draw.byte() % 4)].time_constant_s = x,
            12 => c.soakage_u_rel = x,
            13 => c.pedestal_v = x,
            14 => c.pedestal_u_v = some,
            15 => c.switch_resistance_ohm = x,
            16 => c.slew_v_per_s = some,
            17 => c.temperature_law = TemperatureLaw::Offset { limit_v_per_k: x },
            18 => c.temperature_law = TemperatureLaw::Junction { doubling_k: x },
            19 => c.gain_u_rel = x,
            20 => v.code_zero_v = x,
            21 => v.lsb_v = x,
            22 => v.code_min = draw.long() as i32,
            23 => v.code_max = draw.long() as i32,
            24 => v.tick_hz = x,
            25 => v.code_zero_u_v = x,
            26 => v.lsb_u_rel = x,
            27 => v.linearity_u_counts = x,
            28 => n.readout_counts = x,
            29 => n.input_density = x,
            30 => n.offset_wander = x,
            31 => n.input_flicker = x,
            32 => p.zero_block_s = x,
            33 => p.false_alarm_s = x,
            34 => p.edge_samples = draw.byte(),
            35 => p.gap_limit_s = x,
            36 => p.frozen_samples = draw.word(),
            37 => p.worst_input = some,
            38 => p.input_slew = some,
            39 => p.latency_s = x,
            40 => p.guard_sigma = x,
            41 => p.settling_s = x,
            42 => p.reset_attempts = draw.byte(),
            43 => p.arrival_tolerance_v = some,
            _ => c.soakage = [SoakageBranch { share: x, time_constant_s: x }; 4],
        }
    }
}

fn set_up(parts: &Parts, draw: &mut Draw) {
    let (circuit, converter, noise, policy) = (parts.circuit, parts.converter, parts.noise, parts.policy);
    let charge = Setup::<Charge>::try_new(circuit, converter, noise, policy);
    let flux = Setup::<Flux>::try_new(circuit, converter, noise, policy);
    for refusal in [charge.err(), flux.err()].into_iter().flatten() {
        assert!(!refusal.parameter.is_empty() && refusal.to_string().len() > refusal.parameter.len());
    }
    assert!(charge.is_err() || flux.is_err(), "an input is either a current or a voltage");
    match parts.any_setup() {
        Some(AnySetup::Charge(setup)) => drill(&setup, draw),
        Some(AnySetup::Flux(setup)) => drill(&setup, draw),
        None => {}
    }
}

/// A day's work: reset, zero, run with a reset and a hold, zero, another run; with steps that the policy takes for
/// whole, and levels that the converter has.
fn drill<Q: Plain>(setup: &Setup<Q>, draw: &mut Draw) {
    let converter = setup.converter();
    let on_time = setup.min_on_time_s();
    assert!(on_time.is_finite() && on_time >= 0.0 && on_time < setup.policy().gap_limit_s, "{on_time}");
    let gain = setup.circuit().gain();
    assert!(gain.is_finite() && gain != 0.0 && setup.circuit().drift_limit_v_per_s() >= 0.0);
    let gap = setup.policy().gap_limit_s * converter.tick_hz;
    let ticks = (gap * draw.pick(&[0.1, 0.01, 0.9, 1e-4])).max(1.0) as u32;
    let reset = converter.code(setup.circuit().reset_level_v);
    let slope = draw.pick(&[0.0, 0.01, 3.0, -200.0]);
    let mut dice = Dice::new(7);
    let mut channel = Channel::new(setup);
    let (mut tick, mut level) = (draw.long(), reset);
    let plan = [
        (Mode::Reset, 4),
        (Mode::Zero, 60),
        (Mode::Integrate, 30),
        (Mode::Reset, 4),
        (Mode::Integrate, 30),
        (Mode::Hold, 30),
        (Mode::Integrate, 20),
        (Mode::Zero, 60),
        (Mode::Integrate, 5),
        (Mode::Reset, 3),
        (Mode::Zero, 30),
    ];
    for (mode, samples) in plan {
        for _ in 0..samples {
            level = match mode {
                Mode::Reset => reset,
                Mode::Integrate => level + slope,
                _ => level + 0.01 * slope,
            };
            let noise = setup.noise().readout_counts.min(1e6) * dice.even();
            let counts = (level + noise).round() as i32;
            tick = tick.wrapping_add(ticks);
            channel.feed(Sample { tick, counts, mode, temperature: None });
        }
        check(&channel);
    }
}

fn check<Q: Plain>(channel: &Channel<'_, Q>) {
    for rate in [channel.drift(), channel.droop()] {
        let (value, u) = (rate.value.as_volts_per_second(), rate.u.as_volts_per_second());
        assert!(value.is_finite() && u >= 0.0, "{rate:?}");
    }
    if let Some((offset, bias)) = channel.offset_and_bias() {
        assert!(offset.value.as_volts().is_finite() && offset.u.as_volts() >= 0.0, "{offset:?}");
        assert!(bias.value.as_amperes().is_finite() && bias.u.as_amperes() >= 0.0, "{bias:?}");
    }
    if let Some(reading) = channel.reading() {
        assert_sound(&reading);
        if reading.trust == Trust::Good {
            assert!(reading.elapsed_s > 0.0, "{reading:?}");
        }
    }
}

/// Any points as a table of non-linearity.
fn table(draw: &mut Draw) {
    let mut points = Vec::new();
    let mut code = draw.long() as i32 % (1 << 29);
    for _ in 0..draw.count(36) {
        let error = if draw.flag(16) { draw.any_number() } else { draw.linear(-20.0, 20.0) };
        points.push((code, error));
        let step = if draw.flag(16) { draw.long() as i32 } else { i32::from(draw.word()) };
        code = code.wrapping_add(step);
    }
    let rising = points.windows(2).all(|pair| pair[0].0 < pair[1].0);
    match Linearity::try_new(&points) {
        Ok(table) => {
            assert!(rising && (2..=Linearity::POINTS_MAX).contains(&points.len()), "{points:?}");
            assert!(points.iter().all(|(_, error)| error.abs() <= 16384.0), "{points:?}");
            assert_eq!(Linearity::try_new(&points), Ok(table));
        }
        Err(refusal) => assert_eq!(refusal.parameter, "nonlinearity"),
    }
}

/// Formulas that take numbers from anywhere.
fn formulas(draw: &mut Draw) {
    let numbers = [0; 4].map(|_| draw.any_number());
    let [a, b, c, d] = numbers;
    if let Ok(detector) = Photodetector::try_new(a, b, c, d) {
        let charge = Measured::new(Charge::from_coulombs(1e-6), Charge::from_coulombs(1e-9));
        let exposure = detector.radiant_exposure(charge);
        let (value, u) = (exposure.value.as_joules_per_square_metre(), exposure.u.as_joules_per_square_metre());
        assert!(value > 0.0 && u > 0.0, "{numbers:?}: {value} {u}");
    }
    let circuit = Circuit { capacitance_f: 1e-7, switch_resistance_ohm: 100.0, ..Circuit::DEFAULT };
    let settling = circuit.settling_time_s(a, b);
    if a.is_finite() && b > 0.0 {
        // Half a millisecond is 50 time constants: an f64 has no swing that needs 800 of them to settle.
        assert!((0.0..=0.01).contains(&settling), "{numbers:?}: {settling}");
        if a.abs() > b && (a / b).is_finite() {
            let exact = 1e-5 * (a.abs() / b).ln();
            assert!(settling >= exact * 0.999_999 && settling <= exact * 1.001 + 1e-8, "{numbers:?}: {settling}");
        }
    } else if !b.is_nan() && b <= 0.0 {
        assert!(settling == f64::INFINITY, "{numbers:?}: {settling}");
    }
    let absorption = Absorption { per_decade: 1e-3 };
    let wait = absorption.wait_s(a, b);
    assert!(wait.is_nan() || wait >= 0.0, "{numbers:?}: {wait}");
    let _ = absorption.rate_v_per_s(a, b);
    let _ = Policy::DEFAULT;
}
