//! Which mode comes next: the button starts and stops a run, with a reset put in wherever the channel asks for one.

use brimline::Mode;

use crate::setup::{COIL, PER_SECOND};

/// Samples of zero that a run needs before and after it.
const ZERO: u32 = 5 * PER_SECOND;

/// Samples of the longest run.
const LONGEST: u32 = 60 * PER_SECOND;

/// Samples with the reset switch closed; the last of them is taken after the level has settled.
const RESET: u32 = (COIL.min_on_time_s() * PER_SECOND as f64) as u32 + 2;

/// What a sample has brought about.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Turn {
    /// The zero has lasted long enough for a run.
    Ready,
    /// The button was pressed before that.
    NotReady,
    Started,
    Stopped,
    /// The zero after a run has lasted long enough to close it.
    Closed,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Phase {
    /// In zero, before a first run.
    Settling,
    /// In zero, ready for a run.
    Resting,
    Running,
    /// In zero, after a run.
    Closing,
}

/// Counts samples, and so keeps the time.
#[derive(Debug)]
pub(crate) struct Plan {
    phase: Phase,
    /// Samples of the phase so far, those of resets left out.
    samples: u32,
    /// Samples of a reset still to come.
    reset: u32,
    pressed: bool,
}

impl Default for Plan {
    /// Nothing is known of the level at power-up: a reset comes first.
    fn default() -> Self {
        Self { phase: Phase::Settling, samples: 0, reset: RESET, pressed: false }
    }
}

impl Plan {
    /// The mode that the switches are to be in.
    pub(crate) fn mode(&self) -> Mode {
        match self.phase {
            _ if self.reset > 0 => Mode::Reset,
            Phase::Running => Mode::Integrate,
            _ => Mode::Zero,
        }
    }

    /// A sample in [`mode`](Self::mode) was taken; what the channel asked for, and whether the button was pressed.
    pub(crate) fn advance(&mut self, request: Option<Mode>, pressed: bool) -> Option<Turn> {
        self.pressed |= pressed;
        if self.reset > 0 {
            self.reset -= 1;
            return None;
        }
        self.samples = self.samples.saturating_add(1);
        if request == Some(Mode::Reset) {
            self.reset = RESET;
            return None;
        }
        let pressed = core::mem::take(&mut self.pressed);
        match self.phase {
            Phase::Settling if self.samples >= ZERO => self.enter(Phase::Resting, Turn::Ready),
            Phase::Closing if self.samples >= ZERO => self.enter(Phase::Resting, Turn::Closed),
            Phase::Settling | Phase::Closing if pressed => Some(Turn::NotReady),
            Phase::Resting if pressed => self.enter(Phase::Running, Turn::Started),
            Phase::Running if pressed || self.samples >= LONGEST => self.enter(Phase::Closing, Turn::Stopped),
            _ => None,
        }
    }

    fn enter(&mut self, phase: Phase, turn: Turn) -> Option<Turn> {
        self.phase = phase;
        self.samples = 0;
        Some(turn)
    }
}
