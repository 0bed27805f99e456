//! What is asked for after a reset that failed, and when the switch is given up.

use brimline::{Charge, Circuit, Event, Mode, Policy, Reason, Setup, Trust};

use crate::bench::{Bench, Fault};
use crate::{CIRCUIT, CONVERTER, NOISE, POLICY, SETUP, opened};

fn requests(bench: &mut Bench<'_>, mode: Mode, samples: u32) -> u32 {
    (0..samples).map(|_| u32::from(bench.sample(mode).request == Some(Mode::Reset))).sum()
}

#[test]
fn another_reset_is_asked_for_in_every_mode_until_one_arrives() {
    for worst_input in [None, Some(100e-9)] {
        let setup: Setup<Charge> = Setup::new(CIRCUIT, CONVERTER, NOISE, Policy { worst_input, ..POLICY });
        let mut bench = opened(&setup, Fault::StaysOpen { from: 2, to: 2 }, 1);
        bench.integrate(100, 30_000.0);
        assert_eq!(requests(&mut bench, Mode::Reset, 5), 0, "it is closed already");
        for mode in [Mode::Integrate, Mode::Hold, Mode::Zero, Mode::Integrate] {
            assert_eq!(requests(&mut bench, mode, 10), 10, "{mode:?}");
        }
        assert_eq!(requests(&mut bench, Mode::Reset, 5), 0);
        for mode in [Mode::Integrate, Mode::Hold, Mode::Zero] {
            assert_eq!(requests(&mut bench, mode, 10), 0, "{mode:?}");
        }
        assert_eq!(bench.told(Event::ResetDue), 0, "a retry is not one that is due");
        assert_eq!(bench.told(Event::ResetFailed { in_a_row: 1 }), 1);
    }
}

#[test]
fn a_retry_that_arrives_saves_the_runs_after_it_and_not_its_own() {
    let mut bench = opened(&SETUP, Fault::StaysOpen { from: 2, to: 3 }, 1);
    bench.integrate(100, 30_000.0).reset(5);
    bench.obey(200, 1_000.0);
    assert_eq!(bench.resets, 4, "two that failed and one that did not");
    assert_eq!(bench.told(Event::ResetFailed { in_a_row: 1 }), 1);
    assert_eq!(bench.told(Event::ResetFailed { in_a_row: 2 }), 1);
    assert_eq!(bench.reading().trust, Trust::Invalid);
    bench.zero(300).integrate(200, 1_000.0).zero(100);
    assert_eq!((bench.reading().trust, bench.channel.switch_has_failed()), (Trust::Good, false));
    // The next failure is a first one again.
    bench.fault = Fault::StaysOpen { from: 5, to: 9 };
    bench.set_level(50_000.0);
    bench.reset(5);
    assert_eq!(bench.told(Event::ResetFailed { in_a_row: 1 }), 2);
}

#[test]
fn after_the_attempts_allowed_the_switch_is_given_up() {
    for attempts in [1_u8, 2, 3, 10, 255] {
        let setup: Setup<Charge> = Setup::new(CIRCUIT, CONVERTER, NOISE, Policy { reset_attempts: attempts, ..POLICY });
        let mut bench = opened(&setup, Fault::StaysOpen { from: 2, to: 999 }, 1);
        bench.integrate(100, 30_000.0);
        for attempt in 1..=attempts {
            assert!(!bench.channel.switch_has_failed());
            bench.reset(2);
            assert_eq!(bench.told(Event::ResetFailed { in_a_row: attempt }), 1);
            assert_eq!(requests(&mut bench, Mode::Integrate, 3), if attempt < attempts { 3 } else { 0 });
        }
        assert!(bench.channel.switch_has_failed());
        assert_eq!(bench.told(Event::Fault(Reason::SwitchFailed)), 1);
        assert!(bench.reading().reasons.contains(Reason::SwitchFailed));
    }
}

