//! Simulated boards with known truth: no wrong reading is good.
#![no_main]

libfuzzer_sys::fuzz_target!(|bytes: &[u8]| brimline_fuzz::story::run(bytes));
