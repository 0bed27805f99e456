//! What is left out, and why: all of it is here.

use brimline::{Circuit, SoakageBranch};

use crate::board::Parts;

/// A bug that is open, for the boards of stories: where integrated input noise scatters more within a block of a zero
/// than the readout does, what chance leaves of the difference is taken for the readout's noise. It goes with its mend.
pub fn tame_open(parts: &mut Parts) {
    let Parts { circuit, converter, noise, policy } = parts;
    let most = noise.readout_counts.max(0.3) * converter.lsb_v / circuit.gain().abs() / policy.zero_block_s.sqrt();
    noise.input_density = noise.input_density.min(most);
}

/// Limits of the model, which the documentation states: what the samples cannot show is not asked for.
pub fn tame(parts: &mut Parts, sample_s: f64, speed: f64) {
    let per_count = parts.input_per_count();
    let Parts { circuit, converter, noise, policy } = parts;
    // A counter that does not resolve a sample tells nothing of time.
    converter.tick_hz = converter.tick_hz.max(1e4);
    // The simulated converter is straight.
    converter.linearity = None;
    // Between two samples the level is a straight piece, to the leak one that bends with it: time constants span a few.
    circuit.leak_time_constant_s = circuit.leak_time_constant_s.map(|tau| tau.max(8.0 * sample_s));
    for branch in &mut circuit.soakage {
        *branch = SoakageBranch {
            share: branch.share.min(0.02),
            time_constant_s: branch.time_constant_s.max(8.0 * sample_s),
        };
    }
    // To the dielectric the level after a reset moves in a straight line, a pedestal included: a large one is taken for
    // a ramp over one sample.
    if has_branches(circuit) {
        (circuit.pedestal_v, circuit.pedestal_u_v) = (0.0, None);
    }
    // Noise lifts no level off the end of the range where the amplifier has saturated.
    let codes = f64::from(converter.code_max) - f64::from(converter.code_min);
    noise.readout_counts = noise.readout_counts.min(0.002 * codes);
    // A fast switch: 50 of its time constants in a sample.
    circuit.switch_resistance_ohm = circuit.switch_resistance_ohm.min(0.02 * sample_s / circuit.capacitance_f);
    circuit.slew_v_per_s = None;
    // Flicker is not simulated.
    noise.input_flicker = 0.0;
    policy.gap_limit_s = policy.gap_limit_s.max(40.0 * sample_s).min(2e9 / converter.tick_hz);
    policy.zero_block_s = policy.zero_block_s.min(2e9 / converter.tick_hz);
    // Inputs stay within the worst that the design allows.
    policy.worst_input = policy.worst_input.map(|_| 2.0 * speed * per_count / sample_s);
    policy.input_slew = None;
    // The instant of a sample is known to a tick: what drifts in one is to be less than noise.
    let drift = circuit.drift_limit_v_per_s() / converter.lsb_v / (noise.readout_counts + 0.3);
    let slower = (0.02 * converter.tick_hz / drift).min(1.0);
    circuit.offset_limit_v *= slower;
    circuit.bias_limit_a *= slower;
}

/// Whether the dielectric has branches. Then some things are not done to a board:
///
/// - Silence: the level in it need not have moved in a straight line, and a branch that is faster remembers the end.
/// - A counter that stands or starts anew: nobody knows for how long the dielectric was at which level.
/// - A reset switch that does not close: near the reset level that is within the arrival tolerance, and the books have
///   the dielectric at the reset level.
/// - A level past a rail: nobody knows how far, and the dielectric remembers. There the story ends.
/// - A false end code in a run: it is what a saturated amplifier gives.
/// - A false end code as the last sample before a reset: what soaks meanwhile follows from the samples on both sides.
pub fn soaks(parts: &Parts) -> bool {
    has_branches(&parts.circuit)
}

fn has_branches(circuit: &Circuit) -> bool {
    circuit.soakage.iter().any(|branch| branch.share > 0.0)
}