/// Given up: no request, not even at the rail, and no run is good.
#[test]
fn a_switch_that_is_given_up_is_not_asked_again_and_spoils_every_run() {
    let mut bench = opened(&SETUP, Fault::StaysOpen { from: 2, to: 4 }, 1);
    bench.integrate(100, 30_000.0).reset(2).zero(2).reset(2).zero(2).reset(2);
    assert!(bench.channel.switch_has_failed());
    bench.hold(1).set_level(189_700.0);
    assert_eq!(requests(&mut bench, Mode::Integrate, 20), 0);
    for run in 1..5 {
        bench.hold(1).set_level(0.0);
        bench.zero(300).integrate(100, 1_000.0);
        assert_eq!((bench.reading().trust, bench.told(Event::Fault(Reason::SwitchFailed))), (Trust::Invalid, 1 + run));
        bench.zero(20);
        assert_eq!(bench.reading().reasons.iter().collect::<Vec<_>>(), [Reason::SwitchFailed]);
    }
    // A reset that does arrive is no repair.
    bench.reset(5).zero(300).integrate(100, 1_000.0);
    assert!(bench.channel.switch_has_failed());
    assert_eq!(bench.reading().trust, Trust::Invalid);
}

#[test]
fn a_repaired_switch_is_asked_again_and_its_runs_are_good() {
    let mut bench = opened(&SETUP, Fault::StaysOpen { from: 2, to: 4 }, 1);
    bench.integrate(100, 30_000.0).reset(2).zero(2).reset(2).zero(2).reset(2).zero(300).integrate(100, 1_000.0);
    bench.channel.switch_repaired();
    assert!(!bench.channel.switch_has_failed());
    assert_eq!(bench.reading().trust, Trust::Invalid, "the run that had the fault keeps it");
    assert_eq!(requests(&mut bench, Mode::Zero, 5), 0, "the failure is forgotten");
    bench.set_level(0.0);
    bench.reset(5).zero(300).integrate(100, 1_000.0);
    assert_eq!(bench.reading().trust, Trust::Good);
    bench.set_level(189_700.0);
    assert_eq!(requests(&mut bench, Mode::Integrate, 3), 3);
    // And counted from one again.
    bench.fault = Fault::StaysOpen { from: 0, to: 99 };
    bench.set_level(150_000.0);
    bench.reset(2);
    assert_eq!(bench.told(Event::ResetFailed { in_a_row: 1 }), 2);
    assert!(!bench.channel.switch_has_failed());
}

/// A stuck switch and one that is found out only after it has opened count as failures too.
#[test]
fn failures_of_every_kind_count() {
    let circuit = Circuit { pedestal_v: -300e-6, pedestal_u_v: Some(10e-6), ..CIRCUIT };
    let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, POLICY);
    let mut bench = opened(&setup, Fault::SticksClosed { from: 2 }, 1);
    bench.integrate(100, 3_000.0);
    for attempt in 1..=3 {
        bench.reset(5).zero(5);
        assert_eq!(bench.told(Event::ResetFailed { in_a_row: attempt }), 1, "{:?}", bench.notices);
    }
    assert!(bench.channel.switch_has_failed());

    // One sample of 10 ms is too early for the closed switch, sixteen after it show where the level is.
    let slow: Setup<Charge> = Setup::new(CIRCUIT, CONVERTER, NOISE, Policy { settling_s: 0.02, ..POLICY });
    let mut bench = opened(&slow, Fault::StaysOpen { from: 2, to: 99 }, 1);
    bench.integrate(100, 30_000.0);
    for attempt in 1..=3 {
        bench.reset(1).integrate(16, 0.0);
        assert_eq!(bench.told(Event::ResetFailed { in_a_row: attempt }), 1, "{:?}", bench.notices);
    }
    assert!(bench.channel.switch_has_failed());
}

#[test]
fn a_reset_that_fails_between_runs_concerns_the_next() {
    let mut bench = opened(&SETUP, Fault::StaysOpen { from: 2, to: 2 }, 1);
    bench.integrate(100, 30_000.0).zero(300);
    assert_eq!(bench.reading().trust, Trust::Good);
    bench.reset(3);
    assert_eq!(bench.told(Event::Fault(Reason::ResetNotArrived)), 1);
    assert_eq!(bench.reading().trust, Trust::Good);
    bench.integrate(50, 1_000.0);
    assert!(bench.reading().reasons.contains(Reason::ResetNotArrived));
}
