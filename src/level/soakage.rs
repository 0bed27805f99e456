//! Soakage (dielectric absorption): charge that creeps into the capacitor's dielectric, and back.

use crate::error::{SetupError, check};
use crate::math;
use crate::setup::{SOAKAGE_BRANCHES, SoakageBranch};

/// A branch as the samples need it.
#[derive(Clone, Copy, Debug, PartialEq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub(crate) struct BranchLaw {
    /// Capacitance over the main one, 2^-32; 0: no branch.
    share: u32,
    /// One over the time constant, per tick.
    per_tick: f32,
}

/// All branches.
pub(crate) type SoakageLaw = [BranchLaw; SOAKAGE_BRANCHES];

impl BranchLaw {
    pub(crate) const fn new(branch: &SoakageBranch, tick_hz: f64) -> Result<Self, SetupError> {
        check!(branch.share >= 0.0 && branch.share <= 0.5, "soakage", "of shares from 0 to 0.5 of the capacitance");
        let ticks = branch.time_constant_s * tick_hz;
        check!(
            branch.share == 0.0 || (branch.time_constant_s > 0.0 && ticks >= 1.0 && ticks <= 1e15),
            "soakage",
            "of time constants above 0 (second), from 1 to 1e15 ticks of the counter"
        );
        let per_tick = if branch.share > 0.0 { (1.0 / ticks) as f32 } else { 0.0 };
        Ok(Self { share: (branch.share * 4_294_967_296.0) as u32, per_tick })
    }
}

/// The part of the way to the level's that a branch's voltage goes in a step, and what a ramp of the level adds.
#[derive(Clone, Copy, Debug, Default)]
struct Gains {
    settled: Share,
    ramped: Share,
}

/// A number below 1 to 24 bits, however small: `mantissa 2^-(32 + shift)`.
#[derive(Clone, Copy, Debug, Default)]
struct Share {
    mantissa: u32,
    shift: u8,
}

impl Share {
    fn of(x: f32) -> Self {
        // Below 2^56, and exact.
        let q56 = (x * 72_057_594_037_927_936.0) as u64;
        let leading = q56.leading_zeros().min(63);
        Self { mantissa: ((q56 << leading) >> 32) as u32, shift: leading.saturating_sub(8) as u8 }
    }

    fn part(self, number: i64) -> i64 {
        part(number, self.mantissa) >> self.shift
    }
}

impl Gains {
    /// For a step of `a` time constants: `1 - e^-a` and `1 - (1 - e^-a) / a`, the exact answers to a level that moves
    /// in a straight line.
    fn over(a: f32) -> Self {
        let settled = -math::exp_minus_1(-a);
        // The second is a difference of near equals where the step is short: its series then.
        let ramped = if a < 0.1 {
            0.5 * a * (1.0 - a * (1.0 / 3.0) * (1.0 - 0.25 * a * (1.0 - 0.2 * a)))
        } else {
            1.0 - settled / a
        };
        Self { settled: Share::of(settled), ramped: Share::of(ramped) }
    }
}

/// The branches' voltages above the reset level; they go on through resets.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Soakage {
    /// 2^-24 counts.
    voltages: [i64; SOAKAGE_BRANCHES],
    /// Worked out for steps of so many ticks: samples mostly come at one pace.
    pace: u32,
    gains: [Gains; SOAKAGE_BRANCHES],
}

impl Soakage {
    /// At rest at a level: nothing flows.
    pub(super) fn start(&mut self, level: i32) {
        self.voltages = [i64::from(level) << 24; SOAKAGE_BRANCHES];
    }

    /// The level went from `from` to `to`, counts above the reset level, in `ticks`.
    pub(super) fn take(&mut self, from: i32, to: i32, ticks: u32, law: &SoakageLaw) {
        if ticks != self.pace {
            self.pace = ticks;
            for (gains, branch) in self.gains.iter_mut().zip(law) {
                *gains = Gains::over(ticks as f32 * branch.per_tick);
            }
        }
        let ramp = i64::from(to).saturating_sub(i64::from(from)) << 24;
        for (voltage, gains) in self.voltages.iter_mut().zip(&self.gains) {
            let behind = (i64::from(from) << 24).saturating_sub(*voltage);
            *voltage = voltage.saturating_add(gains.settled.part(behind)).saturating_add(gains.ramped.part(ramp));
        }
    }

    /// What the dielectric holds, as counts of the level, 2^-16.
    pub(super) fn q16(&self, law: &SoakageLaw) -> i64 {
        let held = |(&voltage, branch): (&i64, &BranchLaw)| part(voltage, branch.share);
        self.voltages.iter().zip(law).map(held).fold(0_i64, i64::saturating_add) >> 8
    }
}

/// A number times a share in 2^-32; the number is below 2^56.
fn part(number: i64, share: u32) -> i64 {
    let (high, low) = (number >> 32, number & 0xFFFF_FFFF);
    high * i64::from(share) + ((low.cast_unsigned() * u64::from(share)) >> 32).cast_signed()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn law(share: f64, time_constant_s: f64) -> SoakageLaw {
        let none = BranchLaw::new(&SoakageBranch::NONE, 1e6).unwrap();
        let branch = BranchLaw::new(&SoakageBranch { share, time_constant_s }, 1e6).unwrap();
        [branch, none, none, none]
    }

    #[test]
    fn a_branch_follows_a_step_and_a_ramp_exactly() {
        for (ticks, tau) in [(4_000_u32, 1.1), (10_000, 0.08), (1_000_000, 0.08), (1_000, 10_000.0)] {
            let law = law(0.5, tau);
            let mut soakage = Soakage::default();
            let (mut level, mut voltage) = (20_000_i32, 0.0_f64);
            for _ in 0..500 {
                soakage.take(level, level + 37, ticks, &law);
                let a = f64::from(ticks) * 1e-6 / tau;
                let (settled, start) = (-(-a).exp_m1(), f64::from(level));
                voltage += settled * (start - voltage) + 37.0 * (1.0 - settled / a);
                level += 37;
            }
            let got = soakage.q16(&law) as f64 / 65536.0;
            assert!((got - 0.5 * voltage).abs() < 1e-2, "{ticks} ticks, {tau} s: {got}, not {}", 0.5 * voltage);
        }
    }

    #[test]
    fn the_step_may_be_split() {
        let law = law(0.01, 0.5);
        let (mut fine, mut coarse) = (Soakage::default(), Soakage::default());
        fine.start(-1_000);
        coarse.start(-1_000);
        coarse.take(0, 30_000, 30_000, &law);
        let mut tick = 0_i32;
        for step in [1_000_u32, 7_000, 2, 21_998] {
            fine.take(tick, tick + step.cast_signed(), step, &law);
            tick += step.cast_signed();
        }
        assert!((fine.q16(&law) - coarse.q16(&law)).abs() < 8);
    }

    #[test]
    fn at_rest_nothing_flows() {
        let law = law(0.002, 1.0);
        let mut soakage = Soakage::default();
        soakage.start(-1_234_567);
        let before = soakage.q16(&law);
        for _ in 0..10_000 {
            soakage.take(-1_234_567, -1_234_567, 1_000, &law);
        }
        assert_eq!(soakage.q16(&law), before);
    }

    #[test]
    fn the_largest_levels_overflow_nothing() {
        let law = law(0.5, 1e-3);
        let mut soakage = Soakage::default();
        soakage.start(-(1 << 30));
        soakage.take(-(1 << 30), 1 << 30, 0x7FFF_FFFF, &law);
        assert!((soakage.q16(&law) - (1_i64 << 45)).abs() < 1 << 26);
    }
}
