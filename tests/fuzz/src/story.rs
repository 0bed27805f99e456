//! Measurements with known truth: a simulated board, an input, and whatever goes wrong with modes, time and samples. A
//! reading that says it is good must hold the truth.
//!
//! What the documentation says cannot be seen stays out: an input that changes beside or within a dead time more than
//! once, input in a zero, samples that are off by less than the noise and the worst input allow; and what `excluded`
//! lists.

use brimline::{Channel, Estimate, Event, Mode, Reading, Sample, Setup, Trust};

use crate::board::{AnySetup, Parts, Plain, parts};
use crate::draw::{Dice, Draw};
use crate::excluded;
use crate::plant::{Plant, Truth};
use crate::show;

/// How far a good value may be off, in its own uncertainties: noise alone reaches this once in 10^15 times.
const FAR: f64 = 8.0;
const MOST_SAMPLES: u32 = 3000;

pub fn run(bytes: &[u8]) {
    let mut draw = Draw::new(bytes);
    let mut parts = parts(&mut draw);
    let sample_s = draw.decades(2e-3, 0.05);
    let speed = draw.decades(0.3, 300.0);
    excluded::tame(&mut parts, sample_s, speed);
    excluded::tame_open(&mut parts);
    show(|| format!("{parts:#?}"));
    match parts.any_setup() {
        Some(AnySetup::Charge(setup)) => tell(&mut draw, &parts, &setup, sample_s, speed),
        Some(AnySetup::Flux(setup)) => tell(&mut draw, &parts, &setup, sample_s, speed),
        None => {}
    }
}

struct Story<'s, Q> {
    setup: &'s Setup<Q>,
    channel: Channel<'s, Q>,
    plant: Plant,
    dice: Dice,
    tick: u32,
    samples: u32,
    soaks: bool,
    /// Runs that the channel has started: a sample that it could not use starts none.
    runs: u32,
}

fn tell<Q: Plain>(draw: &mut Draw, parts: &Parts, setup: &Setup<Q>, sample_s: f64, speed: f64) {
    let part = |draw: &mut Draw| draw.linear(-1.0, 1.0);
    let truth = Truth { offset: part(draw), bias: part(draw), pedestal: 2.0 * part(draw) };
    let mut story = Story {
        setup,
        channel: Channel::new(setup),
        plant: Plant::new(parts, truth),
        dice: Dice::new(draw.bits()),
        tick: draw.long(),
        samples: 0,
        soaks: excluded::soaks(parts),
        runs: 0,
    };
    let unit = speed * parts.input_per_count() / sample_s;
    let ticks = (sample_s * parts.converter.tick_hz).round().max(1.0) as u32;
    let mut input = 0.0;
    story.dwell(Mode::Reset, 5, ticks, input);
    while !draw.is_empty() && story.samples < MOST_SAMPLES && !(story.soaks && story.plant.saturated) {
        match draw.byte() % 16 {
            0..3 => story.dwell(Mode::Zero, draw.count(400), ticks, input),
            3..7 => {
                // A line beside a reset is fitted to a few samples: within them the input does not change.
                if draw.flag(128) && story.channel.mode() != Some(Mode::Integrate) {
                    input = part(draw) * unit;
                }
                story.dwell(Mode::Integrate, draw.count(300), ticks, input);
            }
            7..9 => story.dwell(Mode::Reset, draw.count(20), ticks, input),
            9 => story.dwell(Mode::Hold, draw.count(100), ticks, input),
            10 => story.silence(draw, ticks, input),
            11 if !story.soaks => story.stumble(draw, ticks, input),
            12 => story.spike(draw, ticks, input),
            13 if !story.soaks => {
                story.plant.stuck_open = draw.flag(128);
                story.dwell(Mode::Reset, draw.count(20), ticks, input);
                story.plant.stuck_open = false;
            }
            14 => story.channel.switch_repaired(),
            // Unequal steps.
            _ => {
                let mode = draw.pick(&[Mode::Integrate, Mode::Zero, Mode::Hold]);
                for _ in 0..draw.count(30) {
                    story.dwell(mode, 1, 1 + ticks / 128 * (u32::from(draw.byte()) + 8), input);
                }
            }
        }
    }
}

