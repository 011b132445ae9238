//! Writes records and seals, and numbers and chains them.

use super::{
    BOUNDS_STEP, CHECKSUM, CHECKSUM_BYTES, DIGEST, MOST_BYTES, RECORD_KIND, ROWS_STEP, Record,
    SEAL_BYTES, SEAL_KIND, VERSION,
};
use crate::propagate::Rules;
use crate::screen::{Options, Refusal, Step};
use crate::target::{Orientation, Target};
use core::ops::Deref;
use heapless::Vec;

/// Where the digest begins, and where it ends.
const DIGEST_AT: usize = 6;
const AFTER_DIGEST: usize = 14;

/// The bytes of one record.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RecordBytes(Vec<u8, MOST_BYTES>);

/// The record of a refusal, as the first of a log; a [`Chain`] or a [`Log`](super::Log) gives it
/// another place.
///
/// `fingerprint` is that of the machine that was screened, `target` and `options` are those given
/// to [`screen`](crate::screen::screen). Cost: a few operations a byte.
pub fn record(
    fingerprint: u64,
    target: &Target,
    options: &Options,
    refusal: &Refusal<'_>,
) -> RecordBytes {
    let mut bytes = unnumbered(fingerprint, target, options, refusal.steps());
    Chain::new().add(&mut bytes);
    bytes
}

impl Record {
    /// The record as bytes again. Fields outside their documented ranges give bytes that do not read
    /// back.
    pub fn bytes(&self) -> RecordBytes {
        let mut bytes = unnumbered(self.fingerprint, &self.target, &self.options, &self.steps);
        bytes.place(self.sequence, self.digest);
        bytes
    }
}

fn unnumbered(fingerprint: u64, target: &Target, options: &Options, steps: &[Step]) -> RecordBytes {
    let mut bytes = RecordBytes(Vec::new());
    bytes.put(&[RECORD_KIND, VERSION]);
    // The sequence number and the digest.
    bytes.put(&[0; AFTER_DIGEST - 2]);
    bytes.put(&fingerprint.to_le_bytes());
    bytes.put(&options.splits.to_le_bytes());
    bytes.put(&options.pivots.to_le_bytes());
    bytes.put(&[options.candidates, options.rules.0 & Rules::ALL.0]);
    for bounds in &target.position {
        bytes.numbers(&[bounds.lo, bounds.hi]);
    }
    match &target.orientation {
        Orientation::Free => bytes.put(&[0]),
        Orientation::Near {
            quaternion,
            half_sine,
        } => {
            bytes.put(&[1]);
            bytes.numbers(quaternion);
            bytes.numbers(&[*half_sine]);
        }
        Orientation::Axes(cones) => {
            bytes.put(&[2, cones.len() as u8]);
            for cone in cones {
                bytes.numbers(&cone.tip);
                bytes.numbers(&cone.base);
                bytes.numbers(&[cone.half_sine]);
            }
        }
    }
    bytes.put(&[steps.len() as u8]);
    for pair in steps.chunks(2) {
        let half = |step: Option<&Step>| match step {
            Some(Step::Cut(variable)) => (*variable).min(BOUNDS_STEP - 1),
            Some(Step::Bounds) => BOUNDS_STEP,
            Some(Step::Rows) => ROWS_STEP,
            None => 0,
        };
        bytes.put(&[half(pair.first()) | (half(pair.get(1)) << 4)]);
    }
    bytes.put(&[0; CHECKSUM_BYTES]);
    bytes
}

impl RecordBytes {
    /// Adds bytes. All there ever are fit, because the capacity is the sum of the largest parts.
    fn put(&mut self, part: &[u8]) {
        let _ = self.0.extend_from_slice(part);
    }

    fn numbers(&mut self, numbers: &[i32]) {
        for number in numbers {
            self.put(&number.to_le_bytes());
        }
    }

