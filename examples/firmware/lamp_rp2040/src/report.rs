//! What is said of notices, runs and the total. A value appears only as far as it can be trusted.

use core::fmt::{Display, Formatter, Result};

use brimline::{Charge, Event, Measured, Notice, RadiantExposure, Reading, Reasons, Trust};

use crate::setup::DETECTOR;
use outbox::Outbox;

/// Says a notice.
pub(crate) fn notice(out: &mut Outbox, notice: &Notice) {
    match notice.event {
        Event::Fault(reason) => out.say(format_args!("{} us: fault: {}", notice.tick, reason.name())),
        event => out.say(format_args!("{} us: {event:?}", notice.tick)),
    }
}

/// Says what a run came to, after the zero that closes it.
pub(crate) fn run(out: &mut Outbox, reading: &Reading<Charge>) {
    out.say(format_args!("run of {:.2} s, {} resets: {}", reading.elapsed_s, reading.resets, Exposure(reading)));
    if !reading.noise_tested {
        out.say(format_args!("  too few zeros yet to show whether the noise figures hold"));
    }
}

/// Says what a run has come to so far.
pub(crate) fn progress(out: &mut Outbox, reading: &Reading<Charge>) {
    out.say(format_args!("after {:.2} s: {}", reading.elapsed_s, Exposure(reading)));
}

/// The radiant exposure of all runs since power-up.
#[derive(Debug, Default)]
pub(crate) struct Total {
    /// Value and standard uncertainty, J/m^2. The detector and the capacitor are the same in all runs, so uncertainties
    /// are added and not their squares.
    value: f64,
    u: f64,
    runs: u32,
    left_out: u32,
    at_least: bool,
}

impl Total {
    /// Takes a run's final reading. Light has one sign: what a run was at least, it adds at least.
    pub(crate) fn add(&mut self, reading: &Reading<Charge>) {
        let exposure = exposure(reading);
        match reading.trust {
            Trust::Good => {
                self.value += exposure.value.as_joules_per_square_metre();
                self.u += exposure.u.as_joules_per_square_metre();
                self.runs += 1;
            }
            Trust::LowerBound => {
                self.value += at_least(exposure);
                self.at_least = true;
                self.runs += 1;
            }
            Trust::Invalid => self.leave_out(),
        }
    }

    /// A run that was given up, or whose value means nothing.
    pub(crate) fn leave_out(&mut self) {
        self.left_out += 1;
        self.at_least = true;
    }
}

impl Display for Total {
    fn fmt(&self, f: &mut Formatter) -> Result {
        let plural = if self.runs == 1 { "" } else { "s" };
        write!(f, "total of {} run{plural}, {} left out: ", self.runs, self.left_out)?;
        let expanded = 2.0 * self.u;
        match self.at_least {
            true => write!(f, "at least {:.1} J/m^2", (self.value - expanded).max(0.0)),
            false => write!(f, "({:.1} +- {expanded:.1}) J/m^2", self.value),
        }
    }
}

/// A reading in words.
struct Exposure<'r>(&'r Reading<Charge>);

impl Display for Exposure<'_> {
    fn fmt(&self, f: &mut Formatter) -> Result {
        let exposure = exposure(self.0);
        match self.0.trust {
            Trust::Good => {
                let (value, expanded) = (exposure.value, exposure.expanded(2.0));
                let [value, expanded] = [value, expanded].map(RadiantExposure::as_joules_per_square_metre);
                write!(f, "({value:.1} +- {expanded:.1}) J/m^2")
            }
            Trust::LowerBound => write!(f, "at least {:.1} J/m^2:{}", at_least(exposure), Why(self.0.reasons)),
            Trust::Invalid => write!(f, "no value:{}", Why(self.0.reasons)),
        }
    }
}

struct Why(Reasons);

impl Display for Why {
    fn fmt(&self, f: &mut Formatter) -> Result {
        self.0.iter().try_for_each(|reason| write!(f, " {}", reason.name()))
    }
}

fn exposure(reading: &Reading<Charge>) -> Measured<RadiantExposure> {
    DETECTOR.radiant_exposure(reading.latest().integral)
}

/// The lower end of the interval of about 95 %, J/m^2.
fn at_least(exposure: Measured<RadiantExposure>) -> f64 {
    let expanded = exposure.expanded(2.0).as_joules_per_square_metre();
    (exposure.value.as_joules_per_square_metre() - expanded).max(0.0)
}
