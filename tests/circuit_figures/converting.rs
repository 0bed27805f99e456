//! A converter that is bent, and figures of it that are uncertain.

use brimline::{Charge, Circuit, Converter, Event, Linearity, Reason, Setup};

use crate::script::{CIRCUIT, CONVERTER, NOISE};
use crate::{PLAIN, STILL, assert_near, counts, quiet};

static TABLE: Linearity = Linearity::new(&[(-200_000, -30.0), (0, 10.0), (100_000, 64.0), (199_999, 50.0)]);

/// The table by hand: straight lines between its points.
fn error(code: f64) -> f64 {
    match code {
        c if c < 0.0 => 10.0 + 40.0 * c / 200_000.0,
        c if c < 100_000.0 => 10.0 + 54.0 * c / 100_000.0,
        c => 64.0 - 14.0 * (c - 100_000.0) / 99_999.0,
    }
}

#[test]
fn the_table_is_taken_off_each_code() {
    let converter = Converter { linearity: Some(&TABLE), ..CONVERTER };
    let setup: Setup<Charge> = Setup::new(STILL, converter, NOISE, PLAIN);
    for (from, to) in [(0, 100_000), (-150_000, 150_000), (50_000, -1), (7, 33_333)] {
        let mut script = quiet(&setup);
        script.level = f64::from(from);
        script.zero(200);
        script.level = f64::from(to);
        script.integrate(20, 0.0);
        let expected = f64::from(to) - error(f64::from(to)) - (f64::from(from) - error(f64::from(from)));
        let total = counts(script.reading().at_stop.integral.value);
        assert!((total - expected).abs() < 1e-3, "{from} to {to}: {total} {expected}");
        script.zero(200);
        let closed = counts(script.reading().closed.expect("closed").integral.value);
        assert!((closed - expected).abs() < 1e-3, "{from} to {to}: {closed} {expected}");
    }
}

/// Arrival is judged, and the level after a reset known, by what a straight converter would have given.
#[test]
fn a_bent_converter_is_straight_for_resets_too() {
    static STEEP: Linearity = Linearity::new(&[(-200_000, 0.0), (0, 5_000.0), (199_999, 0.0)]);
    for (linearity, blamed) in [(Some(&STEEP), false), (None, true)] {
        let circuit = Circuit { pedestal_u_v: Some(0.0), ..STILL };
        let setup: Setup<Charge> = Setup::new(circuit, Converter { linearity, ..CONVERTER }, NOISE, PLAIN);
        let mut script = quiet(&setup);
        // Ideal level 0 is the code 5,000 c/(1 - ...): where code less error is nothing.
        let code = 5_000.0 / (1.0 + 5_000.0 / 199_999.0);
        script.zero(100).integrate(100, 10_000.0).reset(5, code);
        script.integrate(50, 100.0);
        assert_eq!(script.faults().contains(&Reason::ResetNotArrived), blamed, "{:?}", script.notices);
    }
}

#[test]
fn gain_and_code_width_are_independent() {
    for (gain_u_rel, lsb_u_rel) in [(0.0, 0.0), (0.01, 0.0), (0.0, 0.01), (0.003, 0.004)] {
        let setup: Setup<Charge> =
            Setup::new(Circuit { gain_u_rel, ..STILL }, Converter { lsb_u_rel, ..CONVERTER }, NOISE, PLAIN);
        let mut script = quiet(&setup);
        script.zero(100).integrate(100, 80_000.0);
        let at_stop = script.reading().at_stop;
        let scale = (gain_u_rel * gain_u_rel + lsb_u_rel * lsb_u_rel).sqrt() * 80_000.0;
        assert!((counts(at_stop.budget.scale).abs() - scale).abs() < 1e-3, "{at_stop:?} {scale}");
        let readout = counts(at_stop.budget.readout);
        assert_near(counts(at_stop.integral.u).powi(2), scale * scale + readout * readout, 1e-5);
    }
}

/// A zero of the converter that is off is a level that leaks: a drift of up to `(offset + 2 u) / tau` on top of the
/// rest.
#[test]
fn with_a_leak_an_uncertain_zero_of_the_converter_is_drift() {
    for (tau, code_zero_u_v) in [(None, 5e-3), (Some(10.0), 0.0), (Some(10.0), 5e-3), (Some(2.0), 1e-3)] {
        let circuit = Circuit { leak_time_constant_s: tau, ..CIRCUIT };
        let setup: Setup<Charge> = Setup::new(circuit, Converter { code_zero_u_v, ..CONVERTER }, NOISE, PLAIN);
        // (1 mV / 1 Gohm + 100 pA) / 100 nF.
        let limit = 1.01e-3 + tau.map_or(0.0, |tau| (1e-3 + 2.0 * code_zero_u_v) / tau);
        let prior = brimline::Channel::new(&setup).drift();
        assert_near(prior.u.as_volts_per_second(), limit / 3.0_f64.sqrt(), 1e-5);
        // And as far may it be without blame.
        for (share, blamed) in [(0.97, false), (1.03, true)] {
            let mut script = quiet(&setup);
            // The drift of the effective level: the level itself bends toward where as much leaks.
            let rate = share * limit / 10e-6;
            for j in 1..=1_000 {
                let t = f64::from(j) * 0.01;
                script.level = tau.map_or(rate * t, |tau| rate * tau * -(-t / tau).exp_m1());
                script.sample(brimline::Mode::Zero, crate::script::STEP);
            }
            script.integrate(2, 0.0);
            let told = script.notices.iter().any(|(_, event)| *event == Event::Fault(Reason::DriftOutsideLimits));
            assert_eq!(told, blamed, "{tau:?} {code_zero_u_v} {share}");
        }
    }
}

/// Each level between which a run is measured is off by what the table leaves: two ends, and two more for each reset.
#[test]
fn what_the_table_leaves_counts_at_every_level() {
    let straight: Setup<Charge> = Setup::new(STILL, CONVERTER, NOISE, PLAIN);
    let converter = Converter { linearity_u_counts: 3.0, ..CONVERTER };
    let bent: Setup<Charge> = Setup::new(STILL, converter, NOISE, PLAIN);
    for resets in [0, 1, 3] {
        let variances = [&straight, &bent].map(|setup| {
            let mut script = quiet(setup);
            script.zero(200).integrate(50, 2_000.0);
            for _ in 0..resets {
                script.reset(5, 0.0).integrate(50, 2_000.0);
            }
            let at_stop = counts(script.reading().at_stop.integral.u).powi(2);
            script.zero(200);
            [at_stop, counts(script.reading().closed.expect("closed").integral.u).powi(2)]
        });
        let expected = 9.0 * f64::from(2 + 2 * resets);
        for (without, with) in variances[0].iter().zip(variances[1]) {
            assert_near(with - without, expected, 1e-3);
        }
    }
}
