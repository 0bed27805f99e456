//! The host program from outside: what it prints, what it refuses, and how it ends.

// A test on the host: its arithmetic need not give the same bits on every target.
#![allow(clippy::disallowed_methods)]

#[path = "../examples/replay/setup_file.rs"]
mod setup_file;

#[path = "replay_cli/refusals.rs"]
mod refusals;
#[path = "replay_cli/results.rs"]
mod results;

use std::path::{Path, PathBuf};
use std::process::{Command, Output, Stdio};
use std::sync::OnceLock;

use serde_json::Value;

type Checked = Result<(), Box<dyn std::error::Error>>;

/// The program as cargo has built it beside this test. `cargo test` builds examples before it runs a test; with
/// `--test replay_cli` alone it does not, so the program is built here once.
fn program() -> &'static Path {
    static PROGRAM: OnceLock<PathBuf> = OnceLock::new();
    PROGRAM.get_or_init(|| {
        let own = std::env::current_exe().unwrap_or_default();
        let profile = own.parent().and_then(Path::parent).map(Path::to_owned).unwrap_or_default();
        let mut build = Command::new(env!("CARGO"));
        build.args(["build", "--quiet", "--example", "replay", "--manifest-path"]);
        build.arg(root("Cargo.toml"));
        if let Some(target) = profile.parent() {
            build.arg("--target-dir").arg(target);
        }
        let name = profile.file_name().and_then(|name| name.to_str()).unwrap_or("debug");
        build.args(["--profile", if name == "debug" { "dev" } else { name }]);
        assert!(build.status().is_ok_and(|status| status.success()), "the program cannot be built");
        profile.join("examples").join(format!("replay{}", std::env::consts::EXE_SUFFIX))
    })
}

fn root(path: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(path)
}

/// A folder of its own for each test.
fn folder(test: &str) -> Result<PathBuf, std::io::Error> {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join("replay_cli").join(test);
    std::fs::create_dir_all(&folder)?;
    Ok(folder)
}

fn run(arguments: &[&str]) -> Result<Output, std::io::Error> {
    Command::new(program()).args(arguments).output()
}

/// Replays the text of a trace under the hatchery's set-up.
fn replay(test: &str, trace: &str, more: &[&str]) -> Result<Output, Box<dyn std::error::Error>> {
    let path = folder(test)?.join("trace.csv");
    std::fs::write(&path, trace)?;
    let setup = root("examples/setups/hatchery.toml");
    let output = Command::new(program()).arg(&path).arg("--setup").arg(setup).args(more).output()?;
    Ok(output)
}

fn stdout(output: &Output) -> String {
    String::from_utf8_lossy(&output.stdout).into_owned()
}

fn stderr(output: &Output) -> String {
    String::from_utf8_lossy(&output.stderr).into_owned()
}

fn json(output: &Output) -> Result<Value, serde_json::Error> {
    serde_json::from_slice(&output.stdout)
}

fn number(value: &Value, pointer: &str) -> Result<f64, String> {
    value.pointer(pointer).and_then(Value::as_f64).ok_or(format!("no number at {pointer}"))
}

/// The bundled trace's rows, with its header.
fn hatchery() -> Result<Vec<String>, std::io::Error> {
    Ok(std::fs::read_to_string(root("tests/traces/hatchery.csv"))?.lines().map(str::to_owned).collect())
}

fn joined(lines: &[String]) -> String {
    lines.iter().map(|line| format!("{line}\n")).collect()
}

fn replay_bundled(name: &str, more: &[&str]) -> Result<Output, std::io::Error> {
    let trace = root(&format!("tests/traces/{name}.csv"));
    let setup = root(&format!("examples/setups/{name}.toml"));
    Command::new(program()).arg(trace).arg("--setup").arg(setup).args(more).output()
}

#[test]
fn without_arguments_a_person_reads_the_bundled_trace() -> Checked {
    // From a folder where none of the project's files are.
    let output = Command::new(program()).current_dir(folder("elsewhere")?).output()?;
    let text = stdout(&output);
    assert!(output.status.success(), "{}", stderr(&output));
    assert!(output.stderr.is_empty(), "{}", stderr(&output));
    for part in [
        "3 resets",
        "trust                     good",
        "without drift correction",
        "times U",
        "J/m^2",
        "mJ/cm^2",
        "Caution",
        "Drift: (-8",
        "13.300  reset switch closed",
        "closed: with the zero after the run",
    ] {
        assert!(text.contains(part), "\"{part}\" is missing in:\n{text}");
    }
    // Value and uncertainty end at the same digit.
    let result = text.lines().find_map(|line| line.trim().strip_prefix("result ")).unwrap_or("").trim();
    let (value, rest) = result.trim_start_matches('(').split_once(" ± ").unwrap_or_default();
    let (expanded, _) = rest.split_once(')').unwrap_or_default();
    let decimals = |number: &str| number.split('.').nth(1).map(str::len);
    assert_eq!(decimals(value), decimals(expanded), "{result}");
    assert_eq!(expanded.trim_start_matches(['0', '.']).len(), 2, "{result}");
    Ok(())
}