impl<Q: Plain> Story<'_, Q> {
    fn dwell(&mut self, mode: Mode, samples: u32, ticks: u32, input: f64) {
        for index in 0..samples {
            self.pass(mode, ticks, input);
            let counts = self.plant.code(&mut self.dice);
            self.feed(mode, counts, ticks);
            if index < 3 || index % 32 == 31 {
                self.check();
            }
        }
        self.check();
    }

    fn pass(&mut self, mode: Mode, ticks: u32, input: f64) {
        let seconds = f64::from(ticks) / self.setup.converter().tick_hz;
        self.plant.pass(mode, seconds, input, &mut self.dice);
    }

    fn feed(&mut self, mode: Mode, counts: i32, ticks: u32) {
        self.samples += 1;
        self.tick = self.tick.wrapping_add(ticks);
        let step = self.channel.feed(Sample { tick: self.tick, counts, mode, temperature: None });
        self.runs += u32::from(step.notices.iter().any(|notice| notice.event == Event::RunStarted));
        show(|| {
            let (truth, notices) = (self.plant.integral, step.notices.iter().collect::<Vec<_>>());
            let figure = |e: &Estimate<Q>| (e.integral.value.plain() - truth, e.integral.u.plain());
            let off = self.channel.reading().map(|r| (figure(&r.at_stop), r.closed.as_ref().map(figure)));
            let drift = self.channel.drift();
            format!(
                "{} {mode:?} {counts}: {truth:e} {:?} {notices:?}, off by {off:?}, drift {drift:?}",
                self.tick, self.plant
            )
        });
    }

    /// Samples that did not come; the input goes on. The mode stays, or the switches moved at the last sample.
    fn silence(&mut self, draw: &mut Draw, ticks: u32, input: f64) {
        let mode = draw.pick(&[Mode::Integrate, Mode::Zero, Mode::Hold, Mode::Reset]);
        let gap = (self.setup.policy().gap_limit_s * self.setup.converter().tick_hz) as u32;
        let ticks = draw.pick(&[ticks.saturating_mul(5).min(gap), gap, gap.saturating_mul(2), ticks.saturating_mul(3)]);
        let short = draw.pick(&[1, 2]) * (ticks.min(gap) / 256 + 1);
        self.dwell(mode, 1, if self.soaks { short } else { ticks.min(0x7FFF_FFFF) }, input);
    }

    /// A counter that stands still, or starts again elsewhere, while time goes on.
    fn stumble(&mut self, draw: &mut Draw, ticks: u32, input: f64) {
        let mode = draw.pick(&[Mode::Integrate, Mode::Zero, Mode::Hold, Mode::Reset]);
        if draw.flag(128) {
            self.tick = self.tick.wrapping_sub(0x1000_0000).wrapping_sub(draw.long() >> 2);
            self.dwell(mode, 8, ticks, input);
        } else {
            for _ in 0..draw.count(4) {
                self.pass(mode, ticks, input);
                let counts = self.plant.code(&mut self.dice);
                self.feed(mode, counts, 0);
            }
        }
    }

    /// A sample that is far off: in a zero anywhere, in a run an end code.
    fn spike(&mut self, draw: &mut Draw, ticks: u32, input: f64) {
        let converter = self.setup.converter();
        let mode = if self.soaks { Mode::Zero } else { draw.pick(&[Mode::Zero, Mode::Integrate]) };
        self.pass(mode, ticks, input);
        let end = draw.pick(&[converter.code_min, converter.code_max]);
        self.feed(mode, end, ticks);
        self.check();
        if self.soaks {
            self.dwell(Mode::Zero, 1, ticks, input);
        }
    }

    fn check(&self) {
        if !(self.soaks && self.plant.saturated)
            && let Some(reading) = self.channel.reading()
            && reading.trust == Trust::Good
            && self.runs == self.plant.runs
        {
            self.assert_true(&reading);
        }
    }

    fn assert_true(&self, reading: &Reading<Q>) {
        let truth = self.plant.integral;
        for estimate in [Some(&reading.at_stop), reading.closed.as_ref()].into_iter().flatten() {
            let (value, u) = (estimate.integral.value.plain(), estimate.integral.u.plain());
            let error = value - truth;
            // The crate's own arithmetic: some steps in 24 bits of a drift, 2^-14 count of a leak.
            let rounding = 3e-7 * (truth.abs() + reading.restored.plain().abs() + reading.drift_removed.plain().abs());
            assert!(
                error.abs() <= FAR * u + rounding,
                "a good reading is off by {} u: {value:e} +- {u:e}, not {truth:e}\n{reading:#?}\n{:#?}",
                error / u,
                self.setup
            );
        }
    }
}
