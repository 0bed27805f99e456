//! A zero that never ends: a billion updates of the drift filter without a break.

use brimline::estimate::{Trend, Walk};
use brimline::{Channel, Charge, Circuit, Converter, Mode, Policy, Sample, Setup, VoltageRate};

use crate::extent::{Progress, Table, updates};
use crate::lamp::{CIRCUIT, CONVERTER, Figures, STEP_S};
use crate::noise::{Bits, code};
use crate::reference::Reference;

/// A level that drifts and wanders as the figures say.
struct Wanderer {
    bits: Bits,
    level_q32: i64,
    drift_q32: i64,
    level_step_q32: i64,
    drift_step_q32: i64,
}

impl Wanderer {
    fn new(level: i64, drift: f64, figures: &Figures) -> Self {
        let q32 = |counts: f64| (counts * 4_294_967_296.0) as i64;
        Self {
            bits: Bits::seeded(3),
            level_q32: level << 32,
            drift_q32: q32(drift * STEP_S),
            level_step_q32: q32((figures.level_walk * STEP_S).sqrt()),
            drift_step_q32: q32((figures.rate_walk * STEP_S).sqrt() * STEP_S),
        }
    }

    /// The next sample. In a billion steep drifts come near the end of 32 bits.
    fn next(&mut self) -> i32 {
        if self.drift_step_q32 > 0 {
            self.drift_q32 += self.bits.either(self.drift_step_q32);
        }
        let walk = if self.level_step_q32 > 0 { self.bits.either(self.level_step_q32) } else { 0 };
        self.level_q32 += self.drift_q32 + walk;
        code(self.level_q32 + self.bits.noise_q32())
    }
}

/// What a filter said of itself and the reference of it since the last row.
#[derive(Default)]
struct Since {
    off: f64,
    off_level: f64,
    low: f64,
    high: f64,
}

impl Since {
    fn new() -> Self {
        Self { low: f64::INFINITY, ..Self::default() }
    }

    fn take(&mut self, rate: f64, u: f64, reference: &Reference) {
        let (expected, variance) = reference.rate();
        self.off = self.off.max((rate - expected).abs() / variance.sqrt());
        self.low = self.low.min(u / variance.sqrt());
        self.high = self.high.max(u / variance.sqrt());
    }

    fn take_level(&mut self, trend: &Trend, reference: &Reference) {
        let (level, variance) = reference.level();
        let filtered = trend.anchor() as f64 + f64::from(trend.residual());
        self.off_level = self.off_level.max((filtered - level).abs() / variance.sqrt());
    }

    fn row(&self, updates: u64, reference: &Reference, definite: Option<f64>) -> String {
        let definite = definite.map_or("-".to_owned(), |definite| format!("{definite:.6}"));
        let (rate, variance) = reference.rate();
        format!(
            "| {updates} | {rate:.6} | {:.2e} | {:.1e} | {:.1e} | {:.4} to {:.4} | {:.6} | {definite} |",
            variance.sqrt(),
            self.off,
            self.off_level,
            self.low,
            self.high,
            1.0 - reference.correlation_squared()
        )
    }
}

/// Samples between two looks: no power of two, and no divisor of anything.
const LOOK: u64 = 97;

const HEADING: &str =
    "| updates | drift, counts/s | u | off, u | level off, u | u / reference u | 1 - rho^2, reference | filter |";

/// The filter by itself, of whose covariance matrix all is seen.
fn trend(name: &'static str, drift: f64, figures: Figures, suite: u64) {
    let updates = updates(suite);
    let mut wanderer = Wanderer::new(if drift > 1.0 { -(1 << 30) } else { 1 << 23 }, drift, &figures);
    let walks = (figures.level_walk, figures.rate_walk);
    let prior = Figures::rate_prior_var();
    let readout = Figures::READOUT_VAR as f32;
    let first = wanderer.next();
    let mut trend = Trend::new(first.into(), readout, 0.0, prior as f32);
    let mut reference = Reference::new(f64::from(first), Figures::READOUT_VAR, walks, prior);
    let step = STEP_S as f32;
    let walk = Walk::over(step, figures.level_walk as f32, figures.rate_walk as f32);
    let (mut table, mut progress) = (Table::new(HEADING), Progress::new(name));
    let (mut since, mut next, mut worst) = (Since::new(), 10_000, 0.0_f64);
    for k in 1..=updates {
        let counts = wanderer.next();
        trend.advance(step, walk);
        trend.update(counts.into(), 0.0, readout);
        reference.advance(STEP_S);
        reference.update(f64::from(counts));
        if k % LOOK == 0 || k == updates {
            since.take(trend.rate().into(), f64::from(trend.rate_variance()).sqrt(), &reference);
            assert!(definite(&trend) > 0.0, "{k}: {trend:?}");
            since.take_level(&trend, &reference);
        }
        if k == next || k == updates {
            table.row(&since.row(k, &reference, Some(definite(&trend))));
            worst = worst.max(since.off).max(since.off_level);
            assert!(since.low >= 0.99 && since.high <= 1.01, "{name}, {k}: u {} to {}", since.low, since.high);
            (since, next) = (Since::new(), next * 10);
            progress.tell(k, updates);
        }
        if k % (1 << 20) == 0 {
            progress.tell(k, updates);
        }
    }
    println!("\n{name}: {:.1} ns an update and its reference", progress.pace_ns(updates));
    table.print();
    assert!(worst <= 0.01, "{name}: drift or level is off by {worst} u");
}

