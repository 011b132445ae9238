//! Evidence of refusals: records, seals, and the log that numbers, chains and frames them.
//!
//! A controller writes one record a refusal into a [`Log`] and sends the log's bytes over a serial
//! line. Whoever has the machine's file screens the recorded target again and finds the same
//! bytes, or the record is not what it claims to be.
//!
//! # Layout, version 1
//!
//! Numbers are little-endian two's complement; fractions have 30 fraction bits. A record:
//!
//! | at | bytes | field |
//! |---|---|---|
//! | 0 | 1 | kind: `0xb1` |
//! | 1 | 1 | version: 1 |
//! | 2 | 4 | sequence number: 0 for a log's first record, then one more each, wrapping |
//! | 6 | 8 | chained digest |
//! | 14 | 8 | [`fingerprint`] of the machine |
//! | 22 | 2 | option `splits` |
//! | 24 | 2 | option `pivots` |
//! | 26 | 1 | option `candidates` |
//! | 27 | 1 | option `rules`: the bits of [`Rules`](crate::propagate::Rules) |
//! | 28 | 24 | position box: lower and upper bound of x, of y and of z, in the machine's scale |
//! | 52 | 1 | orientation: 0 free, 1 near a rotation, 2 axes in cones |
//! | | 0 | if 0: nothing |
//! | | 20 | if 1: quaternion w, x, y, z and half sine |
//! | | 1 + 28 n | if 2: number n of cones, then of each the tip axis, the base axis, the half sine |
//! | | 1 | number s of steps |
//! | | (s + 1) / 2 | steps, half a byte each, the lower half first; an unused half is 0 |
//! | | 4 | checksum: CRC-32C of all bytes before |
//!
//! A step from 0 to 13 cuts the span of that variable in its middle and is followed by the steps of
//! the lower part, then those of the upper part; 14 closes a part by propagation, 15 by rows.
//!
//! A seal, which says where the log ends:
//!
//! | at | bytes | field |
//! |---|---|---|
//! | 0 | 1 | kind: `0xb2` |
//! | 1 | 1 | version: 1 |
//! | 2 | 4 | sequence number of the next record |
//! | 6 | 8 | chained digest of the last record; 0 when there was none |
//! | 14 | 4 | records lost since the log's start, at most 2^32 - 1 |
//! | 18 | 4 | checksum: CRC-32C of all bytes before |
//!
//! On a line each of them is a frame of its own: a zero byte, the bytes stuffed so that none is
//! zero (COBS: Cheshire and Baker, *Consistent overhead byte stuffing*, IEEE/ACM Transactions on
//! Networking 7(2), 1999), a zero byte.
//!
//! # What the digest is worth
//!
//! A record's chained digest is CRC-64/XZ of the digest of the record before (0 before the first)
//! and of the record's own bytes without digest and checksum. It reveals that records were lost,
//! exchanged or reordered by mishap. It has no key and reveals **no forgery**: whoever can write a
//! log can write one whose digests fit. What a record claims is shown by screening again alone.

mod fingerprint;
mod read;
mod ring;
mod write;

pub use fingerprint::fingerprint;
pub use read::{Field, Frame, ReadError, Record, read};
pub use ring::{Log, NoRoom};
pub use write::{Chain, RecordBytes, Seal, chained, record};

use crate::screen::MOST_STEPS;
use crate::target::MOST_CONES;
use crc::{CRC_32_ISCSI, CRC_64_XZ, Crc, Table};

/// Version of the layout and of the rules that made a record.
pub const VERSION: u8 = 1;
/// Longest record: three cones and 64 splits.
pub const MOST_BYTES: usize =
    HEAD_BYTES + 24 + (2 + MOST_CONES * CONE_BYTES) + (1 + MOST_STEPS / 2) + CHECKSUM_BYTES;
/// Length of a seal.
pub const SEAL_BYTES: usize = 22;
/// Longest frame: a longest record, one stuffed byte and two zero bytes.
pub const MOST_FRAME_BYTES: usize = MOST_BYTES + 3;

/// Kind, version, sequence number, digest, fingerprint and options.
const HEAD_BYTES: usize = 28;
const CONE_BYTES: usize = 28;
const CHECKSUM_BYTES: usize = 4;
const RECORD_KIND: u8 = 0xb1;
const SEAL_KIND: u8 = 0xb2;
/// Half bytes that stand for the steps that close a part.
const BOUNDS_STEP: u8 = 14;
const ROWS_STEP: u8 = 15;

pub(crate) static CHECKSUM: Crc<u32, Table<1>> = Crc::<u32, Table<1>>::new(&CRC_32_ISCSI);
static DIGEST: Crc<u64, Table<1>> = Crc::<u64, Table<1>>::new(&CRC_64_XZ);
