//! What notices have said, and whether they may.

use brimline::{Event, Mode, Reason, Step};

use super::reasons::{Set, only};
use super::run::Run;

#[derive(Default)]
pub(super) struct Heard {
    /// Faults stated since the run began, and since the zero did.
    pub(super) stated: Set,
    stated_in_zero: Set,
    /// Faults stated since the run began or stopped: once is enough.
    said: Set,
    may_retry: bool,
    due_stated: bool,
}

/// A step's surroundings.
pub(super) struct Scene<'a> {
    /// Whether the mode changed, to which, and the tick of the sample that told so.
    pub(super) boundary: bool,
    pub(super) mode: Mode,
    pub(super) tick: u32,
    pub(super) run: Option<&'a Run>,
    /// Whether resets are advised, and whether one must be.
    pub(super) advises: bool,
    pub(super) due: bool,
}

impl Heard {
    /// The switch was seen to.
    pub(super) fn repaired(&mut self) {
        self.may_retry = false;
    }

    /// A reset begins.
    pub(super) fn reset_closed(&mut self) {
        (self.may_retry, self.due_stated) = (false, false);
    }

    pub(super) fn hear(&mut self, step: &Step, scene: &Scene) {
        let (boundary, mode) = (scene.boundary, scene.mode);
        let running = scene.run.is_some_and(|run| run.running);
        if boundary && mode == Mode::Zero {
            (self.stated_in_zero, self.said) = (0, 0);
        }
        for notice in step.notices.iter() {
            match notice.event {
                Event::RunStarted => {
                    assert!(boundary && mode == Mode::Integrate && running);
                    assert_eq!(scene.run.map(|run| run.start_tick), Some(notice.tick));
                    self.stated = self.stated_in_zero;
                    // These concern the run they are in and no other.
                    self.said = self.stated_in_zero & !only(Reason::Gap) & !only(Reason::DeadTime);
                }
                Event::RunStopped => {
                    assert!(boundary && mode == Mode::Zero && scene.run.is_some() && !running);
                    assert_eq!(scene.run.map(|run| run.end_tick), Some(notice.tick));
                }
                Event::ResetClosed => assert!(boundary && mode == Mode::Reset && running),
                Event::ResetOpened => assert!(boundary && mode == Mode::Integrate && running),
                Event::ResetDue => {
                    assert!(scene.advises && !self.due_stated, "a reset is due: said unasked or twice");
                    self.due_stated = true;
                }
                Event::ResetFailed { in_a_row } => {
                    assert!(in_a_row > 0);
                    self.may_retry = true;
                }
                Event::Fault(reason) => self.fault(reason, notice.tick, scene),
                _ => {}
            }
        }
    }

    fn fault(&mut self, reason: Reason, tick: u32, scene: &Scene) {
        let reason_alone = only(reason);
        assert!(scene.boundary || self.said & reason_alone == 0, "{reason:?} was stated twice");
        self.stated |= reason_alone;
        let enters_zero = scene.boundary && scene.mode == Mode::Zero;
        if !enters_zero {
            self.said |= reason_alone;
        }
        // What the switches' moving showed on the way into a zero concerns what was before it.
        if !enters_zero || tick == scene.tick {
            self.stated_in_zero |= reason_alone;
        }
    }

    pub(super) fn judge_request(&self, request: Option<Mode>, switch_has_failed: bool, scene: &Scene) {
        match request {
            None => assert!(!scene.due || scene.mode == Mode::Reset || switch_has_failed, "no reset is asked for"),
            Some(Mode::Reset) => {
                assert!(scene.mode != Mode::Reset && !switch_has_failed);
                assert!(scene.advises || self.may_retry, "a reset is asked for that no policy wants");
            }
            Some(mode) => panic!("{mode:?} is asked for"),
        }
    }
}
