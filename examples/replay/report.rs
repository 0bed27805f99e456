//! The outcome as text, for a person.

use std::io::{self, Write};

use brimline::Trust;

use crate::replay::{Outcome, RunRecord};
use crate::{units, words};

/// Coverage factor of every uncertainty in the report.
const K: f64 = 2.0;

/// Notices that a person will still read.
const NOTICES_SHOWN: usize = 60;

const CAUTION: &str = "Caution: a measuring aid, never the only protection. UV injures eyes and skin; local codes and \
                       licensed practice decide.";

/// Writes the report. `title` says what was replayed.
pub(crate) fn write(out: &mut impl Write, outcome: &Outcome, title: &str) -> io::Result<()> {
    writeln!(out, "{title}")?;
    writeln!(out, "{} rows, {:.3} s. Every ± is U = {K:.0} u (about 95 %).", outcome.samples, outcome.span_s)?;
    if outcome.runs.is_empty() {
        writeln!(
            out,
            "\nNo complete run. A run begins where the mode becomes integrate and ends with the zero after it."
        )?;
    }
    for (index, run) in outcome.runs.iter().enumerate() {
        writeln!(out)?;
        write_run(out, run, index + 1, outcome)?;
    }
    writeln!(out)?;
    write_drift(out, outcome)?;
    write_notices(out, outcome)?;
    if outcome.runs.iter().any(|run| run.exposure.is_some()) {
        writeln!(out, "\n{CAUTION}")?;
    }
    Ok(())
}

fn write_run(out: &mut impl Write, run: &RunRecord, number: usize, outcome: &Outcome) -> io::Result<()> {
    let unit = outcome.unit;
    let plural = if run.resets == 1 { "" } else { "s" };
    let held = if run.held_s > 0.0 { format!(", {:.3} s of it held", run.held_s) } else { String::new() };
    writeln!(
        out,
        "Run {number}: {:.3} s to {:.3} s, {:.3} s long{held}, {} reset{plural}",
        run.start_s,
        run.start_s + run.elapsed_s,
        run.elapsed_s,
        run.resets
    )?;
    write_trust(out, run)?;
    let figure = |value: f64, u: f64| units::with_uncertainty(value, K * u, unit);
    match (&run.closed, run.ongoing) {
        (Some(closed), _) => {
            line(out, "result", &format!("{}   closed: with the zero after the run", figure(closed.value, closed.u)))?;
            line(out, "at stop", &format!("{}   before that zero", figure(run.at_stop.value, run.at_stop.u)))?;
        }
        (None, stopped_not) => {
            let why = if stopped_not { "the trace ends in mid-run" } else { "no usable row in a zero followed" };
            let text = format!("{}   at stop: {why}", figure(run.at_stop.value, run.at_stop.u));
            line(out, "result", &text)?;
        }
    }
    write_exposure(out, run)?;
    let latest = run.latest();
    let like_result = |value: f64| units::rounded_like(value, K * latest.u, latest.value.abs().max(K * latest.u), unit);
    if run.resets > 0 {
        line(out, "measured", &like_result(run.measured))?;
        line(out, "interpolated", &format!("{}   while the reset switch was closed", like_result(run.interpolated)))?;
    }
    if run.restored != 0.0 {
        let text = format!("{}   put back of what had leaked or soaked away", like_result(run.restored));
        line(out, "restored", &text)?;
    }
    write_budget(out, run, unit)?;
    if latest.scale <= 0.0 {
        line(out, "gain", "taken as exact: what it is not known to is no part of U")?;
    }
    if let Some(warming) = run.warming_mk {
        line(out, "board", &format!("{:+.2} K from the zero before to the end of the run", f64::from(warming) / 1e3))?;
    }
    if run.spikes > 0 {
        line(out, "left out", &format!("{} samples of the zero after the run, too far off for noise", run.spikes))?;
    }
    if !run.noise_tested {
        line(out, "noise figures", "from the set-up: too few zeros yet to show whether they are true")?;
    }
    let uncorrected = run.at_stop.value + run.drift_removed;
    let off = uncorrected - latest.value;
    line(
        out,
        "without drift correction",
        &format!("{}, off by {}{}", like_result(uncorrected), units::two_digits(off, unit), times(off, K * latest.u)),
    )
}

