//! The log of the traces' runs. Numbers are printed as their bits: two logs are equal only if all bits are.

use core::fmt::{self, Write};

use brimline::{Channel, Estimate, Integral, Reading, Reasons, Sample};

use crate::fnv::Fnv;
use crate::table::{CHARGE, FLUX, Trace};

/// Rows between lines where nothing else asks for one.
const ROWS_PER_LINE: u32 = 250;

/// Runs every trace and writes its log.
///
/// # Errors
///
/// When `out` fails.
pub fn write_logs(out: &mut impl Write) -> fmt::Result {
    for trace in &CHARGE {
        write_log(trace, out)?;
    }
    for trace in &FLUX {
        write_log(trace, out)?;
    }
    Ok(())
}

/// A line for each notice, at each mode change, every 250th row and at the end; then a hash over every row's results.
fn write_log<Q: Integral>(trace: &Trace<Q>, out: &mut impl Write) -> fmt::Result {
    let mut channel = Channel::new(trace.setup());
    let mut hash = Fnv::new();
    let (mut rows, mut readings) = (0_u32, 0_u32);
    writeln!(out, "trace {}", trace.name())?;
    let mut samples = trace.samples().peekable();
    while let Some(sample) = samples.next() {
        let switched = channel.mode() != Some(sample.mode);
        let step = channel.feed(sample);
        rows += 1;
        hash.write(&[step.request.map_or(u8::MAX, |mode| mode as u8)]);
        for notice in step.notices.iter() {
            write!(hash, "{notice:?}")?;
            writeln!(out, "{} {:?}", notice.tick, notice.event)?;
        }
        let reading = channel.reading();
        if let Some(reading) = &reading {
            readings += 1;
            hash_reading(trace, &mut hash, reading);
            hash.write_bits(channel.drift().value.as_volts_per_second());
            hash.write_bits(channel.drift().u.as_volts_per_second());
            hash.write_bits(channel.droop().value.as_volts_per_second());
            hash.write_bits(channel.droop().u.as_volts_per_second());
        }
        if switched || rows % ROWS_PER_LINE == 0 || samples.peek().is_none() {
            write_state(trace, out, sample, &channel, reading.as_ref())?;
        }
    }
    writeln!(out, "rows {rows} readings {readings} hash {:016x}", hash.value())
}

/// Every number of a reading.
fn hash_reading<Q: Integral>(trace: &Trace<Q>, hash: &mut Fnv, reading: &Reading<Q>) {
    let estimate = |hash: &mut Fnv, e: &Estimate<Q>| {
        let b = &e.budget;
        let parts = [b.readout, b.input_noise, b.drift, b.dead_time, b.leak_and_soakage, b.scale];
        for part in [e.integral.value, e.integral.u].into_iter().chain(parts) {
            hash.write_bits(trace.si(part));
        }
    };
    estimate(hash, &reading.at_stop);
    hash.write(&[u8::from(reading.closed.is_some())]);
    if let Some(closed) = &reading.closed {
        estimate(hash, closed);
    }
    for part in [reading.measured, reading.interpolated, reading.drift_removed] {
        hash.write_bits(trace.si(part));
    }
    hash.write_bits(reading.elapsed_s);
    for whole in
        [reading.resets, reading.start_tick, reading.end_tick, reading.warming_mk.map_or(0, i32::cast_unsigned)]
    {
        hash.write(&whole.to_le_bytes());
    }
    for reason in reading.reasons.iter() {
        hash.write(&[reason as u8]);
    }
}

fn write_state<Q: Integral>(
    trace: &Trace<Q>,
    out: &mut impl Write,
    sample: Sample,
    channel: &Channel<'_, Q>,
    reading: Option<&Reading<Q>>,
) -> fmt::Result {
    write!(out, "{} {:?}", sample.tick, sample.mode)?;
    if let Some(reading) = reading {
        write_estimate(trace, out, "stop", &reading.at_stop)?;
        if let Some(closed) = &reading.closed {
            write_estimate(trace, out, "closed", closed)?;
        }
        write!(out, " resets {} {:?}", reading.resets, reading.trust)?;
        write_reasons(out, reading.reasons)?;
    }
    let drift = channel.drift();
    let (value, u) = (drift.value.as_volts_per_second(), drift.u.as_volts_per_second());
    writeln!(out, " drift {:016x} {:016x}", value.to_bits(), u.to_bits())
}

fn write_estimate<Q: Integral>(
    trace: &Trace<Q>,
    out: &mut impl Write,
    name: &str,
    estimate: &Estimate<Q>,
) -> fmt::Result {
    let (value, u) = (trace.si(estimate.integral.value), trace.si(estimate.integral.u));
    write!(out, " {name} {:016x} {:016x}", value.to_bits(), u.to_bits())
}

fn write_reasons(out: &mut impl Write, reasons: Reasons) -> fmt::Result {
    for reason in reasons.iter() {
        write!(out, " {}", reason.name())?;
    }
    Ok(())
}
