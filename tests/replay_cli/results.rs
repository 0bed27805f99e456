//! What comes out: values, uncertainties, and what belongs to which run.

use super::*;

/// Span of the tick counter.
const WRAP: f64 = 4_294_967_296.0;

#[test]
fn json_holds_the_truth_of_each_trace_within_three_u() -> Checked {
    for name in ["hatchery", "dim_lamp", "wandering_offset", "search_coil", "tick_wrap"] {
        let truth: Value =
            serde_json::from_str(&std::fs::read_to_string(root(&format!("tests/traces/{name}.truth.json")))?)?;
        let integral = number(&truth, "/truth/runs/0/integral")?;
        let output = replay_bundled(name, &["--json"])?;
        assert!(output.status.success(), "{name}: {}", stderr(&output));
        let document = json(&output)?;
        assert_eq!(document["runs"].as_array().map(Vec::len), Some(1), "{name}");
        for estimate in ["at_stop", "closed"] {
            let value = number(&document, &format!("/runs/0/{estimate}/value"))?;
            let u = number(&document, &format!("/runs/0/{estimate}/u"))?;
            assert!((value - integral).abs() <= 3.0 * u, "{name}, {estimate}: {value} ({u}), truth {integral}");
        }
        let run = &document["runs"][0];
        assert_eq!(run["trust"], "good", "{name}");
        for tick in ["start_tick", "end_tick"] {
            // One trace has jitter: its rows are up to a quarter of their distance, 2,500 ticks, beside the instant.
            let off = number(run, &format!("/{tick}"))? - number(&truth, &format!("/truth/runs/0/{tick}"))?;
            let off = off.rem_euclid(WRAP).min((-off).rem_euclid(WRAP));
            assert!(off < if name == "tick_wrap" { 2500.0 } else { 0.5 }, "{name}, {tick}: {off}");
        }
        assert_eq!(run["resets"].as_u64(), truth["truth"]["resets"].as_array().map(|r| r.len() as u64), "{name}");
        let flux = name == "wandering_offset" || name == "search_coil";
        assert_eq!(run["unit"], if flux { "V s" } else { "C" }, "{name}");
    }
    Ok(())
}

#[test]
fn the_parts_of_the_json_add_up() -> Checked {
    let document = json(&run(&["--json"])?)?;
    let u = number(&document, "/runs/0/closed/u")?;
    let parts = ["readout", "input_noise", "drift", "dead_time", "leak_and_soakage", "scale"];
    let variance =
        parts.iter().map(|part| number(&document, &format!("/runs/0/variance/{part}"))).sum::<Result<f64, _>>()?;
    assert!((variance / (u * u) - 1.0).abs() < 1e-5, "{variance} is not {u} squared");
    let closed = number(&document, "/runs/0/closed/value")?;
    let both = number(&document, "/runs/0/measured")? + number(&document, "/runs/0/interpolated")?;
    assert!((both / closed - 1.0).abs() < 1e-9, "{both} is not {closed}");
    let kinds: Vec<_> = document["notices"].as_array().into_iter().flatten().map(|n| n["kind"].clone()).collect();
    assert_eq!(
        kinds,
        [
            "run_started",
            "reset_closed",
            "reset_opened",
            "reset_closed",
            "reset_opened",
            "reset_closed",
            "reset_opened",
            "run_stopped"
        ]
    );
    Ok(())
}

#[test]
fn what_drift_would_have_added_is_stated() -> Checked {
    let document = json(&run(&["--json"])?)?;
    let removed = number(&document, "/runs/0/drift_removed")?;
    let truth: Value = serde_json::from_str(&std::fs::read_to_string(root("tests/traces/hatchery.truth.json"))?)?;
    // Drift times duration over the gain, -1/C: the drift of this trace is constant.
    let expected = number(&truth, "/truth/final_drift_v_per_s")?
        * number(&document, "/runs/0/elapsed_s")?
        * -number(&truth, "/plant/c_f")?;
    let u = number(&document, "/runs/0/at_stop/u")?;
    assert!((removed - expected).abs() <= 3.0 * u, "{removed}, truth {expected}, u {u}");
    let uncorrected = 1e6 * (number(&document, "/runs/0/at_stop/value")? + removed);
    let text = stdout(&run(&[])?);
    let line = text.lines().find(|line| line.contains("without drift correction")).unwrap_or("");
    assert!(line.contains(&format!("{uncorrected:.5} µC, off by 1.2 nC: 11 times U")), "{line}");
    Ok(())
}

