//! A lamp, its integrator and a board, simulated.

use brimline::Mode;
use lamp_rp2040::{Board, Fault, LAMP, Outbox, PERIOD_US};

/// What goes wrong at the sample with the given number.
#[derive(Clone, Copy, PartialEq)]
pub(crate) enum Mishap {
    None,
    /// The level moves by 0.3 V at once.
    Jump(u32),
    /// For 2 s no sample is taken, and the lamp shines on.
    Silence(u32),
    /// From here on the reset switch stays open.
    SwitchOpen(u32),
    /// The program comes too late.
    Late(u32),
    /// From here on the pins cannot be driven.
    Pins(u32),
}

pub(crate) struct Plant {
    pub(crate) light_a: f64,
    pub(crate) mishap: Mishap,
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
    pub(crate) fn new(light_a: f64, mishap: Mishap, last: u32) -> Self {
        // The counter wraps in the first minute. At power-up the level is at the rail.
        let tick = u32::MAX - 40_000_000;
        Self { light_a, mishap, last, mode: Mode::Hold, text: String::new(), samples: 0, volts: 2.95, tick, random: 1 }
    }

    /// Sum of four uniform numbers, standard deviation 1. Knuth's 64-bit generator (constants from memory).
    fn noise(&mut self) -> f64 {
        let mut uniform = || {
            self.random = self.random.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            (self.random >> 11) as f64 / (1_u64 << 53) as f64 - 0.5
        };
        (uniform() + uniform() + uniform() + uniform()) * 3.0_f64.sqrt()
    }

    fn pass(&mut self, us: u32) {
        const BIAS_A: f64 = 30e-12;
        let stays_open = matches!(self.mishap, Mishap::SwitchOpen(from) if self.samples >= from);
        let input_a = if self.mode == Mode::Integrate { self.light_a } else { 0.0 };
        self.volts += (input_a + BIAS_A) / 470e-9 * f64::from(us) * 1e-6;
        if self.mode == Mode::Reset && !stays_open {
            self.volts = 0.4;
        }
        self.tick = self.tick.wrapping_add(us);
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
        // 115 200 bit/s let 115 bytes through in a period.
        let mut room = 115;
        out.send(|byte| {
            if room > 0 {
                self.text.push(char::from(byte));
                room -= 1;
                return true;
            }
            false
        });
        self.pass(PERIOD_US);
        Ok(())
    }

    fn sample(&mut self) -> Result<(u32, i32), Fault> {
        self.samples += 1;
        match self.mishap {
            Mishap::Jump(at) if at == self.samples => self.volts += 0.3,
            Mishap::Silence(at) if at == self.samples => self.pass(2_000_000),
            Mishap::Late(at) if at == self.samples => return Err(Fault::Late),
            _ if self.samples > self.last => return Err(Fault::Late),
            _ => {}
        }
        let counts = LAMP.converter().code(self.volts) + 24.0 * self.noise();
        let (low, high) = (LAMP.converter().code_min, LAMP.converter().code_max);
        Ok((self.tick, (counts.round() as i32).clamp(low, high)))
    }

    fn restart(&mut self) -> ! {
        panic!("restarted")
    }
}
