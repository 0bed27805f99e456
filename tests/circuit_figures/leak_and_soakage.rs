//! A capacitor that leaks and soaks: what is put back, how uncertain that is, and that the clock need not be steady.

use brimline::{Charge, Circuit, Converter, Mode, Policy, Reason, Setup, SoakageBranch, Trust};

use crate::script::{CONVERTER, NOISE, STEP, Script};
use crate::{PLAIN, READOUT, STILL, assert_near, counts, quiet};

const HEIGHT: f64 = 50_000.0;

fn leaky(time_constant_s: f64, leak_u_rel: f64) -> Setup<Charge> {
    let circuit = Circuit { leak_time_constant_s: Some(time_constant_s), leak_u_rel, ..STILL };
    Setup::new(circuit, CONVERTER, NOISE, PLAIN)
}

fn soaking(share: f64, time_constant_s: f64, soakage_u_rel: f64) -> Setup<Charge> {
    let mut soakage = STILL.soakage;
    soakage[2] = SoakageBranch { share, time_constant_s };
    Setup::new(Circuit { soakage, soakage_u_rel, ..STILL }, CONVERTER, NOISE, PLAIN)
}

/// A zero at the reset level, then a run in which the input holds the level at a height.
fn held_up(setup: &Setup<Charge>, samples: u32) -> Script<'_> {
    let mut script = quiet(setup);
    script.reset(5, 0.0).zero(100);
    script.level = HEIGHT;
    script.integrate(samples, 0.0);
    script
}

/// What has leaked of it: in the first period a steady input took the level up, `s tau (1 - e^(-h/tau))`, and `s h`
/// less that is what leaked; then it stands.
fn leaked(samples: u32, time_constant_s: f64) -> f64 {
    let a = 0.01 / time_constant_s;
    HEIGHT * (a / -(-a).exp_m1() - 1.0) + HEIGHT * (f64::from(samples) - 1.0) * a
}

#[test]
fn a_level_that_stands_has_had_its_height_over_the_time_constant_of_input() {
    for time_constant_s in [0.1, 2.0, 50.0, 1e5] {
        let setup = leaky(time_constant_s, 0.0);
        for samples in [100, 3_000] {
            let expected = HEIGHT + leaked(samples, time_constant_s);
            let reading = held_up(&setup, samples).reading();
            let (total, restored) = (counts(reading.at_stop.integral.value), counts(reading.restored));
            assert!((total - expected).abs() < 1e-3 + 1e-7 * expected, "{time_constant_s}: {total} {expected}");
            assert!((total - restored - HEIGHT).abs() < 1e-3, "{time_constant_s}: {restored} of {total}");
        }
    }
}

#[test]
fn an_uncertain_time_constant_and_the_samples_own_noise_are_stated() {
    for (time_constant_s, leak_u_rel) in [(2.0, 0.01), (0.05, 0.0), (50.0, 0.2)] {
        let setup = leaky(time_constant_s, leak_u_rel);
        let samples = 1_000;
        let leaked = leaked(samples, time_constant_s);
        // Each sample's error counts for its period: `r (h / tau)^2`.
        let readout = READOUT * f64::from(samples) * (0.01 / time_constant_s).powi(2);
        let expected = ((leak_u_rel * leaked).powi(2) + readout).sqrt();
        let stated = held_up(&setup, samples).reading().at_stop.budget.leak_and_soakage;
        assert_near(counts(stated).abs(), expected, 1e-3);
    }
}

#[test]
fn what_the_dielectric_took_is_put_back_and_its_uncertainty_stated() {
    for (share, time_constant_s) in [(0.01, 0.5), (0.002, 20.0), (0.3, 3.0)] {
        let setup = soaking(share, time_constant_s, 0.1);
        let reading = held_up(&setup, 500).reading();
        // The answer to a ramp over one period and then a level that stands.
        let (h, t) = (0.01 / time_constant_s, 4.99 / time_constant_s);
        let soaked = share * HEIGHT * (1.0 - (-t).exp() * -(-h).exp_m1() / h);
        let total = counts(reading.at_stop.integral.value);
        assert!((total - HEIGHT - soaked).abs() < 0.01 + 1e-6 * soaked, "{total} {soaked}");
        assert_near(counts(reading.at_stop.budget.leak_and_soakage).abs(), 0.1 * soaked, 1e-4);
    }
}

