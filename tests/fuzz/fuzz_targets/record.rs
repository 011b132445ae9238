//! Reads records and seals from any bytes. What is accepted must be written as the same bytes.
//!
//! # The checksum
//! It would keep the fuzzer out, so the bytes are read as they are and once more with their last
//! four replaced by the right checksum.
#![no_main]

use balk_core::record::{Frame, read};
use libfuzzer_sys::fuzz_target;

fn check(bytes: &[u8]) {
    match read(bytes) {
        Ok(Frame::Record(record)) => assert_eq!(&*record.bytes(), bytes),
        Ok(Frame::Seal(seal)) => assert_eq!(seal.bytes(), bytes),
        Err(error) => assert!(!error.to_string().is_empty()),
    }
}

fuzz_target!(|bytes: &[u8]| {
    check(bytes);
    let mut repaired = bytes.to_vec();
    balk_fuzz::repair_checksum(&mut repaired);
    check(&repaired);
});