#[test]
fn line_ends_comments_and_the_order_of_columns_make_no_difference() -> Checked {
    let plain = stdout(&run(&["--json"])?);
    let lines = hatchery()?;
    let crlf: String = lines.iter().map(|line| format!("{line}\r\n")).collect();
    let commented = format!("\u{feff}# made by hand\r\n\r\n{crlf}# the end\r\n");
    assert_eq!(stdout(&replay("crlf", &commented, &["--json"])?), plain);
    let no_last_newline = joined(&lines).trim_end().to_owned();
    assert_eq!(stdout(&replay("no_newline", &no_last_newline, &["--json"])?), plain);
    let reordered: String = lines
        .iter()
        .enumerate()
        .map(|(index, line)| {
            let note = if index == 0 { "note" } else { "\"a, b\"" };
            let fields: Vec<_> = line.rsplit(',').collect();
            format!("{note},{}\n", fields.join(","))
        })
        .collect();
    assert_eq!(stdout(&replay("reordered", &reordered, &["--json"])?), plain);
    Ok(())
}

#[test]
fn what_may_be_left_out_of_a_set_up_changes_nothing() -> Checked {
    let setup = std::fs::read_to_string(root("examples/setups/hatchery.toml"))?;
    let defaults = ["inverting", "reset_level_v", "switch_resistance_ohm", "offset_wander", "gain_u_rel"];
    let policy = ["edge_samples", "gap_limit_s", "frozen_samples", "latency_s", "guard_sigma", "settling_s"];
    let shorter: String = setup
        .lines()
        .filter(|line| !defaults.iter().chain(&policy).any(|key| line.starts_with(&format!("{key} ="))))
        .map(|line| format!("{line}\n"))
        .collect();
    assert_eq!(setup.lines().count(), shorter.lines().count() + defaults.len() + policy.len());
    assert_eq!(setup_file::parse(&shorter, "shorter")?, setup_file::parse(&setup, "whole")?);
    Ok(())
}

#[test]
fn a_reader_that_goes_away_is_no_crash() -> Checked {
    let mut child = Command::new(program()).arg("--json").stdout(Stdio::piped()).stderr(Stdio::piped()).spawn()?;
    drop(child.stdout.take());
    let output = child.wait_with_output()?;
    assert!(output.status.success(), "{:?}", output.status);
    assert!(output.stderr.is_empty(), "{}", stderr(&output));
    Ok(())
}

#[test]
fn plots_are_drawn_as_their_name_says() -> Checked {
    let folder = folder("plots")?;
    let svg = folder.join("hatchery.svg");
    assert!(Command::new(program()).arg("--plot").arg(&svg).output()?.status.success());
    let drawing = std::fs::read_to_string(&svg)?;
    assert!(drawing.starts_with("<svg") && drawing.trim_end().ends_with("</svg>"));
    for label in ["level / V", "drift / µV/s", "integral / µC", "time since the first row / s", "± 2 u"] {
        assert!(drawing.contains(label), "the plot has no label {label}");
    }
    assert!(drawing.len() < 150_000, "{} bytes", drawing.len());
    let png = folder.join("hatchery.PNG");
    assert!(Command::new(program()).arg("--plot").arg(&png).output()?.status.success());
    let picture = std::fs::read(&png)?;
    assert!(picture.starts_with(b"\x89PNG\r\n"), "no PNG");
    Ok(())
}

#[test]
fn the_picture_in_the_docs_shows_what_the_program_finds() -> Checked {
    let svg = folder("docs")?.join("hatchery.svg");
    let output = Command::new(program()).arg("--plot").arg(&svg).output()?;
    assert!(output.status.success(), "{}", stderr(&output));
    let headline = |drawing: String| drawing.lines().find(|line| line.contains("U = 2 u")).map(str::to_owned);
    let drawn = headline(std::fs::read_to_string(svg)?);
    assert!(drawn.is_some());
    assert_eq!(drawn, headline(std::fs::read_to_string(root("docs/hatchery.svg"))?), "draw docs/hatchery.svg anew");
    Ok(())
}
