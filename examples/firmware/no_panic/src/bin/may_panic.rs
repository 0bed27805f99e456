//! Must not link: an index that the compiler cannot know may panic. It shows that the other programs' linking means
//! something.
#![cfg_attr(target_os = "none", no_std, no_main)]

#[cfg(target_os = "none")]
#[no_panic::entry]
fn main() -> ! {
    use core::hint::black_box;

    let levels = black_box([1_u8, 2, 3]);
    loop {
        #[allow(clippy::indexing_slicing, reason = "the very thing")]
        black_box(levels[black_box(7_usize)]);
    }
}

#[cfg(not(target_os = "none"))]
fn main() {}
