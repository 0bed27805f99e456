//! Logs requests, notices and readings of the bundled traces: on a target through defmt, with the library's own
//! `defmt::Format`; on the host as `Debug`, without the feature. `check` decodes the former and compares.
#![cfg_attr(target_os = "none", no_std, no_main)]

use brimline::{Channel, Charge, Flux, Integral, Mode};
use trace::{CHARGE, FLUX, Trace};

#[cfg(not(target_os = "none"))]
use core::fmt::Debug as Shown;
#[cfg(target_os = "none")]
use defmt::{Format as Shown, println};

#[cfg(target_os = "none")]
mod target {
    use cortex_m as _;
    use defmt_semihosting as _;
    use semihosting::process;

    #[cortex_m_rt::entry]
    fn main() -> ! {
        super::log_all();
        process::exit(0)
    }
}

#[cfg(not(target_os = "none"))]
fn main() {
    log_all();
}

fn log_all() {
    CHARGE.iter().for_each(|trace| log(trace, Charge::as_coulombs));
    FLUX.iter().for_each(|trace| log(trace, Flux::as_volt_seconds));
}

/// A line for each request that is new and for each notice; the reading when a run stops, before the next begins and at
/// the end.
fn log<Q: Integral + Shown>(trace: &Trace<Q>, si: fn(Q) -> f64) {
    println!("trace {}", trace.name());
    let mut channel = Channel::new(trace.setup());
    let mut asked = None;
    for sample in trace.samples() {
        let before = channel.mode();
        if before == Some(Mode::Zero) && sample.mode != Mode::Zero {
            log_reading(&channel, si);
        }
        let step = channel.feed(sample);
        if step.request != asked {
            println!("{} request {:?}", sample.tick, step.request);
            asked = step.request;
        }
        for notice in step.notices.iter() {
            println!("{:?}", notice);
        }
        if before == Some(Mode::Integrate) && sample.mode == Mode::Zero {
            log_reading(&channel, si);
        }
    }
    log_reading(&channel, si);
}

/// The reading in full, after the bits of its latest value and uncertainty.
fn log_reading<Q: Integral + Shown>(channel: &Channel<'_, Q>, si: fn(Q) -> f64) {
    if let Some(reading) = channel.reading() {
        let latest = reading.latest().integral;
        println!("bits {:016x} {:016x}", si(latest.value).to_bits(), si(latest.u).to_bits());
        println!("{:?}", reading);
    }
}
