//! What a capacitor's dielectric keeps.

/// Most branches that a set-up can describe.
pub(crate) const SOAKAGE_BRANCHES: usize = 4;

/// One branch of a soaking capacitor: a resistor and a small capacitor in series, across the main one
/// (Dow 1958, IRE Trans. Electronic Computers EC-7, from memory).
///
/// Figures come from a recovery test of the very part, or from its data sheet for an order of magnitude.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct SoakageBranch {
    /// The branch's capacitance over the main one: 0 (no branch) to 0.5.
    pub share: f64,
    /// The branch's resistance times its capacitance, s: above 0, 1 to 1e15 ticks of the counter.
    pub time_constant_s: f64,
}

impl SoakageBranch {
    /// No branch.
    pub const NONE: Self = Self { share: 0.0, time_constant_s: 1.0 };
}

/// Soakage of a capacitor of which only one figure is known: the part of a voltage step that comes back in each tenfold
/// of time, 0 to 1.
///
/// With it nothing is corrected; it tells how long to wait after a reset. Data sheets often print the recovery after a
/// test of fixed times (IEC 60384-1, MIL-C-19978) instead: a figure of the same order.
///
/// ```
/// use brimline::Absorption;
///
/// // 0.1 % a decade, reset from 2 V: how long until it creeps by less than 10 uV/s?
/// let polypropylene = Absorption { per_decade: 0.001 };
/// assert!((polypropylene.wait_s(2.0, 10e-6) - 87.0).abs() < 0.5);
/// ```
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Absorption {
    /// Part of the step that comes back in each decade of time.
    pub per_decade: f64,
}

impl Absorption {
    /// How fast the output creeps `after_s` seconds after a reset from `step_v`, V/s, toward the voltage before the
    /// reset: `V0 D / (2.303 t)`. Infinite at 0 s.
    pub const fn rate_v_per_s(&self, step_v: f64, after_s: f64) -> f64 {
        step_v * self.per_decade / (core::f64::consts::LN_10 * after_s)
    }

    /// How long to wait after a reset from `step_v` until the output creeps by no more than `rate_v_per_s`, s; signs do
    /// not matter. Infinite for a rate of 0.
    pub const fn wait_s(&self, step_v: f64, rate_v_per_s: f64) -> f64 {
        let wait = step_v * self.per_decade / (core::f64::consts::LN_10 * rate_v_per_s);
        if wait < 0.0 { -wait } else { wait }
    }
}
