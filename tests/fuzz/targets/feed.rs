//! Any samples in any order, for boards of all kinds.
#![no_main]

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| brimline_fuzz::script::run(bytes));
