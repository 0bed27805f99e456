//! The approximations for a display: how far they are off, found by sweeps against double precision, and what they
//! answer to any bits.
#![cfg(feature = "micromath")]

use brimline::approximate::{bar, decade, decibels, root_sum_square};

/// The errors that the documentation states.
const ROOT_RELATIVE: f64 = 0.0018;
const DECIBELS: f64 = 0.0007;
const THRESHOLD_RELATIVE: f64 = 8e-5;

/// Rounding to single precision, relative.
const ROUNDING: f64 = 1.0 / (1_u32 << 24) as f64;

/// What is stated is neither exceeded nor twice too wide.
fn found(what: &str, error: f64, stated: f64) {
    println!("{what}: {error:.3e}, stated {stated:.3e}");
    assert!(error <= stated && error >= stated / 2.0, "{what}: {error:e} found, {stated:e} stated");
}

/// Positive numbers of single precision from `from` on, every `step`-th, below `to`.
fn numbers(from: f32, to: f32, step: usize) -> impl Iterator<Item = f32> {
    (from.to_bits()..to.to_bits()).step_by(step).map(f32::from_bits)
}

/// Zero, ends of the subnormal and normal ranges, ordinary numbers, infinity and NaN, with both signs.
fn hostile() -> Vec<f32> {
    let tiny = f32::from_bits(1);
    let subnormal = f32::from_bits(f32::MIN_POSITIVE.to_bits() - 1);
    let signalling = f32::from_bits(f32::INFINITY.to_bits() + 1);
    let finite = [0.0, tiny, subnormal, f32::MIN_POSITIVE, 1e-30, 0.5, 1.0, 3.0, 1e30, f32::MAX];
    finite.into_iter().chain([f32::INFINITY, f32::NAN, signalling]).flat_map(|x| [x, -x]).collect()
}

/// Every mantissa of two octaves on its own; all octaves with something smaller beside.
#[test]
fn a_root_of_squares_is_never_too_small_and_little_too_large() {
    let (mut highest, mut lowest) = (0.0_f64, 0.0_f64);
    let mut check = |a: f32, b: f32| {
        let error = f64::from(root_sum_square(a, b)) / f64::from(a).hypot(f64::from(b)) - 1.0;
        highest = highest.max(error);
        lowest = lowest.min(error);
    };
    for a in numbers(1.0, 4.0, 1) {
        check(a, 0.0);
    }
    for a in numbers(f32::MIN_POSITIVE, 2e38, 0x0001_2345) {
        for share in [1.0, 0.9, 0.5, 0.1, 1e-3, 1e-20] {
            check(a, -a * share);
            check(a * share, a);
        }
    }
    found("root of squares, above", highest, ROOT_RELATIVE);
    found("root of squares, below", -lowest, 3.0 * ROUNDING);
}

/// The result of subnormal numbers, in their own steps.
#[test]
fn a_root_of_squares_holds_among_subnormal_numbers() {
    let step = f64::from(f32::from_bits(1));
    for a in numbers(f32::from_bits(1), f32::MIN_POSITIVE, 4099) {
        for b in [0.0, a / 3.0, a] {
            let exact = f64::from(a).hypot(f64::from(b));
            let error = f64::from(root_sum_square(a, b)) - exact;
            let (below, above) = (3.0 * ROUNDING * exact, ROOT_RELATIVE * exact);
            assert!(error >= -0.5 * step - below && error <= 0.5 * step + above, "{a:e} {b:e}: {error:e}");
        }
    }
}

