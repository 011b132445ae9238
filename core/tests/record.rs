//! Records and seals: layout, round trip, and every way they can be wrong.

mod common;

use balk_core::fixed::{Interval, ONE};
use balk_core::propagate::Rules;
use balk_core::record::{
    Chain, Field, Frame, MOST_BYTES, ReadError, Record, SEAL_BYTES, Seal, chained, read,
};
use balk_core::screen::{Options, Step};
use balk_core::target::{Orientation, Target};
use common::Numbers;

/// A reflected cyclic redundancy check, bit by bit.
fn crc(polynomial: u64, width: u32, bytes: &[u8]) -> u64 {
    let ones = u64::MAX >> (64 - width);
    let shift = |sum: u64, _| (sum >> 1) ^ (polynomial * (sum & 1));
    let byte = |sum: u64, byte: &u8| (0..8).fold(sum ^ u64::from(*byte), shift);
    bytes.iter().fold(ones, byte) ^ ones
}

/// CRC-32C; polynomial 0x1edc6f41, reflected.
fn crc32c(bytes: &[u8]) -> [u8; 4] {
    (crc(0x82f6_3b78, 32, bytes) as u32).to_le_bytes()
}

/// CRC-64/XZ; polynomial 0x42f0e1eba9ea3693, reflected.
fn crc64(bytes: &[u8]) -> [u8; 8] {
    crc(0xc96c_5795_d787_0f42, 64, bytes).to_le_bytes()
}

/// `bytes` with the checksum that belongs to them.
fn checked(mut bytes: Vec<u8>) -> Vec<u8> {
    let end = bytes.len() - 4;
    let checksum = crc32c(&bytes[..end]);
    bytes[end..].copy_from_slice(&checksum);
    bytes
}

fn small() -> Record {
    Record {
        sequence: 0x0403_0201,
        digest: 0x1817_1615_1413_1211,
        fingerprint: 0x2827_2625_2423_2221,
        options: Options {
            splits: 4,
            pivots: 0x0102,
            candidates: 2,
            rules: Rules::ALL,
        },
        target: Target {
            position: [1, 2, 3].map(|k| Interval { lo: -k, hi: k }),
            orientation: Orientation::Free,
        },
        steps: [Step::Cut(5), Step::Bounds, Step::Rows]
            .into_iter()
            .collect(),
    }
}

fn error(bytes: &[u8]) -> ReadError {
    read(bytes).expect_err("the bytes are wrong")
}

fn record_of(bytes: &[u8]) -> Record {
    match read(bytes) {
        Ok(Frame::Record(record)) => record,
        other => panic!("{other:?}"),
    }
}

#[test]
fn a_record_has_the_documented_layout() {
    let mut expected = vec![0xb1, 1, 1, 2, 3, 4];
    expected.extend(0x11..=0x18);
    expected.extend(0x21..=0x28);
    expected.extend([4, 0, 2, 1, 2, 0x7f]);
    for k in [1i32, 2, 3] {
        expected.extend((-k).to_le_bytes());
        expected.extend(k.to_le_bytes());
    }
    expected.extend([0, 3, 5 | (14 << 4), 15]);
    let checksum = crc32c(&expected);
    expected.extend(checksum);
    assert_eq!(*small().bytes(), *expected);
}

#[test]
fn a_seal_has_the_documented_layout() {
    let seal = Seal {
        next: 0x0403_0201,
        digest: 0x1817_1615_1413_1211,
        lost: 7,
    };
    let mut expected = vec![0xb2, 1, 1, 2, 3, 4];
    expected.extend(0x11..=0x18);
    expected.extend([7, 0, 0, 0]);
    let checksum = crc32c(&expected);
    expected.extend(checksum);
    assert_eq!(seal.bytes(), *expected);
    assert!(matches!(read(&expected), Ok(Frame::Seal(found)) if found == seal));
}

#[test]
fn a_chain_numbers_and_digests() {
    let mut chain = Chain::new();
    let mut previous = [0; 8];
    for number in 0..3u32 {
        let mut bytes = small().bytes();
        assert_eq!(chain.add(&mut bytes), number);
        let mut summed = previous.to_vec();
        summed.extend([0xb1, 1]);
        summed.extend(number.to_le_bytes());
        summed.extend(&bytes[14..bytes.len() - 4]);
        let record = record_of(&bytes);
        assert_eq!(record.sequence, number);
        assert_eq!(record.digest.to_le_bytes(), crc64(&summed));
        assert_eq!(record.digest, chained(u64::from_le_bytes(previous), &bytes));
        previous = record.digest.to_le_bytes();
    }
    let seal = chain.seal(9);
    assert_eq!(
        (seal.next, seal.digest.to_le_bytes(), seal.lost),
        (3, previous, 9)
    );
}

#[test]
fn what_is_written_reads_back_with_equal_fields() {
    let mut numbers = Numbers(1);
    for round in 0..4000 {
        let cones = [None, Some(0), Some(1), Some(2), Some(3)][round % 5];
        let parts = 1 + numbers.below(64);
        let record = numbers.record(parts, cones);
        let bytes = record.bytes();
        let found = record_of(&bytes);
        assert_eq!(format!("{found:?}"), format!("{record:?}"));
        assert_eq!(found.bytes(), bytes);
    }
}

#[test]
fn the_longest_record_is_as_long_as_stated() {
    let longest = Numbers(2).record(64, Some(3)).bytes();
    assert_eq!(longest.len(), MOST_BYTES);
    const { assert!(MOST_BYTES <= 256) }
    record_of(&longest);
}

