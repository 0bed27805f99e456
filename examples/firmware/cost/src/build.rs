//! Builds and runs programs for each target.

use std::error::Error;
use std::path::PathBuf;
use std::process::{Command, Stdio};

use crate::flash;

/// A target and its column.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Target {
    pub(crate) triple: &'static str,
    pub(crate) name: &'static str,
}

pub(crate) const TARGETS: [Target; 5] = [
    Target { triple: "thumbv6m-none-eabi", name: "Cortex-M0" },
    Target { triple: "thumbv7m-none-eabi", name: "Cortex-M3" },
    Target { triple: "thumbv7em-none-eabihf", name: "Cortex-M4F" },
    Target { triple: "thumbv8m.main-none-eabihf", name: "Cortex-M33" },
    Target { triple: "riscv32imac-unknown-none-elf", name: "RV32IMAC" },
];

/// Names and values, in order.
pub(crate) type Rows = Vec<(String, String)>;

/// What the measuring program prints on the target, and the flash that a channel adds to an empty program.
pub(crate) fn measure(target: &Target) -> Result<Rows, Box<dyn Error>> {
    let mut rows = run("cost", target, "s")?;
    for bin in ["channel", "empty"] {
        cargo(&["build", "--package", "cost", "--bin", bin, "--target", target.triple], "s")?;
    }
    let folder = target_folder()?.join(target.triple).join("release");
    let added = flash::used(&folder.join("channel"))? - flash::used(&folder.join("empty"))?;
    rows.push(("flash for code and tables, with a set-up, bytes".into(), added.to_string()));
    Ok(rows)
}

/// What the program of a package prints on the target: `name: value` lines.
pub(crate) fn run(package: &str, target: &Target, opt_level: &str) -> Result<Rows, Box<dyn Error>> {
    let output = cargo(&["run", "--package", package, "--bin", package, "--target", target.triple], opt_level)?;
    let row = |line: &str| line.rsplit_once(": ").map(|(name, value)| (name.to_owned(), value.to_owned()));
    output.lines().map(|line| row(line).ok_or_else(|| format!("{}: {line}", target.triple).into())).collect()
}

/// Runs cargo in this package, into the folder that this program was built in.
pub(crate) fn cargo(arguments: &[&str], opt_level: &str) -> Result<String, Box<dyn Error>> {
    let mut command = Command::new(env!("CARGO"));
    command.current_dir(env!("CARGO_MANIFEST_DIR")).args(arguments);
    command.args(["--quiet", "--release"]).env("CARGO_PROFILE_RELEASE_OPT_LEVEL", opt_level);
    command.arg("--target-dir").arg(target_folder()?);
    let output = command.stderr(Stdio::inherit()).output()?;
    let text = String::from_utf8(output.stdout)?;
    if output.status.success() { Ok(text) } else { Err(format!("{command:?} failed: {text}").into()) }
}

/// Two folders above this program: it is `target/release/cost`.
fn target_folder() -> Result<PathBuf, Box<dyn Error>> {
    let program = std::env::current_exe()?;
    Ok(program.ancestors().nth(2).ok_or("not in a target folder")?.into())
}
