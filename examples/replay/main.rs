//! Replays a recorded integrator trace: what it collected, how sure that is, and what drift would have done to it.
//!
//! Without arguments it replays the bundled trace of a lamp monitor in a seaweed hatchery.
// Runs on a host only: nothing here has to give the same bits on every target.
#![allow(clippy::disallowed_methods)]

mod chart;
mod json;
mod plot;
mod replay;
mod report;
mod setup_file;
mod trace_file;
mod track;
mod units;
mod words;

use std::fs::File;
use std::io::{self, BufRead, BufReader, BufWriter, IsTerminal, Write};
use std::path::{Path, PathBuf};
use std::process::ExitCode;

use brimline::Setup;
use clap::Parser;
use indicatif::{ProgressBar, ProgressFinish, ProgressStyle};

use crate::plot::PlotFile;
use crate::replay::{Amount, Outcome, Replay};
use crate::setup_file::{AnySetup, Board};
use crate::trace_file::TraceFile;
use crate::track::Track;

const BUNDLED_TRACE: &str = include_str!("../../tests/traces/hatchery.csv");
const BUNDLED_SETUP: &str = include_str!("../setups/hatchery.toml");

/// Traces from this size on show their progress, bytes.
const LONG: u64 = 8 << 20;

/// What a wrong input ends with, as wrong arguments do.
const BAD_INPUT: u8 = 2;

/// Replays a recorded integrator trace: the integral of its input with an uncertainty, run by run.
///
/// Without a trace it replays the bundled one: a lamp monitor in a seaweed hatchery.
#[derive(Parser)]
#[command(name = "replay", after_help = AFTER_HELP)]
struct Arguments {
    /// Trace to replay: CSV with the columns tick, counts, mode (zero, integrate, hold, reset) and, if wanted, temp_c
    #[arg(requires = "setup")]
    trace: Option<PathBuf>,

    /// Set-up of the board that recorded it (TOML); examples/setups/ has commented ones
    #[arg(long, value_name = "SETUP.toml", requires = "trace")]
    setup: Option<PathBuf>,

    /// Print one JSON object instead of the report: SI units, standard uncertainties
    #[arg(long)]
    json: bool,

    /// Draw level, baseline, drift and integral into this file
    #[arg(long, value_name = "FILE.svg|.png", value_parser = PlotFile::parse)]
    plot: Option<PlotFile>,
}

const AFTER_HELP: &str = "Exit code 0: replayed; 1: the result could not be written; 2: wrong arguments or input, told \
                          on stderr with file and line, while the runs before it are still printed.";

/// What a replay came to.
struct Replayed {
    outcome: Option<Outcome>,
    track: Option<Track>,
    error: Option<String>,
}

impl Replayed {
    fn refused(error: String) -> Self {
        Self { outcome: None, track: None, error: Some(error) }
    }
}

fn main() -> ExitCode {
    let arguments = Arguments::parse();
    let board = match &arguments.setup {
        Some(path) => setup_file::read(path),
        None => setup_file::parse(BUNDLED_SETUP, "examples/setups/hatchery.toml"),
    };
    let wants_track = arguments.plot.is_some();
    let trace = arguments.trace.as_deref();
    let replayed = match &board {
        Ok(Board { setup: AnySetup::Charge(setup), detector }) => {
            replay_trace(trace, setup, Replay::new(setup, *detector), wants_track)
        }
        Ok(Board { setup: AnySetup::Flux(setup), detector }) => {
            replay_trace(trace, setup, Replay::new(setup, *detector), wants_track)
        }
        Err(error) => Replayed::refused(error.to_string()),
    };
    let mut written = print(&arguments, &replayed).map_err(|e| format!("the result cannot be written: {e}"));
    if let (Some(file), Some(track), Some(outcome), Ok(board)) =
        (&arguments.plot, &replayed.track, &replayed.outcome, &board)
        && outcome.samples > 1
    {
        let subject = plot::Subject { title: &name(trace), outcome, usable_v: usable_v(&board.setup) };
        let drawn = plot::draw(file, track, &subject).map_err(|e| format!("{file}: the plot cannot be drawn: {e}"));
        written = written.and(drawn);
    }
    let code = match (&replayed.error, &written) {
        (Some(_), _) => ExitCode::from(BAD_INPUT),
        (None, Err(_)) => ExitCode::FAILURE,
        (None, Ok(())) => ExitCode::SUCCESS,
    };
    for error in written.err().iter().chain(&replayed.error) {
        complain(error);
    }
    code
}

