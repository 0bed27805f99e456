//! Builds and runs the programs for each target and sets what they say side by side.

use std::error::Error;
use std::path::PathBuf;
use std::process::{Command, Stdio};

use crate::flash;

const TARGETS: [(&str, &str); 2] = [("thumbv6m-none-eabi", "Cortex-M0"), ("thumbv7em-none-eabihf", "Cortex-M4F")];

type Rows = Vec<(String, String)>;

pub(crate) fn print() -> Result<(), Box<dyn Error>> {
    let [(_, first_name), (_, second_name)] = TARGETS;
    let [first, second] = TARGETS.map(|(target, _)| measure(target));
    println!("| instructions, mean / worst of a single call | {first_name} | {second_name} |");
    println!("| --- | ---: | ---: |");
    let (first, second) = (first?, second?);
    if first.len() != second.len() {
        return Err("the targets measured different things".into());
    }
    for ((name, left), (_, right)) in first.iter().zip(&second) {
        println!("| {name} | {left} | {right} |");
    }
    Ok(())
}

/// What the measuring program prints on `target`, and the flash that a channel adds to an empty program.
fn measure(target: &str) -> Result<Rows, Box<dyn Error>> {
    let output = cargo(&["run", "--bin", "cost", "--target", target])?;
    let mut rows = Rows::new();
    for line in output.lines() {
        let (name, value) = line.rsplit_once(": ").ok_or_else(|| format!("{target}: {line}"))?;
        rows.push((name.into(), value.into()));
    }
    cargo(&["build", "--bins", "--target", target])?;
    let folder = target_folder()?.join(target).join("release");
    let added = flash::used(&folder.join("channel"))? - flash::used(&folder.join("empty"))?;
    rows.push(("flash for code and tables, with a set-up, bytes".into(), added.to_string()));
    Ok(rows)
}

/// Runs cargo in this package, into the folder that this program was built in.
fn cargo(arguments: &[&str]) -> Result<String, Box<dyn Error>> {
    let mut command = Command::new(env!("CARGO"));
    command.current_dir(env!("CARGO_MANIFEST_DIR")).args(arguments);
    command.args(["--quiet", "--release", "--package", "cost", "--target-dir"]).arg(target_folder()?);
    let output = command.stderr(Stdio::inherit()).output()?;
    let text = String::from_utf8(output.stdout)?;
    if output.status.success() { Ok(text) } else { Err(format!("{command:?} failed: {text}").into()) }
}

/// Two folders above this program: it is `target/release/cost`.
fn target_folder() -> Result<PathBuf, Box<dyn Error>> {
    let program = std::env::current_exe()?;
    Ok(program.ancestors().nth(2).ok_or("not in a target folder")?.into())
}
