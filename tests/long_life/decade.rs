//! Ten years of the lamp monitor through the channel, held against the f64 filter and the truth.

use brimline::{Trust, VoltageRate};

use crate::extent::{Progress, Table, days};
use crate::lamp::{CONVERTER, Figures, Lamp, PER_COUNT, RESET_SAMPLES, SAMPLES_A_DAY, STEP_S};
use crate::reference::Reference;

/// What a year came to.
#[derive(Clone, Copy, Debug, Default)]
struct Year {
    drifts: u32,
    /// Largest `|drift - reference| / u`, smallest and largest `u` over the reference's, and how often it was widened
    /// by what the zeros had shown.
    off: f64,
    low: f64,
    high: f64,
    widened: u32,
    readings: u32,
    resets: u64,
    /// Runs without interruption, and the largest `|value - reference| / u` of theirs, at stop and closed.
    whole: u32,
    off_at_stop: f64,
    off_closed: f64,
    /// Sums of squares of error over u, and the largest.
    square_at_stop: f64,
    square_closed: f64,
    worst: f64,
}

impl Year {
    fn new() -> Self {
        Self { low: f64::INFINITY, ..Self::default() }
    }

    fn take_drift(&mut self, lamp: &Lamp<'_>, reference: &Reference) {
        let per_count = |rate: VoltageRate| rate.as_volts_per_second() / CONVERTER.lsb_v;
        let drift = lamp.channel.drift();
        let (rate, variance) = reference.rate();
        let ratio = per_count(drift.u) / variance.sqrt();
        self.drifts += 1;
        self.off = self.off.max((per_count(drift.value) - rate).abs() / variance.sqrt());
        self.low = self.low.min(ratio);
        if ratio > 1.01 {
            self.widened += 1;
        } else {
            self.high = self.high.max(ratio);
        }
        assert!(reference.correlation_squared() < 1.0, "the reference itself is definite");
    }

    fn row(&self, name: usize) -> String {
        let rms = |sum: f64| (sum / f64::from(self.readings)).sqrt();
        format!(
            "| {name} | {} | {} | {:.1e} | {:.4} to {:.4} | {} | {} | {:.1e} | {:.1e} | {:.2} | {:.2} | {:.1} |",
            self.resets,
            self.drifts,
            self.off,
            self.low,
            self.high,
            self.widened,
            self.whole,
            self.off_at_stop,
            self.off_closed,
            rms(self.square_at_stop),
            rms(self.square_closed),
            self.worst
        )
    }

    fn assert_holds(&self, name: usize) {
        assert!(self.off <= 0.01, "year {name}: the drift is off by {} u", self.off);
        assert!(self.low >= 0.99 && self.high <= 1.01, "year {name}: u of the drift {} to {}", self.low, self.high);
        assert!(
            f64::from(self.widened) <= 0.02 * f64::from(self.drifts),
            "year {name}: widened {} times",
            self.widened
        );
        assert!(self.off_at_stop <= 0.01 && self.off_closed <= 0.01, "year {name}: {self:?}");
        assert!(self.worst <= 5.0, "year {name}: an error of {} u", self.worst);
    }
}

/// Zero samples on a day: ten minutes, once a month three hours.
fn zero_samples(day: u64) -> u32 {
    if day % 30 == 29 { 108_000 } else { 6_000 }
}

/// A run of the day from the sample `from` on, and what the reference makes of it.
fn run(lamp: &mut Lamp<'_>, reference: &mut Reference, day: u64, from: u32) -> i32 {
    lamp.start_run();
    reference.start_run();
    let mut hold = match day % 12 {
        4 => 395_000..525_000,
        1 | 7 | 10 => 400_000..400_300,
        _ => 0..0,
    };
    let (mut driven, mut held, mut last) = (0_u32, 0_u32, 0);
    let mut index = from;
    while index < SAMPLES_A_DAY {
        if index == hold.start && lamp.is_near_rail() {
            hold = 0..0;
        }
        if hold.contains(&index) {
            lamp.hold();
            held += 1;
            index += 1;
            continue;
        }
        let (counts, reset) = lamp.integrate(index, day);
        let samples = if reset { 1 + RESET_SAMPLES } else { 1 };
        index += samples;
        driven += samples;
        last = counts;
    }
    reference.advance(f64::from(driven) * STEP_S);
    reference.rest(f64::from(held) * STEP_S);
    last
}

