//! A switch whose resistance grows: told as a time constant long before the reset fails.

use brimline::{Charge, Circuit, Event, Noise, Policy, Reason, Setup, Trust};

use crate::bench::{Bench, Fault};
use crate::{CIRCUIT, CONVERTER, NOISE, POLICY, SETUP, opened};

fn slow(bench: &Bench<'_>) -> Vec<u16> {
    let percent = |event: &Event| if let Event::SettlingSlow { percent } = *event { Some(percent) } else { None };
    bench.notices.iter().filter_map(percent).collect()
}

/// What is told of a reset from 150,000 counts, sampled every `period_s`, with a resistance `growth` times the
/// set-up's.
fn told_of(growth: f64, period_s: f64) -> (Vec<u16>, Vec<Reason>) {
    let mut bench = opened(&SETUP, Fault::Grows { by: growth }, 3);
    bench.integrate(200, 75_000.0);
    bench.period_s = period_s;
    bench.reset(8);
    (slow(&bench), bench.faults())
}

/// By hand, what two samples at `t` and `t + h` show of what decays with `tau` from `A`: what it has moved by between
/// them is taken for what was left at the first, `A (x - y)` with `x = e^(-t/tau)` and `y = e^(-(t + h)/tau)`, and `A
/// (1 - y)` for all.
fn seen_growth(growth: f64, t: f64, h: f64) -> f64 {
    let (x, y) = ((-t / (growth * 1e-4)).exp(), (-(t + h) / (growth * 1e-4)).exp());
    t / ((1.0 - y) / (x - y)).ln() / 1e-4
}

#[test]
fn the_time_constant_is_told_as_two_samples_show_it_and_never_too_long() {
    for (growth, period_s) in
        [(2.2, 1e-3), (3.0, 1e-3), (10.0, 1e-3), (20.0, 10e-3), (50.0, 10e-3), (200.0, 10e-3), (1000.0, 10e-3)]
    {
        let (percent, faults) = told_of(growth, period_s);
        // 3,800 counts of tolerance at the first sample past 2.35 ms.
        let judged = (2.35e-3 / period_s).ceil() * period_s;
        let late = 150_000.0 * (-judged / (growth * 1e-4)).exp() > 3_800.0;
        assert_eq!(faults.contains(&Reason::ResetNotArrived), late, "{growth} {faults:?}");
        // A sample that is late tells just that; the next two then tell the time constant.
        let first = if late && judged == period_s { 2.0 * period_s } else { period_s };
        let expected = 100.0 * seen_growth(growth, first, period_s);
        assert_eq!(percent.len(), 1, "told once a reset: {growth}");
        assert!((f64::from(percent[0]) - expected).abs() <= 1.0 + 2e-3 * expected, "{percent:?} {expected}");
        assert!(f64::from(percent[0]) <= 100.0 * growth, "{percent:?} {growth}");
    }
}

#[test]
fn less_than_twice_is_not_worth_a_word() {
    for growth in [1.0, 1.5, 1.9] {
        assert_eq!(told_of(growth, 1e-3), (vec![], vec![]), "{growth}");
    }
    assert_eq!(told_of(2.1, 1e-3).0.len(), 1);
}

/// Half as much again from reset to reset, up to a thousandfold: slow first, failing later, and told of every reset.
#[test]
fn a_resistance_that_grows_is_told_before_the_reset_fails() {
    let mut bench = opened(&SETUP, Fault::Grows { by: 1.5 }, 5);
    let (mut first_slow, mut first_failed) = (0, 0);
    while bench.resets < 18 {
        bench.hold(1).set_level(150_000.0);
        bench.integrate(5, 0.0).period_s = 1e-3;
        bench.reset(20);
        bench.period_s = 10e-3;
        if first_slow == 0 && !slow(&bench).is_empty() {
            first_slow = bench.resets;
        }
        if first_failed == 0 && !bench.faults().is_empty() {
            first_failed = bench.resets;
        }
    }
    // 1.5^2 is 2.25. Twenty milliseconds are judged from the third: 150,000 e^(-30/g) is 3,800 for g = 8.2, below
    // 1.5^6.
    assert_eq!((first_slow, first_failed), (3, 7));
    assert_eq!(slow(&bench).len(), 16);
    assert!(slow(&bench).is_sorted(), "{:?}", slow(&bench));
    assert_eq!(bench.faults()[0], Reason::ResetNotArrived);
}

/// The same of a closed switch at these levels, one sample each.
fn told_while_closed(setup: &Setup<Charge>, levels: &[f64]) -> (Vec<u16>, Vec<Reason>) {
    let mut bench = opened(setup, Fault::StaysOpen { from: 2, to: 2 }, 1);
    bench.integrate(200, 75_000.0);
    for &level in levels {
        bench.set_level(level);
        bench.reset(1);
    }
    (slow(&bench), bench.faults())
}

