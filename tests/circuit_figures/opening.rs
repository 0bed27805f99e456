//! The level at which the switch opens, known from the closed switch and a known pedestal: how much it is worth, and
//! that it weighs as much as it should.

use brimline::{Charge, Circuit, Converter, Noise, Policy, Setup};

use crate::line::{KTC, Known, Opening, WINDOW, setup, squares};
use crate::reference::Figures;
use crate::script::{CIRCUIT, CONVERTER, NOISE, STEP, Script};
use crate::{PLAIN, READOUT, STILL, assert_near, counts, quiet};

/// A run that begins on a reset of five samples, and has `samples`.
fn after_a_reset(setup: &Setup<Charge>, samples: u32) -> Script<'_> {
    let mut script = quiet(setup);
    script.hold(1, 0.0).reset(5, 0.0).integrate(samples, 20_000.0);
    script
}

/// Few samples after the switch has opened tell little by themselves, and much together with the level at which it
/// opened.
#[test]
fn the_first_samples_are_worth_more_where_the_pedestal_is_known() {
    for samples in [2, 3, 5, 8, 16, 40] {
        let variance =
            |setup: &Setup<Charge>| counts(after_a_reset(setup, samples).reading().at_stop.integral.u).powi(2);
        let unknown = variance(&setup(None, 0.0));
        let line = Opening::new(samples as usize, 0.0, None);
        assert_near(unknown, squares(&line.to_the_last()) * READOUT, 1e-4);
        for pedestal_u in [0.0, 0.3, 3.0] {
            let known = Known { own: READOUT / 5.0 + KTC, pedestal: pedestal_u * pedestal_u, lever: 0.0 };
            let opening = Opening::new(samples as usize, 0.0, Some(known));
            let expected =
                squares(&opening.to_the_last()) * READOUT + opening.gain.powi(2) * (known.own + known.pedestal);
            assert_near(variance(&setup(Some(pedestal_u), 0.0)), expected, 1e-4);
            assert!(expected < unknown, "{expected} {unknown}");
        }
    }
}

/// What the walk does to such a run: the level at which it opened has not walked.
#[test]
fn the_walk_since_the_switch_opened() {
    let walk = 20.0;
    for pedestal_u in [None, Some(0.0), Some(1.0)] {
        let setup = setup(pedestal_u, walk);
        let budget = after_a_reset(&setup, 60).reading().at_stop.budget;
        let known = pedestal_u.map(|u| Known { own: READOUT / 5.0 + KTC, pedestal: u * u, lever: 0.0 });
        let weights = Opening::new(60, 0.0, known).to_the_last();
        let walked: f64 = (1..weights.len()).map(|i| weights[i..].iter().sum::<f64>().powi(2)).sum();
        assert_near(counts(budget.input_noise).abs(), (walked * walk * walk / 2.0 * 0.01).sqrt(), 1e-3);
    }
}

/// Resets in a row share the pedestal's error: the gain falls, and what they add is the square of the gains' sum.
#[test]
fn many_resets_weigh_a_shared_pedestal_less_and_less() {
    let (dead, segment) = (8.0, 40_u32);
    for pedestal_u in [None, Some(0.0), Some(0.2), Some(1.0)] {
        let setup = setup(pedestal_u, 0.0);
        let mut script = quiet(&setup);
        script.zero(300).integrate(segment, 20_000.0);
        let (mut own, mut lever) = (0.0, 0.0);
        for reset in 1..=12 {
            script.reset(8, 0.0).integrate(segment, 20_000.0);
            let pedestal = pedestal_u.unwrap_or(0.0_f64).powi(2);
            let known = Known { own: READOUT / 8.0 + KTC, pedestal, lever };
            let opening = Opening::new(segment as usize, dead / 2.0, pedestal_u.map(|_| known));
            let closing = Opening::new(segment as usize, dead / 2.0 - 1.0, None);
            // The line before ends on the switching instant: its nearest sample is at no distance.
            own += opening.readout() + opening.gain.powi(2) * known.own + closing.readout();
            lever += opening.gain;
            let expected = (own + pedestal * lever * lever).sqrt();
            let stated = counts(script.reading().at_stop.budget.dead_time).abs();
            assert_near(stated, expected, 2e-3);
            assert!(reset > 1 || pedestal_u.is_none() || opening.gain > 0.1);
        }
    }
}

