//! Recorded traces, replayed through the very code of the firmware; as they are, and with a correction switched off.
#![allow(dead_code, reason = "each test program uses a part of this")]

#[path = "../../examples/replay/setup_file.rs"]
pub(crate) mod setup_file;
#[path = "../../examples/replay/trace_file.rs"]
mod trace_file;

use std::fs::File;
use std::io::BufReader;
use std::path::{Path, PathBuf};

use brimline::{Channel, Event, Integral, Mode, Reading, Reason, Sample, Setup, Trust};
use setup_file::AnySetup;
use trace_file::TraceFile;

/// A correction that can be switched off.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Correction {
    /// What the drift added is left in.
    Drift,
    /// A key of the set-up file is left out.
    Key(&'static str),
    /// A hold is taken for integration.
    Hold,
}

/// A reading as bare SI numbers.
#[derive(Clone, Debug)]
pub(crate) struct Outcome {
    /// Value and standard uncertainty, at stop and closed.
    pub(crate) estimates: [(f64, f64); 2],
    pub(crate) uncorrected: f64,
    pub(crate) start_tick: u32,
    pub(crate) end_tick: u32,
    pub(crate) resets: u32,
    pub(crate) trust: Trust,
    pub(crate) reasons: Vec<Reason>,
    pub(crate) events: Vec<Event>,
    pub(crate) drift: (f64, f64),
    /// Offset voltage and bias current, where zeros and holds tell them apart.
    pub(crate) amplifier: Option<[(f64, f64); 2]>,
}

/// A trace and its set-up in the project's tree.
#[derive(Clone, Debug)]
pub(crate) struct Recording {
    pub(crate) trace: PathBuf,
    pub(crate) setup: PathBuf,
}

impl Recording {
    pub(crate) fn new(trace: &str, setup: &str) -> Self {
        let root = Path::new(env!("CARGO_MANIFEST_DIR"));
        Self { trace: root.join(trace), setup: root.join(setup) }
    }

    /// The true integral of the run.
    pub(crate) fn true_integral(&self) -> f64 {
        self.truth()["runs"][0]["integral"].as_f64().unwrap()
    }

    pub(crate) fn truth(&self) -> serde_json::Value {
        self.known()["truth"].take()
    }

    /// The simulated circuit and what is true.
    pub(crate) fn known(&self) -> serde_json::Value {
        let text = std::fs::read_to_string(self.trace.with_extension("truth.json")).unwrap();
        serde_json::from_str(&text).unwrap()
    }

    /// The set-up, less one key.
    pub(crate) fn setup(&self, off: Option<Correction>) -> AnySetup {
        let mut text = std::fs::read_to_string(&self.setup).unwrap();
        if let Some(Correction::Key(key)) = off {
            let mut table: toml::Table = text.parse().unwrap();
            let gone = table.iter_mut().filter_map(|(_, section)| section.as_table_mut()?.remove(key)).count();
            assert_eq!(gone, 1, "{key} is a key of {}", self.setup.display());
            text = table.to_string();
        }
        setup_file::parse(&text, "set-up").unwrap().setup
    }

    pub(crate) fn samples(&self) -> Vec<Sample> {
        let converter = match self.setup(None) {
            AnySetup::Charge(setup) => *setup.converter(),
            AnySetup::Flux(setup) => *setup.converter(),
        };
        let codes = converter.code_min..=converter.code_max;
        let file = BufReader::new(File::open(&self.trace).unwrap());
        TraceFile::new(file, &self.trace.display().to_string(), codes).unwrap().map(Result::unwrap).collect()
    }

    /// What the crate makes of it.
    pub(crate) fn outcome(&self) -> Outcome {
        self.replay(None)
    }

    /// The closed value with a correction switched off.
    pub(crate) fn value_without(&self, correction: Correction) -> f64 {
        let outcome = self.replay(Some(correction));
        if correction == Correction::Drift { outcome.uncorrected } else { outcome.estimates[1].0 }
    }

    fn replay(&self, off: Option<Correction>) -> Outcome {
        let mut samples = self.samples();
        if off == Some(Correction::Hold) {
            for sample in samples.iter_mut().filter(|sample| sample.mode == Mode::Hold) {
                sample.mode = Mode::Integrate;
            }
        }
        match self.setup(off) {
            AnySetup::Charge(setup) => replay(&setup, &samples, |q| q.as_coulombs()),
            AnySetup::Flux(setup) => replay(&setup, &samples, |q| q.as_volt_seconds()),
        }
    }
}

fn replay<Q: Integral>(setup: &Setup<Q>, samples: &[Sample], si: impl Fn(Q) -> f64) -> Outcome {
    let mut channel = Channel::new(setup);
    let mut at_stop: Option<Reading<Q>> = None;
    let mut events = Vec::new();
    for &sample in samples {
        if channel.mode() == Some(Mode::Integrate) && sample.mode == Mode::Zero {
            at_stop = channel.reading();
        }
        events.extend(channel.feed(sample).notices.iter().map(|notice| notice.event));
    }
    let reading = channel.reading().expect("the trace has a run");
    let drift = channel.drift();
    if let Some(live) = at_stop {
        assert_eq!(live.at_stop, reading.at_stop, "what was known when the run stopped");
    }
    let pair = |e: &brimline::Estimate<Q>| (si(e.integral.value), si(e.integral.u));
    Outcome {
        estimates: [pair(&reading.at_stop), reading.closed.as_ref().map_or((f64::NAN, f64::NAN), pair)],
        uncorrected: si(reading.at_stop.integral.value) + si(reading.drift_removed),
        start_tick: reading.start_tick,
        end_tick: reading.end_tick,
        resets: reading.resets,
        trust: reading.trust,
        reasons: reading.reasons.iter().collect(),
        events,
        drift: (drift.value.as_volts_per_second(), drift.u.as_volts_per_second()),
        amplifier: channel.offset_and_bias().map(|(offset, bias)| {
            [(offset.value.as_volts(), offset.u.as_volts()), (bias.value.as_amperes(), bias.u.as_amperes())]
        }),
    }
}