/// Without a resistance there is nothing to compare with.
#[test]
fn nothing_is_told_without_a_resistance_to_compare_with() {
    let setup: Setup<Charge> = Setup::new(Circuit { switch_resistance_ohm: 0.0, ..CIRCUIT }, CONVERTER, NOISE, POLICY);
    let closed = [100_000.0, 3_000.0, 1_500.0, 1_480.0];
    assert!(told_while_closed(&setup, &closed).0.is_empty());
    assert_eq!(told_while_closed(&SETUP, &closed).0.len(), 1);
}

/// A difference that noise explains is no settling, however noisy the channel.
#[test]
fn noise_is_not_taken_for_settling() {
    for readout_counts in [0.3, 3.0, 30.0] {
        let setup: Setup<Charge> = Setup::new(CIRCUIT, CONVERTER, Noise { readout_counts, ..NOISE }, POLICY);
        for seed in 0..200 {
            let mut bench = Bench::new(&setup, Fault::None, seed);
            for level in [0.0, 40.0, -400.0, 100_000.0] {
                bench.set_level(level);
                bench.reset(4).integrate(2, 0.0);
            }
            assert!(slow(&bench).is_empty(), "{readout_counts} {seed}");
        }
    }
}

/// The amplifier is given `settling_s`: what moves before is none of the switch's.
#[test]
fn an_amplifier_that_has_not_followed_is_not_judged() {
    let setup: Setup<Charge> = Setup::new(CIRCUIT, CONVERTER, NOISE, Policy { settling_s: 25e-3, ..POLICY });
    let closed = [100_000.0, 60_000.0, 10.0, 0.0, 0.0];
    assert_eq!(told_while_closed(&setup, &closed), (vec![], vec![]));
    let (percent, faults) = told_while_closed(&SETUP, &closed);
    assert_eq!((percent.len(), faults), (1, vec![Reason::ResetNotArrived]));
}

/// What the amplifier slews is none of the switch's resistance.
#[test]
fn a_slewing_amplifier_is_not_taken_for_a_slow_switch() {
    let setup: Setup<Charge> = Setup::new(Circuit { slew_v_per_s: Some(50.0), ..CIRCUIT }, CONVERTER, NOISE, POLICY);
    let mut bench = opened(&setup, Fault::None, 1);
    for level in [150_000.0, -150_000.0, 20_000.0] {
        bench.integrate(50, 0.0).set_level(level);
        bench.period_s = 2e-3;
        bench.reset(60);
        bench.period_s = 10e-3;
    }
    assert!(bench.faults().is_empty(), "{:?}", bench.faults());
    assert!(slow(&bench).is_empty(), "{:?}", slow(&bench));
}

/// Nor is the time it slews for put down to a switch that is slow as well: never told too slow.
#[test]
fn a_slow_switch_behind_a_slewing_amplifier_is_not_told_too_slow() {
    // 3.8 V take 76 ms.
    let setup: Setup<Charge> = Setup::new(Circuit { slew_v_per_s: Some(50.0), ..CIRCUIT }, CONVERTER, NOISE, POLICY);
    let mut told = 0;
    for growth in [20.0, 50.0, 80.0, 200.0, 500.0] {
        for level in [180_000.0, -60_000.0] {
            let mut bench = opened(&setup, Fault::Grows { by: growth }, 1);
            bench.hold(1).set_level(level);
            bench.integrate(5, 0.0).reset(40);
            let percent = slow(&bench);
            told += percent.len();
            let most = 100.0 * growth;
            assert!(percent.iter().all(|&p| f64::from(p) <= most), "{growth} from {level}: {percent:?}");
        }
    }
    assert!(told >= 4, "{told}");
}

/// Where the level has arrived within the tolerance but still settles, the samples with the switch closed are no
/// measure of the level at which it opens.
#[test]
fn a_level_that_still_settles_is_no_hint_for_the_level_after_it() {
    let circuit = Circuit { pedestal_u_v: Some(20e-6), ..CIRCUIT };
    let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, POLICY);
    let mut bench = opened(&setup, Fault::Grows { by: 100.0 }, 3);
    // To 10,000 counts, discharged with 10 ms for 50 ms: 67 are left. Then as much again.
    bench.integrate(100, 10_000.0).reset(5).integrate(100, 10_000.0);
    let reading = bench.reading();
    // The input was open during the reset: what is interpolated is not the hint's doing.
    let counts = |charge: Charge| -charge.as_coulombs() / 1e-12;
    let error = counts(reading.measured) - 20_000.0;
    let u = counts(reading.at_stop.integral.u).abs();
    assert!(reading.trust != Trust::Good || error.abs() < 5.0 * u, "{error} with u = {u}: {reading:?}");
}