fn times(off: f64, expanded: f64) -> String {
    if expanded > 0.0 { format!(": {} times U", brief((off / expanded).abs())) } else { String::new() }
}

/// Two significant digits, without a prefix.
fn brief(ratio: f64) -> String {
    if ratio >= 10.0 { format!("{ratio:.0}") } else { format!("{ratio:.1}") }
}

fn write_trust(out: &mut impl Write, run: &RunRecord) -> io::Result<()> {
    line(out, "trust", words::trust(run.trust))?;
    for &reason in &run.reasons {
        let (what, remedy) = words::reason(reason);
        line(out, "", &format!("{}: {what};", reason.name()))?;
        line(out, "", &format!("    {remedy}"))?;
    }
    Ok(())
}

fn write_exposure(out: &mut impl Write, run: &RunRecord) -> io::Result<()> {
    let Some((value, u)) = run.exposure else { return Ok(()) };
    let in_joule = units::with_uncertainty(value, K * u, "J/m^2");
    // 1 mJ/cm^2 = 10 J/m^2.
    let in_millijoule = units::in_unit(value / 10.0, K * u / 10.0, "mJ/cm^2");
    let note = match run.trust {
        Trust::Good => "",
        Trust::LowerBound => ", at least, as the run",
        Trust::Invalid => ", invalid as the run",
    };
    line(out, "radiant exposure", &format!("{in_joule} = {in_millijoule}{note}"))
}

fn write_budget(out: &mut impl Write, run: &RunRecord, unit: &str) -> io::Result<()> {
    let latest = run.latest();
    let parts = words::budget(latest);
    let share = |u: f64| if latest.u > 0.0 { 100.0 * u * u / (latest.u * latest.u) } else { 0.0 };
    if let Some(largest) = parts.first() {
        let text = format!("u = {}, mostly {}: {}", units::two_digits(latest.u, unit), largest.name, largest.remedy);
        line(out, "uncertainty", &text)?;
    }
    for part in parts.iter().filter(|part| part.u > 0.0) {
        let size = units::two_digits(part.u, unit);
        line(out, "", &format!("{:>5.1} %  {size:>9}  {}", share(part.u), part.name))?;
    }
    Ok(())
}

fn write_drift(out: &mut impl Write, outcome: &Outcome) -> io::Result<()> {
    let drift = &outcome.drift;
    if !outcome.drift_measured {
        let text = format!("not measured: no zero. Data sheet: 0 with u = {}", units::two_digits(drift.u, "V/s"));
        return writeln!(out, "Drift: {text}");
    }
    writeln!(
        out,
        "Drift: {} at the output, as of the latest zero; as an input: {}",
        units::with_uncertainty(drift.rate_v_per_s, K * drift.u, "V/s"),
        units::with_uncertainty(drift.as_input, K * drift.as_input_u, outcome.input_unit)
    )?;
    let Some(amplifier) = &outcome.amplifier else { return Ok(()) };
    let figure = |(value, u): (f64, f64), unit| units::with_uncertainty(value, K * u, unit);
    writeln!(
        out,
        "Droop: {} with the input open; hence the amplifier's bias {} and offset {}, referred to the input",
        figure(amplifier.droop_v_per_s, "V/s"),
        figure(amplifier.bias_a, "A"),
        figure(amplifier.offset_v, "V")
    )
}

fn write_notices(out: &mut impl Write, outcome: &Outcome) -> io::Result<()> {
    if outcome.notices.is_empty() {
        return Ok(());
    }
    writeln!(out, "\nWhat happened, in seconds since the first row:")?;
    // A step's notices may tell of the past: that a run stopped shows when the zero begins.
    let mut notices: Vec<_> = outcome.notices.iter().take(NOTICES_SHOWN).collect();
    notices.sort_by(|a, b| a.time_s.total_cmp(&b.time_s));
    for notice in notices {
        writeln!(out, "{:>12.3}  {}", notice.time_s, words::event(notice.event))?;
    }
    let more = outcome.notices.len().saturating_sub(NOTICES_SHOWN);
    if more > 0 {
        writeln!(out, "              and {more} more: --json lists them all")?;
    }
    Ok(())
}

/// One labelled line of a run.
fn line(out: &mut impl Write, label: &str, text: &str) -> io::Result<()> {
    writeln!(out, "  {label:<25} {text}")
}
