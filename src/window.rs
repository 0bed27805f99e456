//! The latest integrating samples, kept for the straight lines beside an interruption.

use heapless::Vec;

use crate::estimate::{After, Before, Dot, Hint, Nearest, Taken, Weights};
use crate::setup::{Derived, EDGE_SAMPLES_MAX};

/// Integer work only, until a line is asked for.
#[derive(Clone, Debug, Default)]
pub(crate) struct Window {
    /// The latest level, 2^-16 counts.
    latest_q16: i64,
    /// Where the next sample goes, and samples since the segment began, saturating.
    next: u8,
    seen: u8,
    /// Tick and level, in fine steps; of the level the lower 32 bits, which is enough to tell one from the next.
    samples: [(u32, i32); EDGE_SAMPLES_MAX],
}

/// Places are counted in a byte and wrap.
const _: () = assert!(EDGE_SAMPLES_MAX.is_power_of_two() && EDGE_SAMPLES_MAX <= 128);

impl Window {
    /// A new segment begins.
    pub(crate) fn clear(&mut self) {
        self.seen = 0;
    }

    /// Takes a sample.
    pub(crate) fn push(&mut self, tick: u32, level_q16: i64, derived: &Derived) {
        self.latest_q16 = level_q16;
        if let Some(place) = self.samples.get_mut(usize::from(self.next) % EDGE_SAMPLES_MAX) {
            *place = (tick, low_bits(level_q16, 16 - derived.fine_bits));
        }
        self.next = self.next.wrapping_add(1);
        self.seen = self.seen.saturating_add(1);
    }

    /// Tick and level, 2^-16 counts, of the latest sample of the segment.
    pub(crate) fn latest(&self) -> Option<(u32, i64)> {
        (self.seen > 0).then(|| (self.sample(0).0, self.latest_q16))
    }

    /// Whether the samples with which the segment began have gone.
    pub(crate) fn has_left_opening(&self, derived: &Derived) -> bool {
        self.seen >= 2 * derived.edge_samples
    }

    /// Whether the segment has filled a window.
    pub(crate) fn is_full(&self, derived: &Derived) -> bool {
        self.seen >= derived.edge_samples
    }

    /// The line just after the switch opened at `instant`, when the level was as `hint` says, if it is known;
    /// extrapolated by `d_s` seconds.
    pub(crate) fn after(
        &self,
        instant: u32,
        hint: Option<&Hint>,
        d_s: f32,
        sample_var: f32,
        derived: &Derived,
    ) -> Option<After> {
        let (tick, level) = self.iter(derived).next()?;
        let nearest = Nearest { ticks: tick.wrapping_sub(instant), level_q16: self.level_q16(level, derived) };
        let mut dots = gather(self.iter(derived).map(|(t, l)| (t.wrapping_sub(tick), l.wrapping_sub(level))));
        Some(After::fit(&mut dots, &nearest, sample_var, hint, d_s, derived))
    }

    /// The line just before the switch closed at `instant`. `opening`: the line at the other end of the segment, which
    /// may share samples with this one.
    pub(crate) fn before(
        &self,
        instant: u32,
        opening: Option<&Opening>,
        sample_var: f32,
        derived: &Derived,
    ) -> Option<Before> {
        let (tick, level) = self.iter(derived).next_back()?;
        let nearest = Nearest { ticks: instant.wrapping_sub(tick), level_q16: self.level_q16(level, derived) };
        let mut dots = gather(self.iter(derived).rev().map(|(t, l)| (tick.wrapping_sub(t), l.wrapping_sub(level))));
        let taken = opening.map(|opening| opening.taken(instant));
        Some(Before::fit(&mut dots, &nearest, sample_var, taken.as_ref(), derived))
    }

    /// A kept level as a whole, 2^-16 counts.
    fn level_q16(&self, level: i32, derived: &Derived) -> i64 {
        let shift = 16 - derived.fine_bits;
        let latest = self.latest_q16 >> shift;
        let above = i64::from(level.wrapping_sub(latest as i32));
        (latest << shift).saturating_add(above << shift)
    }

    /// The samples of the segment that lines are drawn through, oldest first.
    fn iter(&self, derived: &Derived) -> impl DoubleEndedIterator<Item = (u32, i32)> {
        (0..self.seen.min(derived.edge_samples)).rev().map(|age| self.sample(age))
    }

    /// The sample so many before the latest.
    fn sample(&self, age: u8) -> (u32, i32) {
        let place = usize::from(self.next.wrapping_sub(1).wrapping_sub(age)) % EDGE_SAMPLES_MAX;
        self.samples.get(place).copied().unwrap_or_default()
    }
}

/// `level_q16 >> shift` to 32 bits, for shifts of 1 to 31: in halves, which costs a small target less.
fn low_bits(level_q16: i64, shift: u8) -> i32 {
    let (low, high) = (level_q16 as u32, (level_q16 >> 32) as u32);
    (low.wrapping_shr(u32::from(shift)) | high.wrapping_shl(32 - u32::from(shift))).cast_signed()
}

/// The line with which a segment opened: which samples it used, and with what weights they are in the run's total.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Opening {
    weights: Weights,
    instant: u32,
    /// Ticks from the instant to the last sample that the line used.
    window: u32,
}

impl Opening {
    pub(crate) fn new(line: &After, instant: u32, last: u32) -> Self {
        Self { weights: line.weights, instant, window: last.wrapping_sub(instant) }
    }

    /// The weight of the sample at `tick`; 0 if the line did not use it.
    pub(crate) fn weight(&self, tick: u32) -> f32 {
        let ticks = tick.wrapping_sub(self.instant);
        if ticks > self.window { 0.0 } else { self.weights.at(ticks) }
    }

    /// What it has taken of the samples before another instant.
    fn taken(&self, instant: u32) -> Taken<'_> {
        Taken { weights: &self.weights, apart: instant.wrapping_sub(self.instant), window: self.window }
    }
}

/// Samples by ticks beyond the nearest and fine steps above it.
fn gather(samples: impl Iterator<Item = (u32, i32)>) -> Vec<Dot, EDGE_SAMPLES_MAX> {
    let mut dots = Vec::new();
    for (ticks, y) in samples {
        // Farther ones have ticks that come round again.
        let Ok(x) = i32::try_from(ticks) else { break };
        let _ = dots.push(Dot { x, y });
    }
    dots
}
