//! Published linear programs with known answers, through the simplex and the kernel.

#[path = "optimisation_checks/double.rs"]
mod double;
#[path = "optimisation_checks/published.rs"]
mod published;

use balk_core::certificate::{Range, Unproved};
use balk_core::simplex::{Outcome, Real, Simplex};
use balk_tests::measure::simplex::{OwnedRow, System};
use rand::{Rng, SeedableRng};
use rand_chacha::ChaCha8Rng;

/// The combined row is impossible by exactly `margin`: raising the upper side of a row that has multiplier
/// 1 by `margin - 1` leaves a proof, and by `margin` leaves none.
fn assert_margin(system: &System, multipliers: &[i32], margin: i64) {
    let row = multipliers
        .iter()
        .position(|&multiplier| multiplier == 1)
        .expect("no row has multiplier 1");
    let raised = |by: i64| {
        let mut system = system.clone();
        let side = system.rows[row]
            .range
            .upper
            .as_mut()
            .expect("the row has no upper side");
        *side += by;
        system.prove(multipliers)
    };
    assert!(raised(margin - 1).is_ok());
    assert_eq!(
        raised(margin).unwrap_err(),
        Unproved::NotStrict { slack: 0 }
    );
}

/// x1 <= 2, x2 <= 2, x1 + x2 >= 5 with free unknowns: multipliers 1, 1, 1 give 0 <= -1 (J. Farkas, *Theorie
/// der einfachen Ungleichungen*, J. reine angew. Math. 124, 1902; the system is one of SciPy's tests).
#[test]
fn farkas_smallest_certificate() {
    let system = System {
        boxes: vec![Range::FREE; 2],
        rows: vec![
            OwnedRow::new([(0, 1)], Range::at_most(2)),
            OwnedRow::new([(1, 1)], Range::at_most(2)),
            OwnedRow::new([(0, -1), (1, -1)], Range::at_most(-5)),
        ],
    };
    assert_margin(&system, &[1, 1, 1], 1);
    assert!(published::direct::<f32>(&system).is_ok());
}

/// Netlib itest2: row 2 + row 3 + 3 row 8 gives 0 <= -11 (Chinneck and Dravnieks 1991).
#[test]
fn itest2_certificate() {
    assert_margin(&published::read("itest2"), &[0, 1, 1, 0, 0, 0, 0, 3, 0], 11);
}

/// Netlib itest6: 5/4 row 1 + row 6 + 5/4 row 7 + 9/4 row 9 gives 0 <= -326250 (Chinneck and Dravnieks
/// 1991). All times 4, and row 1 is read as 5 times itself.
#[test]
fn itest6_certificate() {
    assert_margin(
        &published::read("itest6"),
        &[1, 0, 0, 0, 0, 4, 5, 0, 9, 0, 0],
        4 * 326_250,
    );
}

#[test]
fn netlib_single_precision_is_enough() {
    for name in ["itest2", "itest6", "woodinfe"] {
        assert!(
            published::direct::<f32>(&published::read(name)).is_ok(),
            "{name}"
        );
    }
}

/// Unbounded unknowns forgive no left-over of the wrong sign, so the multipliers must be exact.
#[test]
fn netlib_common_denominator() {
    let system = published::read("bgprtr");
    assert_eq!(
        published::direct::<f64>(&system).unwrap_err(),
        Unproved::Unbounded
    );
    assert!(published::common_denominator(&system).is_ok());
}

#[test]
fn netlib_inside_the_cone() {
    for name in ["forest6", "klein1"] {
        let system = published::read(name);
        assert_eq!(
            published::common_denominator(&system).unwrap_err(),
            Unproved::Unbounded,
            "{name}"
        );
        assert!(published::interior(&system).is_ok(), "{name}");
    }
}