/// While the switch is closed nothing leaks, and the dielectric gives back what it holds.
#[test]
fn a_closed_switch_stops_the_leak_and_empties_the_dielectric() {
    let leaky = leaky(2.0, 0.0);
    let mut script = held_up(&leaky, 100);
    let before = counts(script.reading().measured);
    // A second of a reset, and a level that stands at nothing. What held it up before is interpolated, and not
    // measured.
    script.reset(100, 0.0).integrate(100, 0.0);
    let after = script.reading();
    assert!((counts(after.measured) - before).abs() < 0.01, "{before} {after:?}");
    assert_near(counts(after.interpolated), 0.5 * HEIGHT / 2.0, 1e-3);

    let soaking = soaking(0.01, 0.5, 0.0);
    let mut script = held_up(&soaking, 1_000);
    let before = counts(script.reading().at_stop.integral.value);
    assert!((before - 1.01 * HEIGHT).abs() < 0.1);
    // After a reset of 0.3 s the branch has e^(-0.6) of its voltage; with the switch open it goes on to the output's.
    script.reset(30, 0.0);
    let mut branch = HEIGHT * (-0.6_f64).exp();
    for _ in 0..200 {
        let given = (branch - script.level) * -(-0.02_f64).exp_m1();
        branch -= given;
        script.level += 0.01 * given;
        script.sample(Mode::Integrate, STEP);
    }
    let after = counts(script.reading().at_stop.integral.value);
    assert!((after - before).abs() < 1.0, "{before} {after}");
}

/// A converter that is off zero shows the closed switch off the reset level: the dielectric sees the reset level all
/// the same.
#[test]
fn while_the_switch_is_closed_the_dielectric_sees_the_reset_level() {
    let setup = soaking(0.1, 0.5, 0.0);
    let total = |seen: f64| {
        let mut script = held_up(&setup, 100);
        // Ten time constants: the dielectric is empty after them, and stays so at the reset level.
        script.reset(500, seen);
        script.level = 0.0;
        script.integrate(200, 0.0);
        counts(script.reading().measured)
    };
    assert!((total(300.0) - total(0.0)).abs() < 0.1, "{} {}", total(300.0), total(0.0));
}

/// At power-up the dielectric is at rest, wherever the level is.
#[test]
fn a_level_that_stands_from_the_first_sample_on_soaks_nothing() {
    let setup = soaking(0.1, 5.0, 0.0);
    let mut script = quiet(&setup);
    script.level = HEIGHT;
    script.zero(100).integrate(300, 0.0);
    let total = counts(script.reading().at_stop.integral.value);
    assert!(total.abs() < 1e-3, "{total}");
}

/// An input in steps, counts/s and seconds.
const INPUT: [(f64, f64); 5] = [(20_000.0, 4.0), (0.0, 5.0), (-30_000.0, 4.0), (0.0, 1.0), (10_000.0, 2.0)];

/// The integral of it as the channel sees it, where the level leaks with `tau` and is sampled by a clock that is steady
/// or not.
fn sampled(setup: &Setup<Charge>, tau: Option<f64>, steps: impl Fn(u32) -> u32) -> f64 {
    let mut script = quiet(setup);
    script.reset(5, 0.0).zero(100);
    let mut step = 0;
    for (slope, seconds) in INPUT {
        let mut left = (seconds * 1e6) as u32;
        while left > 0 {
            let ticks = steps(step).min(left);
            step += 1;
            left -= ticks;
            let dt = f64::from(ticks) * 1e-6;
            script.level = match tau {
                Some(tau) => slope * tau + (script.level - slope * tau) * (-dt / tau).exp(),
                None => script.level + slope * dt,
            };
            script.sample(Mode::Integrate, ticks);
        }
    }
    counts(script.reading().at_stop.integral.value)
}

#[test]
fn a_clock_that_jitters_sees_the_same_leak_and_soakage() {
    let leaking = Circuit { leak_time_constant_s: Some(1.5), ..STILL };
    let soakage = [SoakageBranch { share: 0.02, time_constant_s: 0.7 }; 4];
    for circuit in [leaking, Circuit { soakage, ..STILL }, Circuit { soakage, ..leaking }] {
        let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, PLAIN);
        let tau = circuit.leak_time_constant_s;
        let steady = sampled(&setup, tau, |_| 10_000);
        let jittery = sampled(&setup, tau, |step| 4_000 + step.wrapping_mul(2_654_435_761) % 12_001);
        let coarse = sampled(&setup, tau, |step| if step % 7 == 0 { 90_000 } else { 1_000 });
        // Codes are whole counts: what leaks is known no better than half of one over the time constant, each second.
        assert!((steady - jittery).abs() < 2.0 && (steady - coarse).abs() < 2.0, "{steady} {jittery} {coarse}");
        let bare: Setup<Charge> = Setup::new(STILL, CONVERTER, NOISE, PLAIN);
        assert!((steady - sampled(&bare, tau, |_| 10_000)).abs() > 1_000.0);
    }
}

