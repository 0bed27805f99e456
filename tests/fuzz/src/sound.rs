//! What holds for every reading, whatever was fed.

use brimline::{Estimate, Reading, Reason, Trust};

use crate::board::Plain;

/// Signed figures of a reading, and those without sign.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Figures {
    pub signed: [f64; 6],
    pub unsigned: [f64; 18],
    pub whole: [i64; 6],
}

fn estimate_figures<Q: Plain>(estimate: Option<&Estimate<Q>>) -> (f64, [f64; 7]) {
    estimate.map_or((0.0, [0.0; 7]), |e| {
        let b = &e.budget;
        let unsigned = [e.integral.u, b.readout, b.input_noise, b.drift, b.dead_time, b.leak_and_soakage, b.scale];
        (e.integral.value.plain(), unsigned.map(Q::plain))
    })
}

/// All figures but the ticks.
pub fn figures<Q: Plain>(r: &Reading<Q>) -> Figures {
    let (at_stop, stop_parts) = estimate_figures(Some(&r.at_stop));
    let (closed, closed_parts) = estimate_figures(r.closed.as_ref());
    let mut unsigned = [0.0; 18];
    unsigned[..7].copy_from_slice(&stop_parts);
    unsigned[7..14].copy_from_slice(&closed_parts);
    unsigned[14..16].copy_from_slice(&[r.elapsed_s, r.held_s]);
    let reasons: i64 = r.reasons.iter().map(|reason| 1 << reason as i64).sum();
    Figures {
        signed: [
            at_stop,
            closed,
            r.measured.plain(),
            r.interpolated.plain(),
            r.restored.plain(),
            r.drift_removed.plain(),
        ],
        unsigned,
        whole: [
            i64::from(r.resets),
            i64::from(r.spikes),
            reasons,
            r.warming_mk.map_or(i64::MAX, i64::from),
            i64::from(r.noise_tested),
            i64::from(r.closed.is_some()),
        ],
    }
}

impl Figures {
    /// The same run on the same board with the other sign of the input.
    pub fn mirrored(mut self) -> Self {
        self.signed = self.signed.map(|x| -x);
        self
    }

    /// Bit for bit; 0 has no sign.
    pub fn assert_same(&self, other: &Self, what: &str) {
        let bits = |figures: &Self| {
            let plain = |x: f64| if x == 0.0 { 0 } else { x.to_bits() };
            (figures.signed.map(plain), figures.unsigned.map(plain), figures.whole)
        };
        assert!(bits(self) == bits(other), "{what}:\n{self:?}\n{other:?}");
    }
}

/// Checks all that a reading promises by itself.
pub fn assert_sound<Q: Plain>(r: &Reading<Q>) {
    assert_eq!(r.trust == Trust::Good, r.reasons.is_empty(), "{r:?}");
    let invalid = r
        .reasons
        .iter()
        .any(|reason| !matches!(reason, Reason::AtRail | Reason::Gap | Reason::DeadTime | Reason::InputInZero));
    assert_eq!(r.trust == Trust::Invalid, invalid, "{r:?}");
    for e in [Some(&r.at_stop), r.closed.as_ref()].into_iter().flatten() {
        assert_estimate(e, r);
    }
    let latest = r.latest().integral.value.plain();
    assert!(r.closed.map_or(r.at_stop, |closed| closed).integral.value.plain() == latest, "{r:?}");
    let (measured, interpolated) = (r.measured.plain(), r.interpolated.plain());
    if !r.reasons.contains(Reason::OutOfRange) {
        let rounding = 4.0 * f64::EPSILON * (measured.abs() + interpolated.abs());
        assert!((measured + interpolated - latest).abs() <= rounding, "parts are not the whole: {r:?}");
    }
    for part in [measured, interpolated, r.restored.plain(), r.drift_removed.plain(), r.elapsed_s] {
        assert!(part.is_finite(), "{r:?}");
    }
    assert!(r.held_s >= 0.0 && r.held_s <= r.elapsed_s, "{r:?}");
}

fn assert_estimate<Q: Plain>(e: &Estimate<Q>, r: &Reading<Q>) {
    let (value, [u, parts @ ..]) = estimate_figures(Some(e));
    assert!(value.is_finite(), "{r:?}");
    // Nothing known is an infinite uncertainty, but not a number is none, and no measurement is exact.
    assert!(u > 0.0, "{r:?}");
    if r.trust == Trust::Good {
        assert!(u.is_finite(), "{r:?}");
    }
    assert!(parts.iter().all(|part| *part >= 0.0), "{r:?}");
    if u.is_finite() {
        let squares: f64 = parts.iter().map(|part| part * part).sum();
        assert!((squares / (u * u) - 1.0).abs() < 1e-5, "the budget is not the whole: {r:?}");
    }
}
