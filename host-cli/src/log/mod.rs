//! Reads logs of refusals: items in order, and what is missing between them.
//!
//! A log comes in one of three forms, recognised from its content: frames as the controller sends
//! them ([`balk_core::record`]), lines that end in a record or seal in hexadecimal (what a
//! structured logger prints, lines about other things among them), or the JSON lines of `balk screen --json`. Nothing of a damaged item
//! is used; the items around it are still read. Memory does not grow with the log.

mod continuity;
mod frames;
mod lines;
mod replay;

pub use continuity::{Continuity, Finding};
pub use replay::{Mismatch, replay};

use std::fmt;
use std::io::{self, BufReader, Cursor, Read};

use balk_core::record::{Frame, Record, Seal};

use frames::Frames;
use lines::{HexLines, JsonLines};

use crate::read::Lines;

/// Bytes from which the form of a log is recognised.
const HEAD_BYTES: u64 = 4096;
/// Bytes read at a time.
const READ_BYTES: usize = 1 << 16;
/// Of text not even one byte in this many is a control character; of frames many are, because
/// small numbers are stuffed with small numbers.
const TEXT: usize = 16;
/// How lines of `balk screen --json` start.
const JSON_START: &[u8] = b"{\"schema\":";
/// Least digits at the end of a line that is a seal or a record.
const LEAST_DIGITS: usize = 2 * balk_core::record::SEAL_BYTES;

/// Why something is not read as a log at all.
#[derive(Debug, thiserror::Error)]
pub enum LogError {
    /// The source failed.
    #[error(transparent)]
    Source(#[from] io::Error),
    /// There is nothing in it.
    #[error("is empty; a log holds at least a seal")]
    Empty,
    /// Not one item of it can be read.
    #[error("holds no record and no seal that can be read")]
    Nothing,
    /// It is text of another kind.
    #[error(
        "is no log: neither frames between zero bytes, nor lines that end in a record in \
         hexadecimal, nor lines of JSON"
    )]
    Unknown,
}

/// Where an item lies in its log.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Place {
    /// Offset of its first byte, from 0.
    Byte(u64),
    /// Number of its line, from 1.
    Line(usize),
}

impl fmt::Display for Place {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Place::Byte(offset) => write!(f, "byte {offset}"),
            Place::Line(number) => write!(f, "line {number}"),
        }
    }
}

/// One item of a log.
#[derive(Clone, Debug)]
pub struct Item {
    /// Where it lies.
    pub place: Place,
    /// What was read.
    pub content: Content,
}

/// What an item is.
#[derive(Clone, Debug)]
pub enum Content {
    /// Neither a record nor a seal; why not.
    Damaged(String),
    /// The record of a refusal; no other bytes read as the same record.
    Record(Box<Record>),
    /// The end of what was logged so far.
    Seal(Seal),
}

impl Content {
    /// Reads the bytes of a record or a seal.
    fn of(bytes: &[u8]) -> Content {
        match balk_core::record::read(bytes) {
            Err(error) => Content::Damaged(error.to_string()),
            Ok(Frame::Seal(seal)) => Content::Seal(seal),
            Ok(Frame::Record(record)) => Content::Record(Box::new(record)),
        }
    }
}

type Source<R> = BufReader<io::Chain<Cursor<Vec<u8>>, R>>;

/// The items of a log, in order.
pub struct Items<R>(Reader<Source<R>>);

enum Reader<R> {
    Frames(Frames<R>),
    Hex(HexLines<R>),
    Json(JsonLines<R>),
}

impl<R: Read> Items<R> {
    /// Recognises the form of the log in `source`, which is waited for until 4096 bytes are there
    /// or none are left.
    ///
    /// # Errors
    /// See [`LogError`].
    pub fn open(mut source: R) -> Result<Items<R>, LogError> {
        let mut head = Vec::new();
        source.by_ref().take(HEAD_BYTES).read_to_end(&mut head)?;
        let form = Form::of(&head)?;
        let whole = BufReader::with_capacity(READ_BYTES, Cursor::new(head).chain(source));
        Ok(Items(match form {
            Form::Frames => Reader::Frames(Frames::new(whole)),
            Form::Hex => Reader::Hex(HexLines(Lines::new(whole))),
            Form::Json => Reader::Json(JsonLines(Lines::new(whole))),
        }))
    }

    /// Bytes of the log read so far.
    pub fn bytes(&self) -> u64 {
        match &self.0 {
            Reader::Frames(frames) => frames.bytes(),
            Reader::Hex(lines) => lines.0.bytes(),
            Reader::Json(lines) => lines.0.bytes(),
        }
    }
}

impl<R: Read> Iterator for Items<R> {
    type Item = io::Result<Item>;

    fn next(&mut self) -> Option<io::Result<Item>> {
        match &mut self.0 {
            Reader::Frames(frames) => frames.next_item(),
            Reader::Hex(lines) => lines.next_item(),
            Reader::Json(lines) => lines.next_item(),
        }
        .transpose()
    }
}

/// The form of a log.
enum Form {
    Frames,
    Hex,
    Json,
}

impl Form {
    /// The form of a log that begins with `head`. A few damaged bytes do not mislead.
    fn of(head: &[u8]) -> Result<Form, LogError> {
        if head.trim_ascii().is_empty() {
            return Err(LogError::Empty);
        }
        let control = |byte: &&u8| byte.is_ascii_control() && !byte.is_ascii_whitespace();
        if head.iter().filter(control).count() * TEXT > head.len() {
            return Ok(Form::Frames);
        }
        let mut lines = head.split(|byte| *byte == b'\n').map(<[u8]>::trim_ascii);
        if lines.clone().any(|line| line.starts_with(JSON_START)) {
            return Ok(Form::Json);
        }
        let hex = |line: &[u8]| {
            let digits = line
                .iter()
                .rev()
                .take_while(|byte| byte.is_ascii_hexdigit());
            digits.count() >= LEAST_DIGITS
        };
        if lines.any(hex) {
            Ok(Form::Hex)
        } else {
            Err(LogError::Unknown)
        }
    }
}
