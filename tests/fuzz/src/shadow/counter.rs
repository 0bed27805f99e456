//! Time as the ticks tell it.

/// What ticks have told.
#[derive(Clone, Copy, PartialEq)]
pub(super) enum Time {
    Start,
    Ticks(u32),
    Stalled,
    Restarted,
}

/// The counter as the documentation has it: half its span and more is backwards, and a few samples that agree with each
/// other are a counter that was restarted.
#[derive(Default)]
pub(super) struct Counter {
    pub(super) last: Option<u32>,
    astray: u32,
    onward: u32,
}

impl Counter {
    pub(super) fn take(&mut self, tick: u32) -> Time {
        let time = match self.last.map(|last| tick.wrapping_sub(last)) {
            None => Time::Start,
            Some(ticks) if ticks > 0 && ticks < 1 << 31 => Time::Ticks(ticks),
            Some(_) => {
                let agrees = (1..1 << 31).contains(&tick.wrapping_sub(self.astray));
                self.onward = if self.onward == 0 || agrees { self.onward + 1 } else { 1 };
                self.astray = tick;
                if self.onward < 4 {
                    return Time::Stalled;
                }
                Time::Restarted
            }
        };
        self.last = Some(tick);
        self.onward = 0;
        time
    }
}
