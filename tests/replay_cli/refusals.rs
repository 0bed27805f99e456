//! What is refused, with which words and which exit code.

use super::*;

/// Exit code of wrong arguments and wrong input.
const REFUSED: Option<i32> = Some(2);

#[test]
fn bad_rows_are_told_with_their_line_and_end_with_code_2() -> Checked {
    let header = "tick,counts,mode,temp_c";
    let good = "100,32768,zero,25.0";
    let cases = [
        ("", "empty"),
        (header, "trace.csv:1: the trace ends after its header"),
        ("tick,mode\n1,zero", "trace.csv:1: column counts is missing"),
        ("tick;counts;mode\n1;2;zero", "separated by commas"),
        ("tick,tick,counts,mode\n1,1,2,zero", "trace.csv:1: the header names tick twice"),
        ("{}200,32768,pause,25.0", "trace.csv:3: mode is \"pause\""),
        ("{}200,32768.5,zero,25.0", "trace.csv:3: counts is \"32768.5\""),
        ("{}200,65536,zero,25.0", "trace.csv:3: counts is 65536"),
        ("{}200,99999999999,zero,25.0", "trace.csv:3: counts is 99999999999"),
        ("{}-1,32768,zero,25.0", "trace.csv:3: tick is \"-1\""),
        ("{}4294967296,32768,zero,25.0", "trace.csv:3: tick is \"4294967296\""),
        ("{}100,32768,zero,25.0", "trace.csv:3: time stands still"),
        ("{}99,32768,zero,25.0", "trace.csv:3: time runs back"),
        // A step of half the counter's span cannot be told from one back.
        ("{}2147483748,32768,zero,25.0", "trace.csv:3: time runs back"),
        ("{}200,327", "trace.csv:3: the row has 2 of the header's 4 fields"),
        ("{}200,32768,zero,25.0300,32768,zero,25.0", "trace.csv:3: the row has 7 fields"),
        ("{}200,32768,zero,warm", "trace.csv:3: temp_c is \"warm\""),
    ];
    for (index, (rows, message)) in cases.into_iter().enumerate() {
        let trace = rows.replace("{}", &format!("{header}\n{good}\n"));
        let output = replay(&format!("bad_{index}"), &trace, &[])?;
        assert_eq!(output.status.code(), REFUSED, "{rows}: {}", stderr(&output));
        assert!(stderr(&output).contains(message), "{rows}: {}", stderr(&output));
    }
    // One tick less than half the span is time that passed.
    let longest = format!("{header}\n{good}\n2147483747,32768,zero,25.0\n");
    assert!(replay("longest_step", &longest, &[])?.status.success());
    Ok(())
}

#[test]
fn the_runs_before_a_bad_row_are_still_printed() -> Checked {
    let whole = json(&run(&["--json"])?)?;
    let mut lines = hatchery()?;
    lines.push("40060000,331".to_owned());
    let output = replay("truncated", &joined(&lines), &["--json"])?;
    assert_eq!(output.status.code(), REFUSED);
    let document = json(&output)?;
    assert_eq!(document["runs"], whole["runs"]);
    let error = document["error"].as_str().unwrap_or("");
    assert!(error.contains(&format!("trace.csv:{}: ", lines.len())), "{error}");
    assert!(whole.get("error").is_none());
    let text = replay("truncated", &joined(&lines), &[])?;
    assert!(stdout(&text).contains("Run 1: "), "{}", stdout(&text));
    // A run that was cut short by the bad row is not a complete one.
    let stop = lines.iter().position(|line| line.contains("integrate")).ok_or("no run")? + 100;
    let mut cut = lines.get(..stop).unwrap_or_default().to_vec();
    cut.push("x".to_owned());
    let document = json(&replay("cut", &joined(&cut), &["--json"])?)?;
    assert_eq!(document["runs"], Value::Array(Vec::new()));
    Ok(())
}