/// All ratios that single precision knows, and every mantissa of the octaves beside 1.
#[test]
fn decibels_are_off_by_what_is_stated() {
    let mut worst = 0.0_f64;
    let mut check = |value: f32, full_scale: f32| {
        let exact = 20.0 * (f64::from(value) / f64::from(full_scale)).log10();
        worst = worst.max((f64::from(decibels(value, full_scale)) - exact).abs());
    };
    for value in numbers(0.5, 2.0, 1) {
        check(value, 1.0);
    }
    for value in numbers(f32::MIN_POSITIVE, f32::INFINITY, 1999) {
        check(value, 1.0);
    }
    for value in numbers(f32::from_bits(1), 1e29, 3989) {
        check(value, 3e-9);
    }
    found("decibels", worst, DECIBELS);
}

/// The first number between `from` and `to` for which `reached` holds.
fn first(from: f32, to: f32, reached: impl Fn(f32) -> bool) -> f64 {
    let (mut below, mut above) = (from.to_bits(), to.to_bits());
    assert!(!reached(from) && reached(to), "{from:e} to {to:e}");
    while above - below > 1 {
        let middle = below.midpoint(above);
        if reached(f32::from_bits(middle)) { above = middle } else { below = middle }
    }
    f64::from(f32::from_bits(above))
}

#[test]
fn thresholds_of_a_bar_are_off_by_what_is_stated() {
    let mut worst = 0.0_f64;
    for (full_scale, decades, segments) in [(1.0, 1, 10), (20e-9, 3, 12), (7e12, 6, 240), (1.0, 30, 100)] {
        for i in 1..=segments {
            let share = 10_f64.powf(-f64::from(decades) * (1.0 - f64::from(i) / f64::from(segments)));
            let threshold = f64::from(full_scale) * share;
            let (below, above) = ((0.99 * threshold) as f32, (1.01 * threshold) as f32);
            let lit = first(below, above, |value| bar(-value, full_scale, decades, segments) >= i);
            worst = worst.max((lit / threshold - 1.0).abs());
        }
    }
    found("thresholds of a bar", worst, THRESHOLD_RELATIVE);
}

/// One answer from 99.5 % of a power of ten to 99.5 % of the next.
#[test]
fn decades_change_where_two_digits_round_up() {
    let mut worst = 0.0_f64;
    for k in -37_i32..=38 {
        let power = 10_f64.powi(k);
        let changes = first((0.99 * power) as f32, power as f32, |x| decade(x) >= Some(k));
        worst = worst.max((changes / (0.995 * power) - 1.0).abs());
    }
    found("change of decade", worst, THRESHOLD_RELATIVE);
    for x in numbers(f32::MIN_POSITIVE, f32::INFINITY, 9973) {
        let exact = (f64::from(x) / 0.995).log10();
        let beside = (exact - exact.round()).abs() < 1e-4;
        assert!(beside || decade(-x) == Some(exact.floor() as i32), "{x:e}: {:?}", decade(-x));
    }
}

/// End-gauge calibration, JCGM 100:2008, H.1.4 (figures from memory): 25, 9.7, 2.9 and 16.6 nm combine to 32 nm. And
/// 7.2.6: 10.057 62 ohm with an uncertainty of 27 milliohm is shown as 10.058 ohm.
#[test]
fn published_uncertainties_come_out_as_printed() {
    let u = [25.0, 9.7, 2.9, 16.6].into_iter().fold(0.0, root_sum_square);
    assert_eq!(format!("{u:.0}"), "32");
    assert_eq!(decade(u), Some(1));
    let decimals = decade(0.027).and_then(|decade| usize::try_from(1 - decade).ok());
    assert_eq!(decimals.map(|n| format!("{:.n$}", 10.057_62)).as_deref(), Some("10.058"));
}

/// Half is -6.0206 dB, and the 65536 steps of 16 bits are 96.33 dB (common practice).
#[test]
fn known_levels_come_out() {
    assert_eq!(format!("{:.3} {:.2}", decibels(0.5, 1.0), decibels(65536.0, 1.0)), "-6.021 96.33");
    assert_eq!(decibels(1e-9, 1e-9).to_bits(), 0);
}