/// The same gain in the value: where the samples lie off the known level, the total follows by the gain's share; but a
/// level more than five deviations off, 4.1 counts here, is not believed.
#[test]
fn a_known_level_pulls_the_line_by_its_gain() {
    for (off, resets, believed) in [(4.0, 1, true), (-3.0, 1, true), (4.0, 5, true), (-7.0, 1, false)] {
        let total = |pedestal_u: Option<f64>| {
            let setup = setup(pedestal_u, 0.0);
            let mut script = quiet(&setup);
            script.zero(300).integrate(40, 20_000.0);
            for _ in 0..resets {
                script.reset(8, 0.0);
                script.level = off;
                script.integrate(40, 20_000.0);
            }
            counts(script.reading().at_stop.integral.value)
        };
        let (mut pulled, mut lever) = (0.0, 0.0);
        for _ in 0..resets {
            let known = Known { own: READOUT / 8.0 + KTC, pedestal: 0.25, lever };
            let gain = Opening::new(40, 4.0, Some(known)).gain;
            pulled += gain * off;
            lever += gain;
        }
        let pulled = if believed { pulled } else { 0.0 };
        let difference = total(Some(0.5)) - total(None);
        assert!((difference - pulled).abs() < 2e-3 * f64::from(resets), "{difference} {pulled}");
    }
}

/// An input of known slew bends the level: what is left of the bend is in the line, and less of it in a line that is
/// pulled. In steps of 10 ms; half of the bend is taken off, as its prior is as wide as what the noise says of it.
#[test]
fn a_bend_is_pulled_with_the_line() {
    let (centre, mean_square) = (8.5, 21.25);
    let bend = |j: usize| (j as f64 - centre).powi(2) - mean_square;
    let power: f64 = (1..=WINDOW).map(|j| bend(j).powi(2)).sum();
    let slew = 2.0 * (2.0 * READOUT / power).sqrt() * 1e4; // counts/s^2
    let (share, left) = (0.5, READOUT / power * 0.25);
    let d = 4.0;
    let reach = |d: f64| centre * centre - mean_square + d * 2.0 * centre;
    let weight =
        |j: usize, d: f64| 1.0 / 16.0 - (d + centre) * (j as f64 - centre) / 340.0 + share * bend(j) / power * reach(d);
    let sum = |of: &dyn Fn(usize) -> f64| (1..=WINDOW).map(of).sum::<f64>() * READOUT;
    let v = sum(&|j| weight(j, 0.0).powi(2)) + left * reach(0.0).powi(2);
    let cross = sum(&|j| weight(j, 0.0) * weight(j, d)) + left * reach(0.0) * reach(d);
    let own = READOUT / 8.0 + KTC;
    let gain = cross / (v + own);
    let unpulled = sum(&|j| weight(j, d).powi(2)) + left * reach(d).powi(2);
    let pulled = sum(&|j| (weight(j, d) - gain * weight(j, 0.0)).powi(2))
        + left * (reach(d) - gain * reach(0.0)).powi(2)
        + gain * gain * own;
    let dead_time = |pedestal_u_v| {
        let circuit = Circuit { pedestal_u_v, ..STILL };
        let policy = Policy { input_slew: Some(slew * 1e-12), ..PLAIN };
        let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, policy);
        let mut script = quiet(&setup);
        script.zero(300).integrate(100, 20_000.0).reset(8, 0.0).integrate(100, 20_000.0);
        counts(script.reading().at_stop.budget.dead_time).powi(2)
    };
    // The line before is the same in both.
    assert_near(dead_time(None) - dead_time(Some(0.0)), unpulled - pulled, 5e-3);
}

/// A single sample makes no line, and is not pulled.
#[test]
fn a_single_sample_is_not_pulled() {
    let total = |pedestal_u: Option<f64>| {
        let setup = setup(pedestal_u, 0.0);
        let mut script = quiet(&setup);
        script.zero(300).integrate(40, 20_000.0).reset(8, 0.0);
        script.level = 50.0;
        script.integrate(1, 20_000.0);
        let at_stop = script.reading().at_stop;
        (counts(at_stop.integral.value), counts(at_stop.integral.u))
    };
    assert_eq!(total(None), total(Some(0.0)));
}

/// The known level is that of the closed switch, wherever the converter sees it, and the pedestal.
#[test]
fn the_known_level_is_what_the_closed_switch_showed_and_the_pedestal() {
    for pedestal in [0.0, 300.0, -150.0] {
        let circuit = Circuit { pedestal_v: pedestal * 10e-6, pedestal_u_v: Some(0.0), ..STILL };
        let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, PLAIN);
        for closed_at in [0.0, 77.0, -500.0] {
            let mut script = quiet(&setup);
            script.zero(300).integrate(40, 20_000.0).reset(8, closed_at);
            script.level += pedestal;
            script.integrate(40, 20_000.0);
            let interpolated = 0.08 * 20_000.0;
            let expected = 40.0 * 200.0 + interpolated + 40.0 * 200.0;
            let total = counts(script.reading().at_stop.integral.value);
            assert!((total - expected).abs() < 0.01, "{pedestal} {closed_at}: {total} {expected}");
        }
    }
}

