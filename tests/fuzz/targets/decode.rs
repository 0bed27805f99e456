//! Every reader of bytes.
#![no_main]

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| brimline_fuzz::texts::run(bytes));