    /// Overwrites bytes from `at` on.
    fn overwrite(&mut self, at: usize, part: &[u8]) {
        if let Some(place) = self.0.get_mut(at..at + part.len()) {
            place.copy_from_slice(part);
        }
    }

    /// Gives the record a sequence number and a digest, and the checksum that follows from them.
    pub fn place(&mut self, sequence: u32, digest: u64) {
        self.overwrite(2, &sequence.to_le_bytes());
        self.overwrite(DIGEST_AT, &digest.to_le_bytes());
        let end = self.0.len().saturating_sub(CHECKSUM_BYTES);
        let checksum = CHECKSUM.checksum(self.0.get(..end).unwrap_or_default());
        self.overwrite(end, &checksum.to_le_bytes());
    }
}

impl Deref for RecordBytes {
    type Target = [u8];

    fn deref(&self) -> &[u8] {
        &self.0
    }
}

/// Prints kind, sequence number and digest, and as the last word all bytes in hexadecimal.
#[cfg(feature = "defmt")]
impl defmt::Format for RecordBytes {
    fn format(&self, f: defmt::Formatter<'_>) {
        if let Ok(super::Frame::Record(record)) = super::read(self) {
            defmt::write!(
                f,
                "refusal {=u32} digest {=u64:016x} ",
                record.sequence,
                record.digest
            );
        }
        for byte in self.iter() {
            defmt::write!(f, "{=u8:02x}", *byte);
        }
    }
}

/// The chained digest of a record that follows one whose digest is `previous` (0: none).
///
/// `record` are a record's bytes with any digest and checksum; neither is looked at.
pub fn chained(previous: u64, record: &[u8]) -> u64 {
    let end = record.len().saturating_sub(CHECKSUM_BYTES);
    let mut digest = DIGEST.digest();
    digest.update(&previous.to_le_bytes());
    digest.update(record.get(..DIGEST_AT).unwrap_or_default());
    digest.update(record.get(AFTER_DIGEST..end).unwrap_or_default());
    digest.finalize()
}

/// Numbers and chains the records of one log.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Chain {
    next: u32,
    digest: u64,
}

impl Chain {
    /// The chain of a log without records.
    pub const fn new() -> Chain {
        Chain { next: 0, digest: 0 }
    }

    /// Makes `record` the next of the log; returns its sequence number.
    pub fn add(&mut self, record: &mut RecordBytes) -> u32 {
        let sequence = self.next;
        record.place(sequence, 0);
        self.digest = chained(self.digest, record);
        record.place(sequence, self.digest);
        self.next = sequence.wrapping_add(1);
        sequence
    }

    /// The seal of the log as it is now, of whose records `lost` were lost.
    pub fn seal(&self, lost: u32) -> Seal {
        Seal {
            next: self.next,
            digest: self.digest,
            lost,
        }
    }
}

/// Where a log ends.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt", derive(defmt::Format))]
pub struct Seal {
    /// Sequence number of the next record, should there be one.
    pub next: u32,
    /// Chained digest of the last record; 0 when there was none.
    pub digest: u64,
    /// Records lost since the log's start, before they could be sent, when the seal was made.
    pub lost: u32,
}

impl Seal {
    /// The seal as bytes.
    pub fn bytes(&self) -> [u8; SEAL_BYTES] {
        let [n0, n1, n2, n3] = self.next.to_le_bytes();
        let [d0, d1, d2, d3, d4, d5, d6, d7] = self.digest.to_le_bytes();
        let [l0, l1, l2, l3] = self.lost.to_le_bytes();
        let body = [
            SEAL_KIND, VERSION, n0, n1, n2, n3, d0, d1, d2, d3, d4, d5, d6, d7, l0, l1, l2, l3,
        ];
        let mut bytes = [0; SEAL_BYTES];
        let checksum = CHECKSUM.checksum(&body).to_le_bytes();
        for (to, from) in bytes.iter_mut().zip(body.iter().chain(&checksum)) {
            *to = *from;
        }
        bytes
    }
}
