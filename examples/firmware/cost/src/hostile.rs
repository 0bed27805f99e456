//! Samples that no board should give, and some that it may: modes in any order and of any length, with ticks, codes and
//! temperatures that are well for a while and then not.

use brimline::{Integral, Mode, Sample, Setup, Temperature};

use crate::chance::Chance;
use crate::plant::{Codes, Plant};

/// Scripts for each board, and samples in each.
pub(crate) const SCRIPTS: u32 = 10;
/// See [`SCRIPTS`].
pub(crate) const SAMPLES: usize = 500;

/// How the counter goes on.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Pace {
    Even,
    Jittered,
    /// From one tick to many seconds.
    Uneven,
    /// It stalls, goes back, leaves gaps or jumps by half a turn.
    Broken,
}

/// What the thermometer says.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Warmth {
    Absent,
    Same,
    /// A little more or less with each sample.
    Walking,
    /// Now this, now that, now nothing.
    Wild,
}

/// A script without an end.
#[derive(Clone, Debug)]
pub(crate) struct Hostile {
    chance: Chance,
    plant: Plant,
    tick_hz: u32,
    tick: u32,
    mode: Mode,
    /// Samples left in the mode, and segments left with the same habits.
    samples_left: u32,
    segments_left: u32,
    step: u32,
    pace: Pace,
    codes: Codes,
    warmth: Warmth,
    millidegrees: i32,
}

impl Hostile {
    /// The script of a seed, in a board's codes and ticks.
    pub(crate) fn new<Q: Integral>(setup: &Setup<Q>, seed: u32) -> Self {
        let mut chance = Chance::new(seed);
        let tick_hz = setup.converter().tick_hz as u32;
        Self {
            plant: Plant::new(setup, &mut chance),
            tick_hz,
            // Half of the scripts soon come to the counter's wrap.
            tick: if chance.once_in(2) { chance.bits() } else { u32::MAX - chance.below(5_000_000) },
            // Some begin as one should, with a zero that is long enough to show the noise.
            mode: Mode::Zero,
            samples_left: chance.pick(&[0, 0, 30, 350]).unwrap_or(0),
            segments_left: 0,
            step: (tick_hz / 100).max(1),
            pace: Pace::Even,
            codes: Codes::Plausible,
            warmth: Warmth::Same,
            millidegrees: 25_000,
            chance,
        }
    }

    /// Half of the time all is well, so that what follows meets a channel that has learned something.
    fn take_habits(&mut self) {
        let chance = &mut self.chance;
        self.segments_left = 1 + chance.below(6);
        self.step = (self.tick_hz / chance.pick(&[1000, 100, 100, 20, 3]).unwrap_or(100)).max(1);
        let warmths = [Warmth::Same, Warmth::Walking, Warmth::Absent, Warmth::Wild];
        self.warmth = chance.pick(&warmths).unwrap_or(Warmth::Same);
        (self.pace, self.codes) = (Pace::Even, Codes::Plausible);
        if chance.once_in(2) {
            let paces = [Pace::Even, Pace::Jittered, Pace::Uneven, Pace::Broken];
            self.pace = chance.pick(&paces).unwrap_or(Pace::Even);
            if chance.once_in(2) {
                self.codes = chance.pick(&Codes::WRONG).unwrap_or(Codes::Plausible);
            }
        }
    }

    fn switch(&mut self) {
        if self.segments_left == 0 {
            self.take_habits();
        }
        self.segments_left -= 1;
        let chance = &mut self.chance;
        let modes = [Mode::Zero, Mode::Integrate, Mode::Integrate, Mode::Hold, Mode::Reset];
        self.mode = chance.pick(&modes).unwrap_or(Mode::Zero);
        // Short ones, so that lines beside a reset share samples; and some that fill every window.
        let longest = chance.pick(&[1, 2, 4, 15, 30, 60, 150]).unwrap_or(1);
        self.samples_left = 1 + chance.below(longest);
        self.plant.switch(self.mode, chance);
    }

    fn ticks(&mut self) -> u32 {
        let chance = &mut self.chance;
        match self.pace {
            Pace::Even => self.step,
            Pace::Jittered => self.step - self.step / 8 + chance.below(self.step / 4 + 1),
            Pace::Uneven => 1 + (chance.bits() >> (1 + chance.below(31))),
            Pace::Broken => match chance.below(8) {
                0 => 0,
                1 => chance.below(self.step).wrapping_neg(),
                2 => self.tick_hz.saturating_mul(1 + chance.below(40)),
                3 => 0x7fff_fffe_u32.wrapping_add(chance.below(4)),
                4 => chance.bits(),
                _ => self.step,
            },
        }
    }

    fn temperature(&mut self) -> Option<Temperature> {
        let chance = &mut self.chance;
        self.millidegrees = match self.warmth {
            Warmth::Absent => return None,
            Warmth::Same => self.millidegrees,
            Warmth::Walking => (self.millidegrees + chance.within(500) as i32).clamp(-40_000, 125_000),
            Warmth::Wild if chance.once_in(4) => return None,
            Warmth::Wild if chance.once_in(2) => chance.bits() as i32,
            Warmth::Wild => chance.within(150_000) as i32,
        };
        Some(Temperature::from_millidegrees_celsius(self.millidegrees))
    }
}

impl Iterator for Hostile {
    type Item = Sample;

    fn next(&mut self) -> Option<Sample> {
        if self.samples_left == 0 {
            self.switch();
        }
        self.samples_left -= 1;
        self.tick = self.tick.wrapping_add(self.ticks());
        let counts = self.plant.code(self.codes, &mut self.chance);
        Some(Sample { tick: self.tick, counts, mode: self.mode, temperature: self.temperature() })
    }
}
