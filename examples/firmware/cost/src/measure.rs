//! Runs the bundled traces, counts every call and prints `name: value` lines for the host to tabulate.

use core::hint::black_box;

use brimline::{Channel, Charge, Integral, Mode, Reading, Sample, Setup, Step};
use cortex_m::Peripherals;
use cortex_m::register::msp;
use cortex_m_rt::entry;
use semihosting::{println, process};
use trace::{CHARGE, FLUX, Trace};

use crate::counter::Counter;
use crate::stack;

type Feed<'s, Q> = fn(&mut Channel<'s, Q>, Sample) -> Step;
type Read<'s, Q> = fn(&Channel<'s, Q>) -> Option<Reading<Q>>;

/// Counts of one kind of call.
#[derive(Clone, Copy)]
struct Tally {
    name: &'static str,
    calls: u32,
    sum: u64,
    worst: u32,
}

impl Tally {
    const fn new(name: &'static str) -> Self {
        Self { name, calls: 0, sum: 0, worst: 0 }
    }

    fn add(&mut self, count: u32) {
        self.calls += 1;
        self.sum += u64::from(count);
        self.worst = self.worst.max(count);
    }

    fn print(&self) {
        if let Some(mean) = self.sum.checked_div(u64::from(self.calls)) {
            println!("{}: {mean} / {}", self.name, self.worst);
        }
    }
}

/// All kinds of calls.
struct Tallies {
    /// In the order of [`Mode`].
    steady: [Tally; 4],
    switching: [Tally; 4],
    running: Tally,
    stopped: Tally,
}

#[entry]
fn main() -> ! {
    let Some(peripherals) = Peripherals::take() else { process::exit(1) };
    let counter = Counter::start(peripherals.SYST);
    let Some(loops) = counter.check() else {
        println!("loops of known length are miscounted");
        process::exit(1)
    };
    if !stack::check() {
        println!("an array of known size is missed on the stack");
        process::exit(1)
    }
    println!("check, loops of known length counted exactly: {loops}");

    let mut tallies = Tallies {
        steady: ["feed in Zero", "feed in Integrate", "feed in Hold", "feed in Reset"].map(Tally::new),
        switching: ["feed, first in Zero", "feed, first in Integrate", "feed, first in Hold", "feed, first in Reset"]
            .map(Tally::new),
        running: Tally::new("reading in a run"),
        stopped: Tally::new("reading after a run"),
    };
    CHARGE.iter().for_each(|trace| count(&counter, trace, &mut tallies));
    FLUX.iter().for_each(|trace| count(&counter, trace, &mut tallies));
    tallies.steady.iter().chain(&tallies.switching).for_each(Tally::print);
    tallies.running.print();
    tallies.stopped.print();

    let deepest = |depths: (u32, u32), more: (u32, u32)| (depths.0.max(more.0), depths.1.max(more.1));
    let depths = CHARGE.iter().map(dig).chain(FLUX.iter().map(dig)).fold((0, 0), deepest);
    println!("stack of feed, bytes: {}", depths.0);
    println!("stack of reading, bytes: {}", depths.1);
    println!("RAM for a channel, bytes: {}", size_of::<Channel<'_, Charge>>());
    println!("flash for a set-up, bytes: {}", size_of::<Setup<Charge>>());
    process::exit(0)
}

/// Counts every call of a trace, less a call of the same signature that does nothing.
fn count<Q: Integral>(counter: &Counter, trace: &Trace<Q>, tallies: &mut Tallies) {
    let feed: Feed<'_, Q> = black_box(Channel::feed);
    let read: Read<'_, Q> = black_box(Channel::reading);
    let idle_feed: Feed<'_, Q> = black_box(|_, _| Step::default());
    let idle_read: Read<'_, Q> = black_box(|_| None);
    let mut channel = Channel::new(trace.setup());
    let mut started = false;
    for sample in trace.samples() {
        let tallies_of = if channel.mode() == Some(sample.mode) { &mut tallies.steady } else { &mut tallies.switching };
        let idle = count_feed(counter, idle_feed, &mut channel, sample);
        tallies_of[sample.mode as usize].add(count_feed(counter, feed, &mut channel, sample) - idle);

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

/// Stack below the caller that `feed` and `reading` used over a trace.
fn dig<Q: Integral>(trace: &Trace<Q>) -> (u32, u32) {
    let feed: Feed<'_, Q> = black_box(Channel::feed);
    let read: Read<'_, Q> = black_box(Channel::reading);
    let mut channel = Channel::new(trace.setup());
    let top = msp::read();
    let mut deepest = (0, 0);
    for sample in trace.samples() {
        stack::paint(top);
        black_box(feed(&mut channel, sample));
        deepest.0 = deepest.0.max(stack::depth(top));
        stack::paint(top);
        black_box(read(&channel));
        deepest.1 = deepest.1.max(stack::depth(top));
    }
    deepest
}
