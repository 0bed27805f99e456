//! The loop: sample, feed, switch, report; and what happens when something fails.

use core::convert::Infallible;

use brimline::{Channel, Flux, Mode, Sample};

use crate::board::{Board, Fault, Taken};
use crate::button::Button;
use crate::plan::{Plan, Turn};
use crate::report;
use crate::setup::{COIL, PER_SECOND};
use outbox::Outbox;

const PAUSE: u32 = 10 * PER_SECOND;

/// The flux meter.
#[derive(Debug)]
pub struct Fluxmeter {
    out: Outbox,
}

impl Fluxmeter {
    /// A flux meter that has measured nothing.
    pub fn start() -> Self {
        let mut out = Outbox::default();
        out.say(format_args!("started; keep the coil still"));
        Self { out }
    }

    /// Measures at the press of the button until something fails. Channel and drift start anew each time.
    pub fn measure(&mut self, board: &mut impl Board) -> Fault {
        let Err(fault) = self.cycle(board);
        fault
    }

    /// After a fault: opens all switches, says so, and waits. The run that was under way has no value.
    pub fn pause(&mut self, fault: Fault, board: &mut impl Board) {
        if board.switch(Mode::Hold).is_err() {
            board.restart();
        }
        self.out.say(format_args!("STOPPED, {}: all switches open, no value, anew in 10 s", fault.words()));
        board.pace();
        for _ in 0..PAUSE {
            // Nothing is sampled, so nothing is lost.
            let _ = board.wait(&mut self.out);
        }
    }

    fn cycle(&mut self, board: &mut impl Board) -> Result<Infallible, Fault> {
        let mut channel = Channel::new(&COIL);
        let (mut plan, mut button) = (Plan::default(), Button::default());
        board.switch(plan.mode())?;
        board.pace();
        loop {
            let mode = plan.mode();
            board.wait(&mut self.out)?;
            let Taken { tick, counts, button: contact } = board.sample();
            let step = channel.feed(Sample { tick, counts, mode, temperature: None });
            let turn = plan.advance(step.request, button.is_pressed(contact));
            if plan.mode() != mode {
                board.switch(plan.mode())?;
            }
            step.notices.iter().for_each(|notice| report::notice(&mut self.out, &notice));
            if channel.switch_has_failed() {
                return Err(Fault::ResetSwitch);
            }
            if let Some(turn) = turn {
                self.say(turn, &channel);
            }
        }
    }

    fn say(&mut self, turn: Turn, channel: &Channel<Flux>) {
        let out = &mut self.out;
        match (turn, channel.reading()) {
            (Turn::Ready, _) => out.say(format_args!("ready: press to start")),
            (Turn::NotReady, _) => out.say(format_args!("not yet: the zero is being taken")),
            (Turn::Started, _) => out.say(format_args!("running: press to stop")),
            (Turn::Stopped, Some(reading)) => report::at_stop(out, &reading),
            (Turn::Closed, Some(reading)) => report::closed(out, &reading, channel),
            (Turn::Stopped | Turn::Closed, None) => out.say(format_args!("no value: there was no run")),
        }
    }
}
