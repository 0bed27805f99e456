//! Counts a channel's calls and finds how deep they dig.

use core::hint::black_box;

use brimline::{Channel, Integral, Reading, Sample, Step};
use emulated::{Counter, depth, paint, pointer};

type Feed<'s, Q> = fn(&mut Channel<'s, Q>, Sample) -> Step;
type Read<'s, Q> = fn(&Channel<'s, Q>) -> Option<Reading<Q>>;

/// Counts calls, less a call of the same signature that does nothing.
pub(crate) struct Calls<'c, 's, Q> {
    counter: &'c Counter,
    feed: Feed<'s, Q>,
    read: Read<'s, Q>,
    idle_feed: Feed<'s, Q>,
    idle_read: Read<'s, Q>,
}

impl<'c, 's, Q: Integral> Calls<'c, 's, Q> {
    pub(crate) fn new(counter: &'c Counter) -> Self {
        Self {
            counter,
            feed: black_box(Channel::feed),
            read: black_box(Channel::reading),
            idle_feed: black_box(|_, _| Step::default()),
            idle_read: black_box(|_| None),
        }
    }

    pub(crate) fn feed(&self, channel: &mut Channel<'s, Q>, sample: Sample) -> u32 {
        let idle = count_feed(self.counter, self.idle_feed, channel, sample);
        count_feed(self.counter, self.feed, channel, sample) - idle
    }

    pub(crate) fn reading(&self, channel: &Channel<'s, Q>) -> u32 {
        count_reading(self.counter, self.read, channel) - count_reading(self.counter, self.idle_read, channel)
    }
}

/// Never inlined, so that a call and its idle twin are counted by the same instructions.
#[inline(never)]
fn count_feed<'s, Q>(counter: &Counter, feed: Feed<'s, Q>, channel: &mut Channel<'s, Q>, sample: Sample) -> u32 {
    counter.gross(|| feed(channel, sample))
}

/// The same for a reading.
#[inline(never)]
fn count_reading<'s, Q>(counter: &Counter, read: Read<'s, Q>, channel: &Channel<'s, Q>) -> u32 {
    counter.gross(|| read(channel))
}

/// The deepest that `feed` and `reading` dug, bytes.
#[derive(Default)]
pub(crate) struct Depths {
    pub(crate) feed: usize,
    pub(crate) reading: usize,
}

impl Depths {
    /// Stack below the caller that `feed` and `reading` use, a reading after each sample.
    pub(crate) fn dig<'s, Q: Integral>(&mut self, mut channel: Channel<'s, Q>, samples: impl Iterator<Item = Sample>) {
        let feed: Feed<'_, Q> = black_box(Channel::feed);
        let read: Read<'_, Q> = black_box(Channel::reading);
        let top = pointer();
        for sample in samples {
            paint(top);
            black_box(feed(&mut channel, sample));
            self.feed = self.feed.max(depth(top));
            paint(top);
            black_box(read(&channel));
            self.reading = self.reading.max(depth(top));
        }
    }
}
