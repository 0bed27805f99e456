//! Instructions of a call, less those of a call of the same signature that does nothing.

use core::f32::consts::{LN_10, LOG10_E};
use core::hint::black_box;

use brimline::approximate::{bar, decade, decibels, root_sum_square};
use emulated::{Counter, eprintln};

type Function = fn(f32, f32) -> f32;

/// Calls of each function.
const CALLS: u16 = 500;

/// Prints a line for each function, the exact one after the approximate one; `false` if instructions cannot be counted.
pub(crate) fn print() -> bool {
    let Some(counter) = Counter::start() else { return false };
    row(&counter, "root_sum_square", root_sum_square);
    row(&counter, "root_sum_square, exact: hypotf of libm", libm::hypotf);
    row(&counter, "root_sum_square, exact: sqrtf of libm, not scaled", |a, b| libm::sqrtf(a * a + b * b));
    row(&counter, "decibels", decibels);
    row(&counter, "decibels, exact: logf of libm", |a, b| 20.0 / LN_10 * libm::logf(libm::fabsf(a) / b));
    row(&counter, "bar", |a, b| f32::from_bits(u32::from(bar(a, b, 3, 240))));
    row(&counter, "decade", |a, _| f32::from_bits(decade(a).map_or(0, i32::cast_unsigned)));
    row(&counter, "decade, exact: logf of libm", |a, _| {
        f32::from_bits((libm::floorf(LOG10_E * libm::logf(a) + 0.002_176_919_3) as i32).cast_unsigned())
    });
    true
}

/// Mean and worst of calls with values of some nanocoulombs and their uncertainties.
fn row(counter: &Counter, name: &str, function: Function) {
    let (function, idle): (Function, Function) = (black_box(function), black_box(|a, _| a));
    let (mut sum, mut worst) = (0, 0);
    for i in 0..CALLS {
        let value = 1e-9 + 0.37e-10 * f32::from(i);
        let full_scale = 20e-9 - 0.11e-10 * f32::from(i);
        let net = count(counter, function, value, full_scale) - count(counter, idle, value, full_scale);
        sum += net;
        worst = worst.max(net);
    }
    eprintln!("{name}: {} / {worst}", sum / u32::from(CALLS));
}

/// Never inlined, so that a call and its idle twin are counted by the same instructions.
#[inline(never)]
fn count(counter: &Counter, function: Function, a: f32, b: f32) -> u32 {
    counter.gross(|| function(a, b))
}
