//! Counts how often intervals cover the truth.

use super::Claim;

#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Tally {
    trials: u32,
    within_1_u: u32,
    within_1_96_u: u32,
    z_sum: f64,
    z_squares: f64,
    u_sum: f64,
    error_squares: f64,
}

impl Tally {
    pub(crate) fn add(&mut self, claim: Claim, truth: f64) {
        let z = (claim.value - truth) / claim.u;
        assert!(z.is_finite(), "{claim:?} against {truth}");
        self.trials += 1;
        self.within_1_u += u32::from(z.abs() <= 1.0);
        self.within_1_96_u += u32::from(z.abs() <= 1.96);
        self.z_sum += z;
        self.z_squares += z * z;
        self.u_sum += claim.u;
        self.error_squares += (claim.value - truth).powi(2);
    }

    pub(crate) fn trials(&self) -> u32 {
        self.trials
    }

    pub(crate) fn mean_u(&self) -> f64 {
        self.u_sum / f64::from(self.trials)
    }

    pub(crate) fn rms_error(&self) -> f64 {
        (self.error_squares / f64::from(self.trials)).sqrt()
    }

    /// Share of the intervals `value +- u` that hold the truth, %; 68.27 for an honest `u`.
    pub(crate) fn coverage_68(&self) -> f64 {
        100.0 * f64::from(self.within_1_u) / f64::from(self.trials)
    }

    /// The same for `value +- 1.96 u`; 95.0 for an honest `u`.
    pub(crate) fn coverage_95(&self) -> f64 {
        100.0 * f64::from(self.within_1_96_u) / f64::from(self.trials)
    }

    pub(crate) fn mean_z(&self) -> f64 {
        self.z_sum / f64::from(self.trials)
    }

    pub(crate) fn rms_z(&self) -> f64 {
        (self.z_squares / f64::from(self.trials)).sqrt()
    }

    /// A line of the table that `--nocapture` shows; `unit` turns `u` into what the column is in.
    pub(crate) fn print(&self, mix: &str, what: &str, unit: f64) {
        println!(
            "{mix:<22} {what:<26} {:>5}  {:>5.1} % {:>5.1} %  {:>+7.3} {:>7.3}  {:>9.4}",
            self.trials,
            self.coverage_68(),
            self.coverage_95(),
            self.mean_z(),
            self.rms_z(),
            self.u_sum / f64::from(self.trials) / unit,
        );
    }

    pub(crate) fn print_heading() {
        println!(
            "{:<22} {:<26} {:>5}  {:>7} {:>7}  {:>7} {:>7}  {:>9}",
            "mix", "estimate", "runs", "u", "1.96 u", "mean/u", "rms/u", "mean u"
        );
    }

    /// Both coverages within what the claim means, and errors centred and as large as claimed, within 4 standard
    /// errors: the mean of `n` errors of rms 1 scatters by `1/sqrt(n)`, their rms by `1/sqrt(2 n)`.
    pub(crate) fn assert_honest(&self, what: &str) {
        let (low, high) = (self.coverage_68(), self.coverage_95());
        assert!((93.0..=97.0).contains(&high), "{what}: 1.96 u covers {high:.1} %, 95 expected");
        assert!((65.0..=71.0).contains(&low), "{what}: u covers {low:.1} %, 68.3 expected");
        let n = f64::from(self.trials);
        let (mean, rms) = (self.mean_z(), self.rms_z());
        assert!(mean.abs() <= 4.0 / n.sqrt(), "{what}: errors are {mean:.3} u on the average");
        assert!((rms - 1.0).abs() <= 4.0 / (2.0 * n).sqrt(), "{what}: rms error is {rms:.3} u");
    }
}
