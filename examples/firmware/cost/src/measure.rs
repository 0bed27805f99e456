//! Runs the bundled traces and hostile scripts, counts every call and prints `name: value` lines for the host to
//! tabulate.

use brimline::{Channel, Charge, Integral, Mode, Setup};
use emulated::{Counter, dig_is_seen, entry, println, process};
use trace::{BLOCKS_OF_16, CHARGE, FLUX, Trace, UNBLOCKED};

use crate::boards;
use crate::calls::{Calls, Depths};
use crate::fuzzed::Fuzzed;
use crate::tally::Tally;

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
    let mut fuzzed = Fuzzed::new(&counter, "");
    boards::recorded(&mut fuzzed);
    let mut dear = Fuzzed::new(&counter, ", on dear boards");
    boards::dear(&mut dear);

    tallies.print();
    fuzzed.print_counts();
    dear.print_counts();
    println!("stack of feed, bytes: {}", depths.feed);
    println!("stack of reading, bytes: {}", depths.reading);
    fuzzed.print_depths();
    dear.print_depths();
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
    depths.dig(Channel::new(trace.setup()), trace.samples());
}

/// Counts every call of a trace.
fn count<Q: Integral>(counter: &Counter, trace: &Trace<Q>, kind: Kind, tallies: &mut Tallies) {
    let calls = Calls::new(counter);
    let mut channel = Channel::new(trace.setup());
    let mut started = false;
    for sample in trace.samples() {
        let steady = channel.mode() == Some(sample.mode);
        let net = calls.feed(&mut channel, sample);
        tallies.any.add(net);
        if steady {
            tallies.steady_of(kind, sample.mode).add(net);
        } else {
            tallies.switching[sample.mode as usize].add(net);
        }

        started |= sample.mode == Mode::Integrate;
        if started {
            let tally = if sample.mode == Mode::Zero { &mut tallies.stopped } else { &mut tallies.running };
            tally.add(calls.reading(&channel));
        }
    }
}
