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

/// One over the square root, to 1e-4: the bits of the significand in integers of 32 bits, three Newton steps. Where a
/// square root only says how far off is far off, this costs a fraction of [`sqrt`]. A number that is not normal counts
/// as the nearest one that is.
pub(crate) fn about_inverse_sqrt(x: f32) -> f32 {
    let bits = x.to_bits().clamp(f32::MIN_POSITIVE.to_bits(), f32::MAX.to_bits());
    let exponent = (bits >> 23).cast_signed();
    // x = v 4^half with v from 1 to 4, in 2^-14; its inverse root is from 1/2 to 1, in 2^-16.
    let half = (exponent - 127) >> 1;
    let v = ((bits & 0x7F_FFFF) | 0x80_0000) >> (8 + (exponent & 1));
    // A straight line within 9 % of it; the steps come from below, so that no product passes 2^32.
    let mut root = 69_888 - ((v * 19_968) >> 15);
    for _ in 0..3 {
        let square = (root * root) >> 16;
        let toward = (3 * 65_536 - ((square * v) >> 14)) >> 2;
        root = (root * toward) >> 15;
    }
    root as f32 * two_to(-16 - half)
}

/// Two to a whole power that `f32` has as a normal number; the nearest one of these.
pub(crate) fn two_to(power: i32) -> f32 {
    f32::from_bits(((power.clamp(-126, 127) + 127) << 23).cast_unsigned())
}

/// The smaller of two numbers that are not negative: their bits are ordered as they are. A number that is not one is
/// larger than any.
pub(crate) fn lesser(x: f32, y: f32) -> f32 {
    f32::from_bits(x.to_bits().min(y.to_bits()))
}

/// The larger of two numbers that are not negative.
pub(crate) fn greater(x: f32, y: f32) -> f32 {
    f32::from_bits(x.to_bits().max(y.to_bits()))
}

/// `x` within `-most` to `most`.
pub(crate) fn within(x: f32, most: f32) -> f32 {
    if x.to_bits() << 1 <= most.to_bits() << 1 { x } else { most.copysign(x) }
}

/// A whole number, correctly rounded. Most fit 32 bits, whose conversion costs a fraction of that of 64.
pub(crate) fn float(x: i64) -> f32 {
    match i32::try_from(x) {
        Ok(x) => x as f32,
        Err(_) => x as f32,
    }
}

/// The same of one without a sign.
pub(crate) fn float_unsigned(x: u64) -> f32 {
    match u32::try_from(x) {
        Ok(x) => x as f32,
        Err(_) => x as f32,
    }
}

/// A number's whole part, saturating. Most fit 32 bits.
pub(crate) fn whole(x: f32) -> i64 {
    let short = x as i32;
    if short == i32::MAX || short == i32::MIN { x as i64 } else { i64::from(short) }
}

/// Natural logarithm of a number above 0.
pub(crate) fn ln(x: f32) -> f32 {
    libm::logf(x)
}

/// Two to the power of `x`.
pub(crate) fn exp2(x: f32) -> f32 {
    libm::exp2f(x)
}

/// `x 2^bits` for `bits` up to 300 either way, a few steps with integers; 0 where `f32` would be subnormal.
// Inlined everywhere it would fill a kilobyte of flash.
#[inline(never)]
pub(crate) fn scaled(x: f32, bits: i32) -> f32 {
    let exponent = exponent_bits(x);
    match exponent + bits {
        _ if exponent == 0xFF => x,
        _ if exponent == 0 => 0.0,
        ..=0 => 0.0,
        0xFF.. => f32::INFINITY.copysign(x),
        _ => f32::from_bits(x.to_bits().wrapping_add(bits.cast_unsigned() << 23)),
    }
}

/// `x 2^bits` as a whole number, rounded toward zero and saturating; 0 for what is not a number.
pub(crate) fn fixed(x: f32, bits: i32) -> i64 {
    let fraction = i64::from(x.to_bits() & 0x7F_FFFF | 0x80_0000);
    let exponent = exponent_bits(x);
    let magnitude = match exponent - 150 + bits {
        _ if exponent == 0 || x.is_nan() => 0,
        ..=-24 => 0,
        shift @ ..0 => fraction >> -shift,
        shift @ ..39 => fraction << shift,
        _ if x.is_sign_negative() => return i64::MIN,
        _ => return i64::MAX,
    };
    if x.is_sign_negative() { -magnitude } else { magnitude }
}

/// The power of two that a number's magnitude begins with; -127 for 0.
pub(crate) fn exponent(x: f32) -> i32 {
    exponent_bits(x) - 127
}

fn exponent_bits(x: f32) -> i32 {
    (x.to_bits() >> 23 & 0xFF).cast_signed()
}

/// `e^x - 1`, without loss near 0.
pub(crate) fn exp_minus_1(x: f32) -> f32 {
    libm::expm1f(x)
}

/// Magnitude.
pub(crate) fn abs(x: f32) -> f32 {
    libm::fabsf(x)
}

/// A variance that rounding may have taken below zero; 0 for what is not a number.
pub(crate) fn not_negative(variance: f32) -> f32 {
    if variance > 0.0 { variance } else { 0.0 }
}

