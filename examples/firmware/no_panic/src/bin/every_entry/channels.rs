//! Channels and what they give.

use core::convert::Infallible;
use core::hint::black_box;

use brimline::{Channel, Integral, Mode, Reason, Reasons, Sample, Setup, Switches, Temperature};
use embedded_hal::delay::DelayNs;
use embedded_hal::digital::{ErrorType, OutputPin};

pub(crate) fn call<Q: Integral>(setup: Setup<Q>) {
    let setup = black_box(&setup);
    let mut channel = black_box(Channel::new(setup));
    loop {
        let temperature = Temperature::from_millidegrees_celsius(black_box(25_000));
        let sample = Sample {
            tick: black_box(0),
            counts: black_box(0),
            mode: black_box(Mode::Zero),
            temperature: black_box(Some(temperature)),
        };
        let step = channel.feed(sample);
        black_box(step.request);
        black_box(step.notices.is_empty());
        for notice in step.notices.iter() {
            black_box((notice.tick, notice.event, notice == black_box(notice)));
        }
        if let Some(reading) = black_box(&channel).reading() {
            black_box(reading.latest());
            reasons(black_box(reading.reasons));
            black_box(reading == black_box(reading));
        }
        black_box((channel.drift(), channel.droop(), channel.offset_and_bias(), channel.mode()));
        if channel.switch_has_failed() {
            channel.switch_repaired();
        }
        if black_box(false) {
            black_box(channel.clone());
            return;
        }
    }
}

fn reasons(reasons: Reasons) {
    black_box((reasons.is_empty(), reasons.contains(black_box(Reason::Gap)), reasons.trust()));
    for reason in reasons.iter() {
        black_box(reason.name());
    }
}

struct Pin;

impl ErrorType for Pin {
    type Error = Infallible;
}

impl OutputPin for Pin {
    fn set_low(&mut self) -> Result<(), Infallible> {
        black_box(self);
        Ok(())
    }

    fn set_high(&mut self) -> Result<(), Infallible> {
        black_box(self);
        Ok(())
    }
}

struct Delay;

impl DelayNs for Delay {
    fn delay_ns(&mut self, ns: u32) {
        black_box(ns);
    }
}

/// The pins of the switches.
pub(crate) fn switch() {
    let mut switches = Switches::new(Pin, Pin, Pin, black_box(100));
    let _ = black_box(switches.set(black_box(Mode::Reset), &mut Delay));
    switches.release();
}
