//! A lamp monitor: a zero each morning, four exposures a day with resets when the channel asks for them, a hold now
//! and then, dark days, an offset that wanders. Ten samples a second.

use brimline::{Channel, Charge, Circuit, Converter, Event, Mode, Noise, Policy, Reading, Sample, Setup};

use crate::noise::{Bits, NOISE_VAR, code};

/// 2^-21 F and 2^-18 V a code: a count is 2^-39 C, so that sums of counts are exact as charges, too.
pub(crate) const PER_COUNT: f64 = 1.0 / (1_u64 << 39) as f64;
const LSB_V: f64 = 1.0 / (1_u64 << 18) as f64;
const TICK_HZ: f64 = 1e6;
const STEP: u32 = 100_000;
pub(crate) const STEP_S: f64 = 0.1;
pub(crate) const SAMPLES_A_DAY: u32 = 864_000;

pub(crate) const CIRCUIT: Circuit =
    Circuit { capacitance_f: 1.0 / (1_u64 << 21) as f64, rail_low_v: -1.9, rail_high_v: 1.9, ..Circuit::DEFAULT };
pub(crate) const CONVERTER: Converter = Converter {
    code_zero_v: 0.0,
    lsb_v: LSB_V,
    code_min: -(1 << 19),
    code_max: (1 << 19) - 1,
    tick_hz: TICK_HZ,
    ..Converter::DEFAULT
};
/// False alarms in 30,000 years: what the watch for input does to the filter is not the matter here.
const POLICY: Policy = Policy { worst_input: Some(1e-9), false_alarm_s: 1e12, ..Policy::DEFAULT };

/// Noise of the channel, counts and seconds.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Figures {
    pub(crate) level_walk: f64,
    pub(crate) rate_walk: f64,
}

impl Figures {
    pub(crate) fn setup(&self) -> Setup<Charge> {
        let noise = Noise {
            readout_counts: NOISE_VAR.sqrt(),
            input_density: (2.0 * self.level_walk).sqrt() * PER_COUNT,
            offset_wander: self.rate_walk.sqrt() * PER_COUNT,
            ..Noise::NONE
        };
        Setup::new(CIRCUIT, CONVERTER, noise, POLICY)
    }

    /// Variance of a sample, rounding included.
    pub(crate) const READOUT_VAR: f64 = NOISE_VAR + 1.0 / 12.0;

    /// Of the drift that the data sheet allows.
    pub(crate) fn rate_prior_var() -> f64 {
        let limit = CIRCUIT.drift_limit_v_per_s() / LSB_V;
        limit * limit / 3.0
    }
}

/// The board and its channel. The truth is kept in integers.
pub(crate) struct Lamp<'s> {
    pub(crate) channel: Channel<'s, Charge>,
    bits: Bits,
    /// Output and what it moves by in a sample's time, 2^-32 counts, and the steps of the two walks.
    level_q32: i64,
    drift_q32: i64,
    level_step_q32: i64,
    drift_step_q32: i64,
    /// All ticks and samples since power-up.
    pub(crate) ticks: u64,
    pub(crate) samples: u64,
    /// Counts by which the input has moved the level in the present run, dead time included.
    pub(crate) moved: i64,
    pub(crate) resets: u32,
    pub(crate) held: u32,
    asked: bool,
    /// Notices that tell of something wrong, or of a sample left out.
    pub(crate) alarms: Vec<Event>,
}

impl<'s> Lamp<'s> {
    pub(crate) fn new(setup: &'s Setup<Charge>, figures: &Figures, seed: u64) -> Self {
        let q32 = |counts: f64| (counts * 4_294_967_296.0) as i64;
        let mut lamp = Self {
            channel: Channel::new(setup),
            bits: Bits::seeded(seed),
            level_q32: 0,
            drift_q32: q32(0.5 * STEP_S),
            level_step_q32: q32((figures.level_walk * STEP_S).sqrt()),
            drift_step_q32: q32((figures.rate_walk * STEP_S).sqrt() * STEP_S),
            ticks: 0,
            samples: 0,
            moved: 0,
            resets: 0,
            held: 0,
            asked: false,
            alarms: Vec::new(),
        };
        lamp.feed(Mode::Reset);
        lamp
    }