#[test]
fn radiant_exposure_follows_from_charge_responsivity_and_area() -> Checked {
    let document = json(&run(&["--json"])?)?;
    let (charge, u) = (number(&document, "/runs/0/closed/value")?, number(&document, "/runs/0/closed/u")?);
    // Figures of examples/setups/hatchery.toml.
    let exposure = charge / (0.13 * 1e-7);
    let relative = ((u / charge).powi(2) + 0.05_f64.powi(2) + 0.02_f64.powi(2)).sqrt();
    let (value, value_u) =
        (number(&document, "/runs/0/radiant_exposure/value")?, number(&document, "/runs/0/radiant_exposure/u")?);
    assert!((value / exposure - 1.0).abs() < 1e-12, "{value}, expected {exposure}");
    assert!((value_u / (exposure * relative) - 1.0).abs() < 1e-9, "{value_u}, expected {}", exposure * relative);
    let text = stdout(&run(&[])?);
    assert!(text.contains("(263 ± 28) J/m^2 = (26.3 ± 2.8) mJ/cm^2"), "{text}");
    // A voltage input has no such scale, and no caution about it.
    let text = stdout(&replay_bundled("search_coil", &[])?);
    assert!(!text.contains("J/m^2") && !text.contains("Caution"), "{text}");
    Ok(())
}

#[test]
fn a_stuck_switch_is_named_to_programs_and_people() -> Checked {
    let document = json(&replay_bundled("stuck_switch", &["--json"])?)?;
    assert_eq!(document["runs"][0]["trust"], "invalid");
    let reasons = document["runs"][0]["reasons"].as_array().cloned().unwrap_or_default();
    assert!(reasons.contains(&Value::from("reset_not_arrived")), "{reasons:?}");
    let notices = document["notices"].as_array().cloned().unwrap_or_default();
    assert!(notices.iter().any(|n| n["kind"] == "fault" && n["reason"] == "reset_not_arrived"), "{notices:?}");
    let text = stdout(&replay_bundled("stuck_switch", &[])?);
    assert!(text.contains("INVALID") && text.contains("check the reset switch"), "{text}");
    Ok(())
}

#[test]
fn at_stop_knows_nothing_of_the_zero_that_follows() -> Checked {
    let whole = json(&run(&["--json"])?)?;
    let lines = hatchery()?;
    let stop = lines.iter().rposition(|line| line.contains("integrate")).ok_or("no run")?;
    let cut = replay("mid_run", &joined(lines.get(..=stop).unwrap_or_default()), &["--json"])?;
    assert!(cut.status.success(), "{}", stderr(&cut));
    let cut = json(&cut)?;
    assert_eq!(cut["runs"][0]["closed"], Value::Null);
    assert_eq!(cut["runs"][0]["at_stop"], whole["runs"][0]["at_stop"]);
    Ok(())
}

#[test]
fn a_run_is_closed_by_the_whole_zero_after_it_and_by_nothing_more() -> Checked {
    let whole = json(&run(&["--json"])?)?;
    // The same trace again: its first rows, a reset, end the zero.
    let mut lines = hatchery()?;
    let again: Vec<String> = lines
        .iter()
        .skip(1)
        .filter_map(|line| {
            let (tick, rest) = line.split_once(',')?;
            Some(format!("{},{rest}", tick.parse::<u32>().ok()? + 40_050_000))
        })
        .collect();
    lines.extend(again);
    let twice = json(&replay("twice", &joined(&lines), &["--json"])?)?;
    assert_eq!(twice["runs"].as_array().map(Vec::len), Some(2));
    assert_eq!(twice["runs"][0], whole["runs"][0]);
    // The second run knows the drift better: its zero is not the first.
    assert!(number(&twice, "/runs/1/at_stop/u")? < number(&whole, "/runs/0/at_stop/u")?);
    Ok(())
}
