//! A run's books.

use brimline::{Integral, Mode, Reading, Setup};

use super::reasons::{PROVISIONAL, Set, names, set_of};

#[derive(Clone, Copy)]
pub(super) struct Run {
    pub(super) running: bool,
    pub(super) start_tick: u32,
    pub(super) end_tick: u32,
    /// Ticks up to the last integrating sample, and of them in holds.
    ticks: u64,
    held: u64,
    resets: u32,
    /// The interruption that goes on: with the switch closed, in a hold and after it, whether a reset was in it.
    dead: u64,
    holding: u64,
    in_hold: bool,
    reset: bool,
    /// What it must have been found guilty of, and what a reading has said of it.
    pub(super) must: Set,
    shown: Set,
}

impl Run {
    pub(super) fn start(tick: u32, must: Set) -> Self {
        Self {
            running: true,
            start_tick: tick,
            end_tick: tick,
            ticks: 0,
            held: 0,
            resets: 0,
            dead: 0,
            holding: 0,
            in_hold: false,
            reset: false,
            must,
            shown: 0,
        }
    }

    /// A reset begins.
    pub(super) fn close(&mut self) {
        self.reset = true;
    }

    /// The interruption is over. Gives how long the switch was closed in it.
    pub(super) fn resume(&mut self) -> u64 {
        let dead = self.dead;
        self.ticks += dead + self.holding;
        self.held += self.holding;
        self.resets += u32::from(self.reset);
        (self.dead, self.holding, self.in_hold, self.reset) = (0, 0, false, false);
        dead
    }

    /// Time passes in a mode, up to a sample.
    pub(super) fn pass(&mut self, mode: Mode, ticks: u64, tick: u32) {
        match mode {
            Mode::Integrate => {
                self.ticks += ticks;
                self.end_tick = tick;
            }
            Mode::Hold => {
                self.holding += ticks;
                self.in_hold = true;
            }
            // Behind an open input switch a reset is part of the hold.
            Mode::Reset if self.in_hold => self.holding += ticks,
            Mode::Reset => self.dead += ticks,
            Mode::Zero => {}
        }
    }

    /// Checks a reading against the books; `stated`: what notices have said.
    pub(super) fn check<Q: Integral>(&mut self, setup: &Setup<Q>, r: &Reading<Q>, stated: Set) {
        assert_eq!((r.start_tick, r.end_tick, r.resets), (self.start_tick, self.end_tick, self.resets), "{r:?}");
        let seconds = |ticks: u64| ticks as f64 / setup.converter().tick_hz;
        assert!(r.elapsed_s == seconds(self.ticks) && r.held_s == seconds(self.held), "{} {r:?}", self.ticks);
        let reasons = set_of(r.reasons.iter());
        let none_of = |set: Set, what: &str| assert!(set == 0, "{what}: {:?}\n{r:?}", names(set));
        none_of(self.must & !reasons, "not found");
        none_of(self.shown & !reasons, "taken back");
        none_of(reasons & !PROVISIONAL & !stated, "never stated");
        self.shown |= reasons & !PROVISIONAL;
        assert!(!self.running || r.closed.is_none(), "{r:?}");
    }
}
