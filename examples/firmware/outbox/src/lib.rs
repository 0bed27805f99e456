//! Text on its way to the serial line. Samples never wait for it: what finds no room is dropped, and that is said.
#![no_std]
#![deny(clippy::indexing_slicing, clippy::unwrap_used, clippy::expect_used, clippy::panic)]

use core::fmt::{Arguments, Write};

use heapless::String;

const LOST: &str = "[text lost]\r\n";

/// Lines that were said and are still to be sent.
#[derive(Debug, Default)]
pub struct Outbox {
    text: String<1024>,
    sent: usize,
    lost: bool,
}

impl Outbox {
    /// Takes a line.
    pub fn say(&mut self, line: Arguments) {
        let before = self.text.len();
        if self.text.write_fmt(format_args!("{line}\r\n")).is_err() {
            self.text.truncate(before);
            self.lost = true;
        }
    }

    /// Sends as much as the line takes: `write` gives `false` for a byte that it did not take.
    pub fn send(&mut self, mut write: impl FnMut(u8) -> bool) {
        while let Some(&byte) = self.text.as_bytes().get(self.sent) {
            if !write(byte) {
                return;
            }
            self.sent += 1;
        }
        self.text.clear();
        self.sent = 0;
        if core::mem::take(&mut self.lost) {
            // There is room: nothing else is in there.
            let _ = self.text.write_str(LOST);
        }
    }
}
