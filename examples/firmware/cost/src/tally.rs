//! Counts of one kind of call.

use emulated::println;

#[derive(Clone, Copy, Debug)]
pub(crate) struct Tally {
    name: &'static str,
    calls: u32,
    sum: u64,
    worst: u32,
}

impl Tally {
    pub(crate) const fn new(name: &'static str) -> Self {
        Self { name, calls: 0, sum: 0, worst: 0 }
    }

    pub(crate) fn add(&mut self, count: u32) {
        self.calls += 1;
        self.sum += u64::from(count);
        self.worst = self.worst.max(count);
    }

    pub(crate) fn print(&self) {
        self.print_with("");
    }

    /// With something behind the name.
    pub(crate) fn print_with(&self, suffix: &str) {
        if let Some(mean) = self.sum.checked_div(u64::from(self.calls)) {
            println!("{}{suffix}: {mean} / {}", self.name, self.worst);
        }
    }
}
