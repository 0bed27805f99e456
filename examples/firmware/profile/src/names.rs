//! From addresses to functions, with inlining undone.

use std::cell::RefCell;
use std::collections::HashMap;
use std::error::Error;
use std::path::Path;

use addr2line::Loader;

/// Where an instruction belongs.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub(crate) enum Place {
    /// A function of the crate or of what it uses, and the line.
    Function(String, String),
    /// A routine that the compiler calls for arithmetic or copying.
    Routine(String),
    /// The markers around a call.
    Begin,
    /// See [`Begin`](Self::Begin).
    End,
}

/// The names in a program.
pub(crate) struct Names {
    loader: Loader,
    known: RefCell<HashMap<u64, Place>>,
}

impl Names {
    pub(crate) fn of(elf: &Path) -> Result<Self, Box<dyn Error>> {
        let loader = Loader::new(elf).map_err(|e| format!("{}: {e}", elf.display()))?;
        Ok(Self { loader, known: RefCell::default() })
    }

    pub(crate) fn place(&self, address: u64) -> Place {
        self.known.borrow_mut().entry(address).or_insert_with(|| self.look_up(address)).clone()
    }

    fn look_up(&self, address: u64) -> Place {
        // A symbol's address has its last bit set where its code is Thumb.
        let symbol = self.loader.find_symbol(address | 1).unwrap_or("?");
        match symbol {
            "a_call_begins" => return Place::Begin,
            "a_call_ends" => return Place::End,
            _ => {}
        }
        let whole = short(symbol);
        if symbol.starts_with("__") || symbol.starts_with("mem") || symbol.contains("compiler_builtins") {
            return Place::Routine(whole);
        }
        // The innermost function that is not the standard library's.
        let mut inner = None;
        let mut line = String::from("?");
        if let Ok(mut frames) = self.loader.find_frames(address) {
            while let Ok(Some(frame)) = frames.next() {
                let Some(Ok(name)) = frame.function.as_ref().map(|function| function.demangle().map(|n| short(&n)))
                else {
                    continue;
                };
                if !is_of_the_standard_library(&name) {
                    if let Some(at) = frame.location {
                        let file = at.file.unwrap_or("?");
                        let file = file.rsplit_once("/src/").map_or(file, |(_, file)| file);
                        line = format!("{file}:{}", at.line.unwrap_or(0));
                    }
                    inner = Some(name);
                    break;
                }
            }
        }
        Place::Function(inner.unwrap_or(whole), line)
    }
}

/// Also methods of the built-in types, such as `<i64>::saturating_add`.
fn is_of_the_standard_library(name: &str) -> bool {
    let built_in = ["<i", "<u", "<f", "<["].iter().any(|start| name.starts_with(start));
    built_in || ["core::", "<core::"].iter().any(|start| name.starts_with(start)) || name.contains(" as core::")
}

/// A demangled name without its hash and its generic arguments.
pub(crate) fn short(symbol: &str) -> String {
    let name = format!("{:#}", rustc_demangle::demangle(symbol));
    let mut depth = 0_u32;
    let mut kept = String::new();
    let turbofish = name.replace("::<", "\u{1}");
    for c in turbofish.chars() {
        match c {
            '\u{1}' => depth += 1,
            '<' if depth > 0 => depth += 1,
            '>' if depth > 0 => depth -= 1,
            _ if depth == 0 => kept.push(c),
            _ => {}
        }
    }
    kept.replace("brimline::", "")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_lose_hash_and_arguments() {
        assert_eq!(
            short("_ZN8brimline7channel16Channel$LT$Q$GT$4feed17h0123456789abcdefE"),
            "channel::Channel<Q>::feed"
        );
        assert_eq!(short("__aeabi_fmul"), "__aeabi_fmul");
    }

    #[test]
    fn methods_of_built_in_types_belong_to_their_callers() {
        assert!(is_of_the_standard_library("<i64>::saturating_add"));
        assert!(!is_of_the_standard_library("clock::Span::add"));
    }
}
