//! Counts instructions: with `-icount shift=7` each takes 128 ns of the emulated time that the system timer counts.

use core::arch::asm;
use core::hint::black_box;

use cortex_m::peripheral::SYST;
use cortex_m::peripheral::syst::SystClkSource;

/// Instructions per tick, as a fraction: `1e9 / (128 f)`. QEMU clocks the mps2-an386 with 25 MHz and the microbit with
/// 16 MHz; `check` fails where it does not.
const INSTRUCTIONS_PER_TICK: (u32, u32) = if cfg!(target_abi = "eabihf") { (5, 16) } else { (125, 256) };

const RELOAD: u32 = 0xff_ffff;

/// The system timer, running.
pub(crate) struct Counter(());

impl Counter {
    pub(crate) fn start(mut timer: SYST) -> Self {
        timer.set_clock_source(SystClkSource::Core);
        timer.set_reload(RELOAD);
        timer.clear_current();
        timer.enable_counter();
        Self(())
    }

    /// Instructions that `call` takes, together with reading the timer; below five million.
    #[inline(always)]
    pub(crate) fn gross<R>(&self, call: impl FnOnce() -> R) -> u32 {
        let before = SYST::get_current();
        black_box(call());
        let ticks = before.wrapping_sub(SYST::get_current()) & RELOAD;
        let (numerator, denominator) = INSTRUCTIONS_PER_TICK;
        (ticks * numerator + denominator / 2) / denominator
    }

    /// How many loops of known length were counted; `None` unless all were counted exactly.
    pub(crate) fn check(&self) -> Option<usize> {
        const TURNS: [u32; 7] = [2, 3, 10, 51, 1_000, 33_333, 1_000_000];
        let single = self.gross_of_turns(1);
        let exact = |&turns: &u32| self.gross_of_turns(turns) - single == 2 * (turns - 1);
        TURNS.iter().all(exact).then_some(TURNS.len())
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
    unsafe { asm!("2: subs {0}, #1", "bne 2b", inout(reg) turns => _, options(nomem, nostack)) }
}