/// What messages and headings call the trace.
fn name(trace: Option<&Path>) -> String {
    trace.map_or("tests/traces/hatchery.csv".to_owned(), |path| path.display().to_string())
}

/// Opens the trace and feeds it through.
fn replay_trace<Q: Amount>(
    trace: Option<&Path>,
    setup: &Setup<Q>,
    replay: Replay<'_, Q>,
    wants_track: bool,
) -> Replayed {
    let Some(path) = trace else {
        return feed(BUNDLED_TRACE.as_bytes(), &name(trace), setup, replay, wants_track);
    };
    match open(path) {
        Ok(reader) => feed(reader, &name(trace), setup, replay, wants_track),
        Err(error) => Replayed {
            outcome: Some(replay.finish(false)),
            track: None,
            error: Some(format!("{}: the trace cannot be opened: {error}. Check the path.", path.display())),
        },
    }
}

/// A long file, where someone watches, shows how far it has been read.
fn open(path: &Path) -> io::Result<Box<dyn BufRead>> {
    let file = File::open(path)?;
    let length = file.metadata()?.len();
    if length < LONG || !io::stderr().is_terminal() {
        return Ok(Box::new(BufReader::new(file)));
    }
    let bar = ProgressBar::new(length).with_finish(ProgressFinish::AndClear);
    if let Ok(style) = ProgressStyle::with_template("{wide_bar} {percent:>3} %, {eta} left") {
        bar.set_style(style);
    }
    Ok(Box::new(BufReader::with_capacity(1 << 18, bar.wrap_read(file))))
}

fn feed<Q: Amount>(
    reader: impl BufRead,
    name: &str,
    setup: &Setup<Q>,
    mut replay: Replay<'_, Q>,
    wants_track: bool,
) -> Replayed {
    let mut track = wants_track.then(Track::default);
    let codes = setup.converter().code_min..=setup.converter().code_max;
    let mut error = None;
    match TraceFile::new(reader, name, codes) {
        Ok(rows) => {
            for row in rows {
                match row {
                    Ok(sample) => {
                        replay.feed(sample);
                        if let Some(track) = &mut track {
                            track.observe(&replay, setup, &sample);
                        }
                    }
                    Err(cause) => error = Some(cause.to_string()),
                }
            }
        }
        Err(cause) => error = Some(cause.to_string()),
    }
    Replayed { outcome: Some(replay.finish(error.is_none())), track, error }
}

/// Prints the results; a reader that has gone away is no error.
fn print(arguments: &Arguments, replayed: &Replayed) -> io::Result<()> {
    let mut out = BufWriter::new(io::stdout().lock());
    let mut write = || {
        let error = replayed.error.as_deref();
        match &replayed.outcome {
            outcome if arguments.json => json::write(&mut out, outcome.as_ref(), error)?,
            Some(outcome) if outcome.samples > 0 => report::write(&mut out, outcome, &title(arguments))?,
            _ => {}
        }
        out.flush()
    };
    match write() {
        Err(error) if error.kind() == io::ErrorKind::BrokenPipe => Ok(()),
        written => written,
    }
}

fn title(arguments: &Arguments) -> String {
    match (&arguments.trace, &arguments.setup) {
        (Some(trace), Some(setup)) => format!("{}, set-up {}", trace.display(), setup.display()),
        _ => "The bundled trace of a lamp monitor in a seaweed hatchery (tests/traces/hatchery.csv)".to_owned(),
    }
}

/// What the level may use: the rails, or the codes next to the converter's end codes if they are nearer, V.
fn usable_v(setup: &AnySetup) -> (f64, f64) {
    let (circuit, converter) = match setup {
        AnySetup::Charge(setup) => (setup.circuit(), setup.converter()),
        AnySetup::Flux(setup) => (setup.circuit(), setup.converter()),
    };
    (
        circuit.rail_low_v.max(converter.volts(converter.code_min + 1)),
        circuit.rail_high_v.min(converter.volts(converter.code_max - 1)),
    )
}

/// On stderr; if even that is gone, nobody is left to be told.
fn complain(message: &str) {
    let _ = writeln!(io::stderr(), "error: {message}");
}