#[test]
fn a_missing_file_is_named() -> Checked {
    let setup = root("examples/setups/hatchery.toml");
    let output = Command::new(program()).args(["no_such.csv", "--json", "--setup"]).arg(setup).output()?;
    assert_eq!(output.status.code(), REFUSED);
    assert!(stderr(&output).contains("no_such.csv"), "{}", stderr(&output));
    assert_eq!(json(&output)?["runs"], Value::Array(Vec::new()));
    let trace = root("tests/traces/hatchery.csv");
    let output = Command::new(program()).arg(trace).args(["--setup", "no_such.toml"]).output()?;
    assert_eq!(output.status.code(), REFUSED);
    assert!(stderr(&output).contains("no_such.toml"), "{}", stderr(&output));
    Ok(())
}

#[test]
fn a_bad_set_up_names_the_key_and_what_is_allowed() -> Checked {
    let setup = std::fs::read_to_string(root("examples/setups/hatchery.toml"))?;
    let trace = root("tests/traces/hatchery.csv");
    let cases: [(&str, &str, &[&str]); 17] = [
        ("capacitance_f = 470e-9", "", &["[circuit]", "capacitance_f", "missing", "farad"]),
        ("capacitance_f = 470e-9", "capacitence_f = 1", &["capacitence_f", "unknown", "capacitance_f"]),
        ("capacitance_f = 470e-9", "capacitance_f = 2.5", &["[circuit]", "capacitance_f", "2.5", "at most 1"]),
        ("capacitance_f = 470e-9", "capacitance_f = nan", &["[circuit]", "capacitance_f", "nan", "above 0"]),
        ("capacitance_f = 470e-9", "capacitance_f = \"big\"", &["capacitance_f", "big", "a number", "farad"]),
        ("source_resistance_ohm = 5e9", "", &["source_resistance_ohm", "missing", "current"]),
        ("source_resistance_ohm = 5e9", "input_resistance_ohm = 1e5", &["[scale]", "responsivity_a_per_w", "charge"]),
        ("inverting = true", "leak_time_constant_s = 0.0", &["[circuit]", "leak_time_constant_s", "0.0", "above 0"]),
        (
            "inverting = true",
            "soakage = [{ share = 0.6, time_constant_s = 1.0 }]",
            &["[circuit]", "soakage", "0 to 0.5"],
        ),
        ("inverting = true", "soakage = [{ part = 0.1, time_constant_s = 1.0 }]", &["soakage", "part", "share"]),
        (
            "code_max = 65535",
            "code_max = 65535\nnonlinearity = [[0, 0.0]]",
            &["[converter]", "nonlinearity", "2 to 33"],
        ),
        ("area_u_rel = 0.02", "", &["[scale]", "area_u_rel", "missing"]),
        ("area_m2 = 1e-7", "area_m2 = 0", &["[scale]", "area_m2", "above 0"]),
        ("gain_u_rel = 0.0", "gain_u_rel = 1.5", &["[scale]", "gain_u_rel", "1.5", "0 to 1"]),
        ("edge_samples = 16", "edge_samples = 17", &["[policy]", "edge_samples", "17", "2 to 16"]),
        ("edge_samples = 16", "edge_samples = -1", &["[policy]", "edge_samples", "-1", "whole number"]),
        ("code_max = 65535", "", &["[converter]", "code_max", "missing"]),
    ];
    for (index, (key, instead, parts)) in cases.into_iter().enumerate() {
        assert!(setup.contains(key), "the set-up has no {key}");
        let path = folder(&format!("setup_{index}"))?.join("board.toml");
        std::fs::write(&path, setup.replace(key, instead))?;
        let output = Command::new(program()).arg(&trace).arg("--setup").arg(&path).output()?;
        assert_eq!(output.status.code(), REFUSED, "{instead}");
        let message = stderr(&output);
        for part in parts.iter().chain(&["board.toml"]) {
            assert!(message.contains(part), "{key} -> {instead}: \"{part}\" is missing in: {message}");
        }
    }
    Ok(())
}

#[test]
fn wrong_arguments_are_refused_before_any_work() -> Checked {
    for arguments in
        [&["--plot", "picture.pdf"] as &[&str], &["--plot", "no_such_folder/picture.svg"], &["trace.csv"], &["--loud"]]
    {
        let output = run(arguments)?;
        assert_eq!(output.status.code(), REFUSED, "{arguments:?}");
        assert!(output.stdout.is_empty(), "{arguments:?}");
    }
    Ok(())
}
