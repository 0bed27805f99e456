//! Approximations for a display beside a reading, by the crate `micromath`. Nothing in a channel uses them.
//!
//! Each function says how far it may be off; `tests/approximate.rs` finds that error again, and none below half of it.
//! They take and give single precision, any bits whatever without a panic, and the same bits on every target.
//!
//! Mean instructions of a call, counted in QEMU (`cd examples/firmware && cargo run --release -p approximate --target
//! thumbv6m-none-eabi`), beside what the exact function of the crate `libm` takes for the same. Without a
//! floating-point unit they save time; with one, only the root does:
//!
//! | | Cortex-M0 | exact | Cortex-M4F | exact |
//! | --- | ---: | ---: | ---: | ---: |
//! | [`root_sum_square`] | 680 | 1636 (`hypotf`) | 34 | 439 |
//! | [`decibels`] | 1962 | 2794 (`logf`) | 63 | 59 |
//! | [`bar`] | 2481 | - | 88 | - |
//! | [`decade`] | 2332 | 2985 (`logf`) | 83 | 82 |

use core::f32::consts::{LN_10, LOG10_E};

use micromath::F32;

use crate::math;

/// `lg(1 / 0.995)`: from 99.5 % of a power of ten on, two digits round up to it.
const ROUNDING_UP: f32 = 0.002_176_919_3;

const DECIBELS_PER_NEPER: f32 = 20.0 / LN_10;

/// Standard uncertainties of two independent causes as one: `sqrt(a^2 + b^2)` (JCGM 100:2008, 5.1.2). An example is a
/// reading's `u` with a calibration factor's relative uncertainty times the value.
///
/// Not below the exact root by more than three roundings of single precision (1.8e-7), and up to 0.18 % above it: of
/// the two digits that are shown of an uncertainty (JCGM 100:2008, 7.2.6) the last is off by one at most. Among
/// subnormal numbers there is the rounding to their steps besides. Signs do not matter. Infinity where the root exceeds
/// the largest number or where one of the two is infinite; NaN where one of them is NaN.
///
/// ```
/// use brimline::approximate;
///
/// // 0.3 nC from the reading, 2 % of 20 nC from a calibration factor: 0.5 nC.
/// let u = approximate::root_sum_square(0.3e-9, 0.02 * 20e-9);
/// assert!(u >= 0.499_999e-9 && u <= 0.501e-9);
/// ```
pub fn root_sum_square(a: f32, b: f32) -> f32 {
    // So scaled, the larger square is neither too large for a number nor too small for all its digits.
    const LARGE: f32 = power_of_2(40);
    const SMALL: f32 = power_of_2(-40);
    let (a, b) = (math::abs(a), math::abs(b));
    // Bits of numbers that are not negative are in the numbers' order, and compare faster; those of a NaN come last.
    let larger = a.to_bits().max(b.to_bits());
    if larger > f32::INFINITY.to_bits() {
        f32::NAN
    } else if larger == f32::INFINITY.to_bits() {
        f32::INFINITY
    } else if larger > LARGE.to_bits() {
        root(a * power_of_2(-66), b * power_of_2(-66)) * power_of_2(66)
    } else if larger < SMALL.to_bits() {
        root(a * power_of_2(100), b * power_of_2(100)) * power_of_2(-100)
    } else {
        root(a, b)
    }
}

/// The same for numbers whose squares are normal.
fn root(a: f32, b: f32) -> f32 {
    let sum = a * a + b * b;
    // The bare approximation is up to 6 % too large; a step of Newton's makes that 0.18 %, and never too small.
    let rough = F32(sum).sqrt().0;
    let twice = rough + sum / rough;
    // Half of it: the exponent less 1.
    f32::from_bits(twice.to_bits() - (1 << MANTISSA_BITS))
}

const MANTISSA_BITS: u32 = f32::MANTISSA_DIGITS - 1;

/// `2^exponent` for an exponent of -126 to 127.
const fn power_of_2(exponent: i32) -> f32 {
    f32::from_bits(((127 + exponent) as u32) << MANTISSA_BITS)
}

