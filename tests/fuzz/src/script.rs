//! Any samples in any order for a board of any kind, with a second channel beside the first: the same board with the
//! other sign of the input and a counter that started elsewhere. Both must say the same.

use brimline::{Channel, Mode, Sample, Setup, Step, Temperature};

use crate::board::{AnySetup, Parts, Plain, parts};
use crate::draw::{Dice, Draw};
use crate::shadow::{Shadow, assert_kept};
use crate::show;
use crate::sound::{assert_sound, figures};

/// Most samples in a case: enough for every block, window and count there is, and still many cases a second.
const MOST_SAMPLES: u32 = 2000;
const MODES: [Mode; 4] = [Mode::Zero, Mode::Integrate, Mode::Reset, Mode::Hold];

pub fn run(bytes: &[u8]) {
    let mut draw = Draw::new(bytes);
    let parts = parts(&mut draw);
    show(|| format!("{parts:#?}"));
    match parts.any_setup() {
        Some(AnySetup::Charge(setup)) => play(&mut draw, &parts, &setup),
        Some(AnySetup::Flux(setup)) => play(&mut draw, &parts, &setup),
        None => {}
    }
}

struct Bench<'s, Q> {
    setup: &'s Setup<Q>,
    channel: Channel<'s, Q>,
    other: Channel<'s, Q>,
    /// How far the other counter is ahead.
    shift: u32,
    shadow: Shadow,
    dice: Dice,
    tick: u32,
    level: f64,
    temperature: Option<Temperature>,
    samples: u32,
}

fn play<Q: Plain>(draw: &mut Draw, parts: &Parts, setup: &Setup<Q>) {
    let Some(mirrored) = parts.mirrored().setup::<Q>() else { panic!("a sign is no reason to refuse a board") };
    let converter = setup.converter();
    let nominal = (converter.tick_hz * draw.decades(1e-3, 0.1)).clamp(1.0, 2e9) as u32;
    let mut bench = Bench {
        setup,
        channel: Channel::new(setup),
        other: Channel::new(&mirrored),
        shift: draw.long(),
        shadow: Shadow::new(setup),
        dice: Dice::new(draw.bits()),
        tick: draw.long(),
        level: converter.code(setup.circuit().reset_level_v),
        temperature: None,
        samples: 0,
    };
    let gap = (setup.policy().gap_limit_s * converter.tick_hz) as u32;
    let codes = [
        converter.code_min,
        converter.code_max,
        converter.code_min + 1,
        converter.code_max - 1,
        i32::MIN,
        i32::MAX,
        converter.code(setup.circuit().rail_high_v) as i32,
        converter.code(setup.circuit().rail_low_v) as i32,
        converter.code(setup.circuit().reset_level_v).round() as i32,
    ];
    let mut step = nominal;
    while !draw.is_empty() && bench.samples < MOST_SAMPLES {
        match draw.byte() % 16 {
            0..7 => {
                let (mode, samples) = (draw.pick(&MODES), draw.count(400));
                let slope = draw.pick(&[0.0, 0.3, -20.0, 300.0, -7.0]) * draw.unit();
                let noise = draw.pick(&[1.0, 0.0, 0.5, 5.0, 100.0]) * setup.noise().readout_counts.max(0.3);
                bench.dwell(mode, samples, step, slope, noise);
            }
            7 => step = draw.pick(&[nominal, 1, 0x7FFF_FFFF, gap, gap.saturating_add(2), 3]),
            8 => step = nominal.saturating_mul(u32::from(draw.byte()) + 1).min(0x7FFF_FFFF),
            9 => {
                let (ticks, counts, mode) = (draw.long(), draw.long() as i32, draw.pick(&MODES));
                bench.feed(ticks, counts, mode);
            }
            10 => {
                // A counter that stands, steps back and stays there, or was restarted.
                let ticks = draw.pick(&[0, 0x8000_0000, u32::MAX, 0u32.wrapping_sub(nominal)]);
                let mode = draw.pick(&MODES);
                for _ in 0..draw.count(8) {
                    bench.dwell_once(ticks, mode);
                }
            }
            11 => bench.level = f64::from(draw.pick(&codes)),
            12 => bench.level += f64::from(draw.word() as i16),
            13 => {
                bench.channel.switch_repaired();
                bench.other.switch_repaired();
                bench.shadow.repaired();
            }
            14 => {
                let warm = |draw: &mut Draw| {
                    let any = if draw.flag(32) { draw.long() as i32 } else { i32::from(draw.word()) };
                    Temperature::from_millidegrees_celsius(any)
                };
                bench.temperature = draw.flag(200).then(|| warm(draw));
            }
            _ => {
                bench.level = f64::from(codes[8]);
                let samples = draw.count(12);
                bench.dwell(Mode::Reset, samples, step, 0.0, 0.5);
            }
        }
        bench.ask();
    }
}

