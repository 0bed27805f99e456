//! The outcome as one JSON object, for programs: SI units, standard uncertainties.

use std::io::{self, Write};

use brimline::Event;
use serde::Serialize;

use crate::replay::{DriftRecord, Figure, NoticeRecord, Outcome, RunRecord};
use crate::words;

#[derive(Serialize)]
struct Value {
    value: f64,
    u: f64,
}

#[derive(Serialize)]
struct Variance {
    readout: f64,
    input_noise: f64,
    drift: f64,
    dead_time: f64,
    leak_and_soakage: f64,
    scale: f64,
}

#[derive(Serialize)]
struct Exposure {
    value: f64,
    u: f64,
    unit: &'static str,
}

#[derive(Serialize)]
struct Run {
    start_tick: u32,
    end_tick: u32,
    unit: &'static str,
    at_stop: Value,
    closed: Option<Value>,
    measured: f64,
    interpolated: f64,
    drift_removed: f64,
    restored: f64,
    held_s: f64,
    resets: u32,
    start_s: f64,
    elapsed_s: f64,
    ongoing: bool,
    trust: &'static str,
    reasons: Vec<&'static str>,
    variance: Variance,
    #[serde(skip_serializing_if = "Option::is_none")]
    warming_mk: Option<i32>,
    noise_tested: bool,
    spikes: u16,
    #[serde(skip_serializing_if = "Option::is_none")]
    radiant_exposure: Option<Exposure>,
}

#[derive(Serialize)]
struct Drift {
    rate_v_per_s: f64,
    u: f64,
}

#[derive(Serialize)]
struct Notice {
    tick: u32,
    time_s: f64,
    kind: &'static str,
    #[serde(skip_serializing_if = "Option::is_none")]
    reason: Option<&'static str>,
    #[serde(skip_serializing_if = "Option::is_none")]
    percent: Option<u16>,
    #[serde(skip_serializing_if = "Option::is_none")]
    stated_counts: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    observed_counts: Option<f64>,
}

/// Offset voltage, V, and bias current, A, referred to the input.
#[derive(Serialize)]
struct Amplifier {
    offset: Value,
    bias: Value,
}

#[derive(Serialize)]
struct Document {
    runs: Vec<Run>,
    drift: Option<Drift>,
    #[serde(skip_serializing_if = "Option::is_none")]
    droop: Option<Drift>,
    #[serde(skip_serializing_if = "Option::is_none")]
    amplifier: Option<Amplifier>,
    notices: Vec<Notice>,
    #[serde(skip_serializing_if = "Option::is_none")]
    error: Option<String>,
}

/// Writes the object. Without an outcome (the set-up was refused) it holds the error alone.
pub(crate) fn write(out: &mut impl Write, outcome: Option<&Outcome>, error: Option<&str>) -> io::Result<()> {
    let amplifier = outcome.and_then(|o| o.amplifier.as_ref());
    let document = Document {
        runs: outcome.map_or(Vec::new(), |o| o.runs.iter().map(|record| run(record, o.unit)).collect()),
        drift: outcome.map(|o| drift(&o.drift)),
        droop: amplifier.map(|a| Drift { rate_v_per_s: a.droop_v_per_s.0, u: a.droop_v_per_s.1 }),
        amplifier: amplifier.map(|a| Amplifier {
            offset: Value { value: a.offset_v.0, u: a.offset_v.1 },
            bias: Value { value: a.bias_a.0, u: a.bias_a.1 },
        }),
        notices: outcome.map_or(Vec::new(), |o| o.notices.iter().map(notice).collect()),
        error: error.map(str::to_owned),
    };
    serde_json::to_writer_pretty(&mut *out, &document)?;
    writeln!(out)
}

fn run(run: &RunRecord, unit: &'static str) -> Run {
    let latest = run.latest();
    Run {
        start_tick: run.start_tick,
        end_tick: run.end_tick,
        unit,
        at_stop: value(&run.at_stop),
        closed: run.closed.as_ref().map(value),
        measured: run.measured,
        interpolated: run.interpolated,
        drift_removed: run.drift_removed,
        restored: run.restored,
        held_s: run.held_s,
        resets: run.resets,
        start_s: run.start_s,
        elapsed_s: run.elapsed_s,
        ongoing: run.ongoing,
        trust: words::trust_name(run.trust),
        reasons: run.reasons.iter().map(|reason| reason.name()).collect(),
        variance: Variance {
            readout: latest.readout * latest.readout,
            input_noise: latest.input_noise * latest.input_noise,
            drift: latest.drift * latest.drift,
            dead_time: latest.dead_time * latest.dead_time,
            leak_and_soakage: latest.leak_and_soakage * latest.leak_and_soakage,
            scale: latest.scale * latest.scale,
        },
        warming_mk: run.warming_mk,
        noise_tested: run.noise_tested,
        spikes: run.spikes,
        radiant_exposure: run.exposure.map(|(value, u)| Exposure { value, u, unit: "J/m^2" }),
    }
}

fn value(figure: &Figure) -> Value {
    Value { value: figure.value, u: figure.u }
}

fn drift(drift: &DriftRecord) -> Drift {
    Drift { rate_v_per_s: drift.rate_v_per_s, u: drift.u }
}

fn notice(notice: &NoticeRecord) -> Notice {
    let reason = match notice.event {
        Event::Fault(reason) => Some(reason.name()),
        _ => None,
    };
    let (stated_counts, observed_counts) = match notice.event {
        Event::ReadoutNoise { stated_centicounts, observed_centicounts } => {
            (Some(f64::from(stated_centicounts) / 100.0), Some(f64::from(observed_centicounts) / 100.0))
        }
        _ => (None, None),
    };
    let percent = match notice.event {
        Event::NoiseFigures { percent } | Event::DriftWander { percent } => Some(percent),
        _ => None,
    };
    Notice {
        tick: notice.tick,
        time_s: notice.time_s,
        kind: words::event_name(notice.event),
        reason,
        percent,
        stated_counts,
        observed_counts,
    }
}
