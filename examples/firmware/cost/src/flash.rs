//! How much flash a program fills, from its ELF file (32 bit, little endian).

use std::error::Error;
use std::path::Path;

const PROGBITS: usize = 1;
const ALLOCATED: usize = 2;

/// Bytes of all sections that are written to flash.
pub(crate) fn used(elf: &Path) -> Result<usize, Box<dyn Error>> {
    let bytes = std::fs::read(elf).map_err(|e| format!("{}: {e}", elf.display()))?;
    used_by(&bytes).ok_or_else(|| format!("{}: not a 32-bit little-endian ELF file", elf.display()).into())
}

fn used_by(bytes: &[u8]) -> Option<usize> {
    bytes.starts_with(b"\x7fELF\x01\x01").then_some(())?;
    let number = |at: usize, size: usize| -> Option<usize> {
        let digits = bytes.get(at..at.checked_add(size)?)?;
        Some(digits.iter().rev().fold(0, |sum, &digit| sum << 8 | usize::from(digit)))
    };
    let (table, entry_size, entries) = (number(0x20, 4)?, number(0x2e, 2)?, number(0x30, 2)?);
    let mut sum = 0;
    for section in (0..entries).map(|i| table + i * entry_size) {
        let (kind, flags, size) = (number(section + 4, 4)?, number(section + 8, 4)?, number(section + 20, 4)?);
        if kind == PROGBITS && flags & ALLOCATED != 0 {
            sum += size;
        }
    }
    Some(sum)
}
