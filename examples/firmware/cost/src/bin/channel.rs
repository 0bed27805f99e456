//! The least program with a channel in it: every sample is fed and every result asked for.
#![cfg_attr(target_os = "none", no_std, no_main)]

#[cfg(target_os = "none")]
#[no_panic::entry]
fn main() -> ! {
    use brimline::{Channel, Mode, Sample};
    use core::hint::black_box;

    let mut channel = Channel::new(trace::CHARGE[0].setup());
    loop {
        let sample = black_box(Sample { tick: 0, counts: 0, mode: Mode::Zero, temperature: None });
        black_box(channel.feed(sample));
        black_box(channel.reading());
        black_box(channel.drift());
    }
}

#[cfg(not(target_os = "none"))]
fn main() {}
