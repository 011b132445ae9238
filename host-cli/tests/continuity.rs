//! Numbers and digests of a log, at the edges that no short log reaches.

use balk::log::{Content, Continuity, Finding};
use balk_core::fixed::Interval;
use balk_core::record::{Frame, Record, Seal, chained, read};
use balk_core::screen::{Options, Step};
use balk_core::target::{Orientation, Target};

/// The record of that number after one with that digest.
fn record(sequence: u32, before: u64) -> Record {
    let mut record = Record {
        sequence,
        digest: 0,
        fingerprint: 1,
        options: Options::default(),
        target: Target {
            position: [Interval::ZERO; 3],
            orientation: Orientation::Free,
        },
        steps: [Step::Bounds].into_iter().collect(),
    };
    record.digest = chained(before, &record.bytes());
    match read(&record.bytes()) {
        Ok(Frame::Record(record)) => record,
        other => panic!("{other:?}"),
    }
}

/// A continuity and the digest of the record it saw last.
struct Run(Continuity, u64);

impl Run {
    fn new() -> Run {
        Run(Continuity::new(), 0)
    }

    fn see(&mut self, record: &Record) -> Option<Finding> {
        self.1 = record.digest;
        self.0.see(&Content::Record(Box::new(record.clone())))
    }

    /// Sees the record of that number that follows the last one seen.
    fn next(&mut self, sequence: u32) -> Option<Finding> {
        self.see(&record(sequence, self.1))
    }

    fn seal(&mut self, next: u32, lost: u32) -> Option<Finding> {
        let digest = self.1;
        self.0.see(&Content::Seal(Seal { next, digest, lost }))
    }
}

#[test]
fn a_log_in_order_is_continuous() {
    let mut run = Run::new();
    assert_eq!(run.0.end(), Some(Finding::NotSealed { after: None }));
    for number in 0..200 {
        assert_eq!(run.next(number), None);
    }
    assert_eq!(run.0.end(), Some(Finding::NotSealed { after: Some(199) }));
    assert_eq!(run.seal(200, 0), None);
    assert_eq!((run.0.end(), run.0.missing(), run.0.lost()), (None, 0, 0));
}

#[test]
fn numbers_wrap() {
    let mut run = Run::new();
    let begin = u32::MAX - 1;
    assert_eq!(
        run.next(begin),
        Some(Finding::Missing {
            count: begin,
            after: None
        })
    );
    assert_eq!(run.next(u32::MAX), None);
    assert_eq!(run.next(0), None);
    assert_eq!(run.next(1), None);
    assert_eq!(run.next(u32::MAX), Some(Finding::Repeated));
}

#[test]
fn late_records_are_told_from_repeated_ones_within_64_numbers() {
    let mut run = Run::new();
    for number in 0..=100 {
        if number != 30 && number != 90 {
            run.next(number);
        }
    }
    assert_eq!(run.0.missing(), 2);
    let after = Some(100);
    assert_eq!(run.next(90), Some(Finding::OutOfOrder { after }));
    assert_eq!(run.0.missing(), 1);
    assert_eq!(run.next(90), Some(Finding::Repeated));
    assert_eq!(run.next(37), Some(Finding::Repeated));
    // Longer ago than is remembered.
    assert_eq!(run.next(36), Some(Finding::OutOfOrder { after }));
    assert_eq!(run.next(30), Some(Finding::OutOfOrder { after }));
    assert_eq!(run.0.missing(), 1);
}

#[test]
fn a_wide_gap_forgets_what_lies_before_it() {
    let mut run = Run::new();
    run.next(0);
    let missing = |count, after| Some(Finding::Missing { count, after });
    assert_eq!(run.next(1000), missing(999, Some(0)));
    assert_eq!(
        run.next(999),
        Some(Finding::OutOfOrder { after: Some(1000) })
    );
    assert_eq!(run.seal(1003, 5), missing(2, Some(1000)));
    assert_eq!((run.0.missing(), run.0.lost()), (1000, 5));
}

#[test]
fn a_digest_that_does_not_follow_is_found() {
    let mut run = Run::new();
    assert_eq!(
        run.see(&record(0, 9)),
        Some(Finding::ChainBroken { after: None })
    );
    assert_eq!(run.next(1), None);
    let after = Some(1);
    assert_eq!(run.see(&record(2, 9)), Some(Finding::ChainBroken { after }));
    run.1 ^= 1;
    let after = Some(2);
    assert_eq!(run.seal(3, 0), Some(Finding::ChainBroken { after }));
}

#[test]
fn a_seal_bridges_a_gap() {
    let mut run = Run::new();
    run.next(0);
    // The records 1 and 2 are lost, the seal knows the digest of the latter.
    run.1 = record(2, 7).digest;
    assert!(matches!(
        run.seal(3, 2),
        Some(Finding::Missing { count: 2, .. })
    ));
    assert_eq!(run.next(3), None);
    assert_eq!(
        run.see(&record(4, 9)),
        Some(Finding::ChainBroken { after: Some(3) })
    );
}

#[test]
fn an_old_seal_and_damage_after_a_seal_leave_the_log_open() {
    let mut run = Run::new();
    run.next(0);
    run.next(1);
    assert_eq!(run.seal(1, 0), Some(Finding::OutOfOrder { after: Some(1) }));
    assert!(run.0.end().is_some());
    run.seal(2, 0);
    assert!(run.0.end().is_none());
    run.0.see(&Content::Damaged(String::new()));
    assert!(run.0.end().is_some());
}

#[test]
fn a_new_run_begins_at_zero() {
    let mut run = Run::new();
    run.next(0);
    run.next(1);
    run.seal(4, 2);
    let first = record(0, 0);
    assert_eq!(run.see(&first), None);
    run.seal(2, 1);
    assert_eq!((run.0.missing(), run.0.lost()), (3, 3));
    // And once more, though something is missing at the end of the second.
    run.next(2);
    assert_eq!(run.see(&first), Some(Finding::NotSealed { after: Some(2) }));
}
