//! Finds how deep a call digs into the stack, by painting it.

use core::hint::black_box;

use cortex_m::register::msp;

const PAINT: u32 = 0xa5a5_5a5a;

/// How far down the paint goes, bytes; a call that digs as deep is not measured but shows as this depth.
pub(crate) const REACH: u32 = 4096;

/// Paints the stack below the caller, whose stack pointer is `top`.
#[inline(never)]
pub(crate) fn paint(top: u32) {
    let mut word = lowest(top);
    while (word as u32) < msp::read() {
        // SAFETY: between the end of the statics and the stack pointer there is free memory; no interrupt is on.
        unsafe {
            word.write_volatile(PAINT);
            word = word.add(1);
        }
    }
}

/// Bytes between `top` and the deepest word that lost its paint.
#[inline(never)]
pub(crate) fn depth(top: u32) -> u32 {
    let mut word = lowest(top);
    // SAFETY: reads from above the end of the statics up to the caller's stack pointer.
    while (word as u32) < top && unsafe { word.read_volatile() } == PAINT {
        word = unsafe { word.add(1) };
    }
    top - word as u32
}

/// The lowest word that is painted.
fn lowest(top: u32) -> *mut u32 {
    cortex_m_rt::heap_start().max((top - REACH) as *mut u32)
}

/// Whether an array of known size comes out, with no more than a frame's extras.
pub(crate) fn check() -> bool {
    #[inline(never)]
    fn array() {
        black_box([1_u8; 1000]);
    }
    let call: fn() = black_box(array);
    let top = msp::read();
    paint(top);
    call();
    (1000..1064).contains(&depth(top))
}
