//! Feeds the trace and asks for readings, each call between two markers.

use core::hint::black_box;

use brimline::{Channel, Charge, Reading, Sample, Step};
use emulated::{entry, process};

/// The host looks for the names of these functions.
#[unsafe(no_mangle)]
#[inline(never)]
extern "C" fn a_call_begins(kind: u32) {
    black_box(kind);
}

/// The same.
#[unsafe(no_mangle)]
#[inline(never)]
extern "C" fn a_call_ends() {
    black_box(0);
}

type Feed<'s> = fn(&mut Channel<'s, Charge>, Sample) -> Step;
type Read<'s> = fn(&Channel<'s, Charge>) -> Option<Reading<Charge>>;

#[entry]
fn main() -> ! {
    let feed: Feed<'_> = black_box(Channel::feed);
    let read: Read<'_> = black_box(Channel::reading);
    let mut channel = Channel::new(trace::BLOCKS_OF_16.setup());
    for (row, sample) in trace::BLOCKS_OF_16.samples().enumerate() {
        a_call_begins(0);
        black_box(feed(&mut channel, sample));
        a_call_ends();
        if row % 50 == 0 {
            a_call_begins(1);
            black_box(read(&channel));
            a_call_ends();
        }
    }
    process::exit(0)
}
