//! The notices of one step, packed: a step is returned for every sample, and hardly ever has something to say.

use core::fmt;

use crate::notice::{Event, Notice, Reason};

/// The notices of one step, each kind at most once: first what the switches' moving led to, then what the sample
/// showed.
#[derive(Clone, Copy, Default)]
pub struct Notices(Option<Told>);

/// A set of notices: for most samples none is so much as made.
#[derive(Clone, Copy, Default)]
struct Told {
    /// Bits of the kinds that there are, and of those among them that are the sample's.
    kinds: u32,
    of_sample: u32,
    switched_tick: u32,
    sample_tick: u32,
    /// Ticks that are neither: of the end of a run, and of the beginning of input in a zero.
    stopped_tick: u32,
    since_tick: u32,
    /// The figures of those that have some.
    decay_s: u32,
    readout_centicounts: (u16, u16),
    noise_percent: u16,
    wander_percent: u16,
    settling_percent: u16,
    failed_in_a_row: u8,
}

/// Bits of the kinds. Those of a change of mode come in the order in which it is dealt with; faults take the bits of
/// their reasons from [`FAULT`] on.
mod kind {
    pub(super) const DECAY: u32 = 0;
    pub(super) const READOUT_NOISE: u32 = 1;
    pub(super) const NOISE_FIGURES: u32 = 2;
    pub(super) const DRIFT_WANDER: u32 = 3;
    pub(super) const RUN_STOPPED: u32 = 4;
    pub(super) const RUN_STARTED: u32 = 5;
    pub(super) const RESET_OPENED: u32 = 6;
    pub(super) const RESET_CLOSED: u32 = 7;
    pub(super) const SETTLING_SLOW: u32 = 8;
    pub(super) const SPIKE: u32 = 9;
    pub(super) const INPUT_IN_ZERO: u32 = 10;
    pub(super) const RESET_FAILED: u32 = 11;
    pub(super) const RESET_DUE: u32 = 12;
    pub(super) const FAULT: u32 = 13;
}

/// Every kind has a bit of 32.
const _: () = assert!(kind::FAULT as usize + Reason::ALL.len() <= 32);

impl Notices {
    /// Of a sample at a tick, and of switches that moved before it at another.
    pub(crate) fn between(switched_tick: u32, sample_tick: u32) -> Self {
        Self(Some(Told { switched_tick, sample_tick, ..Told::default() }))
    }

    /// The notices in their order.
    pub fn iter(&self) -> impl Iterator<Item = Notice> {
        self.0.into_iter().flat_map(Told::iter)
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.0.is_none_or(|told| told.kinds == 0)
    }

    /// Adds a notice at one of the two ticks, or at the one that its kind has for itself.
    pub(crate) fn push(&mut self, tick: u32, event: Event) {
        if let Some(told) = self.0.as_mut() {
            told.push(tick, event);
        }
    }
}

impl Told {
    fn iter(self) -> impl Iterator<Item = Notice> {
        [(self.kinds & !self.of_sample, self.switched_tick), (self.of_sample, self.sample_tick)]
            .into_iter()
            .flat_map(move |(kinds, tick)| (0..32).filter_map(move |kind| self.get(kinds & 1 << kind, tick)))
    }

    fn push(&mut self, tick: u32, event: Event) {
        let kind = match event {
            Event::RunStarted => kind::RUN_STARTED,
            Event::RunStopped => {
                self.stopped_tick = tick;
                kind::RUN_STOPPED
            }
            Event::ResetClosed => kind::RESET_CLOSED,
            Event::ResetOpened => kind::RESET_OPENED,
            Event::ResetDue => kind::RESET_DUE,
            Event::ResetFailed { in_a_row } => {
                self.failed_in_a_row = in_a_row;
                kind::RESET_FAILED
            }
            Event::SettlingSlow { percent } => {
                self.settling_percent = percent;
                kind::SETTLING_SLOW
            }
            Event::Decay { time_constant_s } => {
                self.decay_s = time_constant_s;
                kind::DECAY
            }
            Event::Spike => kind::SPIKE,
            Event::InputInZero => {
                self.since_tick = tick;
                kind::INPUT_IN_ZERO
            }
            Event::ReadoutNoise { stated_centicounts, observed_centicounts } => {
                self.readout_centicounts = (stated_centicounts, observed_centicounts);
                kind::READOUT_NOISE
            }
            Event::NoiseFigures { percent } => {
                self.noise_percent = percent;
                kind::NOISE_FIGURES
            }
            Event::DriftWander { percent } => {
                self.wander_percent = percent;
                kind::DRIFT_WANDER
            }
            Event::Fault(reason) => kind::FAULT + reason as u32,
        };
        self.kinds |= 1 << kind;
        if tick == self.sample_tick || kind == kind::INPUT_IN_ZERO {
            self.of_sample |= 1 << kind;
        }
    }

