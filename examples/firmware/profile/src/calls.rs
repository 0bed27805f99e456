//! One call: how many instructions each place took.

use std::collections::HashMap;

use crate::names::Place;

/// What the samples of the trace say of a call.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Kind {
    /// `feed` in a mode that goes on.
    Steady(brimline::Mode),
    /// `feed` with the first sample in a mode.
    First(brimline::Mode),
    Reading,
}

/// Instructions of a function.
#[derive(Clone, Copy, Debug, Default)]
pub(crate) struct Share {
    /// Its own.
    pub(crate) own: u64,
    /// Of the routines that it called.
    pub(crate) called: u64,
}

/// A call's instructions.
#[derive(Clone, Debug)]
pub(crate) struct Call {
    pub(crate) kind: Kind,
    pub(crate) row: usize,
    pub(crate) total: u64,
    pub(crate) functions: HashMap<String, Share>,
    pub(crate) routines: HashMap<String, u64>,
    pub(crate) lines: HashMap<String, Share>,
    caller: Option<(String, String)>,
}

impl Call {
    pub(crate) fn new(kind: Kind, row: usize) -> Self {
        Self {
            kind,
            row,
            total: 0,
            functions: HashMap::new(),
            routines: HashMap::new(),
            lines: HashMap::new(),
            caller: None,
        }
    }

    pub(crate) fn add(&mut self, place: Place) {
        self.total += 1;
        match place {
            Place::Function(name, line) => {
                self.functions.entry(name.clone()).or_default().own += 1;
                self.lines.entry(line.clone()).or_default().own += 1;
                self.caller = Some((name, line));
            }
            Place::Routine(name) => {
                *self.routines.entry(name).or_default() += 1;
                if let Some((name, line)) = &self.caller {
                    self.functions.entry(name.clone()).or_default().called += 1;
                    self.lines.entry(line.clone()).or_default().called += 1;
                }
            }
            Place::Begin | Place::End => {}
        }
    }
}
