//! Wrapping ticks to elapsed time.

/// What the next tick says about time.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Elapsed {
    /// The first tick ever seen.
    Start,
    /// Ticks since the sample before; at least 1.
    Ticks(u32),
    /// The counter did not move, or went back (a step of more than half its span).
    Stalled,
    /// The counter has gone on from such a step often enough: it began anew, and the time in between is unknown.
    Restarted,
}

/// A length of time, and how finely it was sampled.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(crate) struct Span {
    pub(crate) ticks: u64,
    /// Sum of the squares of the steps between samples, in coarse ticks; 0 where nothing leaks.
    pub(crate) squares: u64,
}

impl Span {
    /// Adds the step to another sample. Squares matter only where the level leaks, in coarse ticks of `2^shift`, so
    /// that they last for years whatever the counter's rate.
    pub(crate) fn add(&mut self, ticks: u32, coarse_shift: Option<u8>) {
        self.add_blind(u64::from(ticks));
        if let Some(shift) = coarse_shift {
            let coarse = (u64::from(ticks) + (1 << shift >> 1)) >> shift;
            self.squares = self.squares.saturating_add(coarse * coarse);
        }
    }

    /// Adds a length that follows this one.
    pub(crate) fn join(&mut self, other: Self) {
        self.ticks = self.ticks.saturating_add(other.ticks);
        self.squares = self.squares.saturating_add(other.squares);
    }

    /// Leaves the latest `ticks` and gives the time before them, with the samples of all of it.
    pub(crate) fn leave(&mut self, ticks: u64) -> Self {
        let left = Self { ticks: self.ticks.min(ticks), squares: 0 };
        let all = core::mem::replace(self, left);
        Self { ticks: all.ticks.saturating_sub(ticks), ..all }
    }

    /// Adds time in which no sample mattered. The fastest counter takes 146 years to 2^64 ticks.
    pub(crate) fn add_blind(&mut self, ticks: u64) {
        self.ticks = self.ticks.wrapping_add(ticks);
    }
}

/// A free-running 32-bit counter.
///
/// A step of up to 2^31 - 1 ticks is time that passed; a longer one cannot be told from a counter that ran backwards.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Clock {
    /// The latest tick; 0 before the first.
    last: u32,
    started: bool,
    /// The latest tick that was out of order, and how many went forward from there.
    astray: u32,
    onward: u8,
}

/// Longer steps are taken for a counter that ran backwards.
pub(crate) const LONGEST_STEP: u32 = 0x7FFF_FFFF;

/// Ticks in a row that go forward from one that was out of order: the counter has been restarted.
const RESTART_TICKS: u8 = 3;

impl Clock {
    /// Takes the next tick; a stalled counter leaves the clock where it was.
    pub(crate) fn advance(&mut self, tick: u32) -> Elapsed {
        let elapsed = match tick.wrapping_sub(self.last) {
            _ if !self.started => Elapsed::Start,
            ticks @ 1..=LONGEST_STEP => Elapsed::Ticks(ticks),
            _ => match self.stray(tick) {
                false => return Elapsed::Stalled,
                true => Elapsed::Restarted,
            },
        };
        self.last = tick;
        self.started = true;
        self.onward = 0;
        elapsed
    }

    /// Takes a tick that is out of order; `true` if it and those before it make a counter that runs.
    fn stray(&mut self, tick: u32) -> bool {
        let forward = matches!(tick.wrapping_sub(self.astray), 1..=LONGEST_STEP);
        self.onward = if forward || self.onward == 0 { self.onward.saturating_add(1) } else { 1 };
        self.astray = tick;
        self.onward > RESTART_TICKS
    }

    /// Ticks from the latest tick to this one, if the counter has run forward.
    pub(crate) fn ticks_to(&self, tick: u32) -> u32 {
        tick.wrapping_sub(self.last)
    }

    /// Takes a tick that is known to lie within reach, after one that was in order.
    pub(crate) fn pass(&mut self, tick: u32) {
        self.last = tick;
    }

    /// The latest tick; 0 before the first.
    pub(crate) fn tick(&self) -> u32 {
        self.last
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_wrap_is_time_that_passed() {
        let mut clock = Clock::default();
        assert_eq!(clock.advance(u32::MAX - 4), Elapsed::Start);
        assert_eq!(clock.advance(5), Elapsed::Ticks(10));
    }

    #[test]
    fn a_counter_that_stands_or_runs_back_is_stalled() {
        let mut clock = Clock::default();
        clock.advance(100);
        assert_eq!(clock.advance(100), Elapsed::Stalled);
        assert_eq!(clock.advance(99), Elapsed::Stalled);
        assert_eq!(clock.advance(100 + 0x8000_0000), Elapsed::Stalled);
        assert_eq!(clock.advance(100 + 0x7FFF_FFFF), Elapsed::Ticks(0x7FFF_FFFF));
        assert_eq!(clock.tick(), 100 + 0x7FFF_FFFF);
    }

    #[test]
    fn a_counter_that_runs_on_from_a_step_back_was_restarted() {
        let mut clock = Clock::default();
        clock.advance(1_000_000);
        for tick in [10, 20, 30] {
            assert_eq!(clock.advance(tick), Elapsed::Stalled);
        }
        assert_eq!(clock.advance(40), Elapsed::Restarted);
        assert_eq!(clock.advance(50), Elapsed::Ticks(10));
    }

    #[test]
    fn a_counter_that_stands_still_is_never_restarted() {
        let mut clock = Clock::default();
        clock.advance(1_000_000);
        for _ in 0..100 {
            assert_eq!(clock.advance(1_000_000), Elapsed::Stalled);
        }
    }
}
