//! Feeds random bytes to the check of the same name.
#![no_main]

#[path = "../archive.rs"]
mod archive;

libfuzzer_sys::fuzz_target!(|data: &[u8]| archive::archive(data));
