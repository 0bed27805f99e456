//! Any numbers in a set-up.
#![no_main]

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| brimline_fuzz::drill::run(bytes));
