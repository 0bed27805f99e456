//! A trace (CSV), row by row, with errors that tell file, line and remedy.
// Shared with tests through `#[path]`: not every user takes every item.
#![allow(dead_code)]

use std::fmt;
use std::io::{self, BufRead, Read};
use std::ops::RangeInclusive;

use brimline::{Mode, Sample, Temperature};

/// Longest line that a trace may have, bytes: what a file that is no trace may take of the memory.
const LINE_LIMIT: u64 = 64 * 1024;

/// Why a trace could not be read on, ready to be shown.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) struct TraceError {
    /// The line that shows it; `None` where no line does.
    pub(crate) line: Option<u64>,
    /// The whole message: file, line, what is wrong, what to do.
    message: String,
}

impl fmt::Display for TraceError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.message)
    }
}

impl std::error::Error for TraceError {}

/// Where the columns are.
struct Columns {
    tick: usize,
    counts: usize,
    mode: usize,
    temperature: Option<usize>,
    all: usize,
}

/// A trace being read: an iterator over its samples. After an error it ends.
///
/// Memory does not grow with the trace.
pub(crate) struct TraceFile<R> {
    reader: R,
    name: String,
    codes: RangeInclusive<i32>,
    columns: Columns,
    line: Vec<u8>,
    number: u64,
    last_tick: Option<u32>,
    ended: bool,
}

impl<R: BufRead> TraceFile<R> {
    /// Reads the header. `name` is what messages call the trace; `codes` is what the converter can give.
    pub(crate) fn new(reader: R, name: &str, codes: RangeInclusive<i32>) -> Result<Self, TraceError> {
        let columns = Columns { tick: 0, counts: 0, mode: 0, temperature: None, all: 0 };
        let line = Vec::new();
        let name = name.to_owned();
        let mut trace = Self { reader, name, codes, columns, line, number: 0, last_tick: None, ended: false };
        if !trace.next_line()? {
            return Err(trace.without_line("the trace is empty. It must begin with a header: tick,counts,mode,temp_c."));
        }
        trace.columns = trace.header()?;
        Ok(trace)
    }

    /// Finds the columns in the present line.
    fn header(&self) -> Result<Columns, TraceError> {
        let fields = self.fields()?;
        let find = |wanted: &str| {
            let mut places = fields.iter().enumerate().filter(|(_, field)| field.as_str() == wanted);
            match (places.next(), places.next()) {
                (Some(_), Some(_)) => Err(self.error(&format!("the header names {wanted} twice. Keep one of them."))),
                (first, _) => Ok(first.map(|(place, _)| place)),
            }
        };
        let need = |wanted: &str| {
            find(wanted)?.ok_or_else(|| {
                let header = fields.join(",");
                let hint = if header.contains([';', '\t']) { " Columns are separated by commas." } else { "" };
                self.error(&format!(
                    "column {wanted} is missing; the header is: {header}. A trace needs tick, counts and mode, and may \
                     have temp_c.{hint}"
                ))
            })
        };
        Ok(Columns {
            tick: need("tick")?,
            counts: need("counts")?,
            mode: need("mode")?,
            temperature: find("temp_c")?,
            all: fields.len(),
        })
    }

    /// The next sample; `None` at the end.
    fn read(&mut self) -> Result<Option<Sample>, TraceError> {
        if !self.next_line()? {
            if self.last_tick.is_none() {
                return Err(self.error("the trace ends after its header. It needs at least one row."));
            }
            return Ok(None);
        }
        let fields = self.fields()?;
        let (given, all) = (fields.len(), self.columns.all);
        if given < all {
            return Err(self.error(&format!(
                "the row has {given} of the header's {all} fields: it was cut off. Complete it or take it out."
            )));
        }
        if given > all {
            return Err(self.error(&format!(
                "the row has {given} fields, the header {all}. Are two rows in one line, or is a comma used for the \
                 decimal point?"
            )));
        }
        let field = |place: usize| fields.get(place).map_or("", String::as_str);
        let sample = Sample {
            tick: self.tick(field(self.columns.tick))?,
            counts: self.counts(field(self.columns.counts))?,
            mode: self.mode(field(self.columns.mode))?,
            temperature: self.columns.temperature.map_or(Ok(None), |place| self.temperature(field(place)))?,
        };
        self.last_tick = Some(sample.tick);
        Ok(Some(sample))
    }