/// Only samples that have settled tell the reset level, and the noise of their mean is that of so many.
#[test]
fn the_reset_level_is_the_mean_of_the_settled_samples() {
    let circuit = Circuit { pedestal_u_v: Some(0.0), ..STILL };
    let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, Policy { settling_s: 0.035, ..PLAIN });
    for settled in [1_u32, 2, 8, 50] {
        let mut script = quiet(&setup);
        script.hold(1, 0.0).reset(3, 100.0).reset(settled, 0.0).integrate(3, 20_000.0);
        let known = Known { own: READOUT / f64::from(settled) + KTC, pedestal: 0.0, lever: 0.0 };
        let opening = Opening::new(3, 0.0, Some(known));
        let expected = squares(&opening.to_the_last()) * READOUT + opening.gain.powi(2) * known.own;
        let reading = script.reading();
        assert_near(counts(reading.at_stop.integral.u).powi(2), expected, 1e-4);
        assert!((counts(reading.at_stop.integral.value) - 600.0).abs() < 1e-2, "{reading:?}");
    }
}

/// `k T / C` as published, from the variance of runs that begin on a reset: codes of a fifth of it, a noisy converter,
/// and so many samples of the closed switch that nothing else is left.
#[test]
fn the_noise_that_the_switch_leaves_on_the_capacitor() {
    let published = Figures::of(include_str!("../reference/electronics_noise_and_drift.toml"));
    let rows = published.section("ktc_noise_300K").rows::<4>("rows");
    assert_eq!(rows.len(), 10);
    for [capacitance_f, noise_v, ..] in rows {
        let lsb_v = noise_v / 5.0;
        let circuit = Circuit {
            capacitance_f,
            rail_low_v: -190_000.0 * lsb_v,
            rail_high_v: 190_000.0 * lsb_v,
            pedestal_u_v: Some(0.0),
            ..STILL
        };
        let converter = Converter { lsb_v, ..CONVERTER };
        let noise = Noise { readout_counts: 30.0, ..NOISE };
        let setup: Setup<Charge> = Setup::new(circuit, converter, noise, PLAIN);
        let mut script = quiet(&setup);
        let readout = 900.0 + 1.0 / 12.0;
        script.hold(1, 0.0).reset(2_000, 0.0).integrate(60, 20_000.0);
        let per_count = capacitance_f * lsb_v;
        let seen = (script.reading().at_stop.budget.readout.as_coulombs() / per_count).powi(2) - readout;
        // The line alone has the variance `v`, together with the known level `v own / (v + own)`.
        let v = (1.0 / 16.0 + 8.5 * 8.5 / 340.0) * readout;
        let own = v * seen / (v - seen);
        assert_near((own - readout / 2_000.0).sqrt() * lsb_v, noise_v, 1e-3);
    }
}

/// A reset in a hold, or one that a hold follows, opens onto no line: nothing is known of the level then.
#[test]
fn a_hold_after_the_reset_makes_the_level_unknown() {
    let total = |pedestal_u: Option<f64>| {
        let setup = setup(pedestal_u, 0.0);
        let mut script = quiet(&setup);
        script.zero(300).integrate(40, 20_000.0).reset(8, 0.0).hold(5, 0.0);
        script.level = 4.0;
        script.integrate(40, 20_000.0);
        let at_stop = script.reading().at_stop;
        (counts(at_stop.integral.value), counts(at_stop.integral.u))
    };
    assert_eq!(total(None), total(Some(0.0)));
}

/// Nor where the samples with the switch closed came too early, or the reset failed.
#[test]
fn a_reset_that_was_too_short_or_failed_makes_the_level_unknown() {
    for (settling_s, closed_at) in [(0.2, 0.0), (1e-3, 30_000.0)] {
        let total = |pedestal_u_v: Option<f64>| {
            let circuit = Circuit { pedestal_u_v, ..STILL };
            let setup: Setup<Charge> = Setup::new(circuit, CONVERTER, NOISE, Policy { settling_s, ..PLAIN });
            let mut script = quiet(&setup);
            script.zero(300).integrate(40, 20_000.0).reset(8, closed_at);
            script.level += 4.0;
            script.integrate(40, 20_000.0);
            counts(script.reading().at_stop.integral.value)
        };
        assert_eq!(total(None), total(Some(0.0)));
    }
    assert_eq!(STEP, 10_000);
    assert!(CIRCUIT.pedestal_u_v.is_none());
}
