#![no_main]
libfuzzer_sys::fuzz_target!(|data: &[u8]| reelgate_fuzz::label(data));
