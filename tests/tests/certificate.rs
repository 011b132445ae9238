//! The kernel against plain reasoning on small systems, and at every limit.

use balk_core::certificate::{Combination, Range, Refuted, Row, Term, Unproved};
use balk_tests::measure::kernel::{exhaust, kernel, term};

#[test]
fn small_systems() {
    let (compared, proofs) = exhaust(-1..=1, &[-1, 1], &[0, 1], 1);
    println!("{compared} combinations compared, {proofs} proofs");
    assert_eq!(compared, 81 * 82 / 2 * 81 * 9);
    assert!(proofs > 10_000);
}

#[test]
fn each_multiplier_uses_its_side() {
    let x = [([1, 0], Range::between(3, 5))];
    // x <= 5 and x >= 6; x >= 3 and x <= 2; not the other way round.
    assert!(kernel(&x, &[1], [Range::at_least(6), Range::FREE]).is_ok());
    assert!(kernel(&x, &[-1], [Range::at_most(2), Range::FREE]).is_ok());
    assert_eq!(
        kernel(&x, &[-1], [Range::at_least(6), Range::FREE]).unwrap_err(),
        Unproved::Unbounded
    );
    assert_eq!(
        kernel(&x, &[1], [Range::at_most(2), Range::FREE]).unwrap_err(),
        Unproved::Unbounded
    );
}

#[test]
fn ranges_have_the_sides_they_say() {
    assert_eq!(
        Range::FREE,
        Range {
            lower: None,
            upper: None
        }
    );
    assert_eq!(
        Range::at_least(1),
        Range {
            lower: Some(1),
            upper: None
        }
    );
    assert_eq!(
        Range::at_most(1),
        Range {
            lower: None,
            upper: Some(1)
        }
    );
    assert_eq!(
        Range::between(1, 2),
        Range {
            lower: Some(1),
            upper: Some(2)
        }
    );
    assert_eq!(
        Range::exactly(1),
        Range {
            lower: Some(1),
            upper: Some(1)
        }
    );
}

#[test]
fn equality_is_not_a_proof() {
    let row = [([1, 1], Range::at_least(4))];
    let slack = |upper| kernel(&row, &[-1], [Range::between(0, 2), Range::at_most(upper)]);
    assert!(slack(1).is_ok());
    assert_eq!(slack(2).unwrap_err(), Unproved::NotStrict { slack: 0 });
    assert_eq!(slack(3).unwrap_err(), Unproved::NotStrict { slack: 1 });
}

#[test]
fn the_empty_sum_proves_nothing() {
    let refute = |left_overs: &mut [i64], boxes: &[Range]| {
        Combination::new(left_overs)
            .refute(boxes.iter().copied())
            .unwrap_err()
    };
    assert_eq!(refute(&mut [], &[]), Unproved::NotStrict { slack: 0 });
    assert_eq!(
        refute(&mut [0; 2], &[Range::between(1, 0); 2]),
        Unproved::NotStrict { slack: 0 }
    );
}

#[test]
fn working_memory_is_cleared() {
    let boxes = [Range::between(0, 1); 2];
    let sum = Combination::new(&mut [i64::MAX, -7]).refute(boxes);
    assert_eq!(sum.unwrap_err(), Unproved::NotStrict { slack: 0 });
}

#[test]
fn a_multiplier_of_zero_looks_at_nothing() {
    let row = Row {
        terms: &[term(9, i32::MAX)],
        range: Range::FREE,
    };
    let sum = Combination::new(&mut [0; 1])
        .add(0, row)
        .unwrap()
        .refute([Range::FREE]);
    assert_eq!(sum.unwrap_err(), Unproved::NotStrict { slack: 0 });
}

#[test]
fn terms_of_one_unknown_add_up() {
    // 2 x + x - 3 x = 0 x.
    let row = Row {
        terms: &[term(0, 2), term(0, 1), term(0, -3)],
        range: Range::at_most(-1),
    };
    assert!(
        Combination::new(&mut [0; 1])
            .add(1, row)
            .unwrap()
            .refute([Range::FREE])
            .is_ok()
    );
}

#[test]
fn unknowns_and_boxes_must_exist() {
    let row = Row {
        terms: &[term(0, 1), term(1, 1)],
        range: Range::at_most(-1),
    };
    let too_far = Combination::new(&mut [0; 1]).add(1, row).unwrap_err();
    assert_eq!(too_far, Unproved::UnknownOutOfRange);
    let boxes = |count: usize| {
        Combination::new(&mut [0; 2])
            .add(1, row)
            .unwrap()
            .refute([Range::at_least(0); 3].into_iter().take(count))
    };
    assert_eq!(boxes(0).unwrap_err(), Unproved::UnknownOutOfRange);
    assert_eq!(boxes(1).unwrap_err(), Unproved::UnknownOutOfRange);
    assert!(boxes(2).is_ok());
    assert!(boxes(3).is_ok());
}

#[test]
fn missing_sides() {
    let add = |multiplier, range| {
        Combination::new(&mut [0; 1])
            .add(
                multiplier,
                Row {
                    terms: &[term(0, 1)],
                    range,
                },
            )
            .map(|_| ())
    };
    assert_eq!(add(1, Range::at_least(0)), Err(Unproved::MissingSide));
    assert_eq!(add(-1, Range::at_most(0)), Err(Unproved::MissingSide));
    assert_eq!(add(i32::MAX, Range::FREE), Err(Unproved::MissingSide));
    assert_eq!(add(i32::MIN, Range::FREE), Err(Unproved::MissingSide));
    assert_eq!(add(-1, Range::at_least(0)), Ok(()));
    assert_eq!(add(1, Range::at_most(0)), Ok(()));
}

