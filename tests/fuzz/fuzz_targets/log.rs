//! Reads logs in all three forms. The items must be the same however the bytes arrive, their places
//! must rise, records must be written as they were read, and continuity must never fail.
//!
//! # The checksum
//! It would keep the fuzzer out. Beside the bytes as they are, the pieces between zero bytes are
//! given the right checksum and logged as frames, as hexadecimal and as JSON.
#![no_main]

use std::io::Read;

use balk::log::{Content, Continuity, Items, Place};
use libfuzzer_sys::fuzz_target;

/// A source that gives a few bytes at a time.
struct Trickle<'a>(&'a [u8], usize);

impl Read for Trickle<'_> {
    fn read(&mut self, buffer: &mut [u8]) -> std::io::Result<usize> {
        self.1 = self.1 % 7 + 1;
        let count = self.1.min(buffer.len()).min(self.0.len());
        let (head, rest) = self.0.split_at(count);
        buffer[..count].copy_from_slice(head);
        self.0 = rest;
        Ok(count)
    }
}

/// Everything read from a source, as text.
fn items(source: impl Read) -> Result<Vec<String>, String> {
    let mut continuity = Continuity::new();
    let mut last = 0;
    let mut found = Vec::new();
    for item in Items::open(source).map_err(|error| error.to_string())? {
        let item = item.expect("a slice never fails");
        let place = match item.place {
            Place::Byte(byte) => byte + 1,
            Place::Line(line) => line as u64,
        };
        assert!(place > last, "places rise");
        last = place;
        if let Content::Record(record) = &item.content {
            let again = balk_core::record::read(&record.bytes());
            assert!(again.is_ok(), "a record reads back: {again:?}");
        }
        let finding = continuity.see(&item.content);
        found.push(format!("{item:?} {finding:?}"));
    }
    found.push(format!("{:?}", continuity.end()));
    Ok(found)
}

fn check(bytes: &[u8]) {
    let whole = items(bytes);
    assert_eq!(whole, items(Trickle(bytes, 0)));
    if let Ok(found) = whole {
        assert!(found.len() <= bytes.len() + 1);
    }
}

fuzz_target!(|bytes: &[u8]| {
    check(bytes);
    let (mut frames, mut hex, mut json) = (vec![0], String::new(), String::new());
    for piece in bytes
        .split(|byte| *byte == 0)
        .filter(|piece| !piece.is_empty())
    {
        let mut body = vec![0; piece.len()];
        let length = cobs::decode(piece, &mut body).map_or(0, |report| report.frame_size());
        body.truncate(length);
        balk_fuzz::repair_checksum(&mut body);
        let mut stuffed = vec![0; cobs::max_encoding_length(body.len())];
        let length = cobs::encode(&body, &mut stuffed);
        frames.extend_from_slice(&stuffed[..length]);
        frames.push(0);
        let digits = balk_fuzz::hex(&body);
        hex += &format!("refused {digits}\n");
        let key = if body.first() == Some(&0xb2) {
            "seal"
        } else {
            "record"
        };
        json += &format!("{{\"schema\":1,\"{key}\":\"{digits}\"}}\n");
    }
    check(&frames);
    check(hex.as_bytes());
    check(json.as_bytes());
});
