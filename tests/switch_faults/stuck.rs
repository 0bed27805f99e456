//! A switch that stays closed: told by whatever should have moved the level, and by nothing else.

use brimline::{Charge, Circuit, Event, Mode, Noise, Policy, Reason, Setup, SoakageBranch, Trust};

use crate::bench::{Bench, Fault};
use crate::{CIRCUIT, CONVERTER, NOISE, POLICY, SETUP, opened};

/// Nothing moves the level but what the test adds.
const STILL: Circuit = Circuit { offset_limit_v: 0.0, bias_limit_a: 0.0, ..CIRCUIT };
const STUCK: Fault = Fault::SticksClosed { from: 2 };

/// Variance of a sample.
const READOUT: f64 = 1.0 + 1.0 / 12.0;

/// Seconds in `mode` until the switch is told to be stuck; `None` within `limit_s`.
fn told_after(bench: &mut Bench<'_>, mode: Mode, limit_s: f64) -> Option<f64> {
    let samples = (limit_s / bench.period_s).round() as u32;
    let told = (1..=samples).find(|_| {
        bench.sample(mode);
        bench.faults().contains(&Reason::SwitchStuckClosed)
    });
    told.map(|n| f64::from(n) * bench.period_s)
}

/// Of a sample from the mean of a reset's five.
fn deviation() -> f64 {
    (READOUT * (1.0 + 1.0 / 5.0)).sqrt()
}

#[test]
fn drift_tells_in_a_zero_and_not_in_a_run() {
    for seed in 0..20 {
        let mut bench = opened(&SETUP, STUCK, seed);
        let rate = bench.drift / bench.lsb_v();
        // Seen in a long zero, the rate is all but exact: twelve deviations off, or the level is held.
        bench.zero(6_000).integrate(20, 5_000.0).reset(5);
        let expected = 12.0 * deviation() / rate;
        let told = told_after(&mut bench, Mode::Zero, 3.0 * expected).expect("told");
        assert!((0.97 * expected..1.03 * expected + 0.01).contains(&told), "{told} for {expected}");
        assert_eq!(bench.told(Event::ResetFailed { in_a_row: 1 }), 1);
        assert_eq!(bench.told(Event::Fault(Reason::SwitchStuckClosed)), 1);

        // In a run there may be an input that just cancels it.
        let mut bench = opened(&SETUP, STUCK, seed);
        bench.zero(6_000).integrate(20, 5_000.0).reset(5);
        assert_eq!(told_after(&mut bench, Mode::Integrate, 60.0), None);
        // The zero after it tells.
        assert!(told_after(&mut bench, Mode::Zero, 1.0).is_some());
    }
}

/// Pedestal and drift add up, each with its sign.
#[test]
fn a_pedestal_with_the_drift_tells_earlier_and_against_it_later() {
    for pedestal in [8.0, -8.0] {
        let circuit = Circuit { pedestal_v: pedestal * 10e-6, pedestal_u_v: Some(0.0), ..CIRCUIT };
        let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, POLICY);
        let mut bench = opened(&setup, STUCK, 1);
        let rate = bench.drift / bench.lsb_v();
        bench.zero(6_000).integrate(20, 5_000.0).reset(5);
        let expected = (12.0 * deviation() - pedestal) / rate;
        let told = told_after(&mut bench, Mode::Zero, 2.0).expect("told");
        assert!((0.95 * expected..1.05 * expected + 0.01).contains(&told), "{pedestal}: {told} for {expected}");
    }
}

/// What the dielectric would give back to a free level is no movement of the held one.
#[test]
fn a_soaking_capacitor_does_not_hide_a_stuck_switch() {
    let mut soakage = CIRCUIT.soakage;
    soakage[0] = SoakageBranch { share: 0.01, time_constant_s: 5.0 };
    let setup: Setup<Charge> = Setup::new(Circuit { soakage, ..CIRCUIT }, CONVERTER, NOISE, POLICY);
    let mut bench = opened(&setup, STUCK, 1);
    // Ten seconds on the way to 100,000 counts.
    bench.zero(3_000).integrate(1_000, 10_000.0).reset(5);
    assert!(told_after(&mut bench, Mode::Zero, 2.0).is_some());
}

/// Stuck since power-up, nobody knows the drift: no zero has ever seen it.
#[test]
fn a_drift_that_was_never_seen_does_not_tell() {
    let mut bench = Bench::new(&SETUP, Fault::SticksClosed { from: 1 }, 1);
    bench.reset(5);
    assert_eq!(told_after(&mut bench, Mode::Zero, 60.0), None);
    assert!(bench.faults().is_empty(), "{:?}", bench.faults());
}