/// Products of the largest factors are exact, and the sum of a left-over stops at the ends of `i64`.
#[test]
fn left_over_limits() {
    let add = |steps: &[(i32, i32)], lower: i64, upper: i64| {
        let mut left_overs = [0; 1];
        let sum = steps.iter().try_fold(
            Combination::new(&mut left_overs),
            |sum, &(multiplier, coefficient)| {
                sum.add(
                    multiplier,
                    Row {
                        terms: &[term(0, coefficient)],
                        range: Range::between(0, 0),
                    },
                )
            },
        );
        sum.and_then(|sum| sum.refute([Range::between(lower, upper)]))
    };
    let slack = |slack| Unproved::NotStrict { slack };
    let big = (i32::MIN, i32::MIN);
    assert_eq!(add(&[big], 0, 0).unwrap_err(), slack(0));
    assert_eq!(add(&[big], -1, 0).unwrap_err(), slack(1 << 62));
    assert!(add(&[big], 1, 1).is_ok());
    // 2^62 + 2^62 is one too many; -2^63 is not.
    assert_eq!(add(&[big, big], 0, 0).unwrap_err(), Unproved::Overflow);
    let lowest = [
        (i32::MAX, i32::MIN),
        (1, i32::MIN),
        (i32::MAX, i32::MIN),
        (1, i32::MIN),
    ];
    assert_eq!(add(&lowest, -1, 1).unwrap_err(), slack(1 << 63));
    assert_eq!(
        add(&[&lowest[..], &[(1, -1)]].concat(), -1, 1).unwrap_err(),
        Unproved::Overflow
    );
    let highest = [big, (i32::MAX, i32::MAX), (2, i32::MAX)];
    assert_eq!(
        add(&highest, -1, 1).unwrap_err(),
        slack(i128::from(i64::MAX))
    );
    assert_eq!(
        add(&[&highest[..], &[(1, 1)]].concat(), -1, 1).unwrap_err(),
        Unproved::Overflow
    );
}

/// Right sides of any size count exactly.
#[test]
fn right_side_limits() {
    let prove = |multiplier, range| {
        Combination::new(&mut [0; 0])
            .add(multiplier, Row { terms: &[], range })
            .unwrap()
            .refute([])
    };
    let slack = |slack| Unproved::NotStrict { slack };
    let (low, high) = (i128::from(i64::MIN), i128::from(i64::MAX));
    assert_eq!(
        prove(i32::MAX, Range::at_most(i64::MAX)).unwrap_err(),
        slack(i128::from(i32::MAX) * high)
    );
    assert_eq!(
        prove(i32::MIN, Range::at_least(i64::MIN)).unwrap_err(),
        slack(i128::from(i32::MIN) * low)
    );
    assert!(prove(i32::MAX, Range::at_most(i64::MIN)).is_ok());
    assert!(prove(i32::MIN, Range::at_least(i64::MAX)).is_ok());
}

/// Box contributions are exact up to 2^126 each, and their sum and difference stop at the ends of `i128`.
#[test]
fn box_limits() {
    /// `unknowns` unknowns with a left-over of -2^63 each, upper ends `end`, and right side `side` times 2^31.
    fn refute(unknowns: usize, end: i64, side: i64) -> Result<Refuted, Unproved> {
        let terms: Vec<Term> = (0..unknowns)
            .map(|unknown| term(unknown as u16, i32::MIN))
            .collect();
        let mut left_overs = vec![0; unknowns];
        let zero = Row {
            terms: &terms,
            range: Range::at_most(0),
        };
        let last = Row {
            terms: &[],
            range: Range::at_least(side),
        };
        [i32::MAX, i32::MAX, 2]
            .into_iter()
            .try_fold(Combination::new(&mut left_overs), |sum, multiplier| {
                sum.add(multiplier, zero)
            })?
            .add(i32::MIN, last)?
            .refute((0..unknowns).map(|_| Range::at_most(end)))
    }
    let slack = |slack| Unproved::NotStrict { slack };
    let high = i128::from(i64::MAX);
    assert_eq!(refute(1, i64::MAX, 0).unwrap_err(), slack(high << 63));
    assert!(refute(1, i64::MIN, 0).is_ok());
    assert_eq!(refute(2, i64::MAX, 0).unwrap_err(), slack(high << 64));
    // The least value -2^127 + 2^64 still fits; three of them do not, nor do two of +2^126.
    assert_eq!(refute(3, i64::MAX, 0).unwrap_err(), Unproved::Overflow);
    assert_eq!(refute(2, i64::MIN, 0).unwrap_err(), Unproved::Overflow);
    // The right side less that value does not fit.
    assert_eq!(
        refute(2, i64::MAX, i64::MIN).unwrap_err(),
        Unproved::Overflow
    );
}

#[test]
fn every_reason_reads_differently() {
    let reasons = [
        Unproved::MissingSide,
        Unproved::NotStrict { slack: 12 },
        Unproved::Overflow,
        Unproved::Unbounded,
        Unproved::UnknownOutOfRange,
    ];
    let texts: std::collections::BTreeSet<String> =
        reasons.iter().map(ToString::to_string).collect();
    assert_eq!(texts.len(), reasons.len());
    assert!(texts.iter().all(|text| !text.is_empty()));
    assert!(reasons[1].to_string().contains("12"));
}
