//! The monitor on a simulated board: what it says is true, and what it cannot know it does not say.

mod plant;

use brimline::Mode;
use lamp_rp2040::{Fault, Monitor};
use plant::{Mishap, Plant};

/// Samples: two of reset, 30 s of zero, 600 s of run, 30 s of zero, resets between, and a little of the next run.
const ONE_RUN: u32 = 66_500;
const IN_THE_RUN: u32 = 20_000;
const LIGHT_A: f64 = 50e-9;

fn measured(mishap: Mishap) -> (Fault, Plant) {
    let mut plant = Plant::new(LIGHT_A, mishap, ONE_RUN);
    let fault = Monitor::start().measure(&mut plant);
    (fault, plant)
}

/// The first line that begins so, and the number that follows.
fn line<'t>(text: &'t str, start: &str) -> (f64, &'t str) {
    let rest = text.lines().find_map(|line| line.strip_prefix(start)).unwrap_or_else(|| panic!("no {start}: {text}"));
    let end = rest.find(|c: char| !(c.is_ascii_digit() || c == '.')).unwrap();
    (rest[..end].parse().unwrap(), rest)
}

/// The numbers of "(value +- U) J/m^2".
fn interval(rest: &str) -> (f64, f64) {
    let inside = &rest[rest.find('(').unwrap() + 1..rest.find(')').unwrap()];
    let (value, expanded) = inside.split_once(" +- ").unwrap();
    (value.parse().unwrap(), expanded.parse().unwrap())
}

/// `H = Q / (R A)` of 0.13 A/W behind 1e-7 m^2.
fn true_exposure(elapsed_s: f64) -> f64 {
    LIGHT_A * elapsed_s / (0.13 * 1e-7)
}

#[test]
fn a_run_comes_to_what_the_lamp_shone() {
    let (fault, plant) = measured(Mishap::None);
    assert_eq!(fault, Fault::Late, "{}", plant.text);
    let (elapsed, run) = line(&plant.text, "run of ");
    assert!((600.0..601.5).contains(&elapsed), "{run}");
    let (value, expanded) = interval(run);
    let truth = true_exposure(elapsed);
    assert!((value / truth - 1.0).abs() < 3e-4, "{run}, true: {truth}");
    // Twice the root of the squares of 5 %, 2 %, 1 % and 0.3 %.
    assert!((expanded / truth / (2.0 * 0.054_86) - 1.0).abs() < 0.01, "{run}");
    let (runs, total) = line(&plant.text, "total of ");
    assert_eq!((runs, interval(total)), (1.0, (value, expanded)));
    assert!(!plant.text.contains("fault") && !plant.text.contains("lost"), "{}", plant.text);
}

#[test]
fn a_value_that_means_nothing_is_not_said() {
    let (_, plant) = measured(Mishap::Jump(IN_THE_RUN));
    let (_, run) = line(&plant.text, "run of ");
    assert!(run.ends_with("no value: jump"), "{run}");
    let (runs, total) = line(&plant.text, "total of ");
    assert!(runs == 0.0 && total.ends_with("1 left out: at least 0.0 J/m^2"), "{total}");
}

#[test]
fn after_a_silence_a_run_is_at_least_so_much() {
    let (_, plant) = measured(Mishap::Silence(IN_THE_RUN));
    let (elapsed, run) = line(&plant.text, "run of ");
    let (bound, rest) = line(run.split_once("at least ").unwrap().1, "");
    assert!(rest.ends_with(": gap"), "{run}");
    let truth = true_exposure(elapsed);
    // Lower than the truth by U, 11 %.
    assert!((0.88..0.90).contains(&(bound / truth)), "{run}, true: {truth}");
    assert!(line(&plant.text, "total of ").1.contains("at least"), "{}", plant.text);
}

#[test]
fn a_reset_switch_that_fails_stops_the_run_and_opens_all_switches() {
    for from in [0, IN_THE_RUN] {
        let mut plant = Plant::new(LIGHT_A, Mishap::SwitchOpen(from), ONE_RUN);
        let mut monitor = Monitor::start();
        let fault = monitor.measure(&mut plant);
        assert_eq!(fault, Fault::ResetSwitch, "{}", plant.text);
        monitor.pause(fault, &mut plant);
        assert_eq!(plant.mode, Mode::Hold);
        assert!(plant.text.contains("fault: switch_failed"), "{}", plant.text);
        assert!(plant.text.contains("STOPPED, the reset switch has failed: all switches open"), "{}", plant.text);
        assert!(plant.text.contains("1 left out: at least 0.0 J/m^2") && !plant.text.contains("run of"));
    }
}

#[test]
fn a_lost_sample_stops_and_then_all_begins_anew() {
    let mut plant = Plant::new(LIGHT_A, Mishap::Late(IN_THE_RUN), IN_THE_RUN + ONE_RUN);
    let mut monitor = Monitor::start();
    let fault = monitor.measure(&mut plant);
    assert_eq!((fault, plant.mode), (Fault::Late, Mode::Integrate));
    monitor.pause(fault, &mut plant);
    assert_eq!(plant.mode, Mode::Hold);
    assert_eq!(monitor.measure(&mut plant), Fault::Late);
    let (runs, total) = line(&plant.text, "total of ");
    assert!(runs == 1.0 && total.contains("1 left out: at least 2"), "{total}");
}

#[test]
#[should_panic(expected = "restarted")]
fn pins_that_cannot_be_driven_are_let_go_of() {
    let mut plant = Plant::new(LIGHT_A, Mishap::Pins(IN_THE_RUN), ONE_RUN);
    let mut monitor = Monitor::start();
    let fault = monitor.measure(&mut plant);
    assert_eq!(fault, Fault::Pin);
    monitor.pause(fault, &mut plant);
}