fn decade(name: &'static str, figures: Figures, suite_days: u64) {
    let days = days(suite_days);
    let setup = figures.setup();
    let mut lamp = Lamp::new(&setup, &figures, 1);
    let walks = (figures.level_walk, figures.rate_walk);
    let first = lamp.zero();
    let mut reference = Reference::new(f64::from(first), Figures::READOUT_VAR, walks, Figures::rate_prior_var());
    let mut table = Table::new(
        "| year | resets | drifts | off, u | u / reference u | widened | whole runs | off at stop, u | off closed, u \
         | rms error/u at stop | closed | worst |",
    );
    let (mut progress, mut year, mut years) = (Progress::new(name), Year::new(), Vec::new());
    let (mut truth, mut runs) = (None, 0_u32);
    for day in 0..days {
        let zeros = zero_samples(day);
        for k in u32::from(day == 0)..zeros {
            let counts = f64::from(lamp.zero());
            reference.advance(STEP_S);
            if k == 0 {
                reference.find_level(counts);
            } else {
                reference.update(counts);
            }
            if k % 500 == 499 {
                year.take_drift(&lamp, &reference);
            }
        }
        if let Some(moved) = truth.take() {
            take_closed(&lamp, &reference, moved, &mut year);
            runs += 1;
        }
        let last = run(&mut lamp, &mut reference, day, zeros);
        take_at_stop(&lamp, &reference, last, &mut year);
        truth = Some(lamp.moved);
        progress.tell(day, days);
        if day % 365 == 364 || day + 1 == days {
            years.push(core::mem::replace(&mut year, Year::new()));
        }
    }
    for (index, year) in years.iter().enumerate() {
        table.row(&year.row(index + 1));
    }
    println!(
        "\n{name}: {} samples, {} wraps of the counter, {} runs, drift now {:.3} counts/s, {:.1} ns a sample",
        lamp.samples,
        lamp.ticks >> 32,
        runs,
        lamp.drift(),
        progress.pace_ns(lamp.samples)
    );
    table.print();
    // The drift is at its limit at power-up and in the first zeros; nothing may have been left out or found wrong.
    assert!(lamp.alarms.is_empty(), "{:?}", lamp.alarms);
    for (index, year) in years.iter().enumerate() {
        year.assert_holds(index + 1);
    }
    let squares: f64 = years.iter().map(|year| year.square_closed).sum();
    let rms = (squares / f64::from(runs)).sqrt();
    // Where the offset is constant all runs share its error.
    assert!(runs < 300 || figures.rate_walk <= 0.0 || (0.9..1.1).contains(&rms), "rms error {rms} u");
}

fn take_at_stop(lamp: &Lamp<'_>, reference: &Reference, last: i32, year: &mut Year) {
    let reading = lamp.reading();
    let counts = |charge: brimline::Charge| -charge.as_coulombs() / PER_COUNT;
    let integral = reading.at_stop.integral;
    let u = -counts(integral.u);
    let error = (counts(integral.value) - lamp.moved as f64) / u;
    assert_eq!((reading.trust, reading.resets), (Trust::Good, lamp.resets));
    assert_eq!(reading.end_tick, lamp.ticks as u32);
    year.readings += 1;
    year.resets += u64::from(reading.resets);
    year.square_at_stop += error * error;
    year.worst = year.worst.max(error.abs());
    if lamp.resets == 0 && lamp.held == 0 {
        let (value, variance) = reference.at_stop(f64::from(last));
        year.whole += 1;
        year.off_at_stop = year.off_at_stop.max((counts(integral.value) - value).abs() / variance.sqrt());
    }
}

fn take_closed(lamp: &Lamp<'_>, reference: &Reference, moved: i64, year: &mut Year) {
    let reading = lamp.reading();
    let counts = |charge: brimline::Charge| -charge.as_coulombs() / PER_COUNT;
    let Some(closed) = reading.closed else { panic!("a zero has closed the run") };
    let u = -counts(closed.integral.u);
    let error = (counts(closed.integral.value) - moved as f64) / u;
    year.square_closed += error * error;
    year.worst = year.worst.max(error.abs());
    if reading.resets == 0 && reading.held_s == 0.0 {
        let (value, variance) = reference.closed();
        year.off_closed = year.off_closed.max((counts(closed.integral.value) - value).abs() / variance.sqrt());
    }
}

/// An offset that wanders by 0.01 count/s in a day.
#[test]
fn a_wandering_offset() {
    decade("wandering offset", Figures { level_walk: 1e-2, rate_walk: 1e-4 / 86_400.0 }, 60);
}

/// An offset that the set-up takes for constant, and is.
#[test]
fn a_constant_offset() {
    decade("constant offset", Figures { level_walk: 1e-2, rate_walk: 0.0 }, 60);
}
