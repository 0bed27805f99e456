//! How far hostile scripts get: whatever a channel can say comes up, and whatever samples can be.

use std::collections::BTreeSet;

use brimline::{Channel, Event, Integral, Mode, Reason, Sample, Setup};

use crate::boards::{self, Visitor};
use crate::hostile::{self, Hostile};

const MODES: [Mode; 4] = [Mode::Zero, Mode::Integrate, Mode::Hold, Mode::Reset];

/// Words for what was met.
#[derive(Default)]
struct Reach {
    seed: u32,
    /// Names of events and reasons.
    told: BTreeSet<String>,
    samples: BTreeSet<String>,
}

impl Reach {
    fn of(boards: impl FnOnce(&mut Self)) -> Self {
        let mut reach = Self::default();
        boards(&mut reach);
        reach
    }

    fn tell<T: core::fmt::Debug>(&mut self, event: &T) {
        let text = format!("{event:?}");
        self.told.insert(text.split([' ', '{']).next().unwrap_or_default().to_owned());
    }

    fn see<Q: Integral>(&mut self, setup: &Setup<Q>, before: &Sample, sample: &Sample) {
        let converter = setup.converter();
        let ticks = i64::from(sample.tick.wrapping_sub(before.tick) as i32);
        let gap = (setup.policy().gap_limit_s * converter.tick_hz) as i64;
        let (low, high) = (converter.code_min, converter.code_max);
        for (met, what) in [
            (ticks == 0, "stalled"),
            (ticks < 0, "backwards"),
            (ticks > gap, "gap"),
            (sample.tick < before.tick && ticks > 0, "wrap"),
            (sample.counts == i32::MIN, "least"),
            (sample.counts == i32::MAX, "most"),
            (sample.counts == low, "low rail"),
            (sample.counts == high, "high rail"),
            (sample.counts > low && sample.counts < high, "between the rails"),
            (sample.temperature.is_none(), "no temperature"),
            (sample.temperature.is_some() && sample.temperature == before.temperature, "the same temperature"),
            (sample.temperature.is_some() && sample.temperature != before.temperature, "another temperature"),
        ] {
            if met {
                self.samples.insert(what.to_owned());
            }
        }
        self.samples.insert(format!("{:?} to {:?}", before.mode, sample.mode));
    }
}

impl Visitor for Reach {
    fn visit<Q: Integral + 'static>(&mut self, setup: &'static Setup<Q>) {
        for _ in 0..hostile::SCRIPTS {
            self.seed += 1;
            let mut channel = Channel::new(setup);
            let mut before: Option<Sample> = None;
            for sample in Hostile::new(setup, self.seed).take(hostile::SAMPLES) {
                for notice in channel.feed(sample).notices.iter() {
                    match notice.event {
                        Event::Fault(reason) => self.tell(&reason),
                        event => self.tell(&event),
                    }
                }
                if let Some(reading) = channel.reading() {
                    reading.reasons.iter().for_each(|reason| self.tell(&reason));
                    let closed = if reading.closed.is_some() { "closed reading" } else { "open reading" };
                    self.samples.insert(closed.to_owned());
                }
                if let Some(before) = before.replace(sample) {
                    self.see(setup, &before, &sample);
                }
            }
        }
    }
}

#[test]
fn every_notice_and_reason_comes_up() {
    let reach = Reach::of(|reach| {
        boards::recorded(reach);
        boards::dear(reach);
    });
    for event in [
        "RunStarted",
        "RunStopped",
        "ResetClosed",
        "ResetOpened",
        "ResetDue",
        "ResetFailed",
        "SettlingSlow",
        "Decay",
        "Spike",
        "InputInZero",
        "ReadoutNoise",
        "NoiseFigures",
        "DriftWander",
    ] {
        assert!(reach.told.contains(event), "{event} is never told");
    }
    // A run comes to 2^46 counts in no script as short as these.
    for reason in Reason::ALL.into_iter().filter(|reason| *reason != Reason::OutOfRange) {
        assert!(reach.told.contains(&format!("{reason:?}")), "{reason:?} never arises");
    }
}

#[test]
fn samples_are_of_every_kind_on_either_list_of_boards() {
    for reach in [Reach::of(boards::recorded), Reach::of(boards::dear)] {
        let pairs = MODES.iter().flat_map(|from| MODES.iter().map(move |to| format!("{from:?} to {to:?}")));
        for pair in pairs {
            assert!(reach.samples.contains(&pair), "no {pair}");
        }
        for what in [
            "stalled",
            "backwards",
            "gap",
            "wrap",
            "least",
            "most",
            "low rail",
            "high rail",
            "between the rails",
            "no temperature",
            "the same temperature",
            "another temperature",
            "closed reading",
            "open reading",
        ] {
            assert!(reach.samples.contains(what), "no {what}");
        }
    }
}
