//! A set-up file (TOML) into a validated set-up, with errors that name the key.
// Shared with tests through `#[path]`: not every user takes every item.
#![allow(dead_code)]

// Found beside this file, whoever includes it.
#[path = "setup_keys.rs"]
mod setup_keys;

use std::fmt;
use std::path::Path;

use brimline::unit::Photodetector;
use brimline::{
    Charge, Circuit, Converter, Flux, Linearity, Noise, Policy, Setup, SetupError, SoakageBranch, TemperatureLaw,
};

use self::setup_keys::{CircuitKeys, ConverterKeys, PolicyKeys, ScaleKeys, SetupFile, about};

/// A set-up of either kind of input.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) enum AnySetup {
    /// Current input.
    Charge(Setup<Charge>),
    /// Voltage input.
    Flux(Setup<Flux>),
}

/// What a set-up file describes.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Board {
    pub(crate) setup: AnySetup,
    /// Given where `[scale]` has responsivity and area.
    pub(crate) detector: Option<Photodetector>,
}

/// Why a set-up file was refused, ready to be shown.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) struct SetupFileError(String);

impl fmt::Display for SetupFileError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.0)
    }
}

impl std::error::Error for SetupFileError {}

/// Reads and validates the set-up file at `path`.
pub(crate) fn read(path: &Path) -> Result<Board, SetupFileError> {
    let name = path.display().to_string();
    let text = std::fs::read_to_string(path)
        .map_err(|e| SetupFileError(format!("{name}: the set-up file cannot be read: {e}. Check the path.")))?;
    parse(&text, &name)
}

/// Validates the text of a set-up file; `name` is what messages call it.
pub(crate) fn parse(text: &str, name: &str) -> Result<Board, SetupFileError> {
    let file: SetupFile = toml::from_str(text).map_err(|e| syntax(&e, text, name))?;
    board(&file).map_err(|refusal| refusal.into_error(text, name))
}

/// A key whose value is well-formed but cannot stand.
struct Refusal {
    key: &'static str,
    why: String,
}

impl Refusal {
    fn missing(key: &'static str, because: &str) -> Self {
        let allowed = about(key).map_or("", |(_, allowed)| allowed);
        Self { key, why: format!("the key is missing: {because}. It must be {allowed}.") }
    }

    /// With file, line, section and the value that was found.
    fn into_error(self, text: &str, name: &str) -> SetupFileError {
        let section = about(self.key).map_or("", |(section, _)| section);
        let found = find(text, section, self.key);
        let line = found.as_ref().map_or(String::new(), |(line, _)| format!(":{line}"));
        let value = found.map_or(String::new(), |(_, value)| format!(" = {value}"));
        SetupFileError(format!("{name}{line}: [{section}] {}{value}: {}", self.key, self.why))
    }
}

impl From<SetupError> for Refusal {
    fn from(e: SetupError) -> Self {
        Self { key: e.parameter, why: format!("out of range: it must be {}.", e.allowed) }
    }
}

fn board(file: &SetupFile) -> Result<Board, Refusal> {
    let c = &file.circuit;
    if c.input_resistance_ohm.is_none() && c.source_resistance_ohm.is_none() {
        return Err(Refusal::missing(
            "source_resistance_ohm",
            "without input_resistance_ohm the input is a current, and the offset voltage drives a current through its \
             source",
        ));
    }
    let d = Circuit::DEFAULT;
    let circuit = Circuit {
        capacitance_f: c.capacitance_f,
        input_resistance_ohm: c.input_resistance_ohm,
        inverting: c.inverting.unwrap_or(d.inverting),
        reset_level_v: c.reset_level_v.unwrap_or(d.reset_level_v),
        rail_low_v: c.rail_low_v,
        rail_high_v: c.rail_high_v,
        offset_limit_v: c.offset_limit_v,
        bias_limit_a: c.bias_limit_a,
        source_resistance_ohm: c.source_resistance_ohm.unwrap_or(d.source_resistance_ohm),
        leak_time_constant_s: c.leak_time_constant_s,
        leak_u_rel: c.leak_u_rel.unwrap_or(d.leak_u_rel),
        soakage: soakage(c)?,
        soakage_u_rel: c.soakage_u_rel.unwrap_or(d.soakage_u_rel),
        pedestal_v: c.pedestal_v.unwrap_or(d.pedestal_v),
        pedestal_u_v: c.pedestal_u_v,
        switch_resistance_ohm: c.switch_resistance_ohm.unwrap_or(d.switch_resistance_ohm),
        slew_v_per_s: c.slew_v_per_s,
        temperature_law: temperature_law(c)?,
        gain_u_rel: file.scale.gain_u_rel.unwrap_or(d.gain_u_rel),
    };
    let converter = converter(&file.converter)?;
    let noise = Noise {
        readout_counts: file.noise.readout_counts,
        input_density: file.noise.input_density,
        offset_wander: file.noise.offset_wander.unwrap_or(0.0),
        input_flicker: file.noise.input_flicker.unwrap_or(0.0),
    };
    let policy = policy(&file.policy);
    let detector = detector(&file.scale, circuit.input_resistance_ohm.is_some())?;
    let setup = match circuit.input_resistance_ohm {
        None => AnySetup::Charge(Setup::try_new(circuit, converter, noise, policy)?),
        Some(_) => AnySetup::Flux(Setup::try_new(circuit, converter, noise, policy)?),
    };
    Ok(Board { setup, detector })
}

