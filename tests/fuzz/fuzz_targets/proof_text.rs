//! Reads proofs as text. What is accepted must survive being written as text, and as
//! bytes if its items close their tree, which the text reader does not look at and bytes need.
#![no_main]

use balk_checker::{Malformed, binary, text};
use libfuzzer_sys::fuzz_target;

fuzz_target!(|bytes: &[u8]| {
    let Ok(written) = std::str::from_utf8(bytes) else {
        return;
    };
    let proof = match text::read(written) {
        Ok(proof) => proof,
        Err(error) => {
            assert!(!error.to_string().is_empty());
            return;
        }
    };
    let again = text::write(&proof).expect("what was read can be written");
    assert_eq!(text::read(&again), Ok(proof.clone()));
    match binary::write(&proof) {
        Ok(bytes) => assert_eq!(binary::read(&bytes), Ok(proof)),
        Err(Malformed::Short | Malformed::Trailing) => {}
        Err(error) => panic!("what was read can be written: {error}"),
    }
});
