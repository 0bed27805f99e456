//! Packs the recorded traces of `tests/traces` into tables of little more than 2 bytes a row.

use std::error::Error;
use std::fmt::Write;
use std::path::Path;
use std::{env, fs};

const TRACES: [&str; 9] = [
    "hatchery",
    "tick_wrap",
    "stuck_switch",
    "dim_lamp",
    "soakage",
    "wandering_offset",
    "search_coil",
    "leaky",
    "held",
];

fn main() -> Result<(), Box<dyn Error>> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("../../../tests/traces");
    let mut tables = String::new();
    for name in TRACES {
        let path = folder.join(name).with_extension("csv");
        println!("cargo::rerun-if-changed={}", path.display());
        let table = pack(name, &fs::read_to_string(&path)?).map_err(|e| format!("{}: {e}", path.display()))?;
        tables.push_str(&table);
    }
    fs::write(Path::new(&env::var("OUT_DIR")?).join("tables.rs"), tables)?;
    Ok(())
}

/// A trace as Rust source; an error if it does not fit the packed form.
fn pack(name: &str, csv: &str) -> Result<String, Box<dyn Error>> {
    let mut steps = String::new();
    let mut spans: Vec<(&str, u32)> = Vec::new();
    let mut ticks: Vec<(u16, u16)> = Vec::new();
    let mut first = None;
    let mut before: Option<(u32, i32)> = None;
    for row in csv.lines().skip(1) {
        let [tick, counts, mode, temperature] =
            row.split(',').collect::<Vec<_>>().try_into().map_err(|_| format!("not four columns: {row}"))?;
        let (tick, counts): (u32, i32) = (tick.parse()?, counts.parse()?);
        let (start_tick, start_counts, start_temperature) = *first.get_or_insert((tick, counts, temperature));
        if temperature != start_temperature {
            return Err("the temperature changes".into());
        }
        let (last_tick, last_counts) = before.replace((tick, counts)).unwrap_or((start_tick, start_counts));
        write!(steps, "{},", i16::try_from(counts - last_counts)?)?;
        let passed = u16::try_from(tick.wrapping_sub(last_tick))?;
        match ticks.last_mut() {
            Some((last, rows)) if *last == passed => *rows += 1,
            _ => ticks.push((passed, 1)),
        }
        match spans.last_mut() {
            Some((last, rows)) if *last == mode => *rows += 1,
            _ => spans.push((mode, 1)),
        }
    }
    let (tick, counts, temperature) = first.ok_or("no rows")?;
    // Written with three decimals; the test of the unpacked rows would show anything else.
    let millidegrees: i32 = temperature.replace('.', "").parse()?;
    let mut packed = String::new();
    for (mode, rows) in spans {
        let variant = match mode {
            "zero" => "Zero",
            "integrate" => "Integrate",
            "hold" => "Hold",
            "reset" => "Reset",
            _ => return Err(format!("no mode is called {mode}").into()),
        };
        write!(packed, "(Mode::{variant},{rows}),")?;
    }
    Ok(format!(
        "const {}: Table = Table {{ name: \"{name}\", first: ({tick}, {counts}), millidegrees: {millidegrees}, \
         spans: &[{packed}], ticks: &{ticks:?}, steps: &[{steps}] }};\n",
        name.to_uppercase()
    ))
}
