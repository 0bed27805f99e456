//! What fills the flash of the least program with a channel in it.

use std::cmp::Reverse;
use std::error::Error;
use std::path::Path;

use object::{Object, ObjectSymbol, SymbolKind};

use crate::names::short;

const ROWS: usize = 25;

pub(crate) fn print(elf: &Path) -> Result<(), Box<dyn Error>> {
    let bytes = std::fs::read(elf)?;
    let file = object::File::parse(&*bytes)?;
    let kept = |symbol: &object::Symbol<'_, '_>| matches!(symbol.kind(), SymbolKind::Text | SymbolKind::Data);
    let mut symbols: Vec<_> = file.symbols().filter(kept).filter(|symbol| symbol.size() > 0).collect();
    // Aliases of a routine share its address.
    symbols.sort_by_key(|symbol| (Reverse(symbol.size()), symbol.address()));
    symbols.dedup_by_key(|symbol| symbol.address());
    println!("Flash, the {ROWS} largest of {} symbols, bytes:\n\n| symbol | bytes |\n| --- | ---: |", symbols.len());
    for symbol in symbols.iter().take(ROWS) {
        println!("| {} | {} |", short(symbol.name()?), symbol.size());
    }
    Ok(())
}
