//! The loop: sample, feed, switch, report; and what happens when something fails.

use core::convert::Infallible;

use brimline::{Channel, Mode, Sample};

use crate::board::{Board, Fault};
use crate::plan::Plan;
use crate::report::{self, Total};
use crate::setup::{LAMP, PER_SECOND};
use outbox::Outbox;

const PROGRESS: u32 = 10 * PER_SECOND;
const PAUSE: u32 = 10 * PER_SECOND;

/// The lamp monitor.
#[derive(Debug)]
pub struct Monitor {
    out: Outbox,
    total: Total,
}

impl Monitor {
    /// A monitor whose total is zero.
    pub fn start() -> Self {
        let mut out = Outbox::default();
        out.say(format_args!("started; the total begins at zero"));
        Self { out, total: Total::default() }
    }

    /// Zeroes, integrates and reports until something fails. Channel and drift start anew each time.
    pub fn measure(&mut self, board: &mut impl Board) -> Fault {
        let Err(fault) = self.cycle(board);
        fault
    }

    /// After a fault: opens all switches, says so, and waits. What was under way does not count.
    pub fn pause(&mut self, fault: Fault, board: &mut impl Board) {
        if board.switch(Mode::Hold).is_err() {
            board.restart();
        }
        self.total.leave_out();
        self.out.say(format_args!("STOPPED, {}: all switches open, anew in 10 s; {}", fault.words(), self.total));
        board.pace();
        for _ in 0..PAUSE {
            // Nothing is sampled, so nothing is lost.
            let _ = board.wait(&mut self.out);
        }
    }

    fn cycle(&mut self, board: &mut impl Board) -> Result<Infallible, Fault> {
        let out = &mut self.out;
        let mut channel = Channel::new(&LAMP);
        let mut plan = Plan::default();
        let mut samples = 0_u32;
        board.switch(plan.mode())?;
        board.pace();
        loop {
            let mode = plan.mode();
            board.wait(out)?;
            let (tick, counts) = board.sample()?;
            let step = channel.feed(Sample { tick, counts, mode, temperature: None });
            plan.advance(step.request);
            let next = plan.mode();
            if next != mode {
                board.switch(next)?;
            }
            step.notices.iter().for_each(|notice| report::notice(out, &notice));
            if channel.switch_has_failed() {
                return Err(Fault::ResetSwitch);
            }
            samples = samples.wrapping_add(1);
            let zero_is_over = mode == Mode::Zero && next == Mode::Integrate;
            let progress_is_due = mode == Mode::Integrate && samples.is_multiple_of(PROGRESS);
            if !(zero_is_over || progress_is_due) {
                continue;
            }
            // There is none before the first run; after a zero the reading of the run before it is final.
            let Some(reading) = channel.reading() else { continue };
            if zero_is_over {
                report::run(out, &reading);
                self.total.add(&reading);
                out.say(format_args!("{}", self.total));
            } else {
                report::progress(out, &reading);
            }
        }
    }
}
