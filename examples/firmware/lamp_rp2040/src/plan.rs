//! Which mode comes next: `Zero` and `Integrate` in turn, with a reset put in wherever the channel asks for one.

use brimline::Mode;

use crate::setup::{LAMP, PER_SECOND};

const ZERO: u32 = 30 * PER_SECOND;
const INTEGRATE: u32 = 600 * PER_SECOND;

/// Samples with the reset switch closed; the last of them is taken after the level has settled.
const RESET: u32 = (LAMP.min_on_time_s() * PER_SECOND as f64) as u32 + 2;

/// Counts samples, and so keeps the time.
#[derive(Debug)]
pub(crate) struct Plan {
    /// `Zero` or `Integrate`, and how many samples of it are still to come.
    phase: Mode,
    left: u32,
    /// Samples of a reset still to come.
    reset: u32,
}

impl Default for Plan {
    /// Nothing is known of the level at power-up: a reset comes first.
    fn default() -> Self {
        Self { phase: Mode::Zero, left: ZERO, reset: RESET }
    }
}

impl Plan {
    /// The mode that the switches are to be in.
    pub(crate) fn mode(&self) -> Mode {
        if self.reset > 0 { Mode::Reset } else { self.phase }
    }

    /// A sample in [`mode`](Self::mode) was taken, and this is what the channel asked for.
    pub(crate) fn advance(&mut self, request: Option<Mode>) {
        if self.reset > 0 {
            self.reset -= 1;
            return;
        }
        self.left = self.left.saturating_sub(1);
        if request == Some(Mode::Reset) {
            self.reset = RESET;
        } else if self.left == 0 {
            (self.phase, self.left) = match self.phase {
                Mode::Zero => (Mode::Integrate, INTEGRATE),
                _ => (Mode::Zero, ZERO),
            };
        }
    }
}
