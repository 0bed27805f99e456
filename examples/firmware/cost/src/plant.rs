//! What an integrator's output might do, in a board's own codes: enough of a circuit that runs open, close and go over
//! resets, with everything that spoils them.

use brimline::{Integral, Mode, Setup};

use crate::chance::Chance;

/// What is the matter with the codes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Codes {
    Plausible,
    /// With a spike now and then.
    Spiky,
    /// Noise a hundred or a hundred thousand times too large.
    Noisy,
    /// The level steps now and then.
    Stepping,
    /// Anything between the rails, and the rails.
    Anywhere,
    /// Anything that an `i32` holds, and its ends.
    Extreme,
    Frozen,
}

impl Codes {
    pub(crate) const WRONG: [Self; 6] =
        [Self::Spiky, Self::Noisy, Self::Stepping, Self::Anywhere, Self::Extreme, Self::Frozen];
}

/// A level that moves as the mode has it; levels in 2^-16 counts.
#[derive(Clone, Debug)]
pub(crate) struct Plant {
    low: i32,
    high: i32,
    reset_level: i64,
    level: i64,
    slope: i64,
    noise: i64,
    /// The code given before, for a converter that is frozen.
    code: i32,
}

impl Plant {
    pub(crate) fn new<Q: Integral>(setup: &Setup<Q>, chance: &mut Chance) -> Self {
        let (circuit, converter) = (setup.circuit(), setup.converter());
        let code = converter.code(circuit.reset_level_v) as i32;
        let reset_level = i64::from(code) << 16;
        let noise = 1 << (14 + chance.below(5));
        Self {
            low: converter.code_min,
            high: converter.code_max,
            reset_level,
            level: reset_level,
            slope: 0,
            noise,
            code,
        }
    }

    /// The switches move: another slope for each sample, and a reset that now and then does not arrive.
    pub(crate) fn switch(&mut self, to: Mode, chance: &mut Chance) {
        let span = (i64::from(self.high) - i64::from(self.low)) << 16;
        let steepest = match to {
            Mode::Zero if chance.once_in(4) => span / 2000,
            Mode::Zero => 1 << 14,
            Mode::Integrate => span >> (4 + chance.below(10)),
            Mode::Hold => 1 << 12,
            Mode::Reset if chance.once_in(6) => 0,
            Mode::Reset => {
                self.level = self.reset_level + chance.within(span / 5000);
                0
            }
        };
        self.slope = chance.within(steepest);
    }

    /// The next code.
    pub(crate) fn code(&mut self, codes: Codes, chance: &mut Chance) -> i32 {
        let span = (i64::from(self.high) - i64::from(self.low)) << 16;
        self.level = self.level.saturating_add(self.slope).clamp(-1 << 50, 1 << 50);
        let mut noise = self.noise;
        match codes {
            Codes::Noisy => noise *= if chance.once_in(2) { 100 } else { 100_000 },
            Codes::Stepping if chance.once_in(10) => self.level += chance.within(span / 3),
            Codes::Spiky if chance.once_in(12) => noise = span / 10,
            _ => {}
        }
        let level = (self.level + chance.within(noise) + chance.within(noise)) >> 16;
        let seen = level.clamp(i64::from(self.low), i64::from(self.high)) as i32;
        let anywhere = (i64::from(self.low) + ((chance.within(span / 2) + span / 2) >> 16)) as i32;
        self.code = match codes {
            Codes::Frozen => self.code,
            Codes::Anywhere => chance.pick(&[self.low, self.high, anywhere, anywhere]).unwrap_or(seen),
            Codes::Extreme => {
                let any = chance.bits() as i32;
                chance.pick(&[i32::MIN, i32::MIN + 1, -1, 0, 1, i32::MAX, any, any >> 8]).unwrap_or(any)
            }
            _ => seen,
        };
        self.code
    }
}
