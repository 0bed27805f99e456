//! The keys of a set-up file: how they are read, and what each may hold.

use serde::Deserialize;

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct SetupFile {
    pub(crate) circuit: CircuitKeys,
    pub(crate) converter: ConverterKeys,
    pub(crate) noise: NoiseKeys,
    #[serde(default)]
    pub(crate) scale: ScaleKeys,
    #[serde(default)]
    pub(crate) policy: PolicyKeys,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct CircuitKeys {
    pub(crate) capacitance_f: f64,
    pub(crate) input_resistance_ohm: Option<f64>,
    pub(crate) inverting: Option<bool>,
    pub(crate) reset_level_v: Option<f64>,
    pub(crate) rail_low_v: f64,
    pub(crate) rail_high_v: f64,
    pub(crate) offset_limit_v: f64,
    pub(crate) bias_limit_a: f64,
    pub(crate) source_resistance_ohm: Option<f64>,
    pub(crate) leak_time_constant_s: Option<f64>,
    #[serde(default)]
    pub(crate) soakage: Vec<BranchKeys>,
    pub(crate) leak_u_rel: Option<f64>,
    pub(crate) soakage_u_rel: Option<f64>,
    pub(crate) pedestal_v: Option<f64>,
    pub(crate) pedestal_u_v: Option<f64>,
    pub(crate) switch_resistance_ohm: Option<f64>,
    pub(crate) slew_v_per_s: Option<f64>,
    pub(crate) offset_tempco_v_per_k: Option<f64>,
    pub(crate) bias_doubling_k: Option<f64>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct BranchKeys {
    pub(crate) share: f64,
    pub(crate) time_constant_s: f64,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct ConverterKeys {
    pub(crate) code_zero_v: f64,
    pub(crate) lsb_v: f64,
    pub(crate) code_min: i32,
    pub(crate) code_max: i32,
    pub(crate) tick_hz: f64,
    pub(crate) code_zero_u_v: Option<f64>,
    pub(crate) lsb_u_rel: Option<f64>,
    pub(crate) linearity_u_counts: Option<f64>,
    #[serde(default)]
    pub(crate) nonlinearity: Vec<(i32, f64)>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct NoiseKeys {
    pub(crate) readout_counts: f64,
    pub(crate) input_density: f64,
    pub(crate) offset_wander: Option<f64>,
    pub(crate) input_flicker: Option<f64>,
}

#[derive(Default, Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct ScaleKeys {
    pub(crate) responsivity_a_per_w: Option<f64>,
    pub(crate) responsivity_u_rel: Option<f64>,
    pub(crate) area_m2: Option<f64>,
    pub(crate) area_u_rel: Option<f64>,
    pub(crate) gain_u_rel: Option<f64>,
}

#[derive(Default, Deserialize)]
#[serde(deny_unknown_fields)]
pub(crate) struct PolicyKeys {
    pub(crate) zero_block_s: Option<f64>,
    pub(crate) false_alarm_s: Option<f64>,
    pub(crate) edge_samples: Option<u8>,
    pub(crate) gap_limit_s: Option<f64>,
    pub(crate) frozen_samples: Option<u16>,
    pub(crate) worst_input: Option<f64>,
    pub(crate) input_slew: Option<f64>,
    pub(crate) latency_s: Option<f64>,
    pub(crate) guard_sigma: Option<f64>,
    pub(crate) settling_s: Option<f64>,
    pub(crate) reset_attempts: Option<u8>,
    pub(crate) arrival_tolerance_v: Option<f64>,
}

/// Every key: its section, and what it may hold. Where the library checks a range its own words are shown instead.
const KEYS: &[(&str, &str, &str)] = &[
    ("circuit", "capacitance_f", "the integrating capacitance in farad, above 0 and at most 1"),
    (
        "circuit",
        "input_resistance_ohm",
        "the input resistor in ohm, above 0 and at most 1e15; absent for a current input",
    ),
    ("circuit", "inverting", "true or false (default true)"),
    ("circuit", "reset_level_v", "a voltage within the rails, V (default 0)"),
    ("circuit", "rail_low_v", "the lowest linear output voltage, V"),
    ("circuit", "rail_high_v", "the highest linear output voltage, V"),
    ("circuit", "offset_limit_v", "the data sheet's limit of the offset voltage in volt, 0 to 1"),
    ("circuit", "bias_limit_a", "the data sheet's limit of the bias current in ampere, 0 to 1"),
    ("circuit", "source_resistance_ohm", "the resistance of the source in ohm, above 0 and at most 1e18"),
    (
        "circuit",
        "offset_tempco_v_per_k",
        "the data sheet's limit of the offset's change with temperature, V/K, above 0",
    ),
    (
        "circuit",
        "bias_doubling_k",
        "kelvin for a doubling of the bias current, 5 to 20; not beside offset_tempco_v_per_k",
    ),
    (
        "circuit",
        "leak_time_constant_s",
        "the time constant of a leak across the capacitor in second, above 0; absent if it does not leak",
    ),
    ("circuit", "leak_u_rel", "the time constant's relative standard uncertainty, 0 to 1 (default 0)"),
    (
        "circuit",
        "soakage",
        "a list of at most 4 branches { share = 0 to 0.5, time_constant_s = above 0 }; absent if there are none",
    ),
    ("circuit", "soakage_u_rel", "the soakage's relative standard uncertainty, 0 to 1 (default 0)"),
    ("circuit", "pedestal_v", "a voltage within -1 and 1, V (default 0)"),
    ("circuit", "pedestal_u_v", "a voltage from 0 to 1, V; absent if unknown"),
    ("circuit", "switch_resistance_ohm", "a resistance from 0 to 1e6, ohm (default 100)"),
    ("circuit", "slew_v_per_s", "the slew rate of the output during a reset, V/s, above 0; absent if fast enough"),
    ("converter", "code_zero_v", "the output voltage at code 0, V"),
    ("converter", "lsb_v", "volts per code, above 0"),
    ("converter", "code_min", "the lowest code, a whole number within -2^29 and 2^29"),
    ("converter", "code_max", "the highest code, a whole number above code_min and at most 2^29"),
    ("converter", "tick_hz", "the rate of the tick counter in hertz, 1 to 4e9"),
    ("converter", "code_zero_u_v", "the standard uncertainty of code_zero_v, V, 0 to 1e6 (default 0)"),
    ("converter", "lsb_u_rel", "the relative standard uncertainty of lsb_v, 0 to 1 (default 0)"),
    (
        "converter",
        "nonlinearity",
        "a list of 2 to 33 points [code, error in counts] with rising codes; absent if the converter is straight enough",
    ),
    (
        "converter",
        "linearity_u_counts",
        "the non-linearity that the table leaves, rms counts, 0 to 1e4 (default 0: not part of the uncertainty)",
    ),
    ("noise", "readout_counts", "the noise of one sample in rms counts, 0 to 1e6"),
    ("noise", "input_density", "the input's white noise, A (or V) per square root of hertz, 0 to 1"),
    ("noise", "input_flicker", "the input's 1/f noise at 1 Hz, A (or V) per square root of hertz, 0 to 1 (default 0)"),
    ("noise", "offset_wander", "the offset's random walk, A (or V) per square root of second, 0 to 1 (default 0)"),
    ("scale", "responsivity_a_per_w", "the detector's responsivity in A/W, above 0"),
    ("scale", "responsivity_u_rel", "the responsivity's relative standard uncertainty, 0 to 1"),
    ("scale", "area_m2", "the detector's aperture in square metre, above 0"),
    ("scale", "area_u_rel", "the aperture's relative standard uncertainty, 0 to 1"),
    ("scale", "gain_u_rel", "the gain's relative standard uncertainty, 0 to 1 (default 0)"),
    ("policy", "zero_block_s", "how long zero samples are averaged, s, 0 to 60 (default 0.1)"),
    ("policy", "false_alarm_s", "mean time between false alarms of the watch for input in a zero, s, 1 to 1e12"),
    ("policy", "edge_samples", "a whole number from 2 to 16 (default 16)"),
    ("policy", "gap_limit_s", "a time above 0 and below 2^31 / tick_hz, s (default 1)"),
    ("policy", "frozen_samples", "a whole number from 0 to 65535 (default 64)"),
    ("policy", "worst_input", "the largest input by design, A (or V), above 0; absent if unknown"),
    ("policy", "input_slew", "the fastest change of the input by design, A/s (or V/s), 0 or more; absent if unknown"),
    ("policy", "latency_s", "a time from 0 to 3600, s (default 0)"),
    ("policy", "guard_sigma", "a number from 0 to 100 (default 4)"),
    ("policy", "settling_s", "a time from 0 to 3600, s (default 0.001)"),
    ("policy", "reset_attempts", "a whole number from 1 to 255 (default 3)"),
    ("policy", "arrival_tolerance_v", "a voltage above 0, V (default one hundredth of the usable span)"),
];

/// The section that `key` belongs to and what it may hold.
pub(crate) fn about(key: &str) -> Option<(&'static str, &'static str)> {
    KEYS.iter().find(|(_, known, _)| *known == key).map(|&(section, _, allowed)| (section, allowed))
}
