//! Runs the bundled traces, counts every call and prints `name: value` lines for the host to tabulate.

use core::hint::black_box;

use brimline::{Channel, Charge, Integral, Mode, Reading, Sample, Setup, Step};
use emulated::{Counter, depth, dig_is_seen, entry, paint, pointer, println, process};
use trace::{BLOCKS_OF_16, CHARGE, FLUX, Trace, UNBLOCKED};

use crate::tally::Tally;

type Feed<'s, Q> = fn(&mut Channel<'s, Q>, Sample) -> Step;
type Read<'s, Q> = fn(&Channel<'s, Q>) -> Option<Reading<Q>>;

/// All kinds of calls.
struct Tallies {
    /// In the order of [`Mode`].
    steady: [Tally; 4],
    switching: [Tally; 4],
    leaking: Tally,
    soaking: Tally,
    by_16: Tally,
    one_by_one: Tally,
    any: Tally,
    running: Tally,
    stopped: Tally,
}

impl Tallies {
    fn new() -> Self {
        Self {
            steady: ["feed in Zero, blocks of 0.1 s", "feed in Integrate", "feed in Hold", "feed in Reset"]
                .map(Tally::new),
            switching: [
                "feed, first in Zero",
                "feed, first in Integrate",
                "feed, first in Hold",
                "feed, first in Reset",
            ]
            .map(Tally::new),
            leaking: Tally::new("feed in Integrate, with a leak"),
            soaking: Tally::new("feed in Integrate, with two branches of soakage"),
            by_16: Tally::new("feed in Zero, blocks of 16 samples"),
            one_by_one: Tally::new("feed in Zero, sample by sample"),
            any: Tally::new("any feed"),
            running: Tally::new("reading in a run"),
            stopped: Tally::new("reading after a run"),
        }
    }

    /// Where a sample in a mode that goes on is counted: boards with leak and soakage have rows of their own.
    fn steady_of(&mut self, kind: Kind, mode: Mode) -> &mut Tally {
        match (kind, mode) {
            (Kind::Leaking, Mode::Integrate) => &mut self.leaking,
            (Kind::Soaking, Mode::Integrate) => &mut self.soaking,
            (Kind::BlocksOf16, Mode::Zero) => &mut self.by_16,
            (Kind::Unblocked, Mode::Zero) => &mut self.one_by_one,
            _ => &mut self.steady[mode as usize],
        }
    }

    fn print(&self) {
        let [zero, integrate, hold, reset] = &self.steady;
        for tally in [integrate, &self.leaking, &self.soaking, &self.by_16, &self.one_by_one, zero, hold, reset] {
            tally.print();
        }
        self.switching.iter().chain([&self.any, &self.running, &self.stopped]).for_each(Tally::print);
    }
}

/// What is special about a board.
#[derive(Clone, Copy)]
enum Kind {
    Plain,
    Leaking,
    Soaking,
    BlocksOf16,
    Unblocked,
}

/// The deepest that `feed` and `reading` dug, bytes.
#[derive(Default)]
struct Depths {
    feed: usize,
    reading: usize,
}

#[entry]
fn main() -> ! {
    let Some(counter) = Counter::start() else {
        println!("loops of known length are miscounted");
        process::exit(1)
    };
    if !dig_is_seen() {
        println!("an array of known size is missed on the stack");
        process::exit(1)
    }
    let mut tallies = Tallies::new();
    let mut depths = Depths::default();
    for trace in &CHARGE {
        run(&counter, trace, kind(trace), &mut tallies, &mut depths);
    }
    for trace in &FLUX {
        run(&counter, trace, kind(trace), &mut tallies, &mut depths);
    }
    run(&counter, &BLOCKS_OF_16, Kind::BlocksOf16, &mut tallies, &mut depths);
    run(&counter, &UNBLOCKED, Kind::Unblocked, &mut tallies, &mut depths);
    tallies.print();
    println!("stack of feed, bytes: {}", depths.feed);
    println!("stack of reading, bytes: {}", depths.reading);
    println!("RAM for a channel, bytes: {}", size_of::<Channel<'_, Charge>>());
    println!("flash for a set-up, bytes: {}", size_of::<Setup<Charge>>());
    process::exit(0)
}

fn kind<Q: Integral>(trace: &Trace<Q>) -> Kind {
    match trace.name() {
        "leaky" => Kind::Leaking,
        "soakage" => Kind::Soaking,
        _ => Kind::Plain,
    }
}

fn run<Q: Integral>(counter: &Counter, trace: &Trace<Q>, kind: Kind, tallies: &mut Tallies, depths: &mut Depths) {
    count(counter, trace, kind, tallies);
    dig(trace, depths);
}

/// Counts every call of a trace, less a call of the same signature that does nothing.
fn count<Q: Integral>(counter: &Counter, trace: &Trace<Q>, kind: Kind, tallies: &mut Tallies) {
    let feed: Feed<'_, Q> = black_box(Channel::feed);
    let read: Read<'_, Q> = black_box(Channel::reading);
    let idle_feed: Feed<'_, Q> = black_box(|_, _| Step::default());
    let idle_read: Read<'_, Q> = black_box(|_| None);
    let mut channel = Channel::new(trace.setup());
    let mut started = false;
    for sample in trace.samples() {
        let steady = channel.mode() == Some(sample.mode);
        let idle = count_feed(counter, idle_feed, &mut channel, sample);
        let net = count_feed(counter, feed, &mut channel, sample) - idle;
        tallies.any.add(net);
        if steady {
            tallies.steady_of(kind, sample.mode).add(net);
        } else {
            tallies.switching[sample.mode as usize].add(net);
        }

        started |= sample.mode == Mode::Integrate;
        if started {
            let tally = if sample.mode == Mode::Zero { &mut tallies.stopped } else { &mut tallies.running };
            tally.add(count_reading(counter, read, &channel) - count_reading(counter, idle_read, &channel));
        }
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

/// Stack below the caller that `feed` and `reading` use over a trace.
fn dig<Q: Integral>(trace: &Trace<Q>, depths: &mut Depths) {
    let feed: Feed<'_, Q> = black_box(Channel::feed);
    let read: Read<'_, Q> = black_box(Channel::reading);
    let mut channel = Channel::new(trace.setup());
    let top = pointer();
    for sample in trace.samples() {
        paint(top);
        black_box(feed(&mut channel, sample));
        depths.feed = depths.feed.max(depth(top));
        paint(top);
        black_box(read(&channel));
        depths.reading = depths.reading.max(depth(top));
    }
}
