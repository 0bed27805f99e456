//! Set-ups whose branches are not those of the capacitor, and figures that are known to a twentieth.

use brimline::{Mode, SoakageBranch, Trust};

use crate::absorption::{CHARGED_V, DRIFT, Dielectric, Outcome, Standard, absorption_test, setup};
use crate::bench::{Bench, Drive, Network, output_v};
use crate::reference::close;

/// Without its branches, or without the one that matters most in this test, or with that one's time constant wrong by a
/// tenth, the set-up lets the recovery into the reading: what the published test can see.
#[test]
fn recovery_shows_in_the_reading_where_the_set_up_is_wrong() {
    let [standard, _] = Standard::both();
    let branches = Dielectric::named("polypropylene").branches(&standard);
    let (mut one_less, mut one_slow) = (branches, branches);
    one_less[2] = SoakageBranch::NONE;
    one_slow[2].time_constant_s *= 1.1;
    for (soakage, least, most) in
        [([SoakageBranch::NONE; 4], 0.99, 1.01), (one_less, 0.48, 0.53), (one_slow, 0.01, 0.025)]
    {
        let outcome = absorption_test(&setup(soakage, 0.0), &branches, &standard, 1);
        let (value, u) = outcome.at_stop;
        let part = value.abs() / outcome.recovered;
        println!("{part} of the recovery, {:.0} of its uncertainties", value.abs() / u);
        assert!(part > least && part < most && value.abs() > 10.0 * u, "{part} of the recovery, {u:e} V");
    }
}

/// The test with shares that are a twentieth larger than the set-up believes them, and it knows that they may be.
fn known_to_a_twentieth(dielectric: &Dielectric) -> Outcome {
    let [standard, _] = Standard::both();
    let branches = dielectric.branches(&standard);
    let believed = branches.map(|branch| SoakageBranch { share: branch.share / 1.05, ..branch });
    absorption_test(&setup(believed, 0.05), &branches, &standard, 2)
}

/// Shares that are a twentieth off leave a twentieth of the recovery in the reading, and `soakage_u_rel` says so. Data
/// sheets are no better than that.
#[test]
fn a_recovery_that_is_known_to_a_twentieth_is_as_uncertain() {
    for dielectric in Dielectric::all() {
        let outcome = known_to_a_twentieth(&dielectric);
        let (value, u) = outcome.at_stop;
        // What the readout adds is a twentieth of it at most.
        close(&dielectric.name, value.abs() / u, 1.0, 0.05);
        let share_u = (u / outcome.recovered).abs();
        assert!(share_u > 0.045 && share_u < 0.05, "{}: {share_u}", dielectric.name);
    }
}

/// The closing zero knows the shares no better.
#[test]
fn a_closed_reading_is_as_uncertain_as_the_shares() {
    for dielectric in Dielectric::all() {
        let outcome = known_to_a_twentieth(&dielectric);
        for (value, u) in [outcome.closed, outcome.charging] {
            close(&dielectric.name, value.abs() / u, 1.0, 0.05);
        }
    }
}

/// What an uncertain share makes of a zero is no input.
#[test]
fn creep_that_uncertain_shares_explain_is_no_input() {
    for dielectric in Dielectric::all() {
        assert_eq!(known_to_a_twentieth(&dielectric).trust, Trust::Good, "{}", dielectric.name);
    }
}

/// Fast sampling does not change a slow branch: what goes into it in a minute, at 5000 samples per second.
#[test]
fn a_slow_branch_is_the_same_to_a_fast_converter() {
    const PER_SECOND: f64 = 5000.0;
    let [standard, _] = Standard::both();
    let [.., slowest] = Dielectric::named("X7R_source_a").branches(&standard);
    let setup = setup([slowest, SoakageBranch::NONE, SoakageBranch::NONE, SoakageBranch::NONE], 0.0);
    let network = Network { branches: vec![slowest], leak_s: None };
    let mut bench = Bench::new(&setup, network, 1.0 / PER_SECOND, 3);
    let steps = |seconds: f64| (seconds * PER_SECOND) as u32;
    bench.play(Mode::Zero, steps(20.0), Drive::Free(DRIFT));
    let before = bench.stored_v();
    bench.play(Mode::Integrate, steps(1.0), Drive::Forced(CHARGED_V));
    bench.play(Mode::Integrate, steps(59.0), Drive::Forced(0.0));
    let charged = bench.stored_v() - before - DRIFT * 60.0;
    bench.play(Mode::Zero, steps(20.0), Drive::Free(DRIFT));
    let (value, u) = output_v(&setup, bench.reading().latest());
    close("V", value, charged, 3.0 * u);
}
