//! Counts instructions: under `-icount` each takes the same time on the board's timers.

use core::arch::asm;
use core::hint::black_box;

/// The board's timer, running.
pub struct Counter(());

#[cfg(target_arch = "arm")]
mod timer {
    use cortex_m::Peripherals;
    use cortex_m::peripheral::SYST;
    use cortex_m::peripheral::syst::SystClkSource;

    /// Instructions per tick, as a fraction: `1e9 / (128 f)`, as every instruction takes 128 ns (`shift=7`). QEMU
    /// clocks the microbit with 16 MHz, the mps2-an385 and -an386 with 25 MHz, the -an505 with 20 MHz: the build
    /// script tells which board it is. A `Counter` does not start where this is wrong.
    const INSTRUCTIONS_PER_TICK: (u32, u32) = match env!("EMULATED_MHZ").as_bytes() {
        b"16" => (125, 256),
        b"20" => (25, 64),
        _ => (5, 16),
    };

    const RELOAD: u32 = 0xff_ffff;

    pub(super) fn start() -> bool {
        let Some(peripherals) = Peripherals::take() else { return false };
        let mut timer = peripherals.SYST;
        timer.set_clock_source(SystClkSource::Core);
        timer.set_reload(RELOAD);
        timer.clear_current();
        timer.enable_counter();
        true
    }

    #[inline(always)]
    pub(super) fn now() -> u32 {
        SYST::get_current()
    }

    /// The timer counts down; spans of more than five million instructions do not fit it.
    pub(super) fn instructions(before: u32, after: u32) -> u32 {
        let ticks = before.wrapping_sub(after) & RELOAD;
        let (numerator, denominator) = INSTRUCTIONS_PER_TICK;
        (ticks * numerator + denominator / 2) / denominator
    }
}

#[cfg(target_arch = "riscv32")]
mod timer {
    pub(super) fn start() -> bool {
        true
    }

    #[inline(always)]
    pub(super) fn now() -> u32 {
        riscv::register::minstret::read() as u32
    }

    pub(super) fn instructions(before: u32, after: u32) -> u32 {
        after.wrapping_sub(before)
    }
}

impl Counter {
    /// `None` if there is no timer, or if it miscounts loops of known length.
    pub fn start() -> Option<Self> {
        timer::start().then_some(Self(())).filter(Self::counts_exactly)
    }

    /// Instructions that `call` takes, together with reading the timer; below five million.
    #[inline(always)]
    pub fn gross<R>(&self, call: impl FnOnce() -> R) -> u32 {
        let before = timer::now();
        black_box(call());
        timer::instructions(before, timer::now())
    }

    fn counts_exactly(&self) -> bool {
        const TURNS: [u32; 7] = [2, 3, 10, 51, 1_000, 33_333, 1_000_000];
        let single = self.gross_of_turns(1);
        TURNS.iter().all(|&turns| self.gross_of_turns(turns) - single == 2 * (turns - 1))
    }

    /// Never inlined, so that the same instructions surround every loop.
    #[inline(never)]
    fn gross_of_turns(&self, turns: u32) -> u32 {
        self.gross(|| turn(turns))
    }
}

/// Two instructions for each turn.
#[inline(never)]
fn turn(turns: u32) {
    // SAFETY: a loop in one register.
    unsafe {
        #[cfg(target_arch = "arm")]
        asm!("2: subs {0}, #1", "bne 2b", inout(reg) turns => _, options(nomem, nostack));
        #[cfg(target_arch = "riscv32")]
        asm!("2: addi {0}, {0}, -1", "bnez {0}, 2b", inout(reg) turns => _, options(nomem, nostack));
    }
}
