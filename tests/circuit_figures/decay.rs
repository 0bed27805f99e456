//! A drift that falls as the level rises: the time constant told, and how clear it has to be.

use brimline::{Charge, Event, Noise, Policy, Setup};

use crate::script::{CIRCUIT, CONVERTER, NOISE, POLICY, Script};

/// So noisy that rounding is nothing beside it.
const READOUT_COUNTS: f64 = 20.0;

/// Blocks of ten samples in zeros of `opening` and `closing` blocks. Variances of the drift after each, by hand: lines
/// through blocks, and the data sheet's 101 counts/s, rectangular.
fn variances(opening: f64, closing: f64) -> (f64, f64) {
    let information = |blocks: f64| {
        blocks * (blocks * blocks - 1.0) / 12.0 * 0.01 / ((READOUT_COUNTS * READOUT_COUNTS + 1.0 / 12.0) / 10.0)
    };
    let first = information(opening) + 3.0 / (101.0 * 101.0);
    (1.0 / first, 1.0 / (first + information(closing)))
}

/// Told when the second of two zeros, `risen` counts above the first, drifts by `change` counts/s more.
fn told(risen: f64, change: f64) -> Option<u32> {
    // The watch for onsets is another thing: as dull as it can be.
    let noise = Noise { readout_counts: READOUT_COUNTS, ..NOISE };
    let setup: Setup<Charge> = Setup::new(CIRCUIT, CONVERTER, noise, Policy { false_alarm_s: 1e12, ..POLICY });
    let mut script = Script::new(&setup);
    (script.noisy, script.drift) = (false, 0.0);
    script.reset(5, 0.0).zero(200).integrate(100, risen);
    script.drift = change;
    script.zero(200).integrate(1, 0.0);
    script.notices.iter().find_map(|&(_, event)| match event {
        Event::Decay { time_constant_s } => Some(time_constant_s),
        _ => None,
    })
}

#[test]
fn the_time_constant_is_the_rise_over_the_change_of_drift() {
    for (risen, change) in
        [(10_000.0, -24.0), (-10_000.0, 24.0), (10_000.0, -26.0), (-60_000.0, 23.0), (2_000.0, -25.0)]
    {
        let time_constant_s = told(risen, change).unwrap_or_else(|| panic!("{risen} {change}"));
        // From the end of one zero to the end of the other, which takes 2 s; whole seconds.
        let expected = -(risen + 2.0 * change) / change;
        let off = expected - f64::from(time_constant_s);
        assert!((-5e-3 * expected..1.0 + 5e-3 * expected).contains(&off), "{time_constant_s} {expected}");
    }
}

#[test]
fn what_drives_the_level_away_is_no_decay() {
    for (risen, change) in [(10_000.0, 24.0), (-10_000.0, -24.0)] {
        assert_eq!(told(risen, change), None, "{risen} {change}");
    }
}

/// Five standard deviations of what the second zero added to the knowledge of the drift.
#[test]
fn five_uncertainties_are_clear() {
    let (before, after) = variances(20.0, 20.0);
    // The estimate follows the share `(before - after) / before` of a change, and `before - after` is its variance.
    let clear = 5.0 * before / (before - after).sqrt();
    for sign in [1.0, -1.0] {
        assert!(told(-sign * 10_000.0, sign * 1.06 * clear).is_some(), "{clear}");
        assert!(told(-sign * 10_000.0, sign * 0.94 * clear).is_none(), "{clear}");
    }
}
