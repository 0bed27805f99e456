//! One number for the bits of many results.

use brimline::approximate::{bar, decade, decibels, root_sum_square};

/// Pairs of numbers that are tried.
const PAIRS: usize = 20_000;

/// The functions' names with the hashes of their results.
pub(crate) fn all() -> [(&'static str, u64); 4] {
    let hash = |result: fn(f32, f32) -> u32| {
        pairs().take(PAIRS).fold(0_u64, |hash, (a, b)| {
            hash.rotate_left(5).wrapping_mul(0x9e37_79b9_7f4a_7c15) ^ u64::from(result(a, b))
        })
    };
    [
        ("root_sum_square", hash(|a, b| root_sum_square(a, b).to_bits())),
        ("decibels", hash(|a, b| decibels(a, b).to_bits())),
        ("bar", hash(|a, b| u32::from(bar(a, b, 3, 240)))),
        ("decade", hash(|a, _| decade(a).map_or(u32::MAX, i32::cast_unsigned))),
    ]
}

/// Any bits for the first pair of each two, numbers within a few octaves for the other.
fn pairs() -> impl Iterator<Item = (f32, f32)> {
    let mut state = 0x0123_4567_89ab_cdef_u64;
    let mut bits = move || {
        // Marsaglia's xorshift, 64 bit (shifts from memory).
        state ^= state << 13;
        state ^= state >> 7;
        state ^= state << 17;
        (state >> 32) as u32
    };
    (0_u32..).map(move |i| {
        let (a, b) = (bits(), bits());
        if i % 2 == 0 { (f32::from_bits(a), f32::from_bits(b)) } else { (ordinary(a), ordinary(b)) }
    })
}

/// A positive number from 2^-8 to 2^8.
fn ordinary(bits: u32) -> f32 {
    f32::from_bits(((127 - 8) << 23) + (bits >> 5))
}