/// A = [[1, 1], [-1, -1]], b = (1, -1.1), y = (1, 1.0001) leaves -1e-4 on each unknown. Proved on boxes of
/// side 10, not of side 1000; the break-even side is 500.55 (method: A. Neumaier and O. Shcherbina, *Safe
/// bounds in linear and mixed-integer linear programming*, Math. Program. 99, 2004, 283-296). Unknowns in
/// hundredths, rows times 1000, multipliers times 10,000.
#[test]
fn safe_bounds_break_even() {
    let prove = |side: i64| {
        System {
            boxes: vec![Range::between(0, side); 2],
            rows: vec![
                OwnedRow::new([(0, 10), (1, 10)], Range::at_most(1000)),
                OwnedRow::new([(0, -10), (1, -10)], Range::at_most(-1100)),
            ],
        }
        .prove(&[10_000, 10_001])
    };
    assert!(prove(1_000).is_ok());
    assert!(prove(50_054).is_ok());
    assert_eq!(prove(50_055).unwrap_err(), Unproved::NotStrict { slack: 0 });
    // 0.09989 in units of 10^-7.
    assert_eq!(
        prove(100_000).unwrap_err(),
        Unproved::NotStrict { slack: 998_900 }
    );
}

/// The "innocuous" integer program of Neumaier and Shcherbina 2004, section 1 (from memory), with n = 20
/// and s = 6. Many solvers called it infeasible; (1, 2, 1, 2, ..., 1, 2) meets every row with equality.
fn innocuous() -> System {
    let mut rows = vec![OwnedRow::new([(0, 7), (1, -1)], Range::at_least(5))];
    for i in 2..=19_usize {
        let side = if i % 2 == 0 { 7 } else { -7 };
        rows.push(OwnedRow::new(
            [(i - 2, -6), (i - 1, 7), (i, -1)],
            Range::at_least(side),
        ));
    }
    rows.push(OwnedRow::new(
        [(17, -6), (18, -17), (19, 3)],
        Range::at_least(-23),
    ));
    let boxes = (1..=20)
        .map(|i| Range::between(0, if i <= 13 { 10 } else { 1_000_000 }))
        .collect();
    System { boxes, rows }
}

#[test]
fn innocuous_is_never_refuted() {
    let mut system = innocuous();
    let point = |unknown: usize| if unknown.is_multiple_of(2) { 1 } else { 2 };
    for row in &system.rows {
        let value: i64 = row
            .terms
            .iter()
            .map(|term| i64::from(term.coefficient) * point(usize::from(term.unknown)))
            .sum();
        assert_eq!(Some(value), row.range.lower);
    }
    // As stated, then with ever more unknowns fixed at the solution, as a search would.
    for fixed in 0..=20 {
        assert_eq!(
            outcome::<f64>(&system, 500),
            Outcome::Feasible,
            "{fixed} fixed"
        );
        assert!(published::direct::<f64>(&system).is_err());
        assert!(published::direct::<f32>(&system).is_err());
        if fixed < 20 {
            system.boxes[19 - fixed] = Range::exactly(point(19 - fixed));
        }
    }
    let mut random = ChaCha8Rng::seed_from_u64(11);
    for size in (0..31).map(|bits| (1i64 << bits) as i32) {
        for _ in 0..1000 {
            let multipliers: Vec<i32> = (0..20).map(|_| -random.random_range(0..=size)).collect();
            assert!(system.prove(&multipliers).is_err());
        }
    }
}

fn outcome<F: Real>(system: &System, budget: u32) -> Outcome {
    let mut simplex = Box::new(Simplex::<66, 95, F>::new());
    system.load(&mut simplex);
    simplex.solve(budget)
}

/// A program "maximise, subject to rows and boxes" with its optimum, as two feasibility questions.
struct Maximise {
    objective: Vec<(usize, i32)>,
    rows: Vec<OwnedRow>,
    boxes: Vec<Range>,
    optimum: i64,
}

impl Maximise {
    fn reaching(&self, value: i64) -> System {
        let mut rows = self.rows.clone();
        rows.push(OwnedRow::new(
            self.objective.iter().copied(),
            Range::at_least(value),
        ));
        System {
            boxes: self.boxes.clone(),
            rows,
        }
    }

    /// The optimum can be reached; one thousandth or one unit more cannot, with proof. Both precisions say
    /// so within 200 pivots.
    fn check(&self) {
        let reachable = self.reaching(self.optimum);
        let beyond = self.reaching(self.optimum + i64::max(1, self.optimum / 1000));
        assert_eq!(outcome::<f32>(&reachable, 200), Outcome::Feasible);
        assert_eq!(outcome::<f64>(&reachable, 200), Outcome::Feasible);
        assert_eq!(outcome::<f32>(&beyond, 200), Outcome::Infeasible);
        assert_eq!(outcome::<f64>(&beyond, 200), Outcome::Infeasible);
        assert!(
            published::direct::<f64>(&beyond)
                .or_else(|_| published::common_denominator(&beyond))
                .is_ok()
        );
    }
}

