//! A switch that leaks while it is open: drift and droop that depend on the level.

use brimline::{Event, Reason, Trust};

use crate::bench::{Bench, Fault};
use crate::{SETUP, opened};

fn decays(bench: &Bench<'_>) -> Vec<u32> {
    let s = |event: &Event| if let Event::Decay { time_constant_s } = *event { Some(time_constant_s) } else { None };
    bench.notices.iter().filter_map(s).collect()
}

/// What zeros at the reset level and at `level` tell of the leak, for so many seeds.
fn told(time_constant_s: f64, level: f64, seeds: u64) -> Vec<f64> {
    let told = |seed| {
        let mut bench = opened(&SETUP, Fault::Leaks { time_constant_s }, seed);
        for _ in 0..2 {
            bench.integrate(100, level).zero(300).reset(5).zero(300);
        }
        bench.integrate(1, 0.0);
        decays(&bench).first().copied().map(f64::from)
    };
    (0..seeds).filter_map(told).collect()
}

/// The smallest leak that a zero of 3 s can show: five times 0.1 count/s.
#[test]
fn a_leak_that_just_shows_is_told_with_its_time_constant() {
    let told = told(1_000.0, 400.0, 60);
    assert!(told.len() >= 15, "{} of 60", told.len());
    let mean = told.iter().sum::<f64>() / told.len() as f64;
    assert!((800.0..1_250.0).contains(&mean), "{mean}");
    assert!(told.iter().all(|s| (500.0..2_000.0).contains(s)), "{told:?}");
}

/// The more a switch leaks the plainer it should be told. With 10 s the opening zero bends already by what leaks of 120
/// counts, and only large leaks are left to tell.
#[test]
fn a_leak_that_shows_plainly_is_told_with_its_time_constant() {
    let kinds = [30.0, 100.0, 300.0, 1_000.0].into_iter().flat_map(|s| [2_000.0, 20_000.0, -80_000.0].map(|l| (s, l)));
    let mut missed = Vec::new();
    for (time_constant_s, level) in kinds.chain([(10.0, 20_000.0), (10.0, -80_000.0)]) {
        let told = told(time_constant_s, level, 20);
        let near = told.iter().filter(|&s| (0.6..1.5).contains(&(s / time_constant_s))).count();
        if near < 18 {
            missed.push((time_constant_s, level, told.len(), near));
        }
    }
    assert!(missed.is_empty(), "seconds, level, told and told rightly of 20: {missed:?}");
}

/// Whatever it is told as, no run beside a leaking switch passes for good while its leak shows plainly.
#[test]
fn a_run_beside_a_plain_leak_is_not_good() {
    for time_constant_s in [10.0, 100.0, 1_000.0] {
        for level in [20_000.0, -80_000.0] {
            let mut bench = opened(&SETUP, Fault::Leaks { time_constant_s }, 1);
            bench.integrate(100, level).zero(300);
            assert_ne!(bench.reading().trust, Trust::Good, "{time_constant_s} {level}");
        }
    }
}

/// 100 pA into 100 nF are 100 counts/s, and the amplifier's own share here is 40.
#[test]
fn a_hold_shows_a_leak_that_the_bias_cannot_explain() {
    for (time_constant_s, level, told) in [
        (10.0, 20_000.0, true),
        (100.0, 80_000.0, true),
        (100.0, -80_000.0, true),
        (1_000.0, -80_000.0, true),
        // 40 - 80, and 40 + 50.
        (1_000.0, 80_000.0, false),
        (1_000.0, -50_000.0, false),
    ] {
        let mut bench = opened(&SETUP, Fault::Leaks { time_constant_s }, 2);
        bench.integrate(100, level).hold(200).integrate(20, 0.0);
        assert_eq!(bench.faults().contains(&Reason::DroopOutsideLimits), told, "{time_constant_s} {level}");
    }
}
