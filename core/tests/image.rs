//! Images of packed machines: what is written loads, and nothing else does.

#[allow(dead_code, reason = "of the common things only the numbers are used")]
mod common;

use balk_core::fixed::{Arc, Direction, Interval, ONE, Product};
use balk_core::image::{Field, ImageError, MOST_BYTES, bytes_for, image, load, table};
use balk_core::machine::{Joint, Machine, Motion, Placement, Variable};
use balk_core::record::fingerprint;
use common::Numbers;
use crc::{CRC_32_ISCSI, Crc};

const STRAIGHT: Placement = Placement {
    rotation: [[ONE, 0, 0], [0, ONE, 0], [0, 0, ONE]],
    turn_slack: 2,
    origin: [
        Interval { lo: 1000, hi: 1003 },
        Interval::ZERO,
        Interval { lo: -7, hi: ONE },
    ],
    back: [Interval::ZERO, Interval::point(-5), Interval::UNIT],
    square: Product {
        lo: -(1 << 12),
        hi: 1 << 40,
    },
};
const TURN: Variable = Variable {
    arc: Arc {
        lo: Direction::SOUTH,
        hi: Direction {
            x: 644_245_094,
            y: 858_993_459,
        },
        full: false,
    },
    length: Interval::ZERO,
    motion: Motion::Turn,
};
const SLIDE: Variable = Variable {
    arc: Arc::FULL,
    length: Interval { lo: -3, hi: 40 },
    motion: Motion::Slide,
};
const TURNS: Joint = Joint {
    motion: Motion::Turn,
    placement: STRAIGHT,
    variable: 0,
    multiple: 1,
    turn: Arc {
        lo: Direction::EAST,
        hi: Direction::EAST,
        full: false,
    },
    shift: Interval::ZERO,
};
const SLIDES: Joint = Joint {
    motion: Motion::Slide,
    variable: 1,
    multiple: -127,
    turn: Arc::FULL,
    shift: Interval { lo: 9, hi: 10 },
    ..TURNS
};
/// Made at compile time, as packed machines in firmware are.
static MACHINE: Machine<3> = table([TURNS, SLIDES, TURNS], [TURN, SLIDE], STRAIGHT, -3);

/// Where the variables begin, the joints, and the tip's placement.
const VARIABLES: usize = 16;
const JOINTS: usize = VARIABLES + 2 * 26;
const TIP: usize = JOINTS + 3 * 132;

fn bytes() -> Vec<u8> {
    image(&MACHINE).to_vec()
}

/// Gives changed bytes the checksum that fits.
fn summed(mut bytes: Vec<u8>) -> Vec<u8> {
    let end = bytes.len() - 4;
    let checksum = Crc::<u32>::new(&CRC_32_ISCSI).checksum(&bytes[..end]);
    bytes[end..].copy_from_slice(&checksum.to_le_bytes());
    bytes
}

/// The error of loading into room for eight joints.
fn error(bytes: &[u8]) -> Option<ImageError> {
    load::<8>(bytes).err()
}

/// The error once the bytes from `at` on are replaced and the checksum fits again.
fn error_with(at: usize, part: &[u8]) -> Option<ImageError> {
    let mut bytes = bytes();
    bytes[at..at + part.len()].copy_from_slice(part);
    error(&summed(bytes))
}

#[test]
fn a_written_image_loads_as_the_same_machine() {
    let loaded = load::<3>(&bytes()).unwrap();
    assert_eq!(format!("{loaded:?}"), format!("{MACHINE:?}"));
    assert_eq!(fingerprint(&loaded), fingerprint(&MACHINE));
    assert_eq!(image(&loaded), image(&MACHINE));
    assert_eq!(bytes().len(), bytes_for(3, 2));
    // Room for more joints changes nothing.
    assert_eq!(image(&load::<8>(&bytes()).unwrap()), image(&MACHINE));
}

#[test]
fn the_largest_machine_fits() {
    let largest: Machine<8> = table([TURNS; 8], [TURN; 8], STRAIGHT, 0);
    let bytes = image(&largest);
    assert_eq!(bytes.len(), MOST_BYTES);
    assert_eq!(image(&load::<8>(&bytes).unwrap()), bytes);
}

#[test]
fn a_machine_without_joints_loads() {
    let none: Machine<0> = table([], [], STRAIGHT, 1);
    assert_eq!(image(&load::<0>(&image(&none)).unwrap()), image(&none));
}

#[test]
fn every_way_to_be_foreign_has_its_error() {
    assert_eq!(error(b""), Some(ImageError::TooShort));
    assert_eq!(error(b"bal"), Some(ImageError::TooShort));
    assert_eq!(error(b"\x7fELF"), Some(ImageError::NotAnImage));
    assert_eq!(error(b"b"), Some(ImageError::TooShort));
    assert_eq!(error(b"x"), Some(ImageError::NotAnImage));
    assert_eq!(error_with(4, &[2]), Some(ImageError::Version(2)));
    let whole = bytes();
    for length in 0..whole.len() {
        assert_eq!(error(&whole[..length]), Some(ImageError::TooShort));
    }
    let longer = [&whole[..], &[0, 0]].concat();
    assert_eq!(error(&longer), Some(ImageError::Leftover(2)));
}

