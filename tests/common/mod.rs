//! What the statistical tests share: boards, a simulated channel with known truth, two independent estimators to
//! compare with, and a score sheet.
#![allow(dead_code, reason = "each test program uses a part of this")]
#![allow(clippy::disallowed_methods, reason = "a reference on the host computes in f64; only src must give equal bits")]

pub(crate) mod batch;
pub(crate) mod board;
pub(crate) mod plant;
pub(crate) mod recorded;
pub(crate) mod tally;
pub(crate) mod textbook;

use brimline::{Channel, Charge, Flux, Integral, Measured, Notice, Reading, Setup, VoltageRate};
use plant::Record;

/// A reading's quantity as a bare number in its SI unit.
pub(crate) trait Plain: Integral + PartialEq {
    fn plain(self) -> f64;
}

impl Plain for Charge {
    fn plain(self) -> f64 {
        self.as_coulombs()
    }
}

impl Plain for Flux {
    fn plain(self) -> f64 {
        self.as_volt_seconds()
    }
}

/// A value and its standard uncertainty, bare.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Claim {
    pub(crate) value: f64,
    pub(crate) u: f64,
}

impl Claim {
    pub(crate) fn of<Q: Plain>(measured: &Measured<Q>) -> Self {
        Self { value: measured.value.plain(), u: measured.u.plain() }
    }

    pub(crate) fn of_drift(measured: &Measured<VoltageRate>) -> Self {
        Self { value: measured.value.as_volts_per_second(), u: measured.u.as_volts_per_second() }
    }
}

/// What the channel under test said about a record.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Answer<Q> {
    pub(crate) reading: Reading<Q>,
    pub(crate) at_stop: Claim,
    pub(crate) closed: Claim,
    /// V/s, at the last sample of the opening zero.
    pub(crate) drift_opening: Claim,
    /// V/s, at the last sample of the closing zero.
    pub(crate) drift_closing: Claim,
}

/// Feeds a whole record to a new channel.
pub(crate) fn answer<Q: Plain>(setup: &Setup<Q>, record: &Record) -> Answer<Q> {
    answer_with_notices(setup, record).0
}

/// The same, with all that the channel had to say; each notice with the index of the sample that brought it.
pub(crate) fn answer_with_notices<Q: Plain>(setup: &Setup<Q>, record: &Record) -> (Answer<Q>, Vec<(usize, Notice)>) {
    let mut channel = Channel::new(setup);
    let mut notices = Vec::new();
    let mut at_stop = None;
    let mut drift_opening = None;
    for (index, &sample) in record.samples.iter().enumerate() {
        notices.extend(channel.feed(sample).notices.iter().map(|notice| (index, notice)));
        if index == record.opening_end {
            drift_opening = Some(channel.drift());
        }
        if index == record.run_end {
            at_stop = channel.reading().map(|reading| reading.at_stop);
        }
    }
    let (Some(reading), Some(at_stop), Some(drift_opening)) = (channel.reading(), at_stop, drift_opening) else {
        panic!("the record holds an opening zero and a run");
    };
    assert_eq!(reading.at_stop, at_stop, "the value at stop does not change when the zero begins");
    let Some(closed) = reading.closed else { panic!("the record holds a closing zero") };
    let answer = Answer {
        reading,
        at_stop: Claim::of(&at_stop.integral),
        closed: Claim::of(&closed.integral),
        drift_opening: Claim::of_drift(&drift_opening),
        drift_closing: Claim::of_drift(&channel.drift()),
    };
    (answer, notices)
}