#[test]
fn every_defect_has_its_name() {
    let good = small().bytes().to_vec();
    let orientation = 52;
    let with = |at: usize, byte: u8| {
        let mut bytes = good.clone();
        bytes[at] = byte;
        checked(bytes)
    };
    // With other bytes from the orientation on.
    let tail = |tail: &[u8]| {
        let mut bytes = good[..orientation].to_vec();
        bytes.extend(tail);
        bytes.extend([0; 4]);
        checked(bytes)
    };
    let cone = |axis: [i32; 3], half_sine: i32| {
        let numbers = [axis, [0, 0, ONE]].concat().into_iter().chain([half_sine]);
        let mut bytes = vec![2, 1];
        bytes.extend(numbers.flat_map(i32::to_le_bytes));
        bytes.extend([1, 14]);
        tail(&bytes)
    };
    let up = [0, 0, ONE];
    for length in 0..good.len() {
        let expected = match length {
            0..32 => ReadError::TooShort,
            _ => ReadError::Checksum,
        };
        assert_eq!(error(&good[..length]), expected, "{length}");
    }
    let flipped = {
        let mut bytes = good.clone();
        bytes[30] ^= 1;
        bytes
    };
    let wrong = [
        (with(0, 0xb3), ReadError::Kind(0xb3)),
        (with(1, 2), ReadError::Version(2)),
        (flipped, ReadError::Checksum),
        (with(27, 0x80), ReadError::Range(Field::Rules)),
        // A lower bound of about -1.5.
        (with(31, 0xa0), ReadError::Range(Field::Position)),
        (tail(&[3, 1, 14]), ReadError::Orientation(3)),
        (tail(&[1, 1, 14]), ReadError::TooShort),
        (tail(&[2, 1, 1, 14]), ReadError::TooShort),
        (cone([0, 0, ONE - 3], 0), ReadError::Range(Field::Axis)),
        (cone([i32::MIN; 3], 0), ReadError::Range(Field::Axis)),
        (cone(up, -1), ReadError::Range(Field::HalfSine)),
        (cone(up, ONE + 1), ReadError::Range(Field::HalfSine)),
        (tail(&[0, 0]), ReadError::Tree),
        // A cut with one part closed; two parts where there is one; five where four are allowed.
        (tail(&[0, 2, 0xe5]), ReadError::Tree),
        (tail(&[0, 2, 0xee]), ReadError::Tree),
        (tail(&[0, 9, 0, 0, 0xee, 0xee, 0x0e]), ReadError::Tree),
        (tail(&[0, 3, 0xe8, 0x0e]), ReadError::Variable(8)),
        (tail(&[0, 3, 0xed, 0x0e]), ReadError::Variable(13)),
        (
            tail(&[&[0, 255][..], &[0; 128]].concat()),
            ReadError::Steps(255),
        ),
        (tail(&[0, 1, 0x1e]), ReadError::Leftover(0)),
        (tail(&[0, 1, 0x0e, 0]), ReadError::Leftover(1)),
        (tail(&[0, 3, 0xe5]), ReadError::TooShort),
    ];
    for (bytes, expected) in wrong {
        assert_eq!(error(&bytes), expected, "{bytes:02x?}");
        assert!(!expected.to_string().is_empty());
    }
    let seal = Chain::new().seal(0).bytes();
    assert_eq!(error(&seal[..SEAL_BYTES - 1]), ReadError::TooShort);
    let longer = checked([&seal[..18], &[0; 5]].concat());
    assert_eq!(error(&longer), ReadError::Leftover(1));
    record_of(&cone([0, 0, ONE - 2], ONE));
    record_of(&tail(&[0, 1, 15]));
}

#[test]
fn four_cones_are_too_many() {
    let three = Numbers(3).record(1, Some(3)).bytes();
    let mut bytes = three[..52].to_vec();
    bytes.extend([2, 4]);
    bytes.extend(&three[54..54 + 84]);
    bytes.extend(&three[54..54 + 28]);
    bytes.extend([1, 14, 0, 0, 0, 0]);
    assert_eq!(error(&checked(bytes)), ReadError::Cones(4));
}

#[test]
fn values_that_mean_nothing_do_not_read_back() {
    let mut record = small();
    record.steps[0] = Step::Cut(200);
    assert_eq!(error(&record.bytes()), ReadError::Variable(13));
    let mut record = small();
    record.options.rules = Rules(0xff);
    assert_eq!(record_of(&record.bytes()).options.rules, Rules::ALL);
}

#[test]
fn any_bytes_give_a_frame_or_an_error() {
    let mut numbers = Numbers(4);
    let mut read_back = 0;
    for round in 0..200_000 {
        let bytes = if round % 4 == 0 {
            (0..numbers.below(300))
                .map(|_| numbers.next() as u8)
                .collect()
        } else {
            // A record with some bytes exchanged and the checksum made to fit.
            let parts = 1 + numbers.below(8);
            let cones = [None, Some(1), Some(3)][numbers.below(3)];
            let mut bytes = numbers.record(parts, cones).bytes().to_vec();
            for _ in 0..numbers.below(4) {
                let at = numbers.below(bytes.len());
                bytes[at] = numbers.next() as u8;
            }
            bytes.truncate(bytes.len() - numbers.below(3));
            checked(bytes)
        };
        match read(&bytes) {
            // Nothing else gives the same frame.
            Ok(Frame::Record(record)) => {
                assert_eq!(*record.bytes(), *bytes);
                read_back += 1;
            }
            Ok(Frame::Seal(seal)) => assert_eq!(seal.bytes(), *bytes),
            Err(_) => {}
        }
    }
    assert!(read_back > 10_000, "{read_back}");
}