/// And what it sees is the input, however little of that is left on the capacitor.
#[test]
fn what_leaked_is_put_back_to_the_count() {
    let truth: f64 = INPUT.iter().map(|(slope, seconds)| slope * seconds).sum();
    for tau in [0.05, 0.3, 1.5, 40.0] {
        let circuit = Circuit { leak_time_constant_s: Some(tau), ..STILL };
        let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, PLAIN);
        for period in [2_000, 10_000, 100_000] {
            let total = sampled(&setup, Some(tau), |_| period);
            // Half a code at both ends, and the mean of so many rounding errors, over the time constant.
            let rounding = 1.0 + 3.0 * 0.29 * (16.0 * f64::from(period) * 1e-6).sqrt() / tau;
            assert!((total - truth).abs() < rounding, "{tau} {period}: {total} {truth}");
        }
    }
}

/// Zeros that leak: what is put back there is no drift, and a wrong time constant makes the drift as uncertain as it
/// can.
#[test]
fn an_uncertain_leak_makes_the_drift_of_a_zero_uncertain() {
    for leak_u_rel in [0.0, 0.05, 0.1] {
        let circuit = Circuit { leak_time_constant_s: Some(4.0), leak_u_rel, ..crate::script::CIRCUIT };
        let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, PLAIN);
        let mut script = quiet(&setup);
        script.level = HEIGHT;
        for _ in 0..300 {
            script.level *= (-0.01_f64 / 4.0).exp();
            script.sample(Mode::Zero, STEP);
        }
        let drift = script.channel.drift();
        let (rate, u) = (drift.value.as_volts_per_second() * 1e5, drift.u.as_volts_per_second() * 1e5);
        assert!(rate.abs() < 0.5, "{rate}");
        // The leak itself falls from 12,500 counts/s to 5,900; weighed by the line, its error is about that of its
        // mean.
        let slope = leak_slope();
        if leak_u_rel > 0.0 {
            assert_near(u, leak_u_rel * slope, 0.02);
        } else {
            assert!(u < 1.0, "{u}");
        }
    }
}

/// The slope of the straight line through what has leaked, counts/s, by ordinary least squares.
fn leak_slope() -> f64 {
    let leaked = |t: f64| HEIGHT * (1.0 - (-t / 4.0).exp());
    let times: Vec<f64> = (1..=300).map(|j| f64::from(j) * 0.01).collect();
    let mean = times.iter().sum::<f64>() / 300.0;
    let product: f64 = times.iter().map(|&t| (t - mean) * leaked(t)).sum();
    product / times.iter().map(|t| (t - mean).powi(2)).sum::<f64>()
}

/// The noise that leaks is squared in coarse ticks: the counter's rate makes no difference, however long the run.
#[test]
fn the_rate_of_the_counter_changes_no_uncertainty() {
    let stated = [1e6, 84e6, 480e6].map(|tick_hz: f64| {
        let circuit = Circuit { leak_time_constant_s: Some(1.0), ..STILL };
        let policy = Policy { gap_limit_s: 2.0, ..PLAIN };
        let setup: Setup<Charge> = Setup::new(circuit, Converter { tick_hz, ..CONVERTER }, NOISE, policy);
        let mut script = quiet(&setup);
        let ticks = (0.1 * tick_hz) as u32;
        for (mode, samples) in [(Mode::Zero, 100), (Mode::Integrate, 100_000)] {
            (0..samples).for_each(|_| {
                script.sample(mode, ticks);
            });
        }
        counts(script.reading().at_stop.budget.leak_and_soakage).abs()
    });
    let expected = (READOUT * 100_000.0).sqrt() * 0.1;
    stated.iter().for_each(|&u| assert_near(u, expected, 1e-3));
}

/// What leaked in the runs before, 10^14 counts and more, uses up nothing; a run in which so much leaks says so.
#[test]
fn a_leak_of_years_leaves_the_next_run_as_exact() {
    let circuit = Circuit { leak_time_constant_s: Some(0.1), ..STILL };
    let policy = Policy { gap_limit_s: 1500.0, ..PLAIN };
    let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, policy);
    let mut script = quiet(&setup);
    let short_run = |script: &mut Script<'_>| {
        script.level = 0.0;
        script.sample(Mode::Reset, STEP);
        script.zero(50);
        script.level = HEIGHT;
        script.integrate(200, 0.0);
        let reading = script.reading();
        assert_eq!(reading.trust, Trust::Good);
        counts(reading.at_stop.integral.value)
    };
    let first = short_run(&mut script);
    // 1000 s a sample: 5e8 counts each, 1.4e14 in all, in runs of 2e13.
    for _ in 0..7 {
        script.zero(20);
        (0..40_000).for_each(|_| {
            script.sample(Mode::Integrate, 1_000_000_000);
        });
        assert!(!script.reading().reasons.contains(Reason::OutOfRange));
    }
    script.zero(20);
    let last = short_run(&mut script);
    assert!((first - last).abs() < 1e-2, "{first} {last}");
    script.zero(20);
    (0..200_000).for_each(|_| {
        script.sample(Mode::Integrate, 1_000_000_000);
    });
    assert!(script.reading().reasons.contains(Reason::OutOfRange));
}
