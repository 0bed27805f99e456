//! What the monitor needs of a board.

use brimline::Mode;

use outbox::Outbox;

/// A board with its switches, its converter and its serial line.
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

    /// Takes a sample: the counter when it was taken, and the code.
    ///
    /// # Errors
    ///
    /// [`Fault::Converter`].
    fn sample(&mut self) -> Result<(u32, i32), Fault>;

    /// Restarts the chip, which lets go of the switches' pins.
    fn restart(&mut self) -> !;
}

/// Why the monitor had to stop.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Fault {
    /// A switch's pin could not be driven.
    Pin,
    /// The converter gave an error twice in a row.
    Converter,
    /// A sample was lost: it came more than a period too late.
    Late,
    /// The reset switch has failed as often as the policy allows.
    ResetSwitch,
}

impl Fault {
    pub(crate) const fn words(self) -> &'static str {
        match self {
            Self::Pin => "a switch pin cannot be driven",
            Self::Converter => "the converter gives errors",
            Self::Late => "a sample was lost",
            Self::ResetSwitch => "the reset switch has failed",
        }
    }
}
