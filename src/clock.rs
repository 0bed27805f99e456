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
}

/// A free-running 32-bit counter.
///
/// A step of up to 2^31 - 1 ticks is time that passed; a longer one cannot be told from a counter that ran backwards.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Clock {
    last: Option<u32>,
}

impl Clock {
    /// Takes the next tick; a stalled counter leaves the clock where it was.
    pub(crate) fn advance(&mut self, tick: u32) -> Elapsed {
        let elapsed = match self.last {
            None => Elapsed::Start,
            Some(last) => match tick.wrapping_sub(last) {
                0 | 0x8000_0000.. => return Elapsed::Stalled,
                ticks => Elapsed::Ticks(ticks),
            },
        };
        self.last = Some(tick);
        elapsed
    }

    /// The latest tick; 0 before the first.
    pub(crate) fn tick(&self) -> u32 {
        self.last.unwrap_or(0)
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
}
