//! The simplex: answers, limits, warm starts, and a general-purpose solver on the same systems.

use balk_core::certificate::{Range, Row, Term, Unproved};
use balk_core::simplex::{Outcome, RowRejected, Simplex, TooManyUnknowns};
use balk_tests::measure::simplex::{self as measure, Family, OwnedRow, System};
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;

fn row<'a>(terms: &'a [Term], range: Range) -> Row<'a> {
    Row { terms, range }
}

fn term(unknown: u16, coefficient: i32) -> Term {
    Term {
        unknown,
        coefficient,
    }
}

/// x + y >= 3 in [0, 2]^2, then x - y >= 2 as well, then y >= 1.
#[test]
fn rows_and_boxes_come_one_at_a_time() {
    let mut simplex = Simplex::<2, 2>::new();
    simplex.start([Range::between(0, 2); 2]).unwrap();
    assert_eq!(simplex.solve(0), Outcome::Feasible);
    simplex
        .add_row(row(&[term(0, 1), term(1, 1)], Range::at_least(3)))
        .unwrap();
    assert_eq!(simplex.solve(0), Outcome::OutOfPivots);
    assert_eq!(simplex.solve(5), Outcome::Feasible);
    assert!(simplex.value(0).unwrap() + simplex.value(1).unwrap() >= 3.0);
    simplex
        .add_row(row(&[term(0, 2), term(1, -2)], Range::at_least(2)))
        .unwrap();
    assert_eq!(simplex.solve(5), Outcome::Feasible);
    assert_eq!((simplex.value(0), simplex.value(1)), (Some(2.0), Some(1.0)));
    assert!(simplex.set_box(0, Range::between(0, 1)));
    assert_eq!(simplex.solve(5), Outcome::Infeasible);
    assert!(simplex.set_box(0, Range::between(0, 2)));
    assert_eq!(simplex.solve(5), Outcome::Feasible);
    assert_eq!(simplex.rows(), 2);
    simplex.start([Range::FREE]).unwrap();
    assert_eq!((simplex.rows(), simplex.pivots()), (0, 0));
}

#[test]
fn what_does_not_fit_is_refused() {
    let mut simplex = Simplex::<1, 2>::new();
    assert_eq!(simplex.start([Range::FREE; 3]), Err(TooManyUnknowns(2)));
    assert_eq!(simplex.start([Range::at_most(-1); 2]), Ok(()));
    assert!(!simplex.set_box(2, Range::FREE));
    assert_eq!(simplex.value(2), None);
    assert_eq!(simplex.value(1), Some(-1.0));
    let far = [term(0, 1), term(2, 1)];
    assert_eq!(
        simplex.add_row(row(&far, Range::FREE)),
        Err(RowRejected::UnknownOutOfRange)
    );
    assert_eq!(simplex.rows(), 0);
    assert_eq!(simplex.add_row(row(&far[..1], Range::at_least(0))), Ok(()));
    assert_eq!(
        simplex.add_row(row(&far[..1], Range::FREE)),
        Err(RowRejected::Full)
    );
    assert_eq!(simplex.solve(5), Outcome::Infeasible);
}

#[test]
fn no_unknowns() {
    let mut simplex = Simplex::<2, 1>::new();
    simplex.start([]).unwrap();
    assert_eq!(simplex.solve(1), Outcome::Feasible);
    simplex.add_row(row(&[], Range::at_least(1))).unwrap();
    assert_eq!(simplex.solve(1), Outcome::Infeasible);
    let mut multipliers = [7; 3];
    simplex.multipliers(&mut multipliers);
    assert_eq!(multipliers, [-(1 << 29), 0, 0]);
}

/// Without a conflict there are no multipliers, not even those of an earlier conflict.
#[test]
fn multipliers_belong_to_the_last_answer() {
    let mut simplex = Simplex::<1, 1>::new();
    simplex.start([Range::between(0, 1)]).unwrap();
    let multipliers = |simplex: &Simplex<1, 1>| {
        let mut multipliers = [7];
        simplex.multipliers(&mut multipliers);
        multipliers[0]
    };
    simplex
        .add_row(row(&[term(0, 1)], Range::at_least(2)))
        .unwrap();
    assert_eq!(multipliers(&simplex), 0);
    assert_eq!(simplex.solve(5), Outcome::Infeasible);
    assert!(multipliers(&simplex) < 0);
    simplex.set_box(0, Range::between(0, 2));
    assert_eq!(multipliers(&simplex), 0);
    assert_eq!(simplex.solve(5), Outcome::Feasible);
    assert_eq!(multipliers(&simplex), 0);
}

/// The sum of sizes is at most 2^30, so the largest coefficients cannot overflow a left-over.
#[test]
fn multipliers_leave_room_for_the_largest_coefficients() {
    let mut random = ChaCha8Rng::seed_from_u64(3);
    let mut proofs = 0;
    for _ in 0..200 {
        let count = random.random_range(1..=20);
        let sign = |random: &mut ChaCha8Rng| if random.random() { i32::MAX } else { i32::MIN };
        let rows = (0..count).map(|_| {
            let terms: Vec<_> = (0..6).map(|unknown| (unknown, sign(&mut random))).collect();
            OwnedRow::new(terms, Range::at_most(-(1 << 40)))
        });
        let system = System {
            boxes: vec![Range::between(-1000, 1000); 6],
            rows: rows.collect(),
        };
        let mut simplex = Simplex::<20, 6>::new();
        system.load(&mut simplex);
        let infeasible = simplex.solve(500) == Outcome::Infeasible;
        let mut multipliers = [0; 20];
        simplex.multipliers(&mut multipliers);
        let sum: i64 = multipliers
            .iter()
            .map(|&multiplier| i64::from(multiplier).abs())
            .sum();
        assert!(sum <= (1 << 30) + 20);
        assert_eq!(infeasible, sum >= (1 << 29) - 20);
        let answer = system.prove(&multipliers);
        assert_ne!(answer.as_ref().err(), Some(&Unproved::Overflow));
        proofs += u32::from(answer.is_ok());
    }
    assert!(proofs > 0);
}

