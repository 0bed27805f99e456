//! Resets that do not get the level where it should go.

use brimline::{Charge, Circuit, Converter, Event, Mode, Policy, Reason, Setup, Trust};

use crate::bench::{Bench, Fault};
use crate::{CIRCUIT, CONVERTER, NOISE, POLICY, SETUP, opened};

/// A run with a reset at `level`, the second of the bench.
fn with_a_reset(fault: Fault, level: f64) -> Bench<'static> {
    let mut bench = opened(&SETUP, fault, 1);
    bench.integrate(100, level).set_level(level);
    bench.reset(5).integrate(50, 1_000.0);
    bench
}

#[test]
fn a_switch_that_stays_open_is_told_at_the_first_sample_that_should_have_arrived() {
    let mut bench = opened(&SETUP, Fault::StaysOpen { from: 2, to: 9 }, 1);
    bench.integrate(100, 30_000.0);
    assert!(bench.faults().is_empty());
    // Settling takes 2.35 ms.
    bench.reset(1);
    assert_eq!(bench.faults(), [Reason::ResetNotArrived]);
    assert_eq!(bench.told(Event::ResetFailed { in_a_row: 1 }), 1);
    // Told once for a reset, however long.
    bench.reset(20).integrate(50, 0.0);
    assert_eq!(bench.faults(), [Reason::ResetNotArrived]);
    assert_eq!(bench.told(Event::ResetFailed { in_a_row: 1 }), 1);
    assert_eq!(bench.reading().trust, Trust::Invalid);
}

#[test]
fn which_reset_fails_makes_no_difference() {
    for n in 2..8 {
        let mut bench = opened(&SETUP, Fault::StaysOpen { from: n, to: n }, u64::from(n));
        for reset in 2..8 {
            bench.integrate(100, 20_000.0);
            assert_eq!(bench.faults().len(), usize::from(reset > n), "{reset} of {n}");
            bench.reset(5);
            assert_eq!(bench.faults().len(), usize::from(reset >= n), "{reset} of {n}");
        }
        assert_eq!(bench.told(Event::ResetFailed { in_a_row: 1 }), 1);
    }
}

#[test]
fn a_switch_that_closes_half_way_is_told_outside_the_tolerance() {
    // The tolerance is a hundredth of the span of 380,000 counts.
    for (level, told) in [(-80_000.0, 1), (60_000.0, 1), (8_000.0, 1), (7_000.0, 0), (-7_000.0, 0)] {
        let bench = with_a_reset(Fault::HalfWay { from: 2 }, level);
        assert_eq!(bench.told(Event::Fault(Reason::ResetNotArrived)), told, "{level}");
        assert_eq!(bench.told(Event::ResetFailed { in_a_row: 1 }), told, "{level}");
        assert_eq!(bench.faults().len(), told, "{level}: {:?}", bench.notices);
    }
    assert!(with_a_reset(Fault::None, 80_000.0).faults().is_empty());
}

#[test]
fn a_reset_too_short_to_be_judged_closed_is_judged_when_it_has_opened() {
    // 1 Mohm: a time constant of 0.1 s, 1.35 s until half a code is left.
    let policy = Policy { gap_limit_s: 2.0, ..POLICY };
    let setup: Setup<Charge> = Setup::new(Circuit { switch_resistance_ohm: 1e6, ..CIRCUIT }, CONVERTER, NOISE, policy);
    assert!(setup.min_on_time_s() > 1.3);
    let mut bench = opened(&setup, Fault::None, 1);
    bench.integrate(100, 30_000.0).reset(10);
    assert!(bench.faults().is_empty());
    bench.integrate(16, 0.0);
    assert_eq!(bench.faults(), [Reason::ResetNotArrived]);
    assert_eq!(bench.told(Event::ResetFailed { in_a_row: 1 }), 1);
}

/// What a scripted closed switch, or the samples just after it, must show to be blamed: exact to a count.
fn blamed(setup: &Setup<Charge>, closed_at: i32, opened_at: i32) -> bool {
    let mut channel = brimline::Channel::<Charge>::new(setup);
    let mut tick = 0;
    let mut blamed = false;
    let modes = [(Mode::Zero, 0, 100), (Mode::Integrate, 30_000, 100), (Mode::Reset, closed_at, 3)];
    for (mode, counts, samples) in modes.into_iter().chain([(Mode::Integrate, opened_at, 16)]) {
        for _ in 0..samples {
            tick += 10_000;
            let sample = brimline::Sample { tick, counts, mode, temperature: None };
            let step = channel.feed(sample);
            blamed |= step.notices.iter().any(|notice| notice.event == Event::Fault(Reason::ResetNotArrived));
        }
    }
    blamed
}

#[test]
fn the_arrival_windows_are_the_tolerance_and_five_uncertainties() {
    let quiet = Circuit { offset_limit_v: 0.0, bias_limit_a: 0.0, reset_level_v: 0.1, ..CIRCUIT };
    // Volts of tolerance, of pedestal and its uncertainty, of the converter's zero; half widths closed and opened,
    // counts.
    let cases = [
        (1e-3, 0.0, None, 0.0, 100, 100),
        (1e-3, 2e-3, None, 0.0, 100, 100),
        (1e-3, -2e-3, Some(0.1e-3), 0.0, 100, 150),
        (1e-3, 2e-3, Some(0.1e-3), 0.2e-3, 200, 250),
        (1e-3, 0.0, None, 0.2e-3, 200, 200),
    ];
    for (tolerance, pedestal_v, pedestal_u_v, code_zero_u_v, closed, opened) in cases {
        let setup = Setup::new(
            Circuit { pedestal_v, pedestal_u_v, ..quiet },
            Converter { code_zero_u_v, ..CONVERTER },
            NOISE,
            Policy { arrival_tolerance_v: Some(tolerance), frozen_samples: 0, worst_input: None, ..POLICY },
        );
        let reset = 10_000;
        let opening = reset + (pedestal_v / 10e-6).round() as i32;
        for sign in [-1, 1] {
            // One count is left to the rounding of volts to codes.
            let inside = (reset + sign * (closed - 1), opening + sign * (opened - 1));
            let case = (tolerance, pedestal_v, pedestal_u_v, code_zero_u_v, sign);
            assert!(!blamed(&setup, inside.0, inside.1), "{case:?}");
            assert!(blamed(&setup, reset + sign * (closed + 2), inside.1), "closed {case:?}");
            assert!(blamed(&setup, inside.0, opening + sign * (opened + 2)), "opened {case:?}");
        }
    }
}

/// A pause with the input open between reset and run: the level has had time to droop, and is not judged by it.
#[test]
fn a_level_that_a_hold_has_moved_is_not_judged() {
    let mut bench = opened(&SETUP, Fault::None, 1);
    bench.integrate(100, 30_000.0).reset(5).hold(20);
    bench.set_level(9_000.0);
    bench.integrate(50, 0.0);
    assert!(bench.faults().is_empty(), "{:?}", bench.notices);
}