    /// The notice of a kind's bit, that happened at `tick` unless it has a tick for itself.
    fn get(&self, bit: u32, tick: u32) -> Option<Notice> {
        let kind = bit.checked_ilog2()?;
        let event = match kind {
            kind::DECAY => Event::Decay { time_constant_s: self.decay_s },
            kind::READOUT_NOISE => {
                let (stated_centicounts, observed_centicounts) = self.readout_centicounts;
                Event::ReadoutNoise { stated_centicounts, observed_centicounts }
            }
            kind::NOISE_FIGURES => Event::NoiseFigures { percent: self.noise_percent },
            kind::DRIFT_WANDER => Event::DriftWander { percent: self.wander_percent },
            kind::RUN_STOPPED => return Some(Notice { tick: self.stopped_tick, event: Event::RunStopped }),
            kind::RUN_STARTED => Event::RunStarted,
            kind::RESET_OPENED => Event::ResetOpened,
            kind::RESET_CLOSED => Event::ResetClosed,
            kind::SETTLING_SLOW => Event::SettlingSlow { percent: self.settling_percent },
            kind::SPIKE => Event::Spike,
            kind::INPUT_IN_ZERO => return Some(Notice { tick: self.since_tick, event: Event::InputInZero }),
            kind::RESET_FAILED => Event::ResetFailed { in_a_row: self.failed_in_a_row },
            kind::RESET_DUE => Event::ResetDue,
            _ => Event::Fault(*Reason::ALL.get(kind.checked_sub(kind::FAULT)? as usize)?),
        };
        Some(Notice { tick, event })
    }
}

impl PartialEq for Notices {
    fn eq(&self, other: &Self) -> bool {
        self.iter().eq(other.iter())
    }
}

impl Eq for Notices {}

impl fmt::Debug for Notices {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_list().entries(self.iter()).finish()
    }
}

#[cfg(feature = "defmt")]
impl defmt::Format for Notices {
    fn format(&self, f: defmt::Formatter<'_>) {
        defmt::write!(f, "[");
        for (place, notice) in self.iter().enumerate() {
            let comma = if place > 0 { ", " } else { "" };
            defmt::write!(f, "{=str}{}", comma, notice);
        }
        defmt::write!(f, "]");
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// One of every kind, in the order in which they come out.
    fn one_of_each() -> impl Iterator<Item = Event> {
        [
            Event::Decay { time_constant_s: 70_000 },
            Event::ReadoutNoise { stated_centicounts: 90, observed_centicounts: 140 },
            Event::NoiseFigures { percent: 130 },
            Event::DriftWander { percent: 300 },
            Event::RunStopped,
            Event::RunStarted,
            Event::ResetOpened,
            Event::ResetClosed,
            Event::SettlingSlow { percent: 250 },
            Event::Spike,
            Event::InputInZero,
            Event::ResetFailed { in_a_row: 3 },
            Event::ResetDue,
        ]
        .into_iter()
        .chain(Reason::ALL.map(Event::Fault))
    }

    #[test]
    fn every_kind_comes_out_as_it_went_in() {
        for event in one_of_each() {
            let mut notices = Notices::between(7, 9);
            assert!(notices.is_empty() && notices == Notices::default());
            notices.push(9, event);
            assert!(!notices.is_empty());
            assert!(notices.iter().eq([Notice { tick: 9, event }]), "{notices:?}");
        }
    }

    #[test]
    fn all_kinds_fit_in_one_step() {
        let mut notices = Notices::between(7, 9);
        for event in one_of_each() {
            notices.push(9, event);
        }
        assert!(notices.iter().map(|notice| notice.event).eq(one_of_each()), "{notices:?}");
    }

    #[test]
    fn what_the_switches_led_to_comes_first() {
        let mut notices = Notices::between(7, 9);
        notices.push(9, Event::Spike);
        notices.push(7, Event::Fault(Reason::DriftOutsideLimits));
        notices.push(2, Event::RunStopped);
        notices.push(3, Event::InputInZero);
        let ticks = [
            (2, Event::RunStopped),
            (7, Event::Fault(Reason::DriftOutsideLimits)),
            (9, Event::Spike),
            (3, Event::InputInZero),
        ];
        assert!(notices.iter().eq(ticks.map(|(tick, event)| Notice { tick, event })), "{notices:?}");
    }
}
