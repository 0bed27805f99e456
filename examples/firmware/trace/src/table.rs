//! The traces: packed rows and the board that each was recorded on.

use brimline::{Charge, Flux, Mode, Sample, Setup, Temperature};

use crate::boards;

/// Packed rows.
struct Table {
    name: &'static str,
    /// Tick and counts of the first row.
    first: (u32, i32),
    /// Board temperature, the same in all rows.
    millidegrees: i32,
    /// Modes with their number of rows.
    spans: &'static [(Mode, u32)],
    /// Changes of the tick against the row before, with their number of rows.
    ticks: &'static [(u16, u16)],
    /// For each row the change of counts against the row before it.
    steps: &'static [i16],
}

include!(concat!(env!("OUT_DIR"), "/tables.rs"));

/// A recorded trace together with its board.
pub struct Trace<Q: 'static> {
    table: Table,
    setup: &'static Setup<Q>,
    si: fn(Q) -> f64,
}

/// Traces of boards that measure charge.
pub static CHARGE: [Trace<Charge>; 5] = [
    Trace { table: HATCHERY, setup: &boards::HATCHERY, si: Charge::as_coulombs },
    Trace { table: TICK_WRAP, setup: &boards::HATCHERY, si: Charge::as_coulombs },
    Trace { table: STUCK_SWITCH, setup: &boards::HATCHERY, si: Charge::as_coulombs },
    Trace { table: DIM_LAMP, setup: &boards::DIM_LAMP, si: Charge::as_coulombs },
    Trace { table: SOAKAGE, setup: &boards::SOAKAGE, si: Charge::as_coulombs },
];

/// Traces of boards that measure flux.
pub static FLUX: [Trace<Flux>; 4] = [
    Trace { table: WANDERING_OFFSET, setup: &boards::WANDERING_OFFSET, si: Flux::as_volt_seconds },
    Trace { table: SEARCH_COIL, setup: &boards::SEARCH_COIL, si: Flux::as_volt_seconds },
    Trace { table: LEAKY, setup: &boards::LEAKY, si: Flux::as_volt_seconds },
    Trace { table: HELD, setup: &boards::HELD, si: Flux::as_volt_seconds },
];

/// The hatchery's trace again, with zeros in blocks of 16 samples and sample by sample.
pub static BLOCKS_OF_16: Trace<Charge> =
    Trace { table: HATCHERY, setup: &boards::HATCHERY_BLOCKS_OF_16, si: Charge::as_coulombs };
/// See [`BLOCKS_OF_16`].
pub static UNBLOCKED: Trace<Charge> =
    Trace { table: HATCHERY, setup: &boards::HATCHERY_UNBLOCKED, si: Charge::as_coulombs };

impl<Q> Trace<Q> {
    /// The name of its file.
    pub fn name(&self) -> &'static str {
        self.table.name
    }

    /// The board that it was recorded on.
    pub fn setup(&self) -> &'static Setup<Q> {
        self.setup
    }

    /// The rows, in order.
    pub fn samples(&self) -> impl Iterator<Item = Sample> {
        let modes = self.table.spans.iter().flat_map(|&(mode, rows)| (0..rows).map(move |_| mode));
        let temperature = Some(Temperature::from_millidegrees_celsius(self.table.millidegrees));
        let ticks = self.table.ticks.iter().flat_map(|&(ticks, rows)| (0..rows).map(move |_| ticks));
        let steps = ticks.zip(self.table.steps);
        let rows = steps.scan(self.table.first, |(tick, counts), (ticks, &moved)| {
            *tick = tick.wrapping_add(u32::from(ticks));
            *counts += i32::from(moved);
            Some((*tick, *counts))
        });
        rows.zip(modes).map(move |((tick, counts), mode)| Sample { tick, counts, mode, temperature })
    }

    /// The bare number in the SI unit.
    pub(crate) fn si(&self, quantity: Q) -> f64 {
        (self.si)(quantity)
    }
}

#[cfg(test)]
mod tests {
    extern crate std;
    use std::format;
    use std::string::String;

    use super::*;

    /// What was packed comes out again, to the letter.
    #[test]
    fn unpacked_rows_are_the_recorded_ones() {
        fn check<Q>(trace: &Trace<Q>) {
            let path = format!("{}/../../../tests/traces/{}.csv", env!("CARGO_MANIFEST_DIR"), trace.name());
            let mut unpacked = String::from("tick,counts,mode,temp_c\n");
            for s in trace.samples() {
                let mode = format!("{:?}", s.mode).to_lowercase();
                let celsius = s.temperature.map_or(f64::NAN, |t| f64::from(t.as_millidegrees_celsius()) / 1e3);
                unpacked.push_str(&format!("{},{},{mode},{celsius:.3}\n", s.tick, s.counts));
            }
            assert!(std::fs::read_to_string(&path).is_ok_and(|recorded| recorded == unpacked), "{path}");
        }
        CHARGE.iter().for_each(check);
        FLUX.iter().for_each(check);
    }
}