    fn tick(&self, field: &str) -> Result<u32, TraceError> {
        let tick: u32 = field.parse().map_err(|_| {
            self.error(&format!("tick is \"{field}\". It must be a whole number from 0 to 4294967295."))
        })?;
        let Some(last) = self.last_tick else { return Ok(tick) };
        match tick.wrapping_sub(last) {
            0 => Err(self.error(&format!(
                "time stands still: tick {tick} again. Every row needs a tick of its own; take the doubled row out."
            ))),
            0x8000_0000.. => Err(self.error(&format!(
                "time runs back: tick {tick} after {last}. Put the rows in the order they were taken; the counter may \
                 wrap from 4294967295 to 0, and a step may be at most half its span."
            ))),
            _ => Ok(tick),
        }
    }

    fn counts(&self, field: &str) -> Result<i32, TraceError> {
        let (low, high) = (self.codes.start(), self.codes.end());
        let counts: i64 = field.parse().map_err(|_| {
            self.error(&format!("counts is \"{field}\". It must be a whole number from {low} to {high}."))
        })?;
        i32::try_from(counts).ok().filter(|counts| self.codes.contains(counts)).ok_or_else(|| {
            self.error(&format!(
                "counts is {field}, but the set-up's converter gives {low} to {high} only (code_min, code_max). Is \
                 this the set-up of this trace?"
            ))
        })
    }

    fn mode(&self, field: &str) -> Result<Mode, TraceError> {
        match field {
            "zero" => Ok(Mode::Zero),
            "integrate" => Ok(Mode::Integrate),
            "hold" => Ok(Mode::Hold),
            "reset" => Ok(Mode::Reset),
            _ => Err(self.error(&format!("mode is \"{field}\". It must be zero, integrate, hold or reset."))),
        }
    }

    /// An empty field means that this row has no temperature.
    fn temperature(&self, field: &str) -> Result<Option<Temperature>, TraceError> {
        if field.is_empty() {
            return Ok(None);
        }
        field
            .parse()
            .ok()
            .filter(|degrees: &f64| (-273.15..=1e6).contains(degrees))
            .map(|degrees| {
                let rounding = if degrees < 0.0 { -0.5 } else { 0.5 };
                Some(Temperature::from_millidegrees_celsius((degrees * 1e3 + rounding) as i32))
            })
            .ok_or_else(|| {
                self.error(&format!("temp_c is \"{field}\". It must be a temperature in degrees Celsius, or empty."))
            })
    }

    /// Brings the next line that is neither blank nor a comment; `false` at the end of the file.
    fn next_line(&mut self) -> Result<bool, TraceError> {
        loop {
            self.line.clear();
            let read = self.reader.by_ref().take(LINE_LIMIT).read_until(b'\n', &mut self.line);
            match read {
                Ok(0) => return Ok(false),
                Ok(_) => self.number += 1,
                Err(e) if e.kind() == io::ErrorKind::Interrupted => continue,
                Err(e) => return Err(self.without_line(&format!("the trace cannot be read: {e}. Check the path."))),
            }
            if self.line.len() as u64 >= LINE_LIMIT && self.line.last() != Some(&b'\n') {
                return Err(self.error(&format!("the line is longer than {LINE_LIMIT} bytes. Is this a trace?")));
            }
            if self.number == 1 && self.line.starts_with(b"\xEF\xBB\xBF") {
                self.line.drain(..3);
            }
            let text = self.line.trim_ascii();
            if !text.is_empty() && !text.starts_with(b"#") {
                return Ok(true);
            }
        }
    }

    /// The present line's fields, trimmed. A field in double quotes may hold commas.
    fn fields(&self) -> Result<Vec<String>, TraceError> {
        let text = str::from_utf8(&self.line)
            .map_err(|_| self.error("the line is no text (UTF-8). Is this a trace, and was it copied whole?"))?;
        let mut fields = vec![String::new()];
        let mut quoted = false;
        for character in text.trim().chars() {
            match (character, fields.last_mut()) {
                ('"', _) => quoted = !quoted,
                (',', _) if !quoted => fields.push(String::new()),
                (other, Some(field)) => field.push(other),
                (_, None) => {}
            }
        }
        for field in &mut fields {
            *field = field.trim().to_owned();
        }
        Ok(fields)
    }

    /// A message about the present line.
    fn error(&self, what: &str) -> TraceError {
        TraceError { line: Some(self.number), message: format!("{}:{}: {what}", self.name, self.number) }
    }

    fn without_line(&self, what: &str) -> TraceError {
        TraceError { line: None, message: format!("{}: {what}", self.name) }
    }
}

impl<R: BufRead> Iterator for TraceFile<R> {
    type Item = Result<Sample, TraceError>;

    fn next(&mut self) -> Option<Self::Item> {
        if self.ended {
            return None;
        }
        let row = self.read().transpose();
        self.ended = !matches!(row, Some(Ok(_)));
        row
    }
}