/// Level of `value` against `full_scale`: `20 lg(|value| / full_scale)` in dB, negative below full scale.
///
/// That is the level of what stands for an amplitude: a charge, a flux, converter counts. For what stands for an energy
/// or a power the level is half of it (ISO 80000-1:2009, annex C, from memory).
///
/// Off by at most 0.0007 dB. Minus infinity for a value of 0 or one against an infinite full scale; plus or minus
/// infinity also where the ratio or its inverse is 2^128 (771 dB) or more. NaN where the full scale is not above 0,
/// where one of the two is NaN or both are infinite.
///
/// ```
/// use brimline::approximate;
///
/// assert!((approximate::decibels(-0.5, 5.0) + 20.0).abs() < 0.0007);
/// ```
pub fn decibels(value: f32, full_scale: f32) -> f32 {
    let value = math::abs(value);
    if full_scale > 0.0 && value < full_scale {
        -DECIBELS_PER_NEPER * ln(full_scale / value)
    } else if full_scale > 0.0 && full_scale < f32::INFINITY && value >= full_scale {
        DECIBELS_PER_NEPER * ln(value / full_scale)
    } else {
        f32::NAN
    }
}

/// How many of a bar's `segments` to light, where the bar shows |`value`| up to `full_scale` on a logarithmic scale
/// over so many `decades` (0 counts as 1).
///
/// Segment `i` of `n` is lit from `full_scale * 10^(-decades (1 - i/n))` on, the last at full scale; each of these
/// thresholds is off by at most 0.0007 dB (0.008 %). All are lit above full scale, none where [`decibels`] is NaN.
///
/// ```
/// use brimline::approximate;
///
/// // Three decades on 12 segments: four for each. A hundredth of full scale lights a third of the bar.
/// assert_eq!(approximate::bar(0.0101, 1.0, 3, 12), 4);
/// assert_eq!(approximate::bar(1.0, 1.0, 3, 12), 12);
/// assert_eq!(approximate::bar(0.0, 1.0, 3, 12), 0);
/// ```
pub fn bar(value: f32, full_scale: f32, decades: u8, segments: u16) -> u16 {
    let share = 1.0 + decibels(value, full_scale) / (20.0 * f32::from(decades.max(1)));
    // A NaN becomes 0, and what is below 0 too.
    ((share * f32::from(segments)) as u16).min(segments)
}

/// The power of ten of |`x`|'s first digit when it is shown with two digits: `floor(lg(|x| / 0.995))`.
///
/// An uncertainty is shown with two digits (JCGM 100:2008, 7.2.6) and its value to the same place: with `1 - decade`
/// decimals, and none where that is negative. The place where the answer changes is off by at most 0.008 % from 99.5 %
/// of a power of ten. `None` for 0, for what is below the smallest normal number (1.2e-38), and for what is not finite.
///
/// ```
/// use brimline::approximate;
///
/// let (value, u) = (12.345_678, 0.034_567);
/// let decade = approximate::decade(u).unwrap_or(0);
/// let decimals = (1 - decade).max(0) as usize;
/// assert_eq!(format!("{value:.decimals$} +- {u:.decimals$}"), "12.346 +- 0.035");
/// ```
pub fn decade(x: f32) -> Option<i32> {
    let x = math::abs(x);
    if !(f32::MIN_POSITIVE..f32::INFINITY).contains(&x) {
        return None;
    }
    let exponent = if x < 1.0 { -ln(1.0 / x) } else { ln(x) } * LOG10_E + ROUNDING_UP;
    let towards_zero = exponent as i32;
    Some(if exponent < towards_zero as f32 { towards_zero - 1 } else { towards_zero })
}

/// Natural logarithm of a ratio from 1 on. Below 1 the crate takes a rough inverse first, and is off by up to 1 dB.
fn ln(ratio: f32) -> f32 {
    if ratio < f32::INFINITY { F32(ratio).ln().0 } else { ratio }
}
