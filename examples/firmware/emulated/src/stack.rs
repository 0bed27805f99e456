//! Finds how deep a call digs into the stack, by painting it.

use core::arch::asm;
use core::hint::black_box;

const PAINT: u32 = 0xa5a5_5a5a;

/// How far down the paint goes, bytes; a call that digs as deep is not measured but shows as this depth. The statics of
/// the programs end further down.
const REACH: usize = 4096;

/// The stack pointer.
#[inline(always)]
pub fn pointer() -> usize {
    let pointer: usize;
    // SAFETY: reads a register.
    unsafe {
        #[cfg(target_arch = "arm")]
        asm!("mov {}, sp", out(reg) pointer, options(nomem, nostack, preserves_flags));
        #[cfg(target_arch = "riscv32")]
        asm!("mv {}, sp", out(reg) pointer, options(nomem, nostack, preserves_flags));
    }
    pointer
}

/// Paints the stack below the caller, whose stack pointer is `top`.
#[inline(never)]
pub fn paint(top: usize) {
    let mut word = (top - REACH) as *mut u32;
    while (word as usize) < pointer() {
        // SAFETY: between the end of the statics and the stack pointer there is free memory; no interrupt is on.
        unsafe {
            word.write_volatile(PAINT);
            word = word.add(1);
        }
    }
}

/// Bytes between `top` and the deepest word that lost its paint.
#[inline(never)]
pub fn depth(top: usize) -> usize {
    let mut word = (top - REACH) as *const u32;
    // SAFETY: reads up to the caller's stack pointer only.
    while (word as usize) < top && unsafe { word.read_volatile() } == PAINT {
        word = unsafe { word.add(1) };
    }
    top - word as usize
}

/// Whether an array of known size comes out, with no more than a frame's extras.
pub fn dig_is_seen() -> bool {
    #[inline(never)]
    fn array() {
        black_box([1_u8; 1000]);
    }
    let call: fn() = black_box(array);
    let top = pointer();
    paint(top);
    call();
    (1000..1064).contains(&depth(top))
}