#[test]
fn too_little_room_is_said() {
    assert_eq!(load::<2>(&bytes()).err(), Some(ImageError::Capacity(3)));
    // More joints than any preset holds, though the checksum fits.
    let mut bytes = bytes();
    bytes[6] = 9;
    bytes.resize(bytes_for(9, 2), 0);
    assert_eq!(
        load::<20>(&summed(bytes)).err(),
        Some(ImageError::Capacity(9))
    );
}

#[test]
fn every_flipped_bit_is_found() {
    let whole = bytes();
    for bit in 0..whole.len() * 8 {
        let mut bytes = whole.clone();
        bytes[bit / 8] ^= 1 << (bit % 8);
        let expected = match bit / 8 {
            0..4 => ImageError::NotAnImage,
            4 => ImageError::Version(bytes[4]),
            5 | 6 => match bytes
                .len()
                .checked_sub(bytes_for(bytes[6].into(), bytes[5].into()))
            {
                Some(left) => ImageError::Leftover(left),
                None => ImageError::TooShort,
            },
            _ => ImageError::Checksum,
        };
        assert_eq!(error(&bytes), Some(expected), "bit {bit}");
    }
}

#[test]
fn values_out_of_range_are_refused_though_the_checksum_fits() {
    let range = |field, index| Some(ImageError::Range { field, index });
    let two = (ONE + 1).to_le_bytes();
    let five = 5i32.to_le_bytes();
    let million = 1_000_000i32.to_le_bytes();
    assert_eq!(error_with(VARIABLES, &[2]), range(Field::Motion, 0));
    assert_eq!(error_with(VARIABLES + 1, &[2]), range(Field::Full, 0));
    assert_eq!(
        error_with(VARIABLES + 2, &million),
        range(Field::Direction, 0)
    );
    assert_eq!(
        error_with(VARIABLES + 26 + 2, &two),
        range(Field::Direction, 1)
    );
    // Not a direction at all.
    assert_eq!(
        error_with(VARIABLES + 2, &[0; 8]),
        range(Field::Direction, 0)
    );
    // The least number of all, whose negative does not exist.
    let least = i32::MIN.to_le_bytes();
    assert_eq!(
        error_with(VARIABLES + 2, &least),
        range(Field::Direction, 0)
    );
    assert_eq!(
        error_with(VARIABLES + 26 + 22, &two),
        range(Field::Bounds, 1)
    );
    // Bounds out of order.
    assert_eq!(error_with(VARIABLES + 18, &five), range(Field::Bounds, 0));
    // The second joint.
    let second = JOINTS + 132;
    assert_eq!(error_with(second, &[1]), range(Field::Motion, 1));
    assert_eq!(error_with(second + 1, &[0]), range(Field::Motion, 1));
    assert_eq!(error_with(second + 1, &[2]), range(Field::Variable, 1));
    assert_eq!(error_with(second + 2, &[0x80]), range(Field::Multiple, 1));
    assert_eq!(error_with(second + 20, &two), range(Field::Bounds, 1));
    assert_eq!(error_with(TIP, &two), range(Field::Rotation, 3));
    assert_eq!(error_with(TIP, &least), range(Field::Rotation, 3));
    assert_eq!(error_with(TIP + 36, &least), range(Field::TurnSlack, 3));
    assert_eq!(error_with(TIP + 40, &two), range(Field::Bounds, 3));
    assert_eq!(error_with(TIP + 64, &two), range(Field::Bounds, 3));
    assert_eq!(
        error_with(TIP + 88, &i64::MIN.to_le_bytes()),
        range(Field::Square, 3)
    );
    assert_eq!(
        error_with(TIP + 96, &i64::MAX.to_le_bytes()),
        range(Field::Square, 3)
    );
}

#[test]
fn the_fingerprint_must_be_the_machines() {
    // Another fingerprint, another exponent, another value within its range.
    assert_eq!(error_with(8, &[0; 8]), Some(ImageError::Fingerprint));
    assert_eq!(error_with(7, &[4]), Some(ImageError::Fingerprint));
    assert_eq!(error_with(JOINTS + 2, &[2]), Some(ImageError::Fingerprint));
}

#[test]
fn any_bytes_give_an_answer() {
    let mut numbers = Numbers(0x5eed);
    let whole = bytes();
    for _ in 0..20_000 {
        let mut bytes = whole.clone();
        bytes.truncate(whole.len() - numbers.below(2) * numbers.below(whole.len()));
        for _ in 0..1 + numbers.below(4) {
            if bytes.len() > 8 {
                let at = 4 + numbers.below(bytes.len() - 8);
                bytes[at] = numbers.next() as u8;
            }
        }
        if bytes.len() > 4 && numbers.below(2) == 0 {
            bytes = summed(bytes);
        }
        // What loads is written as it was.
        if let Ok(machine) = load::<8>(&bytes) {
            assert_eq!(image(&machine).to_vec(), bytes);
        }
    }
}
