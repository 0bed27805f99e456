//! A coil, its integrator and a board, simulated.

use brimline::Mode;
use coil_stm32f4::{Board, COIL, Fault, Outbox, PERIOD_TICKS, TICK_HZ, Taken};

/// What goes wrong at the sample with the given number.
#[derive(Clone, Copy, PartialEq)]
pub(crate) enum Mishap {
    None,
    /// The level moves by 0.3 V at once.
    Jump(u32),
    /// For 2 s no sample is taken.
    Silence(u32),
    /// From here on the reset switch stays open.
    SwitchOpen(u32),
    /// From here on the pins cannot be driven.
    Pins(u32),
}

pub(crate) struct Plant {
    pub(crate) mishap: Mishap,
    /// Voltage of the coil, from the first of two samples to the other.
    pub(crate) pulse: (f64, u32, u32),
    /// When the button's contact closes, for 50 samples, bouncing in the first and the last 10.
    pub(crate) presses: Vec<u32>,
    /// The simulation is over, as if late, after so many samples.
    pub(crate) last: u32,
    pub(crate) mode: Mode,
    /// Everything sent.
    pub(crate) text: String,
    samples: u32,
    volts: f64,
    tick: u32,
    random: u64,
}

impl Plant {
    pub(crate) fn new(pulse: (f64, u32, u32), presses: &[u32], mishap: Mishap, last: u32) -> Self {
        Self {
            mishap,
            pulse,
            presses: presses.to_vec(),
            last,
            mode: Mode::Hold,
            text: String::new(),
            samples: 0,
            // At power-up the level is at the rail.
            volts: 3.25,
            // The counter wraps in the first second.
            tick: u32::MAX - TICK_HZ / 2,
            random: 1,
        }
    }

    /// Sum of four uniform numbers, standard deviation 1. Knuth's 64-bit generator (constants from memory).
    fn noise(&mut self) -> f64 {
        let mut uniform = || {
            self.random = self.random.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            (self.random >> 11) as f64 / (1_u64 << 53) as f64 - 0.5
        };
        (uniform() + uniform() + uniform() + uniform()) * 3.0_f64.sqrt()
    }

    fn contact(&self) -> bool {
        self.presses.iter().any(|&start| match self.samples.checked_sub(start) {
            Some(since @ (0..10 | 40..50)) => since % 3 != 1,
            Some(since) => since < 40,
            None => false,
        })
    }

    fn pass(&mut self, ticks: u32) {
        const OFFSET_V: f64 = 10e-6;
        let stays_open = matches!(self.mishap, Mishap::SwitchOpen(from) if self.samples >= from);
        let (volts, from, to) = self.pulse;
        let pulse_v = if (from..to).contains(&self.samples) { volts } else { 0.0 };
        let input_v = if self.mode == Mode::Integrate { pulse_v } else { 0.0 };
        self.volts -= (input_v + OFFSET_V) / (22e3 * 1e-6) * f64::from(ticks) / f64::from(TICK_HZ);
        if self.mode == Mode::Reset && !stays_open {
            self.volts = 1.65;
        }
        self.tick = self.tick.wrapping_add(ticks);
    }
}

impl Board for Plant {
    fn switch(&mut self, mode: Mode) -> Result<(), Fault> {
        if matches!(self.mishap, Mishap::Pins(from) if self.samples >= from) {
            return Err(Fault::Pin);
        }
        self.mode = mode;
        Ok(())
    }

    fn pace(&mut self) {}

    fn wait(&mut self, out: &mut Outbox) -> Result<(), Fault> {
        // 115 200 bit/s let 11 bytes through in a period.
        let mut room = 11;
        out.send(|byte| {
            if room > 0 {
                self.text.push(char::from(byte));
                room -= 1;
                return true;
            }
            false
        });
        self.pass(PERIOD_TICKS);
        if self.samples < self.last { Ok(()) } else { Err(Fault::Late) }
    }

    fn sample(&mut self) -> Taken {
        self.samples += 1;
        match self.mishap {
            Mishap::Jump(at) if at == self.samples => self.volts += 0.3,
            Mishap::Silence(at) if at == self.samples => self.pass(2 * TICK_HZ),
            _ => {}
        }
        let counts = COIL.converter().code(self.volts) + 4.0 * self.noise();
        let (low, high) = (COIL.converter().code_min, COIL.converter().code_max);
        let counts = (counts.round() as i32).clamp(low, high);
        Taken { tick: self.tick, counts, button: self.contact() }
    }

    fn restart(&mut self) -> ! {
        panic!("restarted")
    }
}
