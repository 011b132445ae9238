//! The log's ring: whole frames, the newest kept, every loss counted.

mod common;

use balk_core::record::{Frame, Log, MOST_FRAME_BYTES, NoRoom, RecordBytes, read};
use common::Numbers;
use std::collections::VecDeque;

/// The frames of a stream of bytes, each decoded. Between two zero bytes lies a frame or nothing.
fn frames(stream: &[u8]) -> Vec<Frame> {
    stream
        .split(|byte| *byte == 0)
        .filter(|stuffed| !stuffed.is_empty())
        .map(|stuffed| {
            let mut bytes = [0; MOST_FRAME_BYTES];
            let report = cobs::decode(stuffed, &mut bytes).unwrap();
            read(&bytes[..report.frame_size()]).unwrap()
        })
        .collect()
}

fn sequences(stream: &[u8]) -> Vec<u32> {
    let number = |frame| match frame {
        Frame::Record(record) => record.sequence,
        Frame::Seal(seal) => panic!("{seal:?}"),
    };
    frames(stream).into_iter().map(number).collect()
}

fn drain<const BYTES: usize>(log: &mut Log<BYTES>) -> Vec<u8> {
    let mut all = vec![0; BYTES];
    let count = log.read(&mut all);
    assert!(log.is_empty());
    all.truncate(count);
    all
}

/// Records of the same length.
fn record(numbers: &mut Numbers) -> RecordBytes {
    numbers.record(1, Some(1)).bytes()
}

#[test]
fn frames_lie_between_zero_bytes() {
    let mut log = Log::<256>::new();
    let bytes = record(&mut Numbers(1));
    let length = bytes.len();
    assert_eq!(log.push(bytes), 0);
    let stream = drain(&mut log);
    assert_eq!(stream.len(), length + 3);
    assert_eq!((stream[0], stream[length + 2]), (0, 0));
    assert!(stream[1..length + 2].iter().all(|byte| *byte != 0));
    assert_eq!(sequences(&stream), [0]);
}

#[test]
fn pieces_of_any_size_give_the_same_bytes() {
    let mut log = Log::<4096>::new();
    let mut numbers = Numbers(2);
    for _ in 0..10 {
        log.push(record(&mut numbers));
    }
    log.seal().unwrap();
    let whole = drain(&mut log.clone());
    for size in [1, 2, 7, 64, 99, 1000] {
        let mut log = log.clone();
        let mut stream: Vec<u8> = Vec::new();
        let mut piece = vec![0; size];
        while !log.is_empty() {
            let count = log.read(&mut piece);
            assert!(count > 0);
            stream.extend(&piece[..count]);
        }
        assert_eq!(stream, whole, "{size}");
    }
}

#[test]
fn the_oldest_make_room_and_are_counted() {
    let mut log = Log::<300>::new();
    let mut numbers = Numbers(3);
    let length = record(&mut numbers).len() + 3;
    assert!(
        (76..=100).contains(&length),
        "three fit, four do not: {length}"
    );
    for _ in 0..8 {
        log.push(record(&mut numbers));
    }
    assert_eq!(log.lost(), 5);
    let stream = drain(&mut log);
    assert_eq!(sequences(&stream), [5, 6, 7]);
    log.seal().unwrap();
    let seals = frames(&drain(&mut log));
    assert!(matches!(seals[..], [Frame::Seal(seal)] if (seal.next, seal.lost) == (8, 5)));
}

#[test]
fn the_smallest_log_holds_a_seal() {
    let mut log = Log::<25>::new();
    assert_eq!(log.seal(), Ok(()));
    assert_eq!(drain(&mut log).len(), 25);
}

#[test]
fn a_seal_counts_what_it_pushed_out() {
    let mut log = Log::<100>::new();
    log.push(record(&mut Numbers(4)));
    log.seal().unwrap();
    let found = frames(&drain(&mut log));
    assert!(matches!(found[..], [Frame::Seal(seal)] if (seal.next, seal.lost) == (1, 1)));
}

#[test]
fn a_frame_being_sent_stays_whole() {
    let mut numbers = Numbers(5);
    for sent in 1..=91 {
        let mut log = Log::<300>::new();
        for _ in 0..3 {
            log.push(record(&mut numbers));
        }
        let mut stream = vec![0; sent];
        assert_eq!(log.read(&mut stream), sent);
        for _ in 0..4 {
            log.push(record(&mut numbers));
        }
        stream.extend(drain(&mut log));
        let found = sequences(&stream);
        assert_eq!(found.len() as u32 + log.lost(), 7);
        assert_eq!(
            (found[0], found[found.len() - 1]),
            (0, 6),
            "{sent}: {found:?}"
        );
    }
}

#[test]
fn what_never_fits_is_counted() {
    let mut log = Log::<80>::new();
    assert_eq!(log.push(record(&mut Numbers(6))), 0);
    assert_eq!((log.lost(), log.is_empty()), (1, true));
    // A short record is being sent, and there is no room beside it.
    let mut log = Log::<80>::new();
    log.push(Numbers(7).record(1, Some(0)).bytes());
    assert_eq!(log.read(&mut [0]), 1);
    assert_eq!(log.seal(), Err(NoRoom));
    assert_eq!(log.push(record(&mut Numbers(8))), 1);
    assert_eq!(log.lost(), 1);
    assert_eq!(log.read(&mut [0; 60]), 60);
    assert_eq!(log.seal(), Ok(()));
}

/// Random pushes, seals and reads against a plain queue of what must come out.
fn against_a_queue<const BYTES: usize>(seed: u64) -> u32 {
    let mut numbers = Numbers(seed);
    let mut log = Log::<BYTES>::new();
    let mut stream = Vec::new();
    let mut pushed = 0;
    for _ in 0..2000 {
        match numbers.below(4) {
            0 | 1 => {
                let (parts, cones) = (1 + numbers.below(64), numbers.below(4));
                assert_eq!(log.push(numbers.record(parts, Some(cones)).bytes()), pushed);
                pushed += 1;
            }
            2 => {
                let mut piece = vec![0; numbers.below(BYTES)];
                let count = log.read(&mut piece);
                stream.extend(&piece[..count]);
            }
            _ => {
                let _ = log.seal();
            }
        }
    }
    stream.extend(drain(&mut log));
    log.seal().unwrap();
    stream.extend(drain(&mut log));
    // Whole frames alone, in order; what is missing is what the log counted.
    let (mut next, mut missing) = (0, 0);
    let mut found: VecDeque<Frame> = frames(&stream).into();
    while let Some(frame) = found.pop_front() {
        match frame {
            Frame::Record(record) => {
                assert!(record.sequence >= next);
                missing += record.sequence - next;
                next = record.sequence + 1;
            }
            Frame::Seal(seal) => {
                assert!(seal.next >= next);
                if found.is_empty() {
                    assert_eq!(seal.next, pushed);
                    assert_eq!(seal.lost, missing + (seal.next - next));
                }
            }
        }
    }
    assert_eq!(log.lost(), missing + pushed - next);
    missing
}

#[test]
fn any_use_keeps_frames_whole_and_losses_counted() {
    for seed in 1..40 {
        assert!(against_a_queue::<100>(seed) > 0);
        assert!(against_a_queue::<300>(seed) > 0);
        against_a_queue::<1024>(seed);
        against_a_queue::<65_536>(seed);
    }
}
