//! What is said of notices and runs. A value appears only if it can be trusted.

use core::fmt::{Display, Formatter, Result};

use brimline::{Channel, Estimate, Event, Flux, Notice, Reading, Trust};

use outbox::Outbox;

/// Says a notice.
pub(crate) fn notice(out: &mut Outbox, notice: &Notice) {
    match notice.event {
        Event::Fault(reason) => out.say(format_args!("tick {}: fault: {}", notice.tick, reason.name())),
        event => out.say(format_args!("tick {}: {event:?}", notice.tick)),
    }
}

/// Says the flux of the run that has just stopped.
pub(crate) fn at_stop(out: &mut Outbox, reading: &Reading<Flux>) {
    out.say(format_args!("at stop: {}", Value(reading, &reading.at_stop)));
}

/// Says the flux of a run after the zero that closes it, and the drift that the zero has shown.
pub(crate) fn closed(out: &mut Outbox, reading: &Reading<Flux>, channel: &Channel<Flux>) {
    let value = Value(reading, reading.latest());
    out.say(format_args!("closed: {value}, {:.3} s, {} resets", reading.elapsed_s, reading.resets));
    let drift = channel.drift();
    let [rate, expanded] = [drift.value, drift.expanded(2.0)].map(|rate| rate.as_volts_per_second() * 1e6);
    out.say(format_args!("  drift of the output ({rate:.1} +- {expanded:.1}) uV/s"));
    if !reading.noise_tested {
        out.say(format_args!("  too few zeros yet to show whether the noise figures hold"));
    }
}

/// An estimate in words. The flux of a coil has either sign, and a lower bound of it says nothing.
struct Value<'r>(&'r Reading<Flux>, &'r Estimate<Flux>);

impl Display for Value<'_> {
    fn fmt(&self, f: &mut Formatter) -> Result {
        let Self(reading, Estimate { integral, .. }) = self;
        if reading.trust == Trust::Good {
            let [value, expanded] = [integral.value, integral.expanded(2.0)].map(|flux| flux.as_volt_seconds() * 1e3);
            return write!(f, "({value:.4} +- {expanded:.4}) mV s");
        }
        f.write_str("no value:")?;
        reading.reasons.iter().try_for_each(|reason| write!(f, " {}", reason.name()))
    }
}