fn temperature_law(c: &CircuitKeys) -> Result<TemperatureLaw, Refusal> {
    match (c.offset_tempco_v_per_k, c.bias_doubling_k) {
        (None, None) => Ok(TemperatureLaw::Unknown),
        (Some(limit_v_per_k), None) => Ok(TemperatureLaw::Offset { limit_v_per_k }),
        (None, Some(doubling_k)) => Ok(TemperatureLaw::Junction { doubling_k }),
        (Some(_), Some(_)) => {
            let why = "it stands beside offset_tempco_v_per_k. Give the one that makes most of the drift.".to_owned();
            Err(Refusal { key: "bias_doubling_k", why })
        }
    }
}

fn soakage(c: &CircuitKeys) -> Result<[SoakageBranch; 4], Refusal> {
    let mut branches = Circuit::DEFAULT.soakage;
    if c.soakage.len() > branches.len() {
        let why = format!("{} branches are too many: at most 4, the slowest and the largest.", c.soakage.len());
        return Err(Refusal { key: "soakage", why });
    }
    for (branch, keys) in branches.iter_mut().zip(&c.soakage) {
        *branch = SoakageBranch { share: keys.share, time_constant_s: keys.time_constant_s };
    }
    Ok(branches)
}

fn converter(c: &ConverterKeys) -> Result<Converter, Refusal> {
    let d = Converter::DEFAULT;
    // One table for each set-up that a program reads: it lives as long as the program, as in a microcontroller's flash.
    let linearity = match c.nonlinearity.as_slice() {
        [] => None,
        points => Some(&*Box::leak(Box::new(Linearity::try_new(points)?))),
    };
    Ok(Converter {
        code_zero_v: c.code_zero_v,
        lsb_v: c.lsb_v,
        code_min: c.code_min,
        code_max: c.code_max,
        tick_hz: c.tick_hz,
        code_zero_u_v: c.code_zero_u_v.unwrap_or(d.code_zero_u_v),
        lsb_u_rel: c.lsb_u_rel.unwrap_or(d.lsb_u_rel),
        linearity,
        linearity_u_counts: c.linearity_u_counts.unwrap_or(d.linearity_u_counts),
    })
}

fn policy(p: &PolicyKeys) -> Policy {
    let d = Policy::DEFAULT;
    Policy {
        zero_block_s: p.zero_block_s.unwrap_or(d.zero_block_s),
        false_alarm_s: p.false_alarm_s.unwrap_or(d.false_alarm_s),
        edge_samples: p.edge_samples.unwrap_or(d.edge_samples),
        gap_limit_s: p.gap_limit_s.unwrap_or(d.gap_limit_s),
        frozen_samples: p.frozen_samples.unwrap_or(d.frozen_samples),
        worst_input: p.worst_input.or(d.worst_input),
        input_slew: p.input_slew.or(d.input_slew),
        latency_s: p.latency_s.unwrap_or(d.latency_s),
        guard_sigma: p.guard_sigma.unwrap_or(d.guard_sigma),
        settling_s: p.settling_s.unwrap_or(d.settling_s),
        reset_attempts: p.reset_attempts.unwrap_or(d.reset_attempts),
        arrival_tolerance_v: p.arrival_tolerance_v.or(d.arrival_tolerance_v),
    }
}

