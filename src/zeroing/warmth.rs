//! The drift's dependence on temperature.

use crate::estimate::{Bracket, Constant, Innovation, Trend, Walk};
use crate::math;
use crate::quantity::Temperature;
use crate::setup::{Derived, WarmthLaw};

/// The drift is a rate at a reference temperature and a coefficient times what the temperature has changed since.
///
/// Temperatures enter as a *heat* in whole thousandths: of a kelvin for an offset that changes in proportion, of the
/// current at 25 degrees Celsius for a junction's.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Warmth {
    /// Change of the rate for each thousandth, counts/s.
    coefficient: f32,
    /// Its variance and what it has in common with the present zero.
    row: Constant,
    /// Heat that the rate belongs to; `None` before the first temperature.
    reference: Option<i32>,
    latest: i32,
    temperature: Option<Temperature>,
    /// Time integral of the heat above the reference during a run, thousandths times 2^12 ticks, and the rest of it in
    /// thousandths times ticks: no run is long enough to fill it.
    area: i64,
    rest: u16,
}

/// Ticks that areas are counted in, as a power of two.
const AREA_TICKS: u32 = 12;

impl Warmth {
    pub(super) fn new(derived: &Derived) -> Self {
        let variance = match derived.warmth {
            WarmthLaw::Unknown => 0.0,
            WarmthLaw::Linear { coefficient_var } | WarmthLaw::Junction { coefficient_var, .. } => coefficient_var,
        };
        Self { row: Constant { variance, ..Constant::default() }, ..Self::default() }
    }

    /// Takes the temperature of a sample.
    #[inline(never)]
    pub(super) fn take(&mut self, temperature: Temperature, derived: &Derived) {
        if self.temperature != Some(temperature) {
            self.temperature = Some(temperature);
            self.latest = heat(temperature, &derived.warmth);
        }
        self.reference.get_or_insert(self.latest);
    }

    /// Whether there is nothing to learn: the law is not known, and the coefficient is none.
    fn is_certain(&self) -> bool {
        self.row.variance <= 0.0
    }

    /// How far the heat is above the reference.
    fn risen(&self) -> i32 {
        self.reference.map_or(0, |reference| self.latest.saturating_sub(reference))
    }

    /// Time in which the baseline drifts.
    pub(super) fn drive(&mut self, ticks: u64) {
        let risen = self.risen();
        if risen != 0 {
            let area = i64::from(risen).saturating_mul(ticks.cast_signed()).saturating_add(i64::from(self.rest));
            self.area = self.area.saturating_add(area >> AREA_TICKS);
            self.rest = (area & ((1 << AREA_TICKS) - 1)) as u16;
        }
    }

    /// What the warming in a run of `driven_s` seconds has done to a baseline, and how uncertain that is.
    pub(super) fn apply(&mut self, baseline: &mut Trend, driven_s: f32, derived: &Derived) {
        let area = math::scaled(core::mem::take(&mut self.area) as f32 * derived.tick_s, AREA_TICKS.cast_signed());
        self.row.advance(driven_s);
        let risen = self.risen() as f32;
        self.step(baseline, None, area, risen);
        self.follow();
    }

    /// Half of what the warming since the block before does to a zero's rate: once before the time passes, once after.
    pub(super) fn half_step(&mut self, trend: &mut Trend, bracket: Option<&mut Bracket>) {
        if self.risen() != 0 {
            let half = 0.5 * self.risen() as f32;
            self.step(trend, bracket, 0.0, half);
        }
    }

    /// The same for warming that no sample of a zero has followed: while the input was open or the switch closed.
    pub(super) fn whole_step(&mut self, trend: &mut Trend, mut bracket: Option<&mut Bracket>) {
        self.half_step(trend, bracket.as_deref_mut());
        self.half_step(trend, bracket);
        self.follow();
        self.row.with_level = 0.0;
    }

    /// Level and rate move by what the coefficient makes of `area` and `risen`, and have that in common with it.
    fn step(&mut self, trend: &mut Trend, bracket: Option<&mut Bracket>, area: f32, risen: f32) {
        let Constant { variance: v, with_level, with_rate, .. } = self.row;
        trend.shift(self.coefficient * area, self.coefficient * risen);
        let added = Walk {
            level: area * (area * v + 2.0 * with_level),
            cross: area * with_rate + risen * with_level + area * risen * v,
            rate: risen * (risen * v + 2.0 * with_rate),
        };
        trend.absorb(bracket, added);
        // An area comes only with the end of a run, where the level is let go: no covariance with it is kept.
        self.row.with_rate += risen * v;
    }

    /// Forgets what was learned since; what was measured stays.
    pub(super) fn roll_back(&mut self, checkpoint: Self) {
        *self = Self { latest: self.latest, temperature: self.temperature, ..checkpoint };
    }

    /// The rate belongs to the present heat from here on.
    pub(super) fn follow(&mut self) {
        self.area = 0;
        if self.reference.is_some() {
            self.reference = Some(self.latest);
        }
    }

    /// The level of a zero is found anew.
    pub(super) fn release_level(&mut self) {
        self.row.with_level = 0.0;
    }

    /// Time passes in a zero.
    pub(super) fn advance(&mut self, dt_s: f32) {
        if self.is_certain() {
            return;
        }
        self.row.advance(dt_s);
    }

    /// A block of a zero.
    pub(super) fn update(&mut self, innovation: &Innovation) {
        if self.is_certain() {
            return;
        }
        self.row.update(innovation);
        self.coefficient += core::mem::take(&mut self.row.correction);
    }
}

/// The heat of a temperature, in whole thousandths.
fn heat(temperature: Temperature, law: &WarmthLaw) -> i32 {
    let millidegrees = temperature.as_millidegrees_celsius().clamp(-80_000, 200_000);
    match *law {
        WarmthLaw::Unknown => 0,
        WarmthLaw::Linear { .. } => millidegrees,
        WarmthLaw::Junction { doublings_per_millikelvin, .. } => {
            (1000.0 * math::exp2((millidegrees - 25_000) as f32 * doublings_per_millikelvin)) as i32
        }
    }
}
