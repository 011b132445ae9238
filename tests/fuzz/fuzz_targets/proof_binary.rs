//! Reads proofs from any bytes. What is accepted must be written as the same bytes, survive being
//! written as text, and be checked without a panic against its own target.
//!
//! # The digests
//! The one at the end would keep the fuzzer out, so the bytes are read as they are and once more
//! with their last 32 replaced by the right digest. And a proof of another machine is turned down
//! at once, so the machine's digest and the tip are replaced by those of a machine before checking.
#![no_main]

use std::sync::LazyLock;

use balk_checker::{Checker, binary, text};
use balk_fuzz::{FILES, MACHINES};
use libfuzzer_sys::fuzz_target;
use sha2::{Digest, Sha256};

static CHECKERS: LazyLock<Vec<(Checker, String)>> = LazyLock::new(|| {
    FILES
        .iter()
        .zip(MACHINES.iter())
        .map(|(file, machine)| {
            let tip = machine.tips[0].name.clone();
            let checker = Checker::new(file, &tip).expect("the files are good");
            (checker, tip)
        })
        .collect()
});

fn check(bytes: &[u8]) {
    let Ok(mut proof) = binary::read(bytes) else {
        return;
    };
    assert_eq!(binary::write(&proof).as_deref(), Ok(bytes));
    let written = text::write(&proof).expect("what was read can be written");
    assert_eq!(text::read(&written), Ok(proof.clone()));
    for (checker, tip) in CHECKERS.iter() {
        proof.machine = checker.digest();
        proof.tip = tip.clone();
        let line = proof.target.clone();
        let first = checker.check(&proof, &line);
        assert_eq!(first, checker.check(&proof, &line));
    }
}

fuzz_target!(|bytes: &[u8]| {
    check(bytes);
    let mut repaired = bytes.to_vec();
    if let Some((body, digest)) = repaired.split_last_chunk_mut::<32>() {
        *digest = Sha256::digest(&*body).into();
    }
    check(&repaired);
});
