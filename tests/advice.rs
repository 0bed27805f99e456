//! When a reset is asked for.

mod script;

use brimline::{Event, Mode, Policy, Setup};
use script::{CIRCUIT, CONVERTER, NOISE, POLICY, SETUP, STEP, Script};

/// The guard by hand, counts: worst-case rate (100 nA and the data sheet's drift, 100,101 counts per second at 1 pC per
/// count) over one sample period and the latency, and 4 sigma of a readout of at most 1.29 counts.
fn guard(latency_s: f64) -> f64 {
    100_101.0 * (0.01 + latency_s) + 4.0 * 1.289
}

/// Headroom, in counts, at which a level that creeps toward `rail` is first asked to reset.
fn headroom_at_request(setup: &Setup<brimline::Charge>, rail: f64) -> f64 {
    let mut script = Script::new(setup);
    script.noisy = false;
    script.drift = 0.0;
    script.zero(100).integrate(1, 0.0);
    script.level = rail - rail.signum() * 15_000.0;
    for _ in 0..15_000 {
        let step = script.sample(Mode::Integrate, STEP);
        if step.request == Some(Mode::Reset) {
            return (rail - script.level).abs();
        }
        script.level += rail.signum();
    }
    panic!("no reset was asked for");
}

#[test]
fn the_guard_is_the_worst_case_rate_over_sample_period_and_latency_and_the_noise() {
    for latency_s in [0.0, 0.05] {
        let setup = Setup::new(CIRCUIT, CONVERTER, NOISE, Policy { latency_s, ..POLICY });
        for rail in [190_000.0, -190_000.0] {
            let headroom = headroom_at_request(&setup, rail);
            assert!((headroom - guard(latency_s)).abs() <= 4.0, "{headroom} {}", guard(latency_s));
        }
    }
}

#[test]
fn a_longer_sample_period_asks_earlier() {
    let mut script = Script::new(&SETUP);
    script.drift = 0.0;
    script.zero(100).integrate(1, 0.0);
    script.level = 190_000.0 - 3_000.0;
    assert_eq!(script.sample(Mode::Integrate, STEP).request, None);
    assert_eq!(script.sample(Mode::Integrate, 3 * STEP).request, Some(Mode::Reset));
}

#[test]
fn a_request_stands_until_the_reset_and_is_stated_once() {
    let mut script = Script::new(&SETUP);
    script.drift = 0.0;
    script.zero(100).integrate(10, 0.0);
    script.level = 189_500.0;
    script.sample(Mode::Integrate, STEP);
    for _ in 0..5 {
        assert_eq!(script.sample(Mode::Integrate, STEP).request, Some(Mode::Reset));
    }
    assert_eq!(script.notices.iter().filter(|(_, event)| *event == Event::ResetDue).count(), 1);
    script.reset(2, 0.0);
    assert_eq!(script.last_step.request, None);
    script.integrate(20, 0.0);
    assert_eq!(script.last_step.request, None);
    script.level = 189_500.0;
    script.sample(Mode::Integrate, STEP);
    assert_eq!(
        script.notices.iter().filter(|(_, event)| *event == Event::ResetDue).count(),
        2,
        "and once for the next"
    );
}

#[test]
fn without_a_worst_case_input_nothing_is_advised() {
    let setup = Setup::new(CIRCUIT, CONVERTER, NOISE, Policy { worst_input: None, ..POLICY });
    let mut script = Script::new(&setup);
    script.zero(100);
    script.level = 189_990.0;
    script.integrate(10, 0.0);
    assert!(script.notices.iter().all(|(_, event)| *event != Event::ResetDue));
}