impl<Q: Plain> Bench<'_, Q> {
    fn dwell(&mut self, mode: Mode, samples: u32, ticks: u32, slope: f64, noise: f64) {
        for index in 0..samples {
            self.level += slope;
            let counts = (self.level + noise * self.dice.even()).round() as i32;
            self.feed(ticks, counts, mode);
            if index < 4 || index % 16 == 0 {
                self.read();
            }
        }
    }

    fn dwell_once(&mut self, ticks: u32, mode: Mode) {
        self.feed(ticks, self.level.round() as i32, mode);
    }

    fn feed(&mut self, ticks: u32, counts: i32, mode: Mode) {
        self.samples += 1;
        self.tick = self.tick.wrapping_add(ticks);
        let sample = Sample { tick: self.tick, counts, mode, temperature: self.temperature };
        let before = self.channel.reading();
        let step = self.channel.feed(sample);
        show(|| format!("{sample:?} {:?} {:?}", step.request, step.notices.iter().collect::<Vec<_>>()));
        self.compare(sample, &step);
        let used = self.shadow.take(sample, &step, &self.channel);
        // Only an integrating sample moves the total.
        if let (Some(before), Some(after)) = (before, self.channel.reading())
            && used
            && mode != Mode::Integrate
        {
            assert_kept(&before, &after);
        }
    }

    /// The other channel says the same of the same.
    fn compare(&mut self, sample: Sample, step: &Step) {
        let tick = sample.tick.wrapping_add(self.shift);
        let other = self.other.feed(Sample { tick, ..sample });
        assert_eq!(step.request, other.request);
        assert_eq!(step.notices.iter().count(), other.notices.iter().count());
        for (one, two) in step.notices.iter().zip(other.notices.iter()) {
            assert_eq!((one.tick.wrapping_add(self.shift), one.event), (two.tick, two.event));
        }
    }

    fn read(&mut self) {
        let reading = self.channel.reading();
        self.shadow.check(self.setup, reading.as_ref());
        let Some(reading) = reading else { return };
        assert_sound(&reading);
        let own = figures(&reading);
        if let Some(again) = self.channel.reading() {
            own.assert_same(&figures(&again), "asked twice");
            assert_eq!((reading.start_tick, reading.end_tick), (again.start_tick, again.end_tick));
        }
        let Some(other) = self.other.reading() else { panic!("the other channel has no reading") };
        own.assert_same(&figures(&other).mirrored(), "another sign and another counter");
    }

    /// What may be asked at any time.
    fn ask(&mut self) {
        self.read();
        for rate in [self.channel.drift(), self.channel.droop()] {
            let (value, u) = (rate.value.as_volts_per_second(), rate.u.as_volts_per_second());
            assert!(value.is_finite() && u >= 0.0, "{rate:?}");
        }
        assert_eq!(self.channel.drift(), self.other.drift());
        assert_eq!(self.channel.droop(), self.other.droop());
        if let Some((offset, bias)) = self.channel.offset_and_bias() {
            assert!(offset.value.as_volts().is_finite() && offset.u.as_volts() >= 0.0, "{offset:?}");
            assert!(bias.value.as_amperes().is_finite() && bias.u.as_amperes() >= 0.0, "{bias:?}");
        }
        assert_eq!(self.channel.switch_has_failed(), self.other.switch_has_failed());
    }
}
