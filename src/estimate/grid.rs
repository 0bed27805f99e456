//! Samples beside an instant as small whole numbers, of which any processor makes sums of products in few instructions.

/// A sample on its way to a line: at first ticks beyond the nearest sample and fine steps above it; on the grid, units
/// from the middle of the samples and what a chord leaves of the level.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(crate) struct Dot {
    pub(crate) x: i32,
    pub(crate) y: i32,
}

/// How samples were laid on a grid.
///
/// The chord from the nearest to the farthest sample is taken off exactly; what is left is noise and bend, for which
/// abscissas to a two-hundredth of the span are good enough. Samples at even distances lie on the grid exactly.
#[derive(Clone, Copy, Debug)]
pub(super) struct Grid {
    /// Slope of the chord away from the instant, 2^-32 fine steps a tick.
    pub(super) chord_q32: i64,
    /// Ticks from the nearest to the farthest sample.
    pub(super) span: i32,
    /// Of the units that make up the span, `2^unit_bits` go to one step of evenly spaced samples: 128 to 240 in all.
    pub(super) unit_bits: u32,
    /// Sum of the ticks beyond the nearest sample, in `2^tick_bits`.
    pub(super) sum: i32,
    pub(super) tick_bits: u32,
    /// What the chord leaves is in `2^level_bits` fine steps.
    pub(super) level_bits: u32,
}

/// Bits of the whole units in the span.
const UNIT_BITS: u32 = 7;
/// Bits of what the chord leaves.
const LEVEL_BITS: u32 = 18;
/// Bits of the coarse ticks between the grid's lines and the counter's.
const TICK_BITS: u32 = 16;
/// Bits of a unit's fraction while it is rounded.
const FRACTION_BITS: u32 = 23;

impl Grid {
    /// Lays samples on a grid, in the order of growing distance; `None` unless two distances differ.
    ///
    /// On the grid the distances add up to 0: each rounding hands on what it leaves to the next.
    pub(super) fn lay(dots: &mut [Dot]) -> Option<Self> {
        let &Dot { x: span, y: rise } = dots.last()?;
        let count = dots.len() as i32;
        let steps = count - 1;
        let unit_bits = UNIT_BITS.saturating_sub(steps.checked_ilog2()?);
        let chord_q32 = (i64::from(rise) << 32).checked_div(i64::from(span.max(0)))?;
        let tick_bits = TICK_BITS.saturating_sub(span.leading_zeros());
        let (mut sum, mut magnitudes) = (0, 0);
        for dot in dots.iter_mut() {
            let x = dot.x.clamp(0, span);
            let chord = (chord_q32 * i64::from(x) + (1 << 31)) >> 32;
            dot.y = dot.y.saturating_sub(chord as i32);
            dot.x = x >> tick_bits;
            sum += dot.x;
            magnitudes |= dot.y ^ (dot.y >> 31);
        }
        let level_bits = (i32::BITS - LEVEL_BITS).saturating_sub(magnitudes.leading_zeros());
        let whole = count * (span >> tick_bits);
        let scale = ((steps << (unit_bits + FRACTION_BITS)) + (whole >> 1)).checked_div(whole)?;
        let mut rest = 0;
        for dot in dots {
            let x = (count * dot.x - sum) * scale + rest;
            dot.x = (x + (1 << FRACTION_BITS >> 1)) >> FRACTION_BITS;
            rest = x - (dot.x << FRACTION_BITS);
            dot.y = dot.y.saturating_add(1 << level_bits >> 1) >> level_bits;
        }
        Some(Self { chord_q32, span, unit_bits, sum, tick_bits, level_bits })
    }
}
