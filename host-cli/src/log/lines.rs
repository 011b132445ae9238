//! Lines of hexadecimal digits or of JSON.

use std::io::{self, BufRead};

use serde::Deserialize;

use super::{Content, Item, LEAST_DIGITS, Place};
use crate::read::{Line, Lines, MAX_LINE_BYTES};

/// Reads lines whose last word is a record or a seal in hexadecimal. Lines with a shorter last word
/// are another's: what a record cut so short leaves is a gap in the numbers.
pub struct HexLines<R>(pub(super) Lines<R>);

impl<R: BufRead> HexLines<R> {
    pub(super) fn next_item(&mut self) -> io::Result<Option<Item>> {
        while let Some(line) = self.0.next_line()? {
            let mut long = true;
            let item = item(&line, |bytes| {
                let space = bytes.iter().rposition(u8::is_ascii_whitespace);
                let word = &bytes[space.map_or(0, |space| space + 1)..];
                long = word.len() >= LEAST_DIGITS;
                hex(word)
            });
            if long {
                return Ok(Some(item));
            }
        }
        Ok(None)
    }
}

/// Reads the lines of `balk screen --json`; those that passed a target or reject a line of the
/// targets' file hold nothing to be read.
pub struct JsonLines<R>(pub(super) Lines<R>);

/// What is looked at in a line of JSON.
#[derive(Deserialize)]
struct Row {
    schema: u32,
    verdict: Option<String>,
    record: Option<String>,
    seal: Option<String>,
}

impl<R: BufRead> JsonLines<R> {
    pub(super) fn next_item(&mut self) -> io::Result<Option<Item>> {
        while let Some(line) = self.0.next_line()? {
            let mut nothing = false;
            let item = item(&line, |bytes| {
                let row: Row = match serde_json::from_slice(bytes) {
                    Ok(row) => row,
                    Err(error) => {
                        let column = error.column();
                        return Content::Damaged(format!("no row of a screening: column {column}"));
                    }
                };
                nothing = matches!(row.verdict.as_deref(), Some("passed" | "error"));
                match (row.schema, row.record, row.seal) {
                    (1, Some(record), None) => hex(record.as_bytes()),
                    (1, None, Some(seal)) => hex(seal.as_bytes()),
                    (1, ..) => Content::Damaged("neither a record nor a seal".to_owned()),
                    (schema, ..) => Content::Damaged(format!("unknown schema {schema}")),
                }
            });
            if !nothing {
                return Ok(Some(item));
            }
        }
        Ok(None)
    }
}

/// The item on a line.
fn item(line: &Line, content: impl FnOnce(&[u8]) -> Content) -> Item {
    let content = match &line.bytes {
        Some(bytes) => content(bytes),
        None => Content::Damaged(format!("longer than {MAX_LINE_BYTES} bytes")),
    };
    Item {
        place: Place::Line(line.number),
        content,
    }
}

/// What hexadecimal digits stand for.
fn hex(digits: &[u8]) -> Content {
    let digit = |byte: u8| char::from(byte).to_digit(16).map(|digit| digit as u8);
    let pair = |pair: &[u8]| match pair {
        [high, low] => Some((digit(*high)? << 4) | digit(*low)?),
        _ => None,
    };
    match digits.chunks(2).map(pair).collect::<Option<Vec<u8>>>() {
        Some(bytes) => Content::of(&bytes),
        None => Content::Damaged("not pairs of hexadecimal digits".to_owned()),
    }
}