/// E. M. L. Beale, *Cycling in the dual simplex algorithm*, Naval Res. Logist. Q. 2, 1955, 269-275 (from
/// memory): optimum 5/4. Rows and objective times 4.
#[test]
fn beale_ends() {
    Maximise {
        objective: vec![(0, 3), (1, -80), (2, 2), (3, -24)],
        rows: vec![
            OwnedRow::new([(0, 1), (1, -32), (2, -4), (3, 36)], Range::at_most(0)),
            OwnedRow::new([(0, 2), (1, -48), (2, -2), (3, 12)], Range::at_most(0)),
            OwnedRow::new([(2, 1)], Range::at_most(1)),
        ],
        boxes: vec![Range::at_least(0); 4],
        optimum: 5,
    }
    .check();
}

/// V. Chvatal, *Linear Programming*, 1983: optimum 1. The first two rows times 2.
#[test]
fn chvatal_ends() {
    Maximise {
        objective: vec![(0, 10), (1, -57), (2, -9), (3, -24)],
        rows: vec![
            OwnedRow::new([(0, 1), (1, -11), (2, -5), (3, 18)], Range::at_most(0)),
            OwnedRow::new([(0, 1), (1, -3), (2, -1), (3, 2)], Range::at_most(0)),
            OwnedRow::new([(0, 1)], Range::at_most(1)),
        ],
        boxes: vec![Range::at_least(0); 4],
        optimum: 1,
    }
    .check();
}

/// H. W. Kuhn's example (Balinski and Tucker 1969; Gass and Vinjamuri 2004; from memory): optimum 2. The
/// second row times 3.
#[test]
fn kuhn_ends() {
    Maximise {
        objective: vec![(0, 2), (1, 3), (2, -1), (3, -12)],
        rows: vec![
            OwnedRow::new([(0, -2), (1, -9), (2, 1), (3, 9)], Range::at_most(0)),
            OwnedRow::new([(0, 1), (1, 3), (2, -1), (3, -6)], Range::at_most(0)),
            OwnedRow::new([(0, 2), (1, 3), (2, -1), (3, -12)], Range::at_most(2)),
        ],
        boxes: vec![Range::at_least(0); 4],
        optimum: 2,
    }
    .check();
}

/// V. Klee and G. J. Minty 1972, in the form of Chvatal 1983: maximise sum 10^(n-j) x_j subject to
/// 2 sum_{j<i} 10^(i-j) x_j + x_i <= 100^(i-1). Optimum 100^(n-1). Row i implies
/// x_i <= 100^(i-1), which as a box tells the simplex the size of x_i.
#[test]
fn klee_minty_powers_of_ten_ends() {
    for n in 2..=8_u32 {
        let power = |exponent: u32| 10_i32.pow(exponent);
        Maximise {
            objective: (1..=n).map(|j| (j as usize - 1, power(n - j))).collect(),
            rows: (1..=n)
                .map(|i| {
                    let terms = (1..i)
                        .map(|j| (j as usize - 1, 2 * power(i - j)))
                        .chain([(i as usize - 1, 1)]);
                    OwnedRow::new(terms, Range::at_most(100_i64.pow(i - 1)))
                })
                .collect(),
            boxes: (1..=n)
                .map(|i| Range::between(0, 100_i64.pow(i - 1)))
                .collect(),
            optimum: 100_i64.pow(n - 1),
        }
        .check();
    }
}

/// The variant of the SciPy benchmarks: maximise sum 2^(D-i) x_i subject to
/// sum_{j<i} 2^(i-j+1) x_j + x_i <= 5^i. Optimum 5^D. Boxes as above.
#[test]
fn klee_minty_powers_of_five_ends() {
    for d in 2..=7_u32 {
        Maximise {
            objective: (1..=d).map(|i| (i as usize - 1, 1 << (d - i))).collect(),
            rows: (1..=d)
                .map(|i| {
                    let terms = (1..i)
                        .map(|j| (j as usize - 1, 1 << (i - j + 1)))
                        .chain([(i as usize - 1, 1)]);
                    OwnedRow::new(terms, Range::at_most(5_i64.pow(i)))
                })
                .collect(),
            boxes: (1..=d).map(|i| Range::between(0, 5_i64.pow(i))).collect(),
            optimum: 5_i64.pow(d),
        }
        .check();
    }
}