/// The photodetector of `[scale]`: all four of its figures or none, and only where a charge is measured.
fn detector(scale: &ScaleKeys, voltage_input: bool) -> Result<Option<Photodetector>, Refusal> {
    let keys = [
        ("responsivity_a_per_w", scale.responsivity_a_per_w),
        ("responsivity_u_rel", scale.responsivity_u_rel),
        ("area_m2", scale.area_m2),
        ("area_u_rel", scale.area_u_rel),
    ];
    let Some(&(given, _)) = keys.iter().find(|(_, value)| value.is_some()) else { return Ok(None) };
    if voltage_input {
        let why = "a photodetector's scale needs a charge, and with input_resistance_ohm the board measures volt \
                   seconds: it must be absent."
            .to_owned();
        return Err(Refusal { key: given, why });
    }
    let [responsivity, responsivity_u, area, area_u] = keys.map(|(key, value)| {
        value.ok_or_else(|| Refusal::missing(key, "radiant exposure needs responsivity, area and both uncertainties"))
    });
    Ok(Some(Photodetector::try_new(responsivity?, responsivity_u?, area?, area_u?)?))
}

/// What the TOML reader refused: with line, section, key and what is allowed.
fn syntax(error: &toml::de::Error, text: &str, name: &str) -> SetupFileError {
    let message = plain(error.message());
    let at = error.span().map_or(0, |span| span.start.min(text.len()));
    let line_number = text.get(..at).map_or(1, |before| before.matches('\n').count() + 1);
    let line = text.lines().nth(line_number - 1).unwrap_or("").trim();
    let missing = message.strip_prefix("missing field ");
    const BRANCH: [&str; 2] = ["share", "time_constant_s"];
    if let Some(key) = missing.filter(|key| BRANCH.contains(key)) {
        return SetupFileError(format!("{name}:{line_number}: [circuit] soakage: a branch lacks {key}."));
    }
    if let Some(section) = missing.filter(|key| about(key).is_none()) {
        return SetupFileError(format!("{name}: missing section [{section}]: it must be given."));
    }
    let key = missing.unwrap_or_else(|| line.split('=').next().unwrap_or("").trim());
    let place = match about(key).map(|(section, _)| section).or_else(|| section_at(text, line_number)) {
        Some(section) if section_name(key).is_none() => format!("[{section}] {key}"),
        _ => key.to_owned(),
    };
    let what = match missing {
        Some(_) => "the key is missing".to_owned(),
        None => format!("{message} (the line is: {line})"),
    };
    let allowed = about(key).map_or(String::new(), |(_, allowed)| format!(". It must be {allowed}"));
    SetupFileError(format!("{name}:{line_number}: {place}: {what}{allowed}."))
}

/// The reader's message without the names of Rust's types.
fn plain(message: &str) -> String {
    let mut plain = message.replace('`', "");
    for (rust, plain_name) in [
        ("struct ", "section "),
        ("CircuitKeys", "[circuit]"),
        ("ConverterKeys", "[converter]"),
        ("NoiseKeys", "[noise]"),
        ("ScaleKeys", "[scale]"),
        ("PolicyKeys", "[policy]"),
        ("BranchKeys", "{ share, time_constant_s }"),
        ("expected f64", "expected a number"),
        ("expected i32", "expected a whole number"),
        ("expected u8", "expected a whole number"),
        ("expected u16", "expected a whole number"),
        ("a boolean", "true or false"),
    ] {
        plain = plain.replace(rust, plain_name);
    }
    plain
}

/// The section that line `number` lies in.
fn section_at(text: &str, number: usize) -> Option<&str> {
    text.lines().take(number).filter_map(section_name).last()
}

fn section_name(line: &str) -> Option<&str> {
    line.trim().strip_prefix('[')?.split(']').next()
}

/// Line number and value of `key` in `section`, as written.
fn find(text: &str, section: &str, key: &str) -> Option<(usize, String)> {
    let mut current = "";
    for (index, line) in text.lines().enumerate() {
        if let Some(name) = section_name(line) {
            current = name;
        } else if current == section
            && let Some((found, value)) = line.split_once('=')
            && found.trim() == key
        {
            return Some((index + 1, value.split('#').next().unwrap_or("").trim().to_owned()));
        }
    }
    None
}
