//! A reset level that lies between two codes.

use brimline::{Circuit, Converter, Setup, Trust};

use crate::script::{CONVERTER, NOISE, Script};
use crate::{PLAIN, STILL, counts};

/// Levels above the reset level are whole counts, and the part of a count that this leaves seems to leak: 0.4 counts in
/// every half second. Without input, and with nothing that drifts, a zero learns it as drift.
#[test]
fn a_reset_level_between_two_codes_leaks_nothing() {
    let circuit = Circuit { leak_time_constant_s: Some(0.5), ..STILL };
    for beside in [0.4, -0.4, 0.6, 0.0] {
        let converter = Converter { code_zero_v: -beside * CONVERTER.lsb_v, ..CONVERTER };
        let setup = Setup::new(circuit, converter, NOISE, PLAIN);
        let mut script = Script::new(&setup);
        (script.drift, script.level) = (0.0, beside);
        script.reset(20, beside).zero(500).integrate(10_000, 0.0);
        let reading = script.reading();
        let integral = reading.at_stop.integral;
        assert_eq!(reading.trust, Trust::Good, "{beside}: {:?}", script.notices);
        let (moved, u) = (counts(integral.value), counts(integral.u).abs());
        assert!(moved.abs() < 4.0 * u, "{beside}: {moved} counts, u {u}");
    }
}