/// `x`, which has the same bits on every target also if it is not a number: processors make different ones.
fn the_one_nan(x: f32) -> f32 {
    assert!(!x.is_nan() || x.to_bits() == 0x7fc0_0000, "{:08x}", x.to_bits());
    x
}

/// As documented, for any pair: zero, infinite, not a number, or what the sweeps bound.
#[test]
fn any_pair_has_its_documented_answer() {
    for &a in &hostile() {
        for &b in &hostile() {
            let (wide_a, wide_b) = (f64::from(a).abs(), f64::from(b).abs());
            let root = f64::from(the_one_nan(root_sum_square(a, b)));
            if wide_a.is_nan() || wide_b.is_nan() {
                assert!(root.is_nan(), "{a} {b}: {root}");
            } else if wide_a.max(wide_b) == f64::INFINITY {
                assert_eq!(root, f64::INFINITY, "{a} {b}");
            } else {
                let exact = wide_a.hypot(wide_b);
                let too_large = exact * (1.0 + ROOT_RELATIVE) > f64::from(f32::MAX);
                let step = f64::from(f32::from_bits(1));
                let close = (root - exact).abs() <= ROOT_RELATIVE * exact + 0.5 * step;
                assert!(close || (too_large && root == f64::INFINITY), "{a:e} {b:e}: {root:e}");
            }
            let level = f64::from(the_one_nan(decibels(a, b)));
            let ratio = wide_a / f64::from(b);
            let beyond = ratio.max(1.0 / ratio) >= 2_f64.powi(128);
            if b.is_nan() || b <= 0.0 || ratio.is_nan() {
                assert!(level.is_nan(), "{a:e} against {b:e}: {level}");
            } else if beyond {
                assert_eq!(level, if ratio < 1.0 { f64::NEG_INFINITY } else { f64::INFINITY }, "{a:e} against {b:e}");
            } else {
                assert!((level - 20.0 * ratio.log10()).abs() <= DECIBELS, "{a:e} against {b:e}: {level}");
            }
        }
    }
}

#[test]
fn any_bar_has_its_documented_answer() {
    for &value in &hostile() {
        for &full_scale in &hostile() {
            for (decades, segments) in [(0, 10), (1, 10), (3, 0), (255, u16::MAX)] {
                let lit = bar(value, full_scale, decades, segments);
                let level = f64::from(decibels(value, full_scale));
                let expected = if level.is_nan() || segments == 0 {
                    0.0
                } else {
                    let share = 1.0 + level / (20.0 * f64::from(decades.max(1)));
                    (share * f64::from(segments)).clamp(0.0, f64::from(segments))
                };
                // A full bar of 65535 over 255 decades has steps of 0.08 dB; rounding moves one of them at most.
                assert!((f64::from(lit) - expected.floor()).abs() <= 1.0, "{value:e} {full_scale:e}: {lit}");
                assert!(expected != f64::from(segments) || lit == segments, "{value:e} {full_scale:e}: {lit}");
                assert!(expected != 0.0 || lit == 0, "{value:e} {full_scale:e}: {lit}");
            }
        }
    }
}

#[test]
fn any_number_has_its_documented_decade() {
    for x in hostile() {
        let normal = x.is_normal();
        assert_eq!(decade(x).is_some(), normal, "{x:e}");
    }
    assert_eq!([f32::MIN_POSITIVE, -0.5, 1.0, 3.0, f32::MAX].map(decade), [-38, -1, 0, 0, 38].map(Some));
}

/// Bits from all over: no panic, with overflow checked as in a build for debugging.
#[test]
fn no_bits_panic() {
    for bits in (0..=u32::MAX).step_by(4093) {
        let (x, y) = (f32::from_bits(bits), f32::from_bits(bits.rotate_left(13) ^ 0x5a5a_5a5a));
        let shown = (root_sum_square(x, y), decibels(x, y), bar(x, y, bits as u8, bits as u16), decade(x));
        std::hint::black_box(shown);
    }
}
