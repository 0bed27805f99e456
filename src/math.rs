//! The only place where a float function is taken from: `libm` in plain Rust gives the same bits on every target.

/// Square root, correctly rounded; 0 for a negative argument (a variance that rounding took below zero), infinite for
/// one that is not a number (of which nothing is known).
pub(crate) fn sqrt(x: f32) -> f32 {
    if x > 0.0 {
        libm::sqrtf(x)
    } else if x <= 0.0 {
        0.0
    } else {
        f32::INFINITY
    }
}

/// Square root of a number that is not negative, correctly rounded; not for the path of a sample.
pub(crate) fn sqrt_f64(x: f64) -> f64 {
    libm::sqrt(x)
}

/// Natural logarithm of a number above 0.
pub(crate) fn ln(x: f32) -> f32 {
    libm::logf(x)
}

/// Two to the power of `x`.
pub(crate) fn exp2(x: f32) -> f32 {
    libm::exp2f(x)
}

/// Two to a whole power between -126 and 127, without arithmetic.
pub(crate) fn power_of_two(exponent: i32) -> f32 {
    f32::from_bits((127 + exponent).cast_unsigned() << 23)
}

/// `e^x - 1`, without loss near 0.
pub(crate) fn exp_minus_1(x: f32) -> f32 {
    libm::expm1f(x)
}

/// Magnitude.
pub(crate) fn abs(x: f32) -> f32 {
    libm::fabsf(x)
}

/// Nearest whole number of counts, halves away from zero, saturating at the ends of `i64`.
pub(crate) fn nearest(x: f32) -> i64 {
    libm::roundf(x) as i64
}

/// A difference of levels in 2^-16 counts, as counts.
pub(crate) fn counts(q16: i64) -> f32 {
    q16 as f32 * (1.0 / 65536.0)
}

/// A level in 2^-16 counts as whole counts and the rest, which is not negative.
pub(crate) fn whole_and_rest(q16: i64) -> (i64, f32) {
    (q16 >> 16, counts(q16 & 0xFFFF))
}

/// Seconds in `ticks` of a counter whose period is `tick_s`.
pub(crate) fn seconds(ticks: u64, tick_s: f32) -> f32 {
    ticks as f32 * tick_s
}
