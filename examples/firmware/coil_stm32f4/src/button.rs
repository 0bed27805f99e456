//! From a bouncing contact to single presses.

/// So many samples in a row that agree are no bounce.
const STEADY: u8 = 20;

/// A button that starts as released.
#[derive(Debug, Default)]
pub(crate) struct Button {
    down: bool,
    disagreeing: u8,
}

impl Button {
    /// Takes a sample of the contact; `true` once for each press.
    pub(crate) fn is_pressed(&mut self, contact: bool) -> bool {
        self.disagreeing = if contact == self.down { 0 } else { self.disagreeing + 1 };
        if self.disagreeing < STEADY {
            return false;
        }
        self.disagreeing = 0;
        self.down = contact;
        contact
    }
}
