//! Every reader of bytes: errors, never panics; and what was read comes out the same when it is written and read again.

use std::fmt::Write;

use brimline::{Mode, Sample, Temperature};

use crate::draw::Draw;
use crate::packing;
use crate::setup_file::{self, AnySetup};
use crate::table::unpack;
use crate::trace_file::TraceFile;

pub fn run(bytes: &[u8]) {
    let Some((&kind, text)) = bytes.split_first() else { return };
    match kind % 4 {
        0 => setup_text(text),
        1 => trace_text(text),
        2 => rows(text),
        _ => {
            setup_text(text);
            trace_text(text);
        }
    }
}

/// A set-up file: read alike every time, with a message that begins with its name.
fn setup_text(text: &[u8]) {
    let text = String::from_utf8_lossy(text);
    match (setup_file::parse(&text, "board.toml"), setup_file::parse(&text, "board.toml")) {
        (Ok(one), Ok(two)) => {
            assert_eq!(one, two);
            let voltage_input = match &one.setup {
                AnySetup::Charge(setup) => setup.circuit().input_resistance_ohm.is_some(),
                AnySetup::Flux(setup) => setup.circuit().input_resistance_ohm.is_none(),
            };
            assert!(!voltage_input, "a set-up of the wrong kind");
        }
        (Err(one), Err(two)) => {
            assert_eq!(one, two);
            assert!(one.to_string().starts_with("board.toml"), "{one}");
        }
        (one, two) => panic!("read twice: {one:?} {two:?}"),
    }
}

/// The samples of a trace, and whether it could be read to its end.
fn read(text: &[u8]) -> (Vec<Sample>, Option<String>) {
    let mut samples = Vec::new();
    match TraceFile::new(text, "trace.csv", -1_000_000..=1_000_000) {
        Err(error) => (samples, Some(error.to_string())),
        Ok(rows) => {
            for row in rows {
                match row {
                    Ok(sample) => samples.push(sample),
                    Err(error) => return (samples, Some(error.to_string())),
                }
            }
            (samples, None)
        }
    }
}

fn name(mode: Mode) -> &'static str {
    match mode {
        Mode::Zero => "zero",
        Mode::Integrate => "integrate",
        Mode::Hold => "hold",
        Mode::Reset => "reset",
    }
}

/// The trace as recorders write it.
fn written(samples: &[Sample]) -> String {
    let mut text = String::from("tick,counts,mode,temp_c\n");
    for sample in samples {
        let _ = write!(text, "{},{},{},", sample.tick, sample.counts, name(sample.mode));
        if let Some(temperature) = sample.temperature {
            let millidegrees = temperature.as_millidegrees_celsius();
            let sign = if millidegrees < 0 { "-" } else { "" };
            let whole = millidegrees.unsigned_abs();
            let _ = write!(text, "{sign}{}.{:03}", whole / 1000, whole % 1000);
        }
        text.push('\n');
    }
    text
}

fn trace_text(text: &[u8]) {
    let (samples, error) = read(text);
    if let Some(error) = &error {
        assert!(error.starts_with("trace.csv:"), "{error}");
    }
    for pair in samples.windows(2) {
        assert!(pair[1].tick.wrapping_sub(pair[0].tick).wrapping_sub(1) < (1 << 31) - 1, "time does not go forward");
    }
    if samples.is_empty() {
        assert!(error.is_some(), "an empty trace is none");
        return;
    }
    assert_eq!(read(written(&samples).as_bytes()), (samples, None), "read again");
}

/// Rows that a converter could give, through the packed form and back.
fn rows(bytes: &[u8]) {
    let mut draw = Draw::new(bytes);
    let mut tick = draw.long();
    let mut counts = draw.long() as i32 >> draw.pick(&[12, 16, 1]);
    let temperature = Some(Temperature::from_millidegrees_celsius(draw.word() as i16 as i32));
    let (mut mode, mut ticks) = (Mode::Zero, 100);
    let mut samples = Vec::new();
    while !draw.is_empty() {
        samples.push(Sample { tick, counts, mode, temperature });
        if draw.flag(64) {
            mode = draw.pick(&[Mode::Zero, Mode::Integrate, Mode::Reset, Mode::Hold]);
            ticks = if draw.flag(8) { draw.long() } else { u32::from(draw.word()) };
        }
        tick = tick.wrapping_add(ticks);
        counts = counts.saturating_add(i32::from(draw.byte() as i8) * draw.pick(&[1, 1, 1, 100, 300]));
    }
    let packed = packing::pack("any", &written(&samples));
    let steps =
        samples.windows(2).map(|pair| (pair[1].tick.wrapping_sub(pair[0].tick), pair[1].counts - pair[0].counts));
    let fits = steps.into_iter().all(|(ticks, moved)| u16::try_from(ticks).is_ok() && i16::try_from(moved).is_ok());
    assert_eq!(packed.is_ok(), fits && !samples.is_empty(), "{packed:?}");
    if let Ok(source) = packed {
        assert_eq!(unpacked(&source), samples, "{source}");
    }
}

/// Reads a packed table's source, as the compiler does, and unpacks it.
fn unpacked(source: &str) -> Vec<Sample> {
    let part = |from: &str, to: &str| {
        source.split_once(from).and_then(|(_, rest)| rest.split_once(to)).map_or("", |(part, _)| part)
    };
    let numbers = |text: &str| -> Vec<i64> {
        text.split(|c: char| !c.is_ascii_digit() && c != '-').filter_map(|number| number.parse().ok()).collect()
    };
    let (first, ticks) = (numbers(part("first: (", ")")), numbers(part("ticks: &[", "]")));
    let steps: Vec<i16> = numbers(part("steps: &[", "]")).iter().map(|&step| step as i16).collect();
    let ticks: Vec<(u16, u16)> = ticks.chunks(2).map(|pair| (pair[0] as u16, pair[1] as u16)).collect();
    let mut spans = Vec::new();
    for span in part("spans: &[", "]").split("(Mode::").skip(1) {
        let mode = [Mode::Zero, Mode::Integrate, Mode::Hold, Mode::Reset]
            .into_iter()
            .find(|mode| span.starts_with(&format!("{mode:?},")));
        let Some(mode) = mode else { panic!("no mode: {span}") };
        spans.push((mode, numbers(span)[0] as u32));
    }
    let millidegrees = numbers(part("millidegrees: ", ","))[0] as i32;
    unpack((first[0] as u32, first[1] as i32), millidegrees, spans.leak(), ticks.leak(), steps.leak())
}
