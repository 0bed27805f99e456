//! False alarms: a healthy switch is never blamed, whatever the board and the input.

use brimline::{Charge, Circuit, Converter, Event, Linearity, Mode, Noise, Policy, Reason, Setup, SoakageBranch};

use crate::bench::{Bench, Fault};
use crate::{CIRCUIT, CONVERTER, NOISE, POLICY, SETUP};

/// Seeded channels of each kind.
const CHANNELS: u64 = 200;

const WATCHED: [Reason; 4] =
    [Reason::ResetNotArrived, Reason::SwitchStuckClosed, Reason::SwitchFailed, Reason::DroopOutsideLimits];

fn is_alarm(event: &Event) -> bool {
    match event {
        Event::ResetFailed { .. } | Event::SettlingSlow { .. } | Event::Decay { .. } => true,
        Event::Fault(reason) => WATCHED.contains(reason),
        _ => false,
    }
}

/// A morning's work: runs with resets that are asked for and resets that are not, pauses, zeros at whatever level.
fn work(bench: &mut Bench<'_>) {
    bench.drift *= bench.uniform(-2.4, 2.4);
    bench.droop *= bench.uniform(-2.4, 2.4);
    bench.reset(5).zero(300);
    for _ in 0..3 {
        // Dark, dim and with the drift, or bright; one that cancels the drift is a test of its own.
        let drift = bench.drift / bench.lsb_v();
        let inputs = [0.0, bench.uniform(0.5, 3.0) * drift, bench.uniform(-60_000.0, 60_000.0)];
        let input = inputs[bench.uniform(0.0, 3.0) as usize];
        bench.obey(200, input).reset(5).obey(200, 0.5 * input);
        bench.hold(100).obey(100, input).zero(200).reset(5).zero(200);
    }
    bench.obey(30, 0.0).reset(5).hold(50).obey(30, 0.0).zero(100);
}

#[track_caller]
fn assert_never_blamed(kind: &str, setup: &Setup<Charge>, prepare: impl Fn(&mut Bench<'_>)) {
    let mut resets = 0;
    let mut alarms = Vec::new();
    for seed in 0..CHANNELS {
        let mut bench = Bench::new(setup, Fault::None, seed);
        prepare(&mut bench);
        work(&mut bench);
        resets += bench.resets;
        alarms.extend(bench.notices.iter().filter(|event| is_alarm(event)).map(|&event| (seed, event)));
        assert!(!bench.channel.switch_has_failed());
        assert_ne!(bench.last_step.request, Some(Mode::Reset), "{kind} {seed}");
    }
    println!("{kind}: {CHANNELS} channels, {resets} resets, {} alarms", alarms.len());
    assert!(alarms.is_empty(), "{kind}: {} alarms, {:?}", alarms.len(), alarms.first());
}

fn setup(circuit: Circuit, converter: Converter, noise: Noise, policy: Policy) -> Setup<Charge> {
    Setup::try_new(circuit, converter, noise, policy).unwrap_or_else(|e| panic!("{e}"))
}

#[test]
fn a_plain_channel() {
    assert_never_blamed("plain", &SETUP, |_| {});
}

#[test]
fn a_pedestal_that_is_known_as_well_as_stated() {
    let circuit = Circuit { pedestal_v: 200e-6, pedestal_u_v: Some(50e-6), ..CIRCUIT };
    assert_never_blamed("pedestal", &setup(circuit, CONVERTER, NOISE, POLICY), |bench| {
        bench.pedestal_v += 50e-6 * bench.normal();
    });
}

#[test]
fn a_level_that_walks_and_a_drift_that_wanders() {
    // 10 counts per root second, 0.5 counts/s per root second.
    let noise = Noise { input_density: 14e-12, offset_wander: 0.5e-12, ..NOISE };
    assert_never_blamed("walk and wander", &setup(CIRCUIT, CONVERTER, noise, POLICY), |_| {});
}

#[test]
fn a_level_that_only_walks() {
    let circuit = Circuit { offset_limit_v: 0.0, bias_limit_a: 0.0, ..CIRCUIT };
    let noise = Noise { input_density: 10e-12, ..NOISE };
    assert_never_blamed("walk alone", &setup(circuit, CONVERTER, noise, POLICY), |_| {});
}

#[test]
fn a_capacitor_that_leaks_as_stated() {
    let circuit = Circuit { leak_time_constant_s: Some(20.0), leak_u_rel: 1e-3, ..CIRCUIT };
    assert_never_blamed("leak", &setup(circuit, CONVERTER, NOISE, POLICY), |_| {});
}

#[test]
fn a_capacitor_that_soaks_as_stated() {
    let branches = [(2e-3, 0.5), (1e-3, 20.0)].map(|(share, time_constant_s)| SoakageBranch { share, time_constant_s });
    let circuit = Circuit { soakage: [branches[0], branches[1], SoakageBranch::NONE, SoakageBranch::NONE], ..CIRCUIT };
    assert_never_blamed("soakage", &setup(circuit, CONVERTER, NOISE, POLICY), |_| {});
}

#[test]
fn a_switch_that_is_slow_by_design() {
    // 50 kohm: 5 ms, so that five samples of 20 ms are longer than the 69 ms to half a code.
    let circuit = Circuit { switch_resistance_ohm: 50e3, ..CIRCUIT };
    let setup = setup(circuit, CONVERTER, NOISE, POLICY);
    assert!(setup.min_on_time_s() < 0.1);
    assert_never_blamed("slow switch", &setup, |bench| bench.period_s = 0.02);
}

#[test]
fn readings_that_nothing_dithers() {
    let noise = Noise { readout_counts: 0.1, ..NOISE };
    assert_never_blamed("undithered", &setup(CIRCUIT, CONVERTER, noise, POLICY), |_| {});
}

#[test]
fn a_noisy_converter_that_is_bent_and_off_zero() {
    static TABLE: Linearity = Linearity::new(&[(-200_000, 0.0), (0, 40.0), (199_999, 0.0)]);
    let converter = Converter { linearity: Some(&TABLE), code_zero_u_v: 1e-3, ..CONVERTER };
    let noise = Noise { readout_counts: 8.0, ..NOISE };
    assert_never_blamed("bent", &setup(CIRCUIT, converter, noise, POLICY), |bench| {
        bench.bow = |code| 40.0 * (1.0 - code.abs() / 200_000.0);
    });
}
