//! Ten million updates of a level that drifts steadily. Prints `name | bytes | error` lines, first for a level of 2^23
//! counts, then for one that begins at 0.

use filters::{DT, Update, Visit, visit_all};

const UPDATES: u32 = 10_000_000;
/// The last tenth tells the error.
const LAST: u32 = UPDATES / 10;

/// The true drift, counts/s.
const DRIFT: f64 = 0.5;

struct Endure {
    first: i32,
}

impl Visit for Endure {
    /// Prints the root mean square of the drift's error over the last tenth.
    fn filter(&mut self, name: &str, bytes: usize, update: &mut Update<'_>) {
        let mut noise = 1_u64;
        let mut squares = 0.0;
        for n in 1..=UPDATES {
            // The sum of four uniform numbers, 0.9 rms.
            let mut deviation = -2.0;
            for _ in 0..4 {
                noise = noise.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
                deviation += (noise >> 40) as f64 / (1 << 24) as f64;
            }
            let level = f64::from(self.first) + DRIFT * f64::from(n) * f64::from(DT) + 0.9 * 3.0_f64.sqrt() * deviation;
            let error = f64::from(update(level.round() as i32)) - DRIFT;
            squares += if n > UPDATES - LAST { error * error } else { 0.0 };
        }
        println!("{name} | {bytes} | {:.1e}", (squares / f64::from(LAST)).sqrt());
    }
}

pub(crate) fn print() {
    for first in [1 << 23, 0] {
        visit_all(first, &mut Endure { first });
    }
}
