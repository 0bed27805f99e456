//! The flux meter on a simulated board: what it says is true, and what it cannot know it does not say.

mod plant;

use brimline::Mode;
use coil_stm32f4::{Fault, Fluxmeter};
use plant::{Mishap, Plant};

/// A press to start and one to stop, and the end of the simulation: samples, each of a millisecond.
const PRESSES: [u32; 2] = [6_000, 9_000];
const LAST: u32 = 15_000;
const IN_THE_RUN: u32 = 8_500;

fn measured(pulse: (f64, u32, u32), presses: &[u32], mishap: Mishap, last: u32) -> Plant {
    let mut plant = Plant::new(pulse, presses, mishap, last);
    assert_eq!(Fluxmeter::start().measure(&mut plant), Fault::Late, "{}", plant.text);
    plant
}

/// What follows in the first line that begins so.
fn line<'t>(text: &'t str, start: &str) -> &'t str {
    text.lines().find_map(|line| line.strip_prefix(start)).unwrap_or_else(|| panic!("no {start}: {text}"))
}

/// The numbers of "(value +- U) mV s".
fn interval(rest: &str) -> (f64, f64) {
    let (inside, unit) = rest.strip_prefix('(').and_then(|rest| rest.split_once(')')).unwrap();
    assert!(unit.starts_with(" mV s"), "{rest}");
    let (value, expanded) = inside.split_once(" +- ").unwrap();
    (value.parse().unwrap(), expanded.parse().unwrap())
}

#[test]
fn a_run_comes_to_the_flux_of_either_sign() {
    for (volts, flux_mvs) in [(0.02, 10.0), (-0.02, -10.0)] {
        let text = measured((volts, 7_000, 7_500), &PRESSES, Mishap::None, LAST).text;
        for start in ["at stop: ", "closed: "] {
            let (value, expanded) = interval(line(&text, start));
            assert!((value - flux_mvs).abs() < 0.01, "{text}");
            // Twice the root of the squares of 1 % and 1 %, and a little noise.
            assert!((expanded / (2.0 * 0.014_14 * 10.0) - 1.0).abs() < 0.02, "{text}");
        }
        assert_eq!(text.matches("running").count(), 1, "{text}");
        assert!(!text.contains("fault") && !text.contains("lost"), "{text}");
    }
}

#[test]
fn a_flux_that_needs_a_reset_is_whole() {
    let text = measured((0.04, 6_500, 8_500), &PRESSES, Mishap::None, LAST).text;
    let closed = line(&text, "closed: ");
    // 80 mV s move the output by 3.6 V, and there is room for 1.55 V below the reset level.
    assert!(closed.ends_with(" 2 resets"), "{text}");
    assert!((interval(closed).0 - 80.0).abs() < 0.1, "{text}");
}

#[test]
fn what_cannot_be_trusted_has_no_value() {
    for (mishap, reason) in [(Mishap::Jump(IN_THE_RUN), "jump"), (Mishap::Silence(IN_THE_RUN), "gap")] {
        let text = measured((0.02, 7_000, 7_500), &PRESSES, mishap, LAST).text;
        for start in ["at stop: ", "closed: "] {
            assert!(line(&text, start).starts_with(&format!("no value: {reason}")), "{text}");
        }
        assert!(!text.contains("mV s"), "{text}");
    }
}

#[test]
fn a_press_before_the_zero_is_done_starts_nothing() {
    let text = measured((0.0, 0, 0), &[1_000], Mishap::None, LAST).text;
    assert!(text.contains("not yet") && !text.contains("running"), "{text}");
}

#[test]
fn a_run_that_nobody_stops_stops_by_itself() {
    let text = measured((0.0, 0, 0), &[6_000], Mishap::None, 75_000).text;
    assert!(line(&text, "closed: ").contains(", 60.000 s, 0 resets"), "{text}");
}

#[test]
fn a_reset_switch_that_fails_stops_and_opens_all_switches() {
    for from in [0, 7_200] {
        let mut plant = Plant::new((0.04, 6_500, 8_500), &PRESSES, Mishap::SwitchOpen(from), LAST);
        let mut meter = Fluxmeter::start();
        let fault = meter.measure(&mut plant);
        assert_eq!(fault, Fault::ResetSwitch, "{}", plant.text);
        meter.pause(fault, &mut plant);
        assert_eq!(plant.mode, Mode::Hold);
        assert!(plant.text.contains("STOPPED, the reset switch has failed: all switches open"), "{}", plant.text);
        assert!(!plant.text.contains("mV s"), "{}", plant.text);
    }
}

#[test]
#[should_panic(expected = "restarted")]
fn pins_that_cannot_be_driven_are_let_go_of() {
    let mut plant = Plant::new((0.0, 0, 0), &PRESSES, Mishap::Pins(5_000), LAST);
    let mut meter = Fluxmeter::start();
    let fault = meter.measure(&mut plant);
    assert_eq!(fault, Fault::Pin);
    meter.pause(fault, &mut plant);
}
