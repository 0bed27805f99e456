//! The boards that hostile scripts are fed to.

use brimline::{Charge, Flux, Integral, Setup};
use trace::{BLOCKS_OF_16, CHARGE, FLUX, Trace, UNBLOCKED};

use crate::dear;

/// Something that is done with every board of a list.
pub(crate) trait Visitor {
    fn visit<Q: Integral + 'static>(&mut self, setup: &'static Setup<Q>);
}

/// Those that the traces were recorded on.
pub(crate) fn recorded(visitor: &mut impl Visitor) {
    each(&CHARGE, visitor);
    each(&FLUX, visitor);
    [&BLOCKS_OF_16, &UNBLOCKED].iter().for_each(|trace| visitor.visit(trace.setup()));
}

/// Those made to be dear.
pub(crate) fn dear(visitor: &mut impl Visitor) {
    let charge: [&Setup<Charge>; 2] = [&dear::BLOCKED, &dear::UNBLOCKED];
    charge.iter().for_each(|setup| visitor.visit(setup));
    let flux: [&Setup<Flux>; 2] = [&dear::FLUXMETER, &dear::FLUXMETER_UNBLOCKED];
    flux.iter().for_each(|setup| visitor.visit(setup));
}

/// Several traces may be of one board, which is visited once.
fn each<Q: Integral + 'static>(traces: &'static [Trace<Q>], visitor: &mut impl Visitor) {
    for (i, trace) in traces.iter().enumerate() {
        let again = traces.iter().take(i).any(|before| core::ptr::eq(before.setup(), trace.setup()));
        if !again {
            visitor.visit(trace.setup());
        }
    }
}
