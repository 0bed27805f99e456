//! Counts each filter's updates and prints `name: mean` lines.

use core::hint::black_box;

use emulated::{Counter, entry, println, process};
use filters::{Update, Visit, visit_all};

/// The level of the first sample: 2^23.
const LEVEL: i32 = 1 << 23;

/// Updates that find the drift, and those that are counted after them.
const FIRST: u32 = 200;
const COUNTED: u32 = 200;

struct Count(Counter);

impl Visit for Count {
    fn filter(&mut self, name: &str, _: usize, update: &mut Update<'_>) {
        let mut nothing = |_| 0.0;
        let idle: &mut Update<'_> = black_box(&mut nothing);
        let (mut sum, mut noise) = (0, 1_u32);
        for n in 0..FIRST + COUNTED {
            noise = noise.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
            let counts = LEVEL + (n / 200) as i32 + (noise >> 30) as i32;
            let net = count(&self.0, update, counts) - count(&self.0, idle, counts);
            sum += if n < FIRST { 0 } else { net };
        }
        println!("{name}: {}", sum / COUNTED);
    }
}

/// Never inlined, so that an update and its idle twin are counted by the same instructions.
#[inline(never)]
fn count(counter: &Counter, update: &mut Update<'_>, counts: i32) -> u32 {
    counter.gross(|| update(counts))
}

#[entry]
fn main() -> ! {
    let Some(counter) = Counter::start() else { process::exit(1) };
    visit_all(LEVEL, &mut Count(counter));
    process::exit(0)
}
