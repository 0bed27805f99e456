//! Builds the program, runs it in QEMU an instruction at a time, and sorts the instructions by calls.

use std::error::Error;
use std::io::{BufRead, BufReader};
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};

use crate::calls::{Call, Kind};
use crate::names::{Names, Place};

/// Builds a package's program for `target`, with what tells where inlined code came from.
pub(crate) fn build(target: &str, package: &str, program: &str) -> Result<PathBuf, Box<dyn Error>> {
    let own = std::env::current_exe()?;
    let folder = own.ancestors().nth(2).ok_or("not in a target folder")?;
    let mut command = Command::new(env!("CARGO"));
    command.current_dir(env!("CARGO_MANIFEST_DIR")).env("CARGO_PROFILE_RELEASE_DEBUG", "2");
    command.args(["build", "--quiet", "--release", "--package", package, "--bin", program]);
    command.args(["--target", target, "--target-dir"]).arg(folder);
    if !command.status()?.success() {
        return Err(format!("{command:?} failed").into());
    }
    Ok(folder.join(target).join("release").join(program))
}

/// Every call of the run.
pub(crate) fn calls(target: &str, elf: &Path, names: &Names) -> Result<Vec<Call>, Box<dyn Error>> {
    let (qemu, board) = match target {
        "thumbv6m-none-eabi" => ("qemu-system-arm", "microbit"),
        "thumbv7em-none-eabihf" => ("qemu-system-arm", "mps2-an386"),
        _ => return Err(format!("no board for {target}").into()),
    };
    let mut command = Command::new(qemu);
    command.args(["-M", board, "-nographic", "-monitor", "none", "-serial", "none"]);
    command.args(["-semihosting-config", "enable=on,target=native", "-singlestep", "-d", "exec,nochain", "-kernel"]);
    let mut qemu = command.arg(elf).stdin(Stdio::null()).stderr(Stdio::piped()).spawn()?;
    let log = BufReader::with_capacity(1 << 20, qemu.stderr.take().ok_or("no log")?);

    let samples: Vec<_> = trace::BLOCKS_OF_16.samples().collect();
    let mut kinds = Vec::new();
    for (row, sample) in samples.iter().enumerate() {
        let before = row.checked_sub(1).map(|before| samples[before].mode);
        let steady = before == Some(sample.mode);
        kinds.push((if steady { Kind::Steady(sample.mode) } else { Kind::First(sample.mode) }, row));
        if row % 50 == 0 {
            kinds.push((Kind::Reading, row));
        }
    }
    let mut kinds = kinds.into_iter();
    let mut calls = Vec::new();
    let mut call: Option<Call> = None;
    let mut in_marker = false;
    for line in log.split(b'\n') {
        let line = line?;
        let Some(address) = address(&line) else { continue };
        let place = names.place(address);
        match place {
            Place::Begin if !in_marker => {
                let (kind, row) = kinds.next().ok_or("more calls than samples")?;
                call = Some(Call::new(kind, row));
                in_marker = true;
            }
            Place::End => calls.extend(call.take()),
            Place::Begin => {}
            _ => {
                in_marker = false;
                if let Some(call) = call.as_mut() {
                    call.add(place);
                }
            }
        }
    }
    if !qemu.wait()?.success() || kinds.next().is_some() {
        return Err("the run ended early".into());
    }
    Ok(calls)
}

/// The instruction's address in a line such as `Trace 0: 0x7f.. [00000400/000001ac/00000130/ff000201] name`.
fn address(line: &[u8]) -> Option<u64> {
    let line = std::str::from_utf8(line).ok()?.strip_prefix("Trace ")?;
    let address = line.split('/').nth(1)?;
    u64::from_str_radix(address, 16).ok()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn addresses_are_read() {
        let line = b"Trace 0: 0x7f3c74000100 [00400000/000001ac/00000130/ff000201] main";
        assert_eq!(address(line), Some(0x1ac));
        assert_eq!(address(b"Stopped execution of TB chain before 0x7f3c74000100"), None);
    }
}