/// Nearest whole number of counts, halves away from zero, saturating at the ends of `i64`.
pub(crate) fn nearest(x: f32) -> i64 {
    whole(libm::roundf(x))
}

/// A difference of levels in 2^-16 counts, as counts.
pub(crate) fn counts(q16: i64) -> f32 {
    scaled(float(q16), -16)
}

/// 2^-16 counts, rounded toward zero, saturating.
pub(crate) fn to_q16(counts: f32) -> i64 {
    fixed(counts, 16)
}

/// Whole counts in 2^-16 counts, saturating.
pub(crate) fn whole_q16(counts: i64) -> i64 {
    counts.saturating_mul(1 << 16)
}

/// A level in 2^-16 counts as whole counts and the rest, which is not negative.
pub(crate) fn whole_and_rest(q16: i64) -> (i64, f32) {
    (q16 >> 16, counts(q16 & 0xFFFF))
}

/// Seconds in `ticks` of a counter whose period is `tick_s`.
pub(crate) fn seconds(ticks: u64, tick_s: f32) -> f32 {
    float_unsigned(ticks) * tick_s
}

#[cfg(test)]
#[allow(clippy::disallowed_methods, reason = "the test compares with f64 on the host")]
mod tests {
    use super::*;

    const ODD: [f32; 8] = [0.0, -0.0, 1.5e-40, 0.3, -7.75, 1.0e9, -3.4e38, 1.2e-38];

    #[test]
    fn the_inverse_square_root_is_within_1e_4_for_every_significand() {
        let mut worst = 0.0_f64;
        for bits in 0x3F80_0000..0x4080_0000 {
            let x = f32::from_bits(bits);
            worst = worst.max((f64::from(about_inverse_sqrt(x)) * libm::sqrt(f64::from(x)) - 1.0).abs());
        }
        assert!(worst < 1e-4 && worst > 1e-6, "{worst}");
    }

    #[test]
    fn the_inverse_square_root_holds_for_every_exponent() {
        for exponent in -126..=127 {
            let x = two_to(exponent) * 1.5;
            let off = f64::from(about_inverse_sqrt(x)) * libm::sqrt(f64::from(x)) - 1.0;
            assert!(off.abs() < 1e-4, "{x}: {off}");
        }
        for x in [0.0, -1.0, 1e-45, f32::INFINITY, f32::NAN, f32::MAX] {
            assert!(about_inverse_sqrt(x) > 0.0 && about_inverse_sqrt(x) < 1e20, "{x}");
        }
    }

    #[test]
    fn short_conversions_are_the_long_ones() {
        for x in [0_i64, 1, -1, 0x7FFF_FFFF, 0x8000_0000, -0x8000_0000, -0x8000_0001, i64::MAX, i64::MIN, 16_777_217] {
            assert_eq!(float(x), x as f32);
        }
        for x in [0.0, 1.9, -1.9, 2.147e9, 2.147_483_6e9, 2.2e9, -2.147_483_6e9, -2.2e9, 1e30, -1e30, f32::NAN] {
            assert_eq!(whole(x), x as i64);
        }
    }

    #[test]
    fn limits_are_kept() {
        assert_eq!((within(3.0, 2.0), within(-3.0, 2.0), within(1.0, 2.0)), (2.0, -2.0, 1.0));
        assert_eq!((lesser(3.0, 2.0), lesser(2.0, 3.0), lesser(f32::NAN, 2.0)), (2.0, 2.0, 2.0));
        assert_eq!((two_to(-200), two_to(-3), two_to(0), two_to(200)), (f32::MIN_POSITIVE, 0.125, 1.0, 1.7014118e38));
    }

    #[test]
    fn scaling_is_a_product_with_a_power_of_two() {
        for x in ODD {
            for bits in [-140, -30, -1, 0, 1, 17, 60, 140] {
                let exact = f64::from(x) * 2_f64.powi(bits);
                let product = exact as f32;
                let expected = if product.is_subnormal() || x.is_subnormal() { 0.0 } else { product };
                assert_eq!(scaled(x, bits), expected, "{x:e} {bits}");
            }
        }
        assert_eq!(scaled(f32::NEG_INFINITY, -3), f32::NEG_INFINITY);
        assert!(scaled(f32::NAN, -3).is_nan());
    }

    #[test]
    fn fixed_point_is_a_product_rounded_toward_zero() {
        for x in ODD {
            for bits in [-40, -1, 0, 16, 35, 62, 155] {
                let exact = if x.is_subnormal() { 0.0 } else { f64::from(x) * 2_f64.powi(bits) };
                assert_eq!(fixed(x, bits), exact as i64, "{x:e} {bits}");
            }
        }
        assert_eq!((fixed(f32::NAN, 3), fixed(f32::NEG_INFINITY, 3)), (0, i64::MIN));
    }

    #[test]
    fn exponents_begin_magnitudes() {
        assert_eq!([1.0, -1.99, 2.0, 0.25, 0.0].map(exponent), [0, 0, 1, -2, -127]);
    }
}
