//! The embedded-hal edge: a mode becomes pin levels. No arithmetic here.

use embedded_hal::delay::DelayNs;
use embedded_hal::digital::OutputPin;

use crate::sample::Mode;

/// The three analog switches of an integrator; a pin driven high closes its switch.
///
/// `input` connects the signal, `zero` connects the known zero, `reset` shorts the capacitor. Switches that must open
/// do so first, then `break_ns` passes, then those that must close do: break before make.
#[derive(Debug)]
pub struct Switches<I, Z, R> {
    input: I,
    zero: Z,
    reset: R,
    break_ns: u32,
}

impl<E, I, Z, R> Switches<I, Z, R>
where
    I: OutputPin<Error = E>,
    Z: OutputPin<Error = E>,
    R: OutputPin<Error = E>,
{
    /// Takes the pins; nothing moves before [`set`](Self::set).
    pub const fn new(input: I, zero: Z, reset: R, break_ns: u32) -> Self {
        Self { input, zero, reset, break_ns }
    }

    /// Moves the switches to `mode`. The next sample that is taken carries this mode.
    ///
    /// During `Reset` the input is left open, so that the source does not drive the closed switch.
    ///
    /// # Errors
    ///
    /// The first error of a pin; the switches are then in an unknown state, and the safe answer is to stop the dose.
    pub fn set(&mut self, mode: Mode, delay: &mut impl DelayNs) -> Result<(), E> {
        if mode != Mode::Integrate {
            self.input.set_low()?;
        }
        if mode != Mode::Zero {
            self.zero.set_low()?;
        }
        if mode != Mode::Reset {
            self.reset.set_low()?;
        }
        delay.delay_ns(self.break_ns);
        match mode {
            Mode::Integrate => self.input.set_high(),
            Mode::Zero => self.zero.set_high(),
            Mode::Reset => self.reset.set_high(),
            Mode::Hold => Ok(()),
        }
    }

    /// Gives the pins back: input, zero, reset.
    pub fn release(self) -> (I, Z, R) {
        (self.input, self.zero, self.reset)
    }
}