#[test]
fn a_walk_tells_when_it_should_have_left_long_ago() {
    // Counts^2/s from the density in A per root hertz: half its square over (1 pC)^2.
    for walk in [20.0, 60.0_f64] {
        let noise = Noise { input_density: (2.0 * walk).sqrt() * 1e-12, ..NOISE };
        let setup: Setup<Charge> = Setup::new(STILL, CONVERTER, noise, POLICY);
        for mode in [Mode::Zero, Mode::Integrate] {
            // 135 bands of six deviations, squared. In a zero the blocks of ten samples show less and less noise, as
            // the walk that is taken off their scatter is not there: eight degrees of freedom in each tenth of a
            // second, after 30 blocks of the opening zero and 16 degrees for the set-up.
            let missing = if mode == Mode::Zero { walk * 0.01 * 96.0 / 15.0 / 8.0 } else { 0.0 };
            let missing_at = |t: f64| missing * 80.0 * t / (80.0 * t + 256.0);
            let after = |t: f64| 135.0 * 36.0 * (deviation().powi(2) - missing_at(t)) / walk;
            let expected = (0..50).fold(0.0, |t, _| after(t));
            let told = |seed| {
                let mut bench = opened(&setup, STUCK, seed);
                bench.integrate(20, 5_000.0).reset(5);
                told_after(&mut bench, mode, 2.0 * expected).expect("told")
            };
            let mean = (0..20).map(told).sum::<f64>() / 20.0;
            assert!((0.92 * expected..1.08 * expected).contains(&mean), "{walk} {mode:?}: {mean} for {expected}");
        }
    }
}

#[test]
fn a_known_pedestal_tells_at_the_first_sample() {
    // 12 deviations are 13.7 counts, 48 are 55.
    let cases = [
        (Mode::Zero, 25.0, 2.0, true),
        (Mode::Zero, -25.0, 2.0, true),
        (Mode::Zero, 25.0, 3.5, false),
        (Mode::Zero, 11.0, 0.0, false),
        (Mode::Integrate, 25.0, 0.0, false),
    ];
    for (mode, pedestal, u, told) in cases {
        let pedestal_v = pedestal * 10e-6;
        let circuit = Circuit { pedestal_v, pedestal_u_v: Some(u * 10e-6), ..STILL };
        let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, POLICY);
        let mut bench = opened(&setup, STUCK, 1);
        bench.integrate(20, 5_000.0).reset(5);
        let expected = if told { Some(bench.period_s) } else { None };
        assert_eq!(told_after(&mut bench, mode, 5.0), expected, "{mode:?} {pedestal} {u}");
    }
    // Of an unknown one nothing can be asked.
    let circuit = Circuit { pedestal_v: 250e-6, pedestal_u_v: None, ..STILL };
    let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, POLICY);
    let mut bench = opened(&setup, STUCK, 1);
    bench.integrate(20, 5_000.0).reset(5);
    assert_eq!(told_after(&mut bench, Mode::Zero, 5.0), None);
}

/// A steady input that happens to move the level just as far in a sample period as the pedestal, the other way, is no
/// fault: the sample after it shows.
#[test]
fn an_input_that_cancels_the_pedestal_in_one_sample_is_no_stuck_switch() {
    let circuit = Circuit { pedestal_v: 1e-3, pedestal_u_v: Some(50e-6), ..STILL };
    let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, POLICY);
    let mut bench = opened(&setup, Fault::None, 1);
    // 100 counts of pedestal, 10,000 counts/s for 10 ms.
    bench.integrate(50, -10_000.0).reset(5).integrate(50, -10_000.0);
    assert!(bench.faults().is_empty(), "{:?}", bench.faults());
}

/// In a run a large pedestal tells as well.
#[test]
fn a_large_pedestal_tells_in_a_run() {
    let circuit = Circuit { pedestal_v: 800e-6, pedestal_u_v: Some(20e-6), ..STILL };
    let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, POLICY);
    let mut bench = opened(&setup, STUCK, 1);
    bench.integrate(20, 5_000.0).reset(5);
    bench.input = 3_000.0 * bench.lsb_v();
    assert!(told_after(&mut bench, Mode::Integrate, 1.0).is_some());
    assert_eq!(bench.reading().trust, Trust::Invalid);
}

/// No drift, no walk, no pedestal: a level that stays where it was is what a free one does as well. It cannot be told.
#[test]
fn where_nothing_moves_a_free_level_a_held_one_cannot_be_told() {
    let setup: Setup<Charge> = Setup::new(STILL, CONVERTER, NOISE, POLICY);
    let mut bench = opened(&setup, STUCK, 1);
    bench.integrate(20, 5_000.0).reset(5).zero(6_000).integrate(2_000, 5_000.0);
    assert!(bench.faults().is_empty(), "{:?}", bench.faults());
    assert!(bench.reading().at_stop.integral.value.as_coulombs().abs() < 20e-12);
}

