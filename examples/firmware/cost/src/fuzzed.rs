//! Hostile scripts on every board, each call counted.

use brimline::{Channel, Integral, Mode, Setup};
use emulated::{Counter, println};

use crate::boards::Visitor;
use crate::calls::{Calls, Depths};
use crate::chance::Chance;
use crate::hostile::{self, Hostile};
use crate::tally::Tally;

/// After the first run has begun a reading is asked for after one sample in so many.
const READING_ONCE_IN: u32 = 4;

/// What hostile scripts cost on some boards.
pub(crate) struct Fuzzed<'c> {
    counter: &'c Counter,
    /// What is put behind the rows' names.
    suffix: &'static str,
    seed: u32,
    feed: Tally,
    reading: Tally,
    depths: Depths,
}

impl<'c> Fuzzed<'c> {
    pub(crate) fn new(counter: &'c Counter, suffix: &'static str) -> Self {
        Self {
            counter,
            suffix,
            seed: 0,
            feed: Tally::new("feed, fuzzed"),
            reading: Tally::new("reading, fuzzed"),
            depths: Depths::default(),
        }
    }

    pub(crate) fn print_counts(&self) {
        self.feed.print_with(self.suffix);
        self.reading.print_with(self.suffix);
    }

    pub(crate) fn print_depths(&self) {
        println!("stack of feed, fuzzed{}, bytes: {}", self.suffix, self.depths.feed);
        println!("stack of reading, fuzzed{}, bytes: {}", self.suffix, self.depths.reading);
    }

    fn count<Q: Integral>(&mut self, setup: &Setup<Q>) {
        let calls = Calls::new(self.counter);
        let mut channel = Channel::new(setup);
        let mut chance = Chance::new(!self.seed);
        let mut started = false;
        for sample in Hostile::new(setup, self.seed).take(hostile::SAMPLES) {
            self.feed.add(calls.feed(&mut channel, sample));
            started |= sample.mode == Mode::Integrate;
            if started && chance.once_in(READING_ONCE_IN) {
                self.reading.add(calls.reading(&channel));
            }
        }
    }
}

impl Visitor for Fuzzed<'_> {
    fn visit<Q: Integral + 'static>(&mut self, setup: &'static Setup<Q>) {
        for _ in 0..hostile::SCRIPTS {
            self.seed += 1;
            self.count(setup);
        }
        // A path digs as deep each time: part of the scripts will do for the stack, where a sample takes longer.
        for script in 0..hostile::SCRIPTS / 4 {
            let samples = Hostile::new(setup, self.seed - script).take(hostile::SAMPLES);
            self.depths.dig(Channel::new(setup), samples);
        }
    }
}