    /// The true drift, counts/s.
    pub(crate) fn drift(&self) -> f64 {
        self.drift_q32 as f64 / 4_294_967_296.0 / STEP_S
    }

    /// A sample of the level as it is.
    fn feed(&mut self, mode: Mode) -> i32 {
        self.ticks += u64::from(STEP);
        self.samples += 1;
        let counts = code(self.level_q32 + self.bits.noise_q32());
        let step = self.channel.feed(Sample { tick: self.ticks as u32, counts, mode, temperature: None });
        self.asked = step.request == Some(Mode::Reset);
        self.alarms.extend(step.notices.iter().map(|notice| notice.event).filter(|&event| is_alarm(event)));
        counts
    }

    fn wander(&mut self) {
        if self.drift_step_q32 > 0 {
            self.drift_q32 += self.bits.either(self.drift_step_q32);
        }
    }

    pub(crate) fn zero(&mut self) -> i32 {
        self.wander();
        self.level_q32 += self.drift_q32 + self.bits.either(self.level_step_q32);
        self.feed(Mode::Zero)
    }

    /// A sample with the input connected, and a reset after it if it was asked for, or will be before morning.
    /// `true` if there was one.
    pub(crate) fn integrate(&mut self, index: u32, day: u64) -> (i32, bool) {
        self.wander();
        let input = input_at(index, day);
        self.moved += input;
        self.level_q32 += (input << 32) + self.drift_q32 + self.bits.either(self.level_step_q32);
        let counts = self.feed(Mode::Integrate);
        let asked = self.asked || (index >= EVENING && self.is_near_rail());
        if asked {
            self.resets += 1;
            self.level_q32 = 0;
            for after in 1..=RESET_SAMPLES {
                self.wander();
                self.moved += input_at(index + after, day);
                self.feed(Mode::Reset);
            }
        }
        (counts, asked)
    }

    /// The input is open for a sample; the level droops by a quarter of the drift.
    pub(crate) fn hold(&mut self) {
        self.wander();
        self.held += 1;
        self.level_q32 += self.drift_q32 / 4;
        self.feed(Mode::Hold);
    }

    /// Whether a long hold or zero could end at a rail.
    pub(crate) fn is_near_rail(&self) -> bool {
        (self.level_q32 >> 32).abs() > 480_000
    }

    pub(crate) fn start_run(&mut self) {
        (self.moved, self.resets, self.held) = (0, 0, 0);
    }

    pub(crate) fn reading(&self) -> Reading<Charge> {
        let Some(reading) = self.channel.reading() else { panic!("a run has started") };
        reading
    }
}

/// From here on, samples of a day, nothing but the zero is to come.
const EVENING: u32 = 860_000;

/// How long the reset switch is closed, samples.
pub(crate) const RESET_SAMPLES: u32 = 2;

fn is_alarm(event: Event) -> bool {
    matches!(
        event,
        Event::Fault(_) | Event::Spike | Event::InputInZero | Event::ResetFailed { .. } | Event::Decay { .. }
    )
}

/// Whole counts that the lamp moves the level by up to the sample `index` of a day: four exposures of two hours, with a
/// ripple; on every seventh day one, and dim.
fn input_at(index: u32, day: u64) -> i64 {
    let (exposure, within) = (index / 216_000, index % 216_000);
    if !(100_000..172_000).contains(&within) {
        return 0;
    }
    if is_dark(day) {
        return if exposure == 1 { -1 } else { 0 };
    }
    let ripple = i64::from((within % 1024).abs_diff(512) / 128);
    -(8 + (day * 7 % 24).cast_signed() + ripple)
}

pub(crate) fn is_dark(day: u64) -> bool {
    day % 7 == 3
}
