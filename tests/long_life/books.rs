//! A board without noise and drift, whose every code is exact: the totals must be, too, to the last bit. The input
//! pauses beside resets and holds, so that the lines there are level and nothing is interpolated.

use brimline::{Channel, Charge, Circuit, Converter, Mode, Noise, Policy, Sample, Setup, Trust};

use crate::extent::{Progress, Table, days};
use crate::lamp::{CIRCUIT, CONVERTER, PER_COUNT, SAMPLES_A_DAY};
use crate::noise::Bits;

/// A fast counter: it wraps every 51 s.
const TICK_HZ: f64 = 84e6;
const STEP: u32 = 8_400_000;
/// Samples for a line, and with the switch closed.
const EDGE: u32 = 4;
const CLOSED: u32 = 2;

fn setup() -> Setup<Charge> {
    Setup::new(
        Circuit { offset_limit_v: 0.0, bias_limit_a: 0.0, ..CIRCUIT },
        Converter { tick_hz: TICK_HZ, ..CONVERTER },
        Noise::NONE,
        Policy { edge_samples: EDGE as u8, worst_input: Some(4000.0 * PER_COUNT), ..Policy::DEFAULT },
    )
}

/// The truth of a run so far.
#[derive(Clone, Copy, Debug, Default)]
struct Truth {
    moved: i64,
    resets: u32,
    ticks: u64,
    held: u64,
}

impl Truth {
    /// All that a reading says of it, to the last bit: 2^-39 C to a count.
    fn assert_in(&self, channel: &Channel<'_, Charge>, stopped: bool) {
        let Some(reading) = channel.reading() else { panic!("a run has started") };
        let charge = -(self.moved as f64) * PER_COUNT;
        assert_eq!(reading.at_stop.integral.value.as_coulombs(), charge, "{self:?} {reading:?}");
        assert_eq!(reading.latest().integral.value.as_coulombs(), charge, "{self:?} {reading:?}");
        assert_eq!(reading.closed.is_some(), stopped);
        assert_eq!(reading.resets, self.resets);
        assert_eq!(reading.elapsed_s, self.ticks as f64 / TICK_HZ);
        assert_eq!(reading.held_s, self.held as f64 / TICK_HZ);
        assert_eq!((reading.trust, reading.spikes), (Trust::Good, 0), "{reading:?}");
        assert!(reading.at_stop.integral.u.as_coulombs() > 0.0);
    }
}

/// One board and two channels that see it: for `daily` each day begins with a zero, for `whole` the input is connected
/// all the time, and the whole life is one run.
struct Books<'s> {
    daily: Channel<'s, Charge>,
    whole: Channel<'s, Charge>,
    day: Truth,
    life: Truth,
    bits: Bits,
    level: i32,
    ticks: u64,
    asked: bool,
}

impl Books<'_> {
    fn feed(&mut self, daily: Mode, whole: Mode) {
        self.ticks += u64::from(STEP);
        let sample = |mode| Sample { tick: self.ticks as u32, counts: self.level, mode, temperature: None };
        let asked = self.daily.feed(sample(daily)).request.is_some();
        let whole_asked = self.whole.feed(sample(whole)).request.is_some();
        assert_eq!(asked, whole_asked, "both see the same codes");
        self.asked = asked;
        for (truth, mode) in [(&mut self.day, daily), (&mut self.life, whole)] {
            match mode {
                Mode::Zero => {}
                Mode::Hold => {
                    truth.ticks += u64::from(STEP);
                    truth.held += u64::from(STEP);
                }
                Mode::Integrate | Mode::Reset => truth.ticks += u64::from(STEP),
            }
        }
    }

    fn integrate(&mut self, input: i32) {
        self.level += input;
        self.day.moved += i64::from(input);
        self.life.moved += i64::from(input);
        self.feed(Mode::Integrate, Mode::Integrate);
    }

    fn pause(&mut self) {
        for _ in 0..EDGE {
            self.integrate(0);
        }
    }

    /// The switch closes, and the level is wherever it comes to lie near the reset level.
    fn reset(&mut self) {
        self.pause();
        self.level = self.bits.below(2001) as i32 - 1000;
        for _ in 0..CLOSED {
            self.feed(Mode::Reset, Mode::Reset);
        }
        self.day.resets += 1;
        self.life.resets += 1;
        self.pause();
    }

    /// The input is open and the level droops; that belongs to no run.
    fn hold(&mut self) {
        self.pause();
        // Less in all than the headroom that the advice keeps.
        let droop = self.bits.below(9) as i32 - 4;
        for _ in 0..50 {
            self.level += droop;
            self.feed(Mode::Hold, Mode::Hold);
        }
        self.pause();
    }

    /// An input of one sign, up to 100 counts a sample, another one every minute.
    fn run(&mut self, samples: u32) {
        let mut input = 0;
        for index in 0..samples {
            if index % 600 == 0 {
                input = self.bits.below(101) as i32;
            }
            if index % 100_000 == 50_000 {
                self.hold();
            }
            self.integrate(input);
            if self.asked {
                self.reset();
            }
        }
    }
}

#[test]
fn totals_are_exact_in_integers() {
    let days = days(40);
    let setup = setup();
    let mut books = Books {
        daily: Channel::new(&setup),
        whole: Channel::new(&setup),
        day: Truth::default(),
        life: Truth::default(),
        bits: Bits::seeded(2),
        level: 0,
        ticks: 0,
        asked: false,
    };
    let mut table = Table::new("| year | resets | counts | counts of one run | its resets | wraps of the counter |");
    let mut progress = Progress::new("exact totals");
    let (mut resets, mut counts, mut samples) = (0_u64, 0_i64, 0_u64);
    for day in 0..days {
        for k in 0..600 {
            let whole = if day == 0 { Mode::Zero } else { Mode::Integrate };
            books.feed(Mode::Zero, whole);
            if day > 0 && k == 0 {
                books.day.assert_in(&books.daily, true);
            }
        }
        if day > 0 {
            books.day.assert_in(&books.daily, true);
            books.life.assert_in(&books.whole, false);
        }
        books.day = Truth::default();
        books.run(SAMPLES_A_DAY - 600);
        books.day.assert_in(&books.daily, false);
        books.life.assert_in(&books.whole, false);
        resets += u64::from(books.day.resets);
        counts += books.day.moved;
        samples = books.ticks / u64::from(STEP);
        progress.tell(day, days);
        if day % 365 == 364 || day + 1 == days {
            let Truth { moved, resets: life, .. } = books.life;
            let wraps = books.ticks >> 32;
            table.row(&format!("| {} | {resets} | {counts} | {moved} | {life} | {wraps} |", day / 365 + 1));
            (resets, counts) = (0, 0);
        }
    }
    println!("\nexact totals: {samples} samples, {:.1} ns a sample for two channels", progress.pace_ns(samples));
    table.print();
    let bridged = books.life.resets;
    assert!(u64::from(bridged) > 50 * days, "{bridged} resets");
}