/// Ends of the integer types, empty ranges and useless rows: no panic, and no proof of what has a solution.
#[test]
fn extreme_numbers() {
    let mut random = ChaCha8Rng::seed_from_u64(4);
    let ends = [
        i64::MIN,
        i64::MIN + 1,
        -(1 << 40),
        -1,
        0,
        1,
        1 << 40,
        i64::MAX - 1,
        i64::MAX,
    ];
    let coefficients = [i32::MIN, -1, 0, 1, i32::MAX];
    for _ in 0..20_000 {
        let mut side =
            || (random.random_range(0..4) > 0).then(|| ends[random.random_range(0..ends.len())]);
        let boxes: Vec<Range> = (0..4)
            .map(|_| Range {
                lower: side(),
                upper: side(),
            })
            .collect();
        let ranges: Vec<Range> = (0..6)
            .map(|_| Range {
                lower: side(),
                upper: side(),
            })
            .collect();
        let rows = ranges.into_iter().map(|range| {
            let terms: Vec<_> = (0..4)
                .map(|unknown| (unknown, coefficients[random.random_range(0..5)]))
                .collect();
            OwnedRow::new(terms, range)
        });
        let mut system = System {
            boxes,
            rows: rows.collect(),
        };
        let mut simplex = Simplex::<6, 4>::new();
        let mut multipliers = [0; 6];
        system.load(&mut simplex);
        let _ = simplex.solve(100);
        simplex.multipliers(&mut multipliers);
        let _ = system.prove(&multipliers);
        // Widen everything to hold the origin.
        for range in system
            .boxes
            .iter_mut()
            .chain(system.rows.iter_mut().map(|row| &mut row.range))
        {
            range.lower = range.lower.map(|lower| lower.min(0));
            range.upper = range.upper.map(|upper| upper.max(0));
        }
        system.load(&mut simplex);
        assert_eq!(simplex.solve(100), Outcome::Feasible);
    }
}

/// Rows added one by one to a solved tableau, and boxes changed in it, give the answer of a fresh start.
#[test]
fn warm_equals_cold() {
    let mut random = ChaCha8Rng::seed_from_u64(5);
    let (mut feasible, mut infeasible) = (0, 0);
    for _ in 0..200 {
        let mut system = Family::Open.draw(12, 14, 4, &mut random);
        let mut warm = Simplex::<14, 12, f64>::new();
        let rows = std::mem::take(&mut system.rows);
        warm.start(system.boxes.iter().copied()).unwrap();
        for row in rows {
            warm.add_row(row.as_row()).unwrap();
            system.rows.push(row);
            let unknown = random.random_range(0..12);
            let (lower, upper) = (
                system.boxes[unknown].lower.unwrap(),
                system.boxes[unknown].upper.unwrap(),
            );
            system.boxes[unknown] = Range::between(lower + (upper - lower) / 16, upper);
            assert!(warm.set_box(unknown, system.boxes[unknown]));
            let answer = warm.solve(500);
            let mut cold = Simplex::<14, 12, f64>::new();
            system.load(&mut cold);
            assert_eq!(answer, cold.solve(500));
            match answer {
                Outcome::Feasible => feasible += 1,
                _ => {
                    let mut multipliers = vec![0; warm.rows()];
                    warm.multipliers(&mut multipliers);
                    assert!(system.prove(&multipliers).is_ok());
                    infeasible += 1;
                    break;
                }
            }
            assert_met(&system, |unknown| warm.value(unknown).unwrap());
        }
    }
    assert!(
        feasible > 100 && infeasible > 100,
        "{feasible} {infeasible}"
    );
}

/// Every box and row holds, up to one part in 10^8 of the size of the numbers involved.
fn assert_met(system: &System, value: impl Fn(usize) -> f64) {
    let holds = |value: f64, size: f64, range: Range| {
        assert!(
            range
                .lower
                .is_none_or(|lower| value >= lower as f64 - size * 1e-8)
        );
        assert!(
            range
                .upper
                .is_none_or(|upper| value <= upper as f64 + size * 1e-8)
        );
    };
    for (unknown, &range) in system.boxes.iter().enumerate() {
        holds(value(unknown), 1e6, range);
    }
    for row in &system.rows {
        let part = |term: &Term| f64::from(term.coefficient) * value(usize::from(term.unknown));
        let size = row
            .terms
            .iter()
            .map(|term| f64::from(term.coefficient).abs() * 1e6)
            .sum();
        holds(row.terms.iter().map(part).sum(), size, row.range);
    }
}

/// Single precision against a general-purpose solver: never a contradiction, and nothing missed.
#[test]
fn agrees_with_a_general_purpose_solver() {
    for family in Family::ALL {
        for (unknowns, rows, density) in [(30, 8, 4), (50, 30, 8), (80, 40, 20)] {
            let tally = measure::tally(family, unknowns, rows, density, 20, 7);
            assert_eq!((tally.contradictions, tally.missed), (0, 0), "{tally:?}");
            match family {
                Family::Feasible => assert_eq!(tally.feasible, tally.systems),
                Family::Infeasible => assert_eq!(tally.proved, tally.systems),
                Family::Open => assert_eq!(tally.proved + tally.feasible, tally.systems),
            }
        }
    }
}

/// What the documentation says of memory.
#[test]
fn size() {
    assert!(size_of::<Simplex<40, 60>>() <= 4 * (40 * 60 + 5 * 40 + 7 * 60));
}
