//! Frames between zero bytes.

use std::io::{self, BufRead};

use balk_core::record::{MOST_BYTES, MOST_FRAME_BYTES};

use super::{Content, Item, Place};

/// Longest stuffed frame without its zero bytes.
const MOST_STUFFED: usize = MOST_FRAME_BYTES - 2;

/// Reads what lies between zero bytes.
pub struct Frames<R> {
    source: R,
    bytes: u64,
}

impl<R: BufRead> Frames<R> {
    pub(super) fn new(source: R) -> Self {
        Frames { source, bytes: 0 }
    }

    pub(super) fn bytes(&self) -> u64 {
        self.bytes
    }

    /// The next frame that is not empty, or `None` at the end.
    pub(super) fn next_item(&mut self) -> io::Result<Option<Item>> {
        // Never more than one byte beyond the longest frame is held.
        let mut stuffed = Vec::with_capacity(MOST_STUFFED + 1);
        let mut place = self.bytes;
        loop {
            let available = match self.source.fill_buf() {
                Err(error) if error.kind() == io::ErrorKind::Interrupted => continue,
                other => other?,
            };
            if available.is_empty() {
                return Ok((!stuffed.is_empty()).then(|| Item {
                    place: Place::Byte(place),
                    content: Content::Damaged("cut off: no zero byte at its end".to_owned()),
                }));
            }
            let end = available.iter().position(|byte| *byte == 0);
            let part = &available[..end.unwrap_or(available.len())];
            let room = MOST_STUFFED + 1 - stuffed.len();
            stuffed.extend_from_slice(&part[..part.len().min(room)]);
            let used = end.map_or(available.len(), |end| end + 1);
            self.source.consume(used);
            self.bytes += used as u64;
            if end.is_some() {
                if !stuffed.is_empty() {
                    return Ok(Some(Item {
                        place: Place::Byte(place),
                        content: content(&stuffed),
                    }));
                }
                place = self.bytes;
            }
        }
    }
}

/// What a stuffed frame holds.
fn content(stuffed: &[u8]) -> Content {
    if stuffed.len() > MOST_STUFFED {
        return Content::Damaged("longer than any frame".to_owned());
    }
    let mut bytes = [0; MOST_BYTES + 1];
    match cobs::decode(stuffed, &mut bytes) {
        Ok(report) => Content::of(&bytes[..report.frame_size()]),
        Err(_) => Content::Damaged("not stuffed as a frame is".to_owned()),
    }
}
