//! What the flux meter needs of a board.

use brimline::Mode;

use outbox::Outbox;

/// A board with its switches, its converter, its button and its serial line.
pub trait Board {
    /// Moves the switches.
    ///
    /// # Errors
    ///
    /// [`Fault::Pin`]: where they are is not known.
    fn switch(&mut self, mode: Mode) -> Result<(), Fault>;

    /// Starts the pace of the samples anew: the next is due in a period.
    fn pace(&mut self);

    /// Sends text until the next sample is due.
    ///
    /// # Errors
    ///
    /// [`Fault::Late`].
    fn wait(&mut self, out: &mut Outbox) -> Result<(), Fault>;

    /// Takes a sample.
    fn sample(&mut self) -> Taken;

    /// Restarts the chip, which lets go of the switches' pins.
    fn restart(&mut self) -> !;
}

/// What is read in each period.
#[derive(Clone, Copy, Debug)]
pub struct Taken {
    /// The counter when the code was taken.
    pub tick: u32,
    /// The converter's code.
    pub counts: i32,
    /// Whether the button is down.
    pub button: bool,
}

/// Why the flux meter had to stop.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Fault {
    /// A switch's pin could not be driven.
    Pin,
    /// A sample was lost.
    Late,
    /// The reset switch has failed as often as the policy allows.
    ResetSwitch,
}

impl Fault {
    pub(crate) const fn words(self) -> &'static str {
        match self {
            Self::Pin => "a switch pin cannot be driven",
            Self::Late => "a sample was lost",
            Self::ResetSwitch => "the reset switch has failed",
        }
    }
}
