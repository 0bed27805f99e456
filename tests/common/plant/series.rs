//! Many runs in a row, with zeros between them.

use brimline::{Mode, Sample};

use super::{Plant, Timing};

/// One run of a series: from the zero before it to the zero after it, which is the zero before the next.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Run {
    /// Index of the run's last sample, and of the last of the zero after it.
    pub(crate) run_end: usize,
    pub(crate) closing_end: usize,
    /// True integral of the input, C or V s.
    pub(crate) integral: f64,
}

#[derive(Clone, Debug)]
pub(crate) struct Series {
    pub(crate) samples: Vec<Sample>,
    pub(crate) runs: Vec<Run>,
}

impl Plant {
    /// Power-up reset, opening zero, then runs and zeros in turn.
    pub(crate) fn measure_series(mut self, timing: &Timing, runs: usize) -> Series {
        self.dwell(Mode::Reset, 5);
        self.dwell(Mode::Zero, self.periods_in(timing.opening_s));
        let mut series = Vec::new();
        for _ in 0..runs {
            let before = self.integral;
            self.dwell(Mode::Integrate, self.periods_in(timing.run_s));
            let (run_end, integral) = (self.samples.len() - 1, self.integral - before);
            self.dwell(Mode::Zero, self.periods_in(timing.closing_s));
            series.push(Run { run_end, closing_end: self.samples.len() - 1, integral });
        }
        Series { samples: self.samples, runs: series }
    }
}
