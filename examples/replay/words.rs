//! Events, reasons and parts of the budget in words that tell what to do.

use brimline::{Event, Reason, Trust};

use crate::replay::Figure;

/// A part of the uncertainty: its standard uncertainty, its name, and what makes it smaller.
pub(crate) struct Part {
    pub(crate) u: f64,
    pub(crate) name: &'static str,
    pub(crate) remedy: &'static str,
}

/// The parts of `figure`, largest first.
pub(crate) fn budget(figure: &Figure) -> Vec<Part> {
    let mut parts = vec![
        Part {
            u: figure.readout,
            name: "readout noise",
            remedy: "take more samples in the zeros, or a quieter converter",
        },
        Part {
            u: figure.input_noise,
            name: "noise of the input",
            remedy: "a shorter run, or a quieter source and amplifier",
        },
        Part { u: figure.drift, name: "drift", remedy: "longer zeros before and after the run, or a shorter run" },
        Part {
            u: figure.dead_time,
            name: "dead time at resets",
            remedy: "fewer resets, or faster sampling beside them",
        },
        Part {
            u: figure.leak_and_soakage,
            name: "leak and soakage",
            remedy: "measure their time constants and shares on this very board",
        },
        Part { u: figure.scale, name: "gain", remedy: "calibrate the gain against a known input" },
    ];
    parts.sort_by(|a, b| b.u.total_cmp(&a.u));
    parts
}

/// The name that programs see.
pub(crate) fn trust_name(trust: Trust) -> &'static str {
    match trust {
        Trust::Good => "good",
        Trust::LowerBound => "lower_bound",
        Trust::Invalid => "invalid",
    }
}

/// What a degree of trust means.
pub(crate) fn trust(trust: Trust) -> &'static str {
    match trust {
        Trust::Good => "good: value and uncertainty hold",
        Trust::LowerBound => "LOWER BOUND: for an input of one sign the true value is at least this large",
        Trust::Invalid => "INVALID: the value means nothing, do not use it",
    }
}

/// What happened, and what to do about it.
pub(crate) fn reason(reason: Reason) -> (&'static str, &'static str) {
    match reason {
        Reason::AtRail => (
            "the level was at a rail or the converter at an end code, and input went unseen",
            "reset sooner (worst_input, latency_s), or take a larger capacitor",
        ),
        Reason::Gap => (
            "samples are missing for longer than gap_limit_s, and input may have gone unseen",
            "look for lost samples; raise gap_limit_s only if the level cannot have been reset in such a time",
        ),
        Reason::Jump => (
            "the level moved faster than worst_input (without it: than a quarter of the range in a sample) allows",
            "look for a reset that no row shows, a disturbance, or a worst_input that is too small",
        ),
        Reason::DeadTime => (
            "the input during a reset is a guess: too few samples beside it, or the switch was closed too long",
            "sample faster, leave more time between resets, or close the switch for less than gap_limit_s",
        ),
        Reason::ResetNotArrived => (
            "after a reset the level was not at the reset level",
            "check the reset switch and its drive, and whether settling_s and the time it stays closed suffice",
        ),
        Reason::Frozen => (
            "the readings stood still although noise should move them",
            "check converter, reference and wiring; lower readout_counts if the channel really is that quiet",
        ),
        Reason::DriftOutsideLimits => (
            "the drift is larger than offset voltage and bias current within their limits can cause",
            "look for leakage, a wrong amplifier, light on the detector during the zero, or limits set too tight",
        ),
        Reason::ClockStalled => {
            ("the counter stood still or ran backwards", "check the timer and the order in which samples are handed on")
        }
        Reason::InputInZero => (
            "the level moved during a zero as if there were input, or the drift changed",
            "look for light or leakage during the zero; if the drift does wander, give offset_wander",
        ),
        Reason::Inconsistent => (
            "the zero after the run contradicts what was known when it stopped",
            "look for a reset or disturbance that no row shows, and check the noise figures",
        ),
        Reason::DroopOutsideLimits => (
            "the droop while the input was open is larger than the bias current within its limit can cause",
            "look for a leaking input or reset switch, a dirty board, or a limit set too tight",
        ),
        Reason::SwitchStuckClosed => (
            "after a reset the level stayed at the reset level although drift, noise or pedestal should have moved it",
            "check whether the reset switch opens, and its drive",
        ),
        Reason::OutOfRange => {
            ("the run came to more movement than its books hold", "end runs with a zero now and then")
        }
        Reason::SwitchFailed => (
            "as many resets in a row as reset_attempts allows have failed, and the switch was given up",
            "replace the reset switch or repair its drive; what was measured since cannot be saved",
        ),
        _ => ("the library gives a reason that this program does not know", "update this program"),
    }
}

/// The name that programs see.
pub(crate) fn event_name(event: Event) -> &'static str {
    match event {
        Event::RunStarted => "run_started",
        Event::RunStopped => "run_stopped",
        Event::ResetClosed => "reset_closed",
        Event::ResetOpened => "reset_opened",
        Event::ResetDue => "reset_due",
        Event::ResetFailed { .. } => "reset_failed",
        Event::SettlingSlow { .. } => "settling_slow",
        Event::Decay { .. } => "decay",
        Event::Spike => "spike",
        Event::InputInZero => "input_in_zero",
        Event::ReadoutNoise { .. } => "readout_noise",
        Event::NoiseFigures { .. } => "noise_figures",
        Event::DriftWander { .. } => "drift_wander",
        Event::Fault(_) => "fault",
        _ => "other",
    }
}

/// What happened, for a person.
pub(crate) fn event(event: Event) -> String {
    match event {
        Event::RunStarted => "run started".to_owned(),
        Event::RunStopped => "run stopped".to_owned(),
        Event::ResetClosed => "reset switch closed".to_owned(),
        Event::ResetOpened => "reset switch opened".to_owned(),
        Event::ResetDue => "reset due: the level could reach a rail before the next sample".to_owned(),
        Event::ResetFailed { in_a_row } => format!("a reset failed, {in_a_row} in a row"),
        Event::SettlingSlow { percent } => {
            format!("the reset settled with {percent} % of the time constant of switch and capacitor")
        }
        Event::Decay { time_constant_s } => format!(
            "the drift changed from the zero before as a level does that decays in about {time_constant_s} s: the reset \
             switch or the board may leak"
        ),
        Event::Spike => "a sample too far off for noise was left out".to_owned(),
        Event::InputInZero => "input began during a zero".to_owned(),
        Event::ReadoutNoise { stated_centicounts, observed_centicounts } => format!(
            "single samples scatter by {:.2} counts rms, not {:.2} as readout_counts and rounding say",
            f64::from(observed_centicounts) / 100.0,
            f64::from(stated_centicounts) / 100.0
        ),
        Event::NoiseFigures { percent } => {
            format!("the zeros scatter by {percent} % of what the set-up's noise figures say")
        }
        Event::DriftWander { percent } => {
            format!("the drifts of the zeros differ by {percent} % of what the set-up's noise figures allow")
        }
        Event::Fault(cause) => format!("FAULT {}: {}", cause.name(), reason(cause).0),
        _ => "something that this program does not know".to_owned(),
    }
}