/// A level that has left is free, wherever it goes then: back to the reset level, too.
#[test]
fn a_level_that_has_left_is_free() {
    let mut bench = opened(&SETUP, Fault::None, 1);
    bench.integrate(20, 5_000.0).reset(5).integrate(1, 5_000.0);
    bench.fault = Fault::SticksClosed { from: 0 };
    assert_eq!(told_after(&mut bench, Mode::Integrate, 10.0), None);
}

/// An input that comes within a tenth of cancelling the drift leaves the level alone for long; that is no fault either.
#[test]
fn an_input_that_nearly_cancels_the_drift_is_no_stuck_switch() {
    let mut bench = opened(&SETUP, Fault::None, 1);
    let rate = bench.drift / bench.lsb_v();
    bench.integrate(50, -0.95 * rate).reset(5).integrate(1_000, -0.95 * rate);
    assert!(bench.faults().is_empty(), "{:?}", bench.faults());
}

/// Through a leak that the set-up knows, a level comes to rest where as much leaks as drifts: near the reset level, for
/// good.
#[test]
fn a_leaking_level_at_rest_is_no_stuck_switch() {
    let circuit = Circuit { leak_time_constant_s: Some(0.1), ..CIRCUIT };
    let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, POLICY);
    for seed in 0..20 {
        let mut bench = opened(&setup, Fault::None, seed);
        bench.integrate(50, 5_000.0).reset(5).zero(500);
        assert!(bench.faults().is_empty(), "{seed}: {:?}", bench.faults());
    }
}

/// Nor one that walks, but never far before it has leaked back: by 0.4 counts here.
#[test]
fn a_walk_that_leaks_back_is_no_stuck_switch() {
    let circuit = Circuit { leak_time_constant_s: Some(0.05), ..STILL };
    // 6 counts^2/s.
    let noise = Noise { input_density: 12.0_f64.sqrt() * 1e-12, ..NOISE };
    let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, noise, POLICY);
    let mut bench = opened(&setup, Fault::None, 1);
    bench.integrate(20, 5_000.0).reset(5).zero(150_000);
    assert!(!bench.faults().contains(&Reason::SwitchStuckClosed), "{:?}", bench.faults());
}

/// With the input open the drift is another, and says nothing.
#[test]
fn a_hold_does_not_tell() {
    let mut bench = opened(&SETUP, STUCK, 1);
    bench.integrate(20, 5_000.0).reset(5);
    assert_eq!(told_after(&mut bench, Mode::Hold, 20.0), None);
    assert!(told_after(&mut bench, Mode::Zero, 5.0).is_some(), "the zero after it does");
}

/// What the held level shows is not the amplifier's drift.
#[test]
fn a_zero_with_the_switch_stuck_teaches_no_drift() {
    let mut bench = opened(&SETUP, STUCK, 1);
    bench.zero(3_000).integrate(20, 5_000.0);
    let before = bench.channel.drift();
    bench.reset(5).zero(1_000);
    assert!(bench.faults().contains(&Reason::SwitchStuckClosed));
    let after = bench.channel.drift();
    let moved = after.value.as_volts_per_second() - before.value.as_volts_per_second();
    assert!(moved.abs() < 4.0 * before.u.as_volts_per_second(), "{before:?} {after:?}");
}

/// Nor where no drift was known before: told at its first sample, it is over.
#[test]
fn a_first_zero_with_the_switch_stuck_leaves_the_drift_unknown() {
    let circuit = Circuit { pedestal_v: 500e-6, pedestal_u_v: Some(10e-6), ..CIRCUIT };
    let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, POLICY);
    let mut bench = Bench::new(&setup, Fault::SticksClosed { from: 1 }, 1);
    let before = bench.channel.drift();
    bench.reset(5).zero(300);
    assert!(bench.faults().contains(&Reason::SwitchStuckClosed));
    assert_eq!(bench.channel.drift(), before);
}

/// The samples of a reset that was no longer than settling tell no level to leave.
#[test]
fn a_reset_too_short_to_settle_tells_no_level_to_leave() {
    let setup: Setup<Charge> = Setup::new(CIRCUIT, CONVERTER, NOISE, Policy { settling_s: 0.1, ..POLICY });
    let mut bench = opened(&setup, STUCK, 1);
    bench.zero(3_000).reset(5);
    assert_eq!(told_after(&mut bench, Mode::Integrate, 10.0), None);
}
