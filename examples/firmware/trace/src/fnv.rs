//! A checksum for long rows of results.

use core::fmt;

/// FNV-1a, 64 bit (Fowler, Noll and Vo; constants from memory, checked below).
pub(crate) struct Fnv(u64);

impl Fnv {
    pub(crate) const fn new() -> Self {
        Self(0xcbf2_9ce4_8422_2325)
    }

    pub(crate) fn write(&mut self, bytes: &[u8]) {
        for &byte in bytes {
            self.0 = (self.0 ^ u64::from(byte)).wrapping_mul(0x0000_0100_0000_01b3);
        }
    }

    pub(crate) fn write_bits(&mut self, value: f64) {
        self.write(&value.to_bits().to_le_bytes());
    }

    pub(crate) const fn value(&self) -> u64 {
        self.0
    }
}

/// Hashes text as its bytes.
impl fmt::Write for Fnv {
    fn write_str(&mut self, text: &str) -> fmt::Result {
        self.write(text.as_bytes());
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Published test vectors of the function's authors, figures from memory.
    #[test]
    fn published_vectors() {
        for (text, hash) in
            [("", 0xcbf2_9ce4_8422_2325), ("a", 0xaf63_dc4c_8601_ec8c), ("foobar", 0x8594_4171_f739_67e8)]
        {
            let mut fnv = Fnv::new();
            fnv.write(text.as_bytes());
            assert_eq!(fnv.value(), hash, "{text}");
        }
    }
}