/// `1 - correlation^2`: above 0 for a matrix that is positive definite.
fn definite(trend: &Trend) -> f64 {
    let (level, rate) = (f64::from(trend.level_variance()), f64::from(trend.rate_variance()));
    let shared = f64::from(trend.covariance());
    if level > 0.0 && rate > 0.0 && level.is_finite() && rate.is_finite() {
        1.0 - shared * shared / (level * rate)
    } else {
        -1.0
    }
}

#[test]
fn filter_of_a_wandering_offset() {
    trend("filter, wandering offset", 0.5, Figures { level_walk: 1e-2, rate_walk: 1e-9 }, 20_000_000);
}

#[test]
fn filter_of_a_steep_drift() {
    trend("filter, steep drift", 20.0, Figures { level_walk: 1e-4, rate_walk: 1e-9 }, 10_000_000);
}

#[test]
fn filter_of_a_constant_offset() {
    trend("filter, constant offset", 0.5, Figures { level_walk: 1e-4, rate_walk: 0.0 }, 20_000_000);
}

/// The same through the channel, whose every sample is a block of its own. The converter is wide enough for years of
/// drift.
#[test]
fn channel_in_an_endless_zero() {
    let updates = updates(10_000_000);
    let figures = Figures { level_walk: 1e-2, rate_walk: 1e-9 };
    let plain = figures.setup();
    let converter = Converter { code_min: -(1 << 29), code_max: 1 << 29, ..CONVERTER };
    let circuit = Circuit { rail_low_v: -1e3, rail_high_v: 1e3, ..CIRCUIT };
    let policy = Policy { zero_block_s: 0.0, false_alarm_s: 1e12, ..Policy::DEFAULT };
    let setup: Setup<Charge> = Setup::new(circuit, converter, *plain.noise(), policy);
    let mut wanderer = Wanderer::new(-100_000_000, 0.5, &figures);
    let mut channel = Channel::new(&setup);
    let mut tick = 0_u32;
    let mut feed = |channel: &mut Channel<'_, _>, counts| {
        tick = tick.wrapping_add(100_000);
        let step = channel.feed(Sample { tick, counts, mode: Mode::Zero, temperature: None });
        assert!(step.notices.is_empty(), "{:?}", step.notices);
    };
    let first = wanderer.next();
    feed(&mut channel, first);
    let walks = (figures.level_walk, figures.rate_walk);
    let mut reference = Reference::new(f64::from(first), Figures::READOUT_VAR, walks, Figures::rate_prior_var());
    let mut table = Table::new(HEADING);
    let (mut progress, mut since, mut next) = (Progress::new("channel, endless zero"), Since::new(), 10_000);
    let (mut widened, mut looks, mut worst) = (0_u64, 0_u64, 0.0_f64);
    for k in 1..=updates {
        let counts = wanderer.next();
        feed(&mut channel, counts);
        reference.advance(STEP_S);
        reference.update(f64::from(counts));
        if k % LOOK == 0 || k == updates {
            let per_count = |rate: VoltageRate| rate.as_volts_per_second() / CONVERTER.lsb_v;
            let drift = channel.drift();
            let (_, variance) = reference.rate();
            looks += 1;
            // Now and then the innovations by chance look as if the noise were larger.
            let is_widened = per_count(drift.u) > 1.01 * variance.sqrt();
            widened += u64::from(is_widened);
            let u = if is_widened { variance.sqrt() } else { per_count(drift.u) };
            since.take(per_count(drift.value), u, &reference);
        }
        if k == next || k == updates {
            table.row(&since.row(k, &reference, None));
            worst = worst.max(since.off);
            assert!(since.low >= 0.99 && since.high <= 1.01, "{k}: u {} to {}", since.low, since.high);
            (since, next) = (Since::new(), next * 10);
        }
        if k % (1 << 20) == 0 {
            progress.tell(k, updates);
        }
    }
    println!(
        "\nchannel, endless zero: {:.1} ns a sample and its reference; u widened at {widened} of {looks} looks",
        progress.pace_ns(updates)
    );
    table.print();
    assert!(worst <= 0.01, "the drift is off by {worst} u");
    assert!(widened * 50 <= looks, "widened at {widened} of {looks} looks");
}
